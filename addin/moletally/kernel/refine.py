"""The steady balance of one tank in 50 digits, for the few where doubles lose too many."""

from decimal import Decimal, DivisionByZero, InvalidOperation, Overflow, localcontext

import numpy as np

from moletally.kernel.arithmetic import Value
from moletally.kernel.decimals import DECIMAL_SLOPES, DECIMALS, DIGITS
from moletally.kernel.rates import Floats, Tape
from moletally.kernel.totals import exact_coefficients

__all__ = ["refine"]

MOST_ITERATIONS = 40
MOST_SHRINK = Decimal("-0.9")
ENOUGH = Decimal("1e-25")  # relative change of a last iteration
MOST_SPECIES = 30  # elimination in decimals takes about a microsecond per product

Row = list[Decimal]


def refine(tape: Tape, nu: Floats, c: Floats, feed: Floats, tau: float, T: float, p: Floats) -> Floats | None:
    """The root near c, rounded to doubles once; None where Newton's method in decimals finds none.

    tape : the running terms, derivatives by the S present species; nu : ndarray, shape (terms, S)
    c, feed : ndarray, shape (S,) [mol/m3]; tau [s], T [K], p : ndarray, shape (P,)
    The inputs are taken as exact, coefficients as the fractions that were meant.
    """
    if len(c) > MOST_SPECIES:
        return None
    with localcontext(DIGITS):
        try:
            return _newton(tape, nu, c, feed, tau, _bound(tape, T, p))
        except (InvalidOperation, DivisionByZero, Overflow, ZeroDivisionError):
            return None


def _newton(
    tape: Tape, nu: Floats, c: Floats, feed: Floats, tau: float, registers: list[Value]
) -> Floats | None:
    fed, time = [Decimal(x) for x in feed.tolist()], Decimal(tau)
    weights = [[Decimal(x.numerator) / x.denominator for x in row] for row in exact_coefficients(nu)]
    state = [Decimal(x) for x in c.tolist()]
    for _ in range(MOST_ITERATIONS):
        rates, slopes = _laws(tape, registers, state)
        change = _eliminate(*_balance(weights, rates, slopes, fed, state, time))
        state = [x * (1 + d) if d > MOST_SHRINK else x / 10 for x, d in zip(state, change, strict=True)]
        if max(map(abs, change)) < ENOUGH:
            return np.array([float(x) for x in state])
    return None


def _bound(tape: Tape, T: float, p: Floats) -> list[Value]:
    program = tape.program
    registers: list[Value] = [Decimal(0)] * (program.n_registers + 1)
    registers[program.temperature] = Decimal(T)
    registers[program.first_parameter : program.first_literal] = [Decimal(x) for x in p.tolist()]
    registers[program.first_literal : program.first_temporary] = [
        Decimal(x) for x in program.literals.tolist()
    ]
    tape.run(tape.prelude, registers, DECIMALS)
    return registers


def _laws(tape: Tape, base: list[Value], state: Row) -> tuple[Row, list[dict[int, Decimal]]]:
    registers = base.copy()
    for leaf, value in zip(tape.leaves, state, strict=True):
        registers[leaf] = value
    tape.run(tape.body, registers, DECIMALS)
    outputs = range(len(tape.outputs))
    slopes = [tape.slope(j, registers, DECIMAL_SLOPES, Decimal(1)) for j in outputs]
    position = {leaf: i for i, leaf in enumerate(tape.leaves)}
    by_species = [{position[k]: v for k, v in s.items() if k in position} for s in slopes]
    return [registers[out] for out in tape.outputs], by_species


def _balance(
    nu: list[Row], rates: Row, slopes: list[dict[int, Decimal]], feed: Row, c: Row, tau: Decimal
) -> tuple[list[Row], Row]:
    """(I - tau nu^T V) diag(c) and feed - c + tau nu^T r."""
    size = len(c)
    right = [feed[i] - c[i] for i in range(size)]
    matrix = [[c[i] if i == k else Decimal(0) for k in range(size)] for i in range(size)]
    for row, rate, slope in zip(nu, rates, slopes, strict=True):
        for i, weight in enumerate(row):
            if weight:
                factor = weight * tau
                right[i] += factor * rate
                for k, value in slope.items():
                    matrix[i][k] -= factor * value * c[k]
    return matrix, right


def _eliminate(matrix: list[Row], right: Row) -> Row:
    """Gauss with row scaling and pivoting; a decimal error where singular."""
    size = len(right)
    rows = []
    for row, b in zip(matrix, right, strict=True):
        scale = max(map(abs, row))
        rows.append([x / scale for x in (*row, b)])
    for k in range(size):
        best = max(range(k, size), key=lambda i: abs(rows[i][k]))
        rows[k], rows[best] = rows[best], rows[k]
        for i in range(k + 1, size):
            if rows[i][k]:
                factor = rows[i][k] / rows[k][k]
                rows[i] = [x - factor * y for x, y in zip(rows[i], rows[k], strict=True)]
    out = [Decimal(0)] * size
    for k in reversed(range(size)):
        rest = rows[k][size] - sum(rows[k][i] * out[i] for i in range(k + 1, size))
        out[k] = rest / rows[k][k]
    return out
