"""How a law answers to each concentration over all positive concentrations: intervals of d ln|r|/d ln c.

A fourth arithmetic runs the programs: powers multiply an interval, products add, a sum of positive
values lies between its terms. So A/(K + A) gets 1 - [0, 1] = [0, 1]: it never falls with A. What the
intervals can't tell (differences, logarithms) is [-inf, inf].
"""

import math
from collections.abc import Sequence
from typing import NamedTuple

from moletally.kernel.arithmetic import FLOATS, Table, Value
from moletally.kernel.program import Op
from moletally.kernel.rates import Tape

__all__ = ["Elastic", "elasticities"]

UNKNOWN = 2  # a sign that may be either
Interval = tuple[float, float]
ANYTHING: Interval = (-math.inf, math.inf)
RIGID: Interval = (0.0, 0.0)


class Elastic(NamedTuple):
    """The sign of a value (-1, 0, 1, UNKNOWN), its elasticities by species, its number if it is constant."""

    sign: int
    by: dict[int, Interval]
    constant: float | None = None


def _constant(value: float) -> Elastic:
    sign = UNKNOWN if math.isnan(value) else int(math.copysign(1, value)) if value else 0
    return Elastic(sign, {}, value)


def _vague(*values: Elastic) -> Elastic:
    return Elastic(UNKNOWN, dict.fromkeys((i for v in values for i in v.by), ANYTHING))


def _add(x: Elastic, y: Elastic) -> Elastic:
    if x.sign == 0 or y.sign == 0:
        return y if x.sign == 0 else x
    if x.sign != y.sign or x.sign == UNKNOWN:
        return _vague(x, y)
    return Elastic(x.sign, _hull(x, y))


def _hull(x: Elastic, y: Elastic) -> dict[int, Interval]:
    out = {}
    for i in x.by.keys() | y.by.keys():
        (a, b), (c, d) = x.by.get(i, RIGID), y.by.get(i, RIGID)
        out[i] = (min(a, c), max(b, d))
    return out


def _negative(x: Elastic) -> Elastic:
    return x._replace(sign=x.sign if x.sign == UNKNOWN else -x.sign)


def _times(x: Interval, factor: float) -> Interval:
    low, high = x[0] * factor, x[1] * factor
    return (low, high) if factor >= 0 else (high, low)


def _multiply(x: Elastic, y: Elastic, power: float = 1.0) -> Elastic:
    if x.sign == 0:
        return Elastic(0, {})
    sign = UNKNOWN if UNKNOWN in (x.sign, y.sign) else x.sign * y.sign
    out = dict(x.by)
    for i, interval in y.by.items():
        low, high = _times(interval, power)
        a, b = out.get(i, RIGID)
        out[i] = (a + low, b + high)
    return Elastic(sign, out)


def _power(x: Elastic, y: Elastic) -> Elastic:
    if y.constant is None or math.isnan(y.constant):
        return _vague(x, y)
    if y.constant == 0:
        return Elastic(1, {})
    if x.sign not in (0, 1):
        return _vague(x)
    return Elastic(x.sign, {i: _times(e, y.constant) for i, e in x.by.items()})


def _exp(x: Elastic) -> Elastic:
    """d ln exp(x) / d ln c = x times the elasticity of x, and |x| may be anything."""
    out = {}
    for i, (low, high) in x.by.items():
        if x.sign == UNKNOWN or low < 0 < high:
            out[i] = ANYTHING
        elif low >= 0:
            out[i] = (0.0, math.inf) if x.sign > 0 else (-math.inf, 0.0)
        else:
            out[i] = (-math.inf, 0.0) if x.sign > 0 else (0.0, math.inf)
    return Elastic(1, out)


def _extreme(x: Elastic, y: Elastic) -> Elastic:
    if x.sign != y.sign or x.sign in (0, UNKNOWN):
        return _vague(x, y)
    return Elastic(x.sign, _hull(x, y))


def _size(x: Elastic) -> Elastic:
    return x._replace(sign=abs(x.sign)) if x.sign != UNKNOWN else Elastic(UNKNOWN, _vague(x).by)


_FUNCTIONS: dict[Op, Value] = {
    Op.ADD: _add,
    Op.SUB: lambda x, y: _add(x, _negative(y)),
    Op.MUL: lambda x, y: _multiply(x, y) if y.sign else Elastic(0, {}),
    Op.DIV: lambda x, y: _multiply(x, y, -1.0) if y.sign else _vague(x, y),
    Op.POW: _power,
    Op.MIN: _extreme,
    Op.MAX: _extreme,
    Op.NEG: lambda x, _: _negative(x),
    Op.SQRT: lambda x, _: _power(x, _constant(0.5)),
    Op.EXP: lambda x, _: _exp(x),
    Op.LN: lambda x, _: _vague(x),
    Op.LOG10: lambda x, _: _vague(x),
    Op.ABS: lambda x, _: _size(x),
}
_ELASTIC: Table = tuple(_FUNCTIONS[op] for op in Op)
assert len(_ELASTIC) == len(FLOATS)


def elasticities(tape: Tape, registers: Sequence[float]) -> list[Elastic]:
    """Signs and elasticities of a tape's outputs; registers as for `leading`."""
    values: list[Value] = [_constant(r) for r in registers]
    values[: tape.program.n_species] = [Elastic(1, {i: (1.0, 1.0)}) for i in range(tape.program.n_species)]
    tape.run(tape.body, values, _ELASTIC)
    return [values[out] for out in tape.outputs]
