"""Adaptive integration of many vessels at once, each on its own mesh of steps.

A mesh depends on where it starts and on nothing else: not on where the answer is wanted, not on the
other cases. Whoever asks for a point in between takes one shorter step from the mesh point before it.
Integration starts explicit; where stability rather than accuracy limits the step, or a species sinks
to where its laws are cut, it goes on with the stiff method.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.rates import Floats
from moletally.kernel.reference.explicit import DOP853
from moletally.kernel.reference.flow import Flow
from moletally.kernel.reference.rosenbrock import Rodas5P
from moletally.kernel.reference.tolerance import Tolerance
from moletally.kernel.reference.totals import Totals
from moletally.kernel.status import Status

__all__ = ["METHODS", "STIFF", "Stepper", "Stride"]

METHODS = (DOP853, Rodas5P)
EXPLICIT, STIFF = 0, 1

SAFETY = 0.9
MOST_SHRINK = 0.1
NOT_FINITE_SHRINK = 0.1  # where a law has no value the step went far too far
TOO_FAR = 0.3  # of a step that ends below zero
AHEAD = 0.98  # of the way to zero
FIRST_CHANGE = 0.1  # a first step may change what is there by a tenth
STIFF_LIMIT = 3.0  # |h lambda|: accuracy asks for less than 1, stability for less than 6
STIFF_STEPS = 12.0  # that many such steps, accepted or not, are no accident
PATIENCE = 500  # explicit steps after which something must be stiff that does not show in the estimate
PARDON = 0.25  # what a step that is not so limited takes off the count
SMALLEST = 1e-40  # of the time gone: where a fast law ends steps are tiny; time is kept to twice the digits
RUNAWAY, RUSH = (
    1e6,
    1e-6,
)  # growth, and share of the time gone, at which steps show concentrations running away
REVIEW_EVERY = 400  # steps
PROGRESS = 1e-9  # of the time gone, that so many steps have to bring
LARGEST = 1e250

Ints = NDArray[np.intp]


@dataclass(frozen=True, slots=True)
class Stride:
    """Steps just accepted: for each of `rows` from time t and state c a step of size h with a method."""

    rows: Ints
    t: Floats
    c: Floats
    h: Floats
    method: int


class Stepper:
    """Steps n vessels; `attempt` tries one step for each that is still active.

    t (n,), c (n, S), h (n,) - time, state and next step; mode (n,) - index in METHODS
    active (n,) - set False by the caller when a vessel has arrived, by the stepper when it fails
    status (n,), steps (n,), work (n,) - counts include rejected steps; work is in evaluations
    """

    def __init__(
        self, flow: Flow, c: Floats, tolerance: Tolerance, most_steps: int, mode: int = EXPLICIT,
        totals: Totals | None = None,
    ) -> None:  # fmt: skip
        n = len(c)
        self.totals = totals
        self.flow = flow
        self.tolerance = tolerance
        self.most_steps = most_steps
        self.t = np.zeros(n)
        self.c = c.copy()
        self.h = self._first_step()
        self._late = np.zeros(n)  # what rounding has kept from t
        self.mode = np.full(n, mode)
        self.active = np.ones(n, dtype=np.bool_)
        self.status = np.zeros(n, dtype=np.int_)
        self.steps = np.zeros(n, dtype=np.int_)
        self.work = np.zeros(n, dtype=np.int_)
        self._stiff_steps = np.zeros(n)
        self._h_before = np.full(n, 1e-300)  # of the last explicit step; nothing is foreseen before the first
        self._size_before = np.full(n, 1e-300)
        self._reviewed = np.zeros(n)  # time at the last review
        self._rejected = np.zeros(n, dtype=np.bool_)
        largest = np.abs(c).max(axis=1)
        self._largest = np.where(largest > 0, largest, np.inf)  # nothing to measure growth by
        self._whole: tuple[Ints, Flow, Tolerance] | None = None

    def attempt(self) -> list[Stride]:
        """One step for every active vessel; returns those that were accepted."""
        strides = []
        active = np.flatnonzero(self.active)
        for method in (EXPLICIT, STIFF):
            rows = active[self.mode[active] == method]
            if len(rows):
                strides.append(self._try(rows, method))
        return strides

    def _first_step(self) -> Floats:
        """A step that changes what is there a little. Species still at zero don't count."""
        with np.errstate(all="ignore"):
            f = np.abs(self.flow.slope(self.c))
            there = np.abs(self.c)
            change = np.where(there > 0, f / there, 0.0).max(axis=1)
            made = np.where(there > 0, 0.0, f).max(axis=1) / there.max(axis=1)
            fastest = np.maximum(change, np.where(np.isfinite(made), made, 0.0))
            first = FIRST_CHANGE / fastest
        return np.where(np.isfinite(first) & (first > 0), first, 1.0)

    def _cut(self, rows: Ints) -> tuple[Flow, Tolerance]:
        """Flow and tolerance of some vessels; the last cut is kept, as it rarely changes."""
        if len(rows) == len(self.t):
            return self.flow, self.tolerance
        if self._whole is None or not np.array_equal(self._whole[0], rows):
            self._whole = (rows, self.flow.at(rows), self.tolerance.at(rows))
        return self._whole[1], self._whole[2]

    def _try(self, rows: Ints, method: int) -> Stride:
        flow, tolerance = self._cut(rows)
        t, c, h = self.t[rows], self.c[rows], self.h[rows]
        with np.errstate(all="ignore"):
            new, error, stiffness = METHODS[method].step(flow, c, h, tolerance.least)
            size = tolerance.missed(flow, error, c, new, method).max(axis=1)
            finite = np.isfinite(size) & np.isfinite(new).all(axis=1)
            size = np.where(finite, np.maximum(size, 1e-10), np.inf)
            factor = SAFETY * size ** (-1.0 / (METHODS[method].error_order + 1))
            negative = (new < -tolerance.least).any(axis=1)
            factor = np.where(negative, np.minimum(factor, TOO_FAR), factor)
            leak = tolerance.leaked(flow, c, new, h)
            if leak is not None:
                factor = np.where(leak > 1.0, np.minimum(factor, SAFETY / leak), factor)
                size = np.maximum(size, leak)
        fine = (size <= 1.0) & ~negative
        growth = np.where(self._rejected[rows] & fine, 1.0, METHODS[method].most_growth)
        factor = np.clip(factor, np.where(finite, MOST_SHRINK, NOT_FINITE_SHRINK), growth)
        self.steps[rows] += 1
        self.work[rows] += METHODS[method].evaluations
        self.h[rows] = np.minimum(h, LARGEST) * factor
        if not fine.all() and len(self.flow.laws.edged):
            self._approach_zero(rows[~fine], h[~fine])
        self._rejected[rows] = ~fine
        if method == EXPLICIT:
            self._foresee(rows[fine], h[fine], size[fine])
        done = rows[fine]
        self._pass_time(done, h[fine])
        self.c[done] = (
            new[fine] if self.totals is None else self.totals.restore(new[fine], done, self.t[done])
        )
        self._look_for_trouble(rows, fine, finite)
        if method == EXPLICIT:
            assert stiffness is not None
            self._look_for_stiffness(rows, stiffness > STIFF_LIMIT, fine)
        return Stride(done, t[fine], c[fine], h[fine], method)

    def _approach_zero(self, rows: Ints, h: Floats) -> None:
        """Where a rejected step would have used a species up, the next leaves a little of it.

        Stages beyond zero say nothing about how far the step was too long, but the slope before it does.
        """
        laws = self.flow.laws
        c = self.c[np.ix_(rows, laws.edged)]
        f = self.flow.at(rows).slope(self.c[rows])[:, laws.edged]
        with np.errstate(all="ignore"):
            left = np.where((f < 0) & (c > laws.depth[rows]), -c / f, np.inf).min(axis=1)
        self.h[rows] = np.where(left < h, AHEAD * left, self.h[rows])

    def _foresee(self, rows: Ints, h: Floats, size: Floats) -> None:
        """Where steps have to become shorter and shorter the next one is foreseen to.

        Towards the end of a species of fractional order every second step would fail else. Reference:
        K. Gustafsson, ACM Trans. Math. Softw. 20 (1994) 496.
        """
        trend = h / self._h_before[rows]
        with np.errstate(all="ignore"):
            root = (size * size / self._size_before[rows]) ** (-1.0 / (METHODS[EXPLICIT].error_order + 1))
            ahead = h * SAFETY * trend * root
        self.h[rows] = np.where((trend < 1.0) & (ahead < self.h[rows]), ahead, self.h[rows])
        self._h_before[rows], self._size_before[rows] = h, size

    def _pass_time(self, rows: Ints, h: Floats) -> None:
        before = self.t[rows]
        step = h + self._late[rows]
        self.t[rows] = before + step
        self._late[rows] = step - (self.t[rows] - before)

    def _look_for_stiffness(self, rows: Ints, limited: NDArray[np.bool_], moved: NDArray[np.bool_]) -> None:
        count = self._stiff_steps[rows]
        self._stiff_steps[rows] = np.where(limited, count + 1.0, np.maximum(count - PARDON, 0.0))
        stiff = (self._stiff_steps[rows] >= STIFF_STEPS) | (self.steps[rows] >= PATIENCE)
        laws = self.flow.laws
        if len(laws.edged):
            stiff |= moved & laws.at(rows).low(self.c[rows]).any(axis=1)
        self.mode[rows[stiff]] = STIFF

    def _look_for_trouble(self, rows: Ints, fine: NDArray[np.bool_], finite: NDArray[np.bool_]) -> None:
        """Gives up vessels whose step vanishes, whose state explodes or whose allowance is spent."""
        stuck = ~fine & (self.h[rows] <= SMALLEST * self.t[rows])
        stuck |= ~fine & (self.h[rows] < 1e-290)
        size = np.abs(self.c[rows]).max(axis=1)
        explodes = (size > LARGEST) | (
            (size > RUNAWAY * self._largest[rows]) & (self.h[rows] < RUSH * self.t[rows])
        )
        review = self.steps[rows] % REVIEW_EVERY == 0
        stuck |= review & (self.t[rows] - self._reviewed[rows] <= PROGRESS * self.t[rows])
        self._reviewed[rows] = np.where(review, self.t[rows], self._reviewed[rows])
        for bad, status in (
            (self.steps[rows] >= self.most_steps, Status.WORK_CAP),
            (stuck, Status.STEP_TOO_SMALL),
            (stuck & ~finite, Status.NOT_FINITE),
            (explodes, Status.BLOW_UP),
        ):
            if bad.any():
                self.status[rows[bad]] = status
                self.active[rows[bad]] = False
