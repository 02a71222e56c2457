"""Stirred tanks: 0 = feed - c + tau nu^T r(c), the state that a start-up reaches."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.cutoff import STEADY_DEPTH, Laws
from moletally.kernel.program import Model
from moletally.kernel.rates import Floats
from moletally.kernel.settle import Settled, settle
from moletally.kernel.stability import invaded
from moletally.kernel.startup import start_up
from moletally.kernel.status import Status
from moletally.kernel.steady import NOTHING, Tanks, newton
from moletally.kernel.structure import Structure, structures

__all__ = ["TankResult", "solve_tanks"]

FIRST_GUESSES = (1e-3, 1e-9)  # of the largest concentration, for species that are not fed
BRIEFEST = 1e-50  # s: no residence time above it is brief
BRIEF = 1e-100  # of the feed: a conversion that is exact to first order
NOWHERE = 1.0  # mol/m3: the scale of a vessel into which nothing is fed, for want of another

Ints = NDArray[np.intp]


@dataclass(frozen=True, eq=False)
class TankResult:
    """The answer to N tanks.

    c : ndarray, shape (N, S) - outlets [mol/m3]; nan where the case failed
    status : ndarray, shape (N,)
    unique : bool ndarray, shape (N,) - one steady state is proven
    from_transient : bool ndarray, shape (N,) - the start-up chose the state
    exhausted : bool ndarray, shape (N, S) - species that a law of order zero uses up: it is cut
    residual : ndarray, shape (N,) - largest residual relative to the sum of its balance's terms
    iterations, work : ndarray, shape (N,) - of Newton's method; evaluations of the laws
    condition : ndarray, shape (N,) - relative change of an outlet per relative change of feed and rates
    growth : ndarray, shape (N,) - largest real part of the eigenvalues of the dynamic balances [1/s]
    """

    c: Floats
    status: NDArray[np.int_]
    unique: NDArray[np.bool_]
    from_transient: NDArray[np.bool_]
    exhausted: NDArray[np.bool_]
    residual: Floats
    iterations: NDArray[np.int_]
    work: NDArray[np.int_]
    condition: Floats
    growth: Floats

    @classmethod
    def of_feed(cls, feed: Floats, tau: Floats) -> "TankResult":
        """Tanks in which nothing happens."""
        n = len(feed)
        with np.errstate(all="ignore"):
            back = -1.0 / tau
        return cls(
            feed.copy(), np.zeros(n, dtype=np.int_), np.ones(n, dtype=np.bool_), np.zeros(n, dtype=np.bool_),
            np.zeros(feed.shape, dtype=np.bool_), np.zeros(n), np.zeros(n, dtype=np.int_),
            np.zeros(n, dtype=np.int_), np.ones(n), back,
        )  # fmt: skip


def solve_tanks(
    model: Model, feed: Floats, tau: Floats, T: Floats, p: Floats, start: Floats | None = None
) -> TankResult:
    """Outlets of N tanks.

    feed : ndarray, shape (N, S) [mol/m3], >= 0; tau : ndarray, shape (N,) [s], >= 0
    T : ndarray, shape (N,) [K]; p : ndarray, shape (N, P)
    start : ndarray, shape (N, S) - first contents of the vessels; None: full of feed
    """
    result = TankResult.of_feed(feed, tau)
    seeded = np.zeros(feed.shape, dtype=np.bool_) if start is None else (start > 0) & ~(feed > 0)
    contents = feed if start is None else start
    for structure, rows in structures(model, (feed > 0) | seeded, T, p):
        running = rows[tau[rows] > 0]
        if len(running) and tau[running].min() < BRIEFEST:
            running = running[~_hardly_changed(structure, result, running, tau, T, p)]
        if len(running):
            group = _Group(structure, result, running)
            faded = group.solve(feed[running], tau[running], T[running], p[running], contents[running])
            if len(faded):
                _without_seeds(model, result, running[faded], feed, tau, T, p)
    return result


def _hardly_changed(
    structure: Structure, result: TankResult, rows: Ints, tau: Floats, T: Floats, p: Floats
) -> NDArray[np.bool_]:
    """Answers tanks of so short a residence time that products of products would underflow."""
    feed = result.c[np.ix_(rows, structure.present)]
    largest = feed.max(axis=1, initial=0.0)
    scale = np.broadcast_to(np.where(largest > 0, largest, NOWHERE)[:, None], feed.shape)
    laws = Laws.of(structure, structure.edged, scale, T[rows], p[rows])
    with np.errstate(all="ignore"):
        extent = tau[rows, None] * laws.rates(feed)
        brief = (np.abs(extent) < BRIEF * largest[:, None]).all(axis=1) & (largest > 0)
        result.c[np.ix_(rows[brief], structure.present)] += structure.coefficients.gain(extent[brief])
    return np.asarray(brief)


def _without_seeds(
    model: Model, result: TankResult, rows: Ints, feed: Floats, tau: Floats, T: Floats, p: Floats
) -> None:
    """Tanks whose first contents were washed out before they could take hold: the feed alone is left.

    The start-up that follows begins full of feed; it was near that state already.
    """
    again = solve_tanks(model, feed[rows], tau[rows], T[rows], p[rows])
    for name in TankResult.__dataclass_fields__:
        getattr(result, name)[rows] = getattr(again, name)


class _Group:
    """Tanks of one structure; writes into their rows of the result."""

    def __init__(self, structure: Structure, result: TankResult, rows: Ints) -> None:
        self.structure, self.out, self.rows = structure, result, rows

    def solve(self, feed: Floats, tau: Floats, T: Floats, p: Floats, start: Floats) -> Ints:
        """Settle every row; returns those whose seeds were washed out."""
        structure, out, rows = self.structure, self.out, self.rows
        here = structure.present
        out.unique[rows] = structure.unique
        out.exhausted[np.ix_(rows, structure.wanted)] = True
        faded = np.zeros(0, dtype=np.intp)
        if structure.unbounded:
            self._fail(np.arange(len(rows)), Status.UNBOUNDED_AT_ZERO)
            return faded
        c = feed[:, here].copy()
        largest = np.maximum(feed, start).max(axis=1, keepdims=True)
        scale = np.broadcast_to(np.where(largest > 0, largest, NOWHERE), c.shape)
        tanks = Tanks(
            Laws.of(structure, structure.starved, scale, T, p, STEADY_DEPTH),
            structure.coefficients,
            c.copy(),
            tau,
            NOTHING * scale[:, :1],
        )
        if len(structure.firing):
            faded = self._states(tanks, c, scale, T, p, start[:, here])
        elif not structure.unique:
            self._fail(np.flatnonzero(invaded(structure, c, tau, T, p)), Status.UNSTABLE)
            return faded
        good = np.setdiff1d(np.flatnonzero(out.status[rows] == Status.OK), faded)
        if len(structure.firing) and len(good):
            self._keep(good, settle(structure, tanks.at(good), c[good], T[good], p[good]))
        return faded

    def _keep(self, places: Ints, answer: Settled) -> None:
        out, rows = self.out, self.rows[places]
        out.c[rows], out.status[rows] = answer.c, answer.status
        out.exhausted[rows] |= answer.exhausted
        out.residual[rows], out.condition[rows] = answer.residual, answer.condition
        out.growth[rows] = answer.growth

    def _fail(self, places: Ints, status: int | NDArray[np.int_]) -> None:
        rows = self.rows[places]
        self.out.status[rows] = status
        self.out.c[rows] = np.nan

    def _states(self, tanks: Tanks, c: Floats, scale: Floats, T: Floats, p: Floats, start: Floats) -> Ints:
        """Writes steady states into c; returns the places of tanks whose seeds were washed out."""
        structure, out = self.structure, self.out
        left = np.arange(len(c))
        for guess in FIRST_GUESSES if structure.unique else ():
            part = tanks.at(left)
            roots = newton(part, np.maximum(part.feed, guess * scale[left]))
            out.iterations[self.rows[left]] += roots.iterations
            out.work[self.rows[left]] += 2 * roots.iterations
            c[left[roots.settled]] = roots.c[roots.settled]
            left = left[~roots.settled]
            if not len(left):
                return left
        fed = self._fed(tanks.feed[left])
        laws = Laws.of(structure, structure.edged, scale[left], T[left], p[left])
        rest = start_up(structure, tanks.at(left), laws, start[left], fed)
        rows = self.rows[left]
        out.from_transient[rows] = True
        out.iterations[rows] += rest.iterations
        out.work[rows] += rest.work
        c[left] = rest.c
        lost = (rest.status != Status.OK) & ~rest.faded
        self._fail(left[lost], rest.status[lost])
        return left[rest.faded]

    def _fed(self, feed: Floats) -> NDArray[np.bool_]:
        """Present species that the feed alone would bring about, shape (n, present)."""
        structure = self.structure
        alone = np.zeros(feed.shape, dtype=np.bool_)
        for k, reached in enumerate(map(structure.reached, map(tuple, (feed > 0).tolist()))):
            alone[k] = reached
        return alone
