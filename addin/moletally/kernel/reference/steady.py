"""Newton's method for steady tanks: 0 = F(c) = feed - c + tau nu^T r(c), many at once.

Unknowns are relative changes y = dc/c, so that a trace species counts as much as an abundant one:
(I - tau nu^T V) diag(c) y = F. Concentrations stay positive: a step may take at most nine tenths,
and more only of a species that has been losing that much step after step.
"""

from dataclasses import dataclass
from fractions import Fraction

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.coefficients import Coefficients
from moletally.kernel.rates import Floats
from moletally.kernel.reference.cutoff import Laws
from moletally.kernel.reference.exact import balance
from moletally.kernel.reference.linear import inverse, solve
from moletally.kernel.totals import exact_coefficients

__all__ = ["CLOSED", "EPSILON", "NOTHING", "Roots", "Tanks", "newton", "polish"]

MOST_ITERATIONS = 60
MOST_FALL, DEEPEST_FALL = 0.1, 1e-16
NOTHING = 1e-200  # of the largest concentration: the root of the root of the root of it is still little
DEEPEST = 1e-20  # of that: where a falling concentration stops
SETTLED = 1e-9  # relative change after which the next, quadratic, one is rounding
STALLED = 1e-4  # rounding may keep an ill-conditioned tank from settling closer
ROUGHLY_CLOSED = 1e-8  # before the last change; where species that count as none still feed others it is not
CLOSED = 1e-12  # residual relative to the terms of its balance
GOOD = 1e-12  # estimated relative error that needs no second look
EPSILON = 2.2e-16

Ints = NDArray[np.intp]


@dataclass(frozen=True, slots=True)
class Tanks:
    """n tanks of one structure: laws and coefficients of its S present species, feed (n, S), tau (n,).

    nothing : ndarray, shape (n, 1) - below it a concentration is as good as none [mol/m3]; it is not
        followed further (there are such species: what would be made of one that is used up)
    """

    laws: Laws
    coefficients: Coefficients
    feed: Floats
    tau: Floats
    nothing: Floats

    def at(self, rows: Ints) -> "Tanks":
        """The cases in `rows`."""
        return Tanks(
            self.laws.at(rows), self.coefficients, self.feed[rows], self.tau[rows], self.nothing[rows]
        )

    def linear(self, c: Floats) -> tuple[Floats, Floats, Floats]:
        """F (n, S), its terms' sum of sizes (n, S), and (I - tau nu^T V) diag(c) (n, S, S)."""
        r, v = self.laws.slopes(c)
        tau = self.tau[:, None]
        f = self.feed - c + tau * self.coefficients.gain(r)
        terms = self.feed + c + tau * self.coefficients.traffic(r)
        matrix = self.coefficients.jacobian(v) * (-tau[:, :, None] * c[:, None, :])
        diagonal = np.arange(c.shape[1])
        matrix[:, diagonal, diagonal] += c
        return f, terms, matrix


@dataclass(frozen=True, slots=True)
class Roots:
    """Where Newton's method ended: c (n, S), settled (n,), iterations (n,)."""

    c: Floats
    settled: NDArray[np.bool_]
    iterations: NDArray[np.int_]


def newton(tanks: Tanks, start: Floats, most: int = MOST_ITERATIONS) -> Roots:
    """Iterate from start, shape (n, S), > 0."""
    c = start.copy()
    n = len(c)
    settled = np.zeros(n, dtype=np.bool_)
    iterations = np.full(n, most)
    active, part = np.arange(n), tanks
    fall = np.full(c.shape, MOST_FALL)
    with np.errstate(all="ignore"):
        for k in range(most):
            now = c[active]
            f, terms, matrix = part.linear(now)
            y = solve(matrix, f)
            there = (now > part.nothing) | (now * (1.0 + y) > part.nothing)
            change = _largest(np.abs(y), there)
            falls = ~(y > MOST_FALL - 1.0)
            c[active] = np.maximum(now * np.where(falls, fall, 1.0 + y), DEEPEST * part.nothing)
            fall = np.where(falls, np.maximum(fall * fall, DEEPEST_FALL), MOST_FALL)
            gap = _largest(np.abs(f) / terms, there)
            done = (change <= SETTLED) & (gap <= ROUGHLY_CLOSED)
            done |= (change <= STALLED) & (gap <= CLOSED) & (k >= 8)
            lost = ~np.isfinite(change)
            if done.any() or lost.any():
                settled[active[done]] = True
                iterations[active[done | lost]] = k + 1
                keep = ~(done | lost)
                active, fall = active[keep], fall[keep]
                if not len(active):
                    break
                part = tanks.at(active)
    return Roots(c, settled, iterations)


@dataclass(frozen=True, slots=True)
class Polished:
    """Roots with their last digits: c (n, S), residual and condition (n,), error (n,) relative estimate.

    residual : largest |F| relative to the sum of its terms
    condition : largest relative change of an outlet per relative change of feed and rates
    """

    c: Floats
    residual: Floats
    condition: Floats
    error: Floats


def polish(tanks: Tanks, c: Floats, gone: NDArray[np.bool_]) -> Polished:
    """Improve roots until rounding no longer shows, with sums in twice the digits where it does.

    gone : bool ndarray, shape (n, S) - species that are used up: what is left of them has no digits to lose
    """
    c = c.copy()
    with np.errstate(all="ignore"):
        f, terms, matrix = tanks.linear(c)
        solver = inverse(matrix)
        there = (c > tanks.nothing) & ~gone
        error = EPSILON * _largest(np.matmul(np.abs(solver), terms[:, :, None])[:, :, 0], there)
        residual = _largest(np.abs(f) / terms, there)
        r = tanks.laws.rates(c)
        sway = np.matmul(solver, tanks.coefficients.nu.T) * (tanks.tau[:, None] * np.abs(r))[:, None, :]
        fed = np.matmul(np.abs(solver), (tanks.feed)[:, :, None])[:, :, 0]
        condition = _largest(np.abs(sway).sum(axis=2) + fed, there)
        rough = np.flatnonzero(~(error <= GOOD))
        if len(rough):
            part = tanks.at(rough)
            c[rough], residual[rough], last = _twice_the_digits(part, c[rough], gone[rough])
            error[rough] = np.maximum(last, EPSILON * condition[rough])
    return Polished(c, residual, condition, error)


def _largest(values: Floats, there: NDArray[np.bool_]) -> Floats:
    """The largest of each row, shape (n,), among species that are there."""
    return np.asarray(np.where(there, values, 0.0 * values).max(axis=1, initial=0.0))


def _twice_the_digits(tanks: Tanks, c: Floats, gone: NDArray[np.bool_]) -> tuple[Floats, Floats, Floats]:
    """c, residual, and the last relative change."""
    finer = _finer(tanks.coefficients.nu)
    last = np.full(len(c), np.inf)
    residual = np.full(len(c), np.inf)
    for _ in range(6):
        r = tanks.laws.rates(c)
        f = balance(tanks.coefficients.nu, finer, tanks.tau[:, None] * r, tanks.feed, c)
        _, terms, matrix = tanks.linear(c)
        y = solve(matrix, f)
        there = (c > tanks.nothing) & ~gone
        change = _largest(np.abs(y), there)
        better = change < last
        residual = np.where(better, _largest(np.abs(f) / terms, there), residual)
        last = np.where(better, change, last)
        c = np.where(better[:, None] & (y > -0.5), c * (1.0 + y), c)
        if not better.any() or (change <= EPSILON).all():
            break
    return c, residual, np.where(np.isfinite(last), last, np.inf)


def _finer(nu: Floats) -> Floats:
    """What the coefficients lost in rounding: 0 for all but those like 2/3."""
    exact = exact_coefficients(nu)
    return np.array(
        [
            [float(a - Fraction(b)) for a, b in zip(*rows, strict=True)]
            for rows in zip(exact, nu.tolist(), strict=True)
        ]
    )
