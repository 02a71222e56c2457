"""Laws near zero concentrations: the leading term a*e^q of each law where some species vanish as e.

A third arithmetic runs the same programs: a value is its order q and coefficient a. Orders add in
products, the smallest wins in sums. Where coefficients cancel (1 - exp(-A)) the next order is taken
to be the first: laws are smooth where they are not powers.
"""

import math
from collections.abc import Sequence
from typing import NamedTuple

from moletally.kernel.arithmetic import FLOATS, Table, Value
from moletally.kernel.program import Op
from moletally.kernel.rates import Tape

__all__ = ["Leading", "leading"]

CANCELLED = 1e-12  # a sum smaller than this share of its terms is rounding
LOG_ORDER = 1e-6  # the order that stands for ln(e): smaller than any power, yet without bound


class Leading(NamedTuple):
    """coefficient * e^order, and whether a cancellation was met on the way."""

    order: float
    coefficient: float
    cancelled: bool = False


NOTHING = Leading(math.inf, 0.0)


def _constant(value: float, cancelled: bool = False) -> Leading:
    return Leading(0.0, value, cancelled) if value else NOTHING


def _add(x: Leading, y: Leading) -> Leading:
    cancelled = x.cancelled or y.cancelled
    if x.order != y.order:
        smaller = x if x.order < y.order else y
        return smaller._replace(cancelled=cancelled)
    total = x.coefficient + y.coefficient
    if abs(total) > CANCELLED * max(abs(x.coefficient), abs(y.coefficient)):
        return Leading(x.order, total, cancelled)
    return NOTHING if x.order == math.inf else Leading(x.order + 1.0, 1.0, True)


def _negative(x: Leading) -> Leading:
    return x._replace(coefficient=-x.coefficient)


def _multiply(x: Leading, y: Leading) -> Leading:
    if math.inf in (x.order, y.order):
        return NOTHING
    return Leading(x.order + y.order, x.coefficient * y.coefficient, x.cancelled or y.cancelled)


def _divide(x: Leading, y: Leading) -> Leading:
    if x.order == math.inf:
        return NOTHING
    if y.order == math.inf:
        return Leading(-math.inf, x.coefficient)
    cancelled = x.cancelled or y.cancelled
    return Leading(x.order - y.order, FLOATS[Op.DIV](x.coefficient, y.coefficient), cancelled)


def _power(x: Leading, y: Leading) -> Leading:
    exponent = y.coefficient if y.order == 0 else 0.0
    if exponent == 0:
        return _constant(1.0)
    if x.order == math.inf:
        return NOTHING if exponent > 0 else Leading(-math.inf, 1.0)
    return Leading(x.order * exponent, FLOATS[Op.POW](x.coefficient, exponent), x.cancelled)


def _either(x: Leading, y: Leading) -> Leading:
    """min or max: which of them rules is a matter of concentrations, so the one that vanishes less."""
    return x if x.order <= y.order else y


def _exp(x: Leading) -> Leading:
    if x.order > 0:
        return _constant(1.0)
    if x.order == 0:
        return _constant(FLOATS[Op.EXP](x.coefficient, None), x.cancelled)
    return Leading(-math.inf, 1.0) if x.coefficient > 0 else NOTHING


def _ln(x: Leading) -> Leading:
    if x.order == 0:
        value = FLOATS[Op.LN](x.coefficient, None)
        if abs(value) < CANCELLED:
            return Leading(1.0, 1.0, True)
        return Leading(0.0, value, x.cancelled)
    return Leading(-LOG_ORDER, -1.0 if x.order > 0 else 1.0, x.cancelled)


_FUNCTIONS: dict[Op, Value] = {
    Op.ADD: _add,
    Op.SUB: lambda x, y: _add(x, _negative(y)),
    Op.MUL: _multiply,
    Op.DIV: _divide,
    Op.POW: _power,
    Op.MIN: _either,
    Op.MAX: _either,
    Op.NEG: lambda x, _: _negative(x),
    Op.SQRT: lambda x, _: _power(x, Leading(0.0, 0.5)),
    Op.EXP: lambda x, _: _exp(x),
    Op.LN: lambda x, _: _ln(x),
    Op.LOG10: lambda x, _: _ln(x),
    Op.ABS: lambda x, _: x._replace(coefficient=abs(x.coefficient)),
}
_LEADING: Table = tuple(_FUNCTIONS[op] for op in Op)


def leading(tape: Tape, registers: Sequence[float], species: Sequence[Leading]) -> list[Leading]:
    """The leading terms of a tape's outputs.

    registers : floats of temperature, parameters, literals and prelude (entries of species are ignored)
    species : a leading term for every species of the program
    """
    values: list[Value] = [_constant(r) for r in registers]
    values[: len(species)] = species
    tape.run(tape.body, values, _LEADING)
    return [values[out] for out in tape.outputs]
