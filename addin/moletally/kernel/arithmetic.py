"""What the operations of a program mean for floats and for arrays of cases.

A table has a function of two arguments for each Op, by its number; unary operations ignore the second.
Nothing raises: where a law is undefined the result is nan or inf, and the callers look for that.
A fractional power of a negative number is continued as sign(x)|x|^p: integrators step a little below
zero. `STRICT` has nan there; answers are checked with it.
"""

import math
from collections.abc import Callable
from typing import Any, TypeAlias

import numpy as np

from moletally.kernel.program import Op

__all__ = [
    "ARRAYS", "ARRAY_SLOPES", "FLOATS", "FLOAT_SLOPES", "STRICT", "Slopes", "Table", "Value", "slopes", "table",
]  # fmt: skip

# A register may hold a float, an array of cases or a Decimal: what they share is arithmetic.
Value: TypeAlias = Any
Table: TypeAlias = tuple[Callable[[Value, Value], Value], ...]
Slope: TypeAlias = Callable[[Value, Value, Value], Value] | None
Slopes: TypeAlias = tuple[tuple[Slope, ...], tuple[Slope, ...]]


def table(**functions: Callable[[Value, Value], Value]) -> Table:
    """Functions in the order of Op."""
    return tuple(functions[op.name] for op in Op)


def _divide(x: float, y: float) -> float:
    try:
        return x / y
    except ZeroDivisionError:
        return math.nan if x == 0 or x != x else math.copysign(math.inf, x)


def _power(x: float, y: float) -> float:
    try:
        if x > 0 or (x < 0 and y.is_integer()):
            return float(x**y)
        if x == 0:
            return 0.0 if y > 0 else (1.0 if y == 0 else math.inf)
        return -float((-x) ** y)
    except (OverflowError, ValueError):
        return math.inf if x > 0 else math.nan


def _exp(x: float) -> float:
    try:
        return math.exp(x)
    except OverflowError:
        return math.inf


def _ln(x: float) -> float:
    return math.log(x) if x > 0 else (-math.inf if x == 0 else math.nan)


def _root(x: float) -> float:
    return math.sqrt(x) if x >= 0 else (-math.sqrt(-x) if x < 0 else math.nan)


FLOATS: Table = table(
    ADD=lambda x, y: x + y,
    SUB=lambda x, y: x - y,
    MUL=lambda x, y: x * y,
    DIV=_divide,
    POW=_power,
    MIN=min,
    MAX=max,
    NEG=lambda x, _: -x,
    SQRT=lambda x, _: _root(x),
    EXP=lambda x, _: _exp(x),
    LN=lambda x, _: _ln(x),
    LOG10=lambda x, _: _ln(x) / math.log(10.0),
    ABS=lambda x, _: abs(x),
)


def _powers(x: Value, y: Value) -> Value:
    if np.min(x) >= 0 or (isinstance(y, float) and y.is_integer()):
        return np.power(x, y)
    whole = np.equal(y, np.rint(y))
    size = np.power(np.abs(x), y)
    return np.where(whole, np.power(x, np.where(whole, y, 1.0)), np.copysign(size, x))


def _strict_powers(x: Value, y: Value) -> Value:
    return np.power(x, y)


_ARRAY_FUNCTIONS: dict[str, Callable[[Value, Value], Value]] = {
    "ADD": lambda x, y: x + y,
    "SUB": lambda x, y: x - y,
    "MUL": lambda x, y: x * y,
    "DIV": np.divide,
    "POW": _powers,
    "MIN": np.minimum,
    "MAX": np.maximum,
    "NEG": lambda x, _: -x,
    "SQRT": lambda x, _: np.copysign(np.sqrt(np.abs(x)), x),
    "EXP": lambda x, _: np.exp(x),
    "LN": lambda x, _: np.log(x),
    "LOG10": lambda x, _: np.log10(x),
    "ABS": lambda x, _: np.abs(x),
}
ARRAYS: Table = table(**_ARRAY_FUNCTIONS)
STRICT: Table = table(**(_ARRAY_FUNCTIONS | {"POW": _strict_powers, "SQRT": lambda x, _: np.sqrt(x)}))


def _float_slope(x: float, y: float, _: float) -> float:
    if y == 0:
        return 0.0
    if x > 0:
        return y * _power(x, y - 1.0)
    # The odd continuation of a fractional power has an even slope.
    return y * (_power(x, y - 1.0) if y.is_integer() else _power(-x, y - 1.0))


def _array_slope(x: Value, y: Value, _: Value) -> Value:
    whole = np.equal(y, np.rint(y))
    size = np.where(whole, x, np.abs(x))
    return np.where(np.equal(y, 0), 0.0, y * np.power(size, np.subtract(y, 1.0)))


def slopes(
    power: Callable[[Value, Value, Value], Value],
    exponent: Callable[[Value, Value], Value],
    functions: Table,
    unit: Value,
) -> Slopes:
    """For each Op the functions of (x, y, z) that give dz/dx and dz/dy of z = op(x, y); None is 1.

    power, exponent : dz/dx of x^y, and dz/dy of it, which is nothing where z is: 0^y stays 0
    """
    half = unit / 2
    per_decade = unit / functions[Op.LN](unit * 10, None)
    div = functions[Op.DIV]
    first = {
        "ADD": None,
        "SUB": None,
        "MUL": lambda x, y, z: y,
        "DIV": lambda x, y, z: div(unit, y),
        "POW": power,
        "MIN": lambda x, y, z: (x <= y) * unit,
        "MAX": lambda x, y, z: (x >= y) * unit,
        "NEG": lambda x, y, z: -unit,
        "SQRT": lambda x, y, z: div(half, abs(z)),
        "EXP": lambda x, y, z: z,
        "LN": lambda x, y, z: div(unit, x),
        "LOG10": lambda x, y, z: div(per_decade, x),
        "ABS": lambda x, y, z: (x > 0) * unit - (x < 0) * unit,
    }
    second = {
        "ADD": None,
        "SUB": lambda x, y, z: -unit,
        "MUL": lambda x, y, z: x,
        "DIV": lambda x, y, z: -div(z, y),
        "POW": lambda x, y, z: exponent(x, z),
        "MIN": lambda x, y, z: (y < x) * unit,
        "MAX": lambda x, y, z: (y > x) * unit,
    }
    return tuple(first[op.name] for op in Op), tuple(second.get(op.name) for op in Op)


FLOAT_SLOPES = slopes(_float_slope, lambda x, z: z * _ln(x) if z else 0.0, FLOATS, 1.0)
ARRAY_SLOPES = slopes(_array_slope, lambda x, z: np.where(np.equal(z, 0), 0.0, z * np.log(x)), ARRAYS, 1.0)
