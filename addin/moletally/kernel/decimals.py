"""What the operations of a program mean for long decimals: a table like those of arithmetic.py."""

from decimal import Context, Decimal

from moletally.kernel.arithmetic import Table, slopes, table

__all__ = ["DECIMALS", "DECIMAL_SLOPES", "DIGITS"]

# For DECIMALS to run in (decimal.localcontext): long enough for a condition of 1e30.
DIGITS = Context(prec=50, Emin=-(10**8), Emax=10**8)


def _decimal_power(x: Decimal, y: Decimal) -> Decimal:
    return x**y if x >= 0 or y == y.to_integral_value() else -((-x) ** y)


DECIMALS: Table = table(
    ADD=lambda x, y: x + y,
    SUB=lambda x, y: x - y,
    MUL=lambda x, y: x * y,
    DIV=lambda x, y: x / y,
    POW=_decimal_power,
    MIN=min,
    MAX=max,
    NEG=lambda x, _: -x,
    SQRT=lambda x, _: x.sqrt() if x >= 0 else -(-x).sqrt(),
    EXP=lambda x, _: x.exp(),
    LN=lambda x, _: x.ln(),
    LOG10=lambda x, _: x.log10(),
    ABS=lambda x, _: abs(x),
)


def _decimal_slope(x: Decimal, y: Decimal, _: Decimal) -> Decimal:
    return y * _decimal_power(x if y == y.to_integral_value() else abs(x), y - 1) if y else y


DECIMAL_SLOPES = slopes(_decimal_slope, lambda x, z: z * x.ln() if z else z, DECIMALS, Decimal(1))
