"""Plug-flow tubes of one structure: dc/dtau = nu^T r(c), c(0) = feed, at any number of residence times."""

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.cases import TubeAnswers
from moletally.kernel.rates import Floats
from moletally.kernel.reference.cutoff import LOW, Laws
from moletally.kernel.reference.flow import Flow
from moletally.kernel.reference.steady import EPSILON
from moletally.kernel.reference.stepping import METHODS, STIFF, Stepper, Stride
from moletally.kernel.reference.tolerance import NOTHING, Tolerance
from moletally.kernel.reference.totals import Totals
from moletally.kernel.status import Status
from moletally.kernel.structure import Structure

__all__ = ["solve"]

RELATIVE = (1e-10, 1e-8)  # error of a step, explicit and stiff; the sum of all stays below 1e-8
MOST_STEPS = 12000
VANISHING = 1e-5  # of the feed: where a law of negative order is about to end
INVARIANT = 1e-9  # of the sum of a total's terms
SUMMED = 16 * EPSILON  # of the feed: rounding of the steps that a law of order zero takes from it
NOWHERE = 1.0  # mol/m3: the scale of a vessel into which nothing is fed, for want of another

Ints = NDArray[np.intp]


def solve(structure: Structure, feed: Floats, asked: Floats, T: Floats, p: Floats) -> TubeAnswers:
    """Answers to N tubes of one structure at M residence times each; asked, shape (N, M)."""
    run = _Run(structure, feed, asked, T, p)
    run.march()
    return TubeAnswers(
        run.points, run.status.astype(np.int32), run.exhausted_at,
        run.stepper.steps.astype(np.int32), run.stepper.work.astype(np.int32),
    )  # fmt: skip


class _Run:
    """Tubes of one structure on their way; see TubeAnswers for points (c), status and exhausted_at."""

    def __init__(self, structure: Structure, feed: Floats, asked: Floats, T: Floats, p: Floats) -> None:
        self.structure, self.asked = structure, asked
        self.feed = feed
        self.points = np.repeat(feed[:, None, :], asked.shape[1], axis=1)
        self.status = np.zeros(asked.shape, dtype=np.int_)
        self.pending = asked > 0
        self.exhausted_at = np.full(feed.shape, np.nan)
        self.exhausted_at[:, structure.wanted] = 0.0
        self.endless_from = np.full(len(feed), np.inf)
        c = feed[:, structure.present]
        largest = feed.max(axis=1, keepdims=True)
        scale = np.broadcast_to(np.where(largest > 0, largest, NOWHERE), c.shape)
        laws = Laws.of(structure, structure.edged, scale, T, p)
        self.flow = Flow(laws, structure.coefficients)
        self.tolerance = Tolerance.of(structure, laws, scale, RELATIVE)
        totals = Totals.of(structure.conserved[:, structure.present], c, c, np.zeros(len(c)))
        self.stepper = Stepper(self.flow, c, self.tolerance, MOST_STEPS, totals=totals)
        self.answers: list[tuple[Stride, Ints, Ints, Floats]] = []

    def march(self) -> None:
        """Step until every point asked for is behind, then answer."""
        if not len(self.structure.firing):
            return
        stepper = self.stepper
        stepper.active &= self.pending.any(axis=1)
        while stepper.active.any():
            for stride in stepper.attempt():
                if len(stride.rows):
                    self._note(stride)
        self._answer()
        self._check()

    def _note(self, stride: Stride) -> None:
        """Keep what is needed for the points that this stride covers."""
        rows = stride.rows
        pending = self.pending[rows]
        covered = pending & (self.asked[rows] <= (stride.t + stride.h)[:, None])
        if covered.any():
            row, point = np.nonzero(covered)
            self.answers.append((stride, row, point, self.asked[rows[row], point] - stride.t[row]))
            self.pending[rows[row], point] = False
            self.stepper.active[rows] &= self.pending[rows].any(axis=1)
        if len(self.structure.edged):
            self._note_ends(stride)

    def _note_ends(self, stride: Stride) -> None:
        """Which species this stride has brought to nothing, and whether a law has no bound there."""
        structure, rows, laws = self.structure, stride.rows, self.flow.laws
        edged = structure.edged
        now = laws.at(rows).low(self.stepper.c[rows])
        species = structure.present[edged]
        ends = structure.finite_end[edged]
        known = self.exhausted_at[np.ix_(rows, species)]
        event = np.where(now & ends, np.where(np.isnan(known), self._end(stride), known), np.nan)
        self.exhausted_at[np.ix_(rows, species)] = event
        endless = structure.runaway[:, edged]
        if endless.any() and now.any():
            r = laws.bound.at(rows).rates(np.maximum(self.stepper.c[rows], 1e-300))
            hit = (now[:, None, :] & endless & (r != 0)[:, :, None]).any(axis=(1, 2))
            self.endless_from[rows[hit]] = np.minimum(self.endless_from[rows[hit]], stride.t[hit])

    def _end(self, stride: Stride) -> Floats:
        """When c reaches zero, shape (rows, edged): c' = -k c^q from the stride's start."""
        structure, edged = self.structure, self.structure.edged
        order = np.where(structure.nu[:, edged] < 0, structure.order[:, edged], np.inf).min(axis=0)
        flow = self.flow.at(stride.rows)
        with np.errstate(all="ignore"):
            left = stride.c[:, edged] / -flow.slope(stride.c)[:, edged] / (1.0 - np.minimum(order, 0.999))
        left = np.where(np.isfinite(left) & (left >= 0), left, 0.0)
        return stride.t[:, None] + np.minimum(left, stride.h[:, None])

    def _answer(self) -> None:
        """One shorter step to every point asked for, all of a method at once."""
        for method in range(len(METHODS)):
            parts = [a for a in self.answers if a[0].method == method]
            if not parts:
                continue
            rows = np.concatenate([s.rows[row] for s, row, _, _ in parts])
            points = np.concatenate([point for _, _, point, _ in parts])
            c = np.concatenate([s.c[row] for s, row, _, _ in parts])
            h = np.concatenate([h for *_, h in parts])
            flow, tolerance = self.flow.at(rows), self.tolerance.at(rows)
            with np.errstate(all="ignore"):
                new, error, _ = METHODS[method].step(flow, c, h, tolerance.least)
            # A shorter step is a better one, but for fast transients that the long one damps.
            fine = (tolerance.missed(flow, error, c, new, method) <= 4.0) & (new >= -tolerance.least)
            leak = tolerance.leaked(flow, c, new, h)
            poor = ~fine.all(axis=1) if leak is None else ~fine.all(axis=1) | ~(leak <= 4.0)
            for k in np.flatnonzero(poor):
                one = np.array([k])
                new[k] = _creep(flow.at(one), c[one], float(h[k]), tolerance.at(one))
            if self.stepper.totals is not None:
                new = self.stepper.totals.restore(new, rows, h)
            self.points[rows[:, None], points[:, None], self.structure.present] = new

    def _check(self) -> None:
        """Settle the status of every point; failed ones become nan, vanished species zero."""
        structure = self.structure
        c = self.points[:, :, structure.present]
        edged, depth = structure.edged, self.flow.laws.depth[:, None, :]
        if len(edged):
            rounding = (
                SUMMED * self.feed[:, None, structure.present[edged]] * np.isin(edged, structure.starved)
            )
            low = (c[:, :, edged] < LOW * depth) | (c[:, :, edged] < rounding)
            gone = low & structure.finite_end[edged] & (self.asked > 0)[:, :, None]
            c[:, :, edged] = np.where(gone, 0.0, c[:, :, edged])
        least = self.tolerance.least[:, None, :]
        negative = (c < -least).any(axis=2)
        nothing = np.abs(c) < NOTHING * self.feed.max(axis=1)[:, None, None]
        self.points[:, :, structure.present] = np.where(((c < 0) & (c >= -least)) | nothing, 0.0, c)
        w = structure.conserved
        with np.errstate(all="ignore"):
            off = np.abs((self.points - self.feed[:, None, :]) @ w.T)
            terms = (np.abs(self.points) + self.feed[:, None, :]) @ np.abs(w).T
            lost = (off > INVARIANT * terms).any(axis=2)
        for bad, status in (
            (lost, Status.INVARIANT),
            (negative, Status.NEGATIVE),
            (~np.isfinite(self.points).all(axis=2), Status.NOT_CONVERGED),
            (self._undefined(c) | ~(self.asked >= 0), Status.NOT_FINITE),
            (self.asked > self.endless_from[:, None], Status.UNBOUNDED_AT_ZERO),
        ):
            self.status[bad] = status
        self.status = np.where(self.pending, self._stopped()[:, None], self.status)
        self.points[self.status != Status.OK] = np.nan

    def _stopped(self) -> NDArray[np.int_]:
        """Why vessels stopped early: beside a vanishing species it is that species' doing."""
        ends = self.structure.endless
        largest = self.feed.max(axis=1, keepdims=True)
        gone = (self.stepper.c[:, ends] < VANISHING * largest).any(axis=1)
        return np.where(
            gone & (self.stepper.status != Status.OK), Status.UNBOUNDED_AT_ZERO, self.stepper.status
        )

    def _undefined(self, c: Floats) -> NDArray[np.bool_]:
        """Points where, or at whose inlet, a root of a negative number would have been taken, shape (N, M)."""
        if not self.structure.tape.takes_roots:
            return np.zeros(self.asked.shape, dtype=np.bool_)
        n, points, species = c.shape
        laws = self.flow.laws.at(np.repeat(np.arange(n), points))
        r = laws.strict(np.maximum(c, 0.0).reshape(-1, species))
        inlet = self.flow.laws.strict(self.feed[:, self.structure.present])
        undefined = np.asarray(~np.isfinite(r).all(axis=1)).reshape(n, points)
        return undefined | np.asarray(~np.isfinite(inlet).all(axis=1))[:, None]


def _creep(flow: Flow, c: Floats, h: float, tolerance: Tolerance) -> Floats:
    """The state of one vessel a time h after c, in as many steps as it takes; nan if they are too many."""
    stepper = Stepper(flow, c, tolerance, MOST_STEPS, STIFF)
    while stepper.active[0] and stepper.t[0] < h:
        stepper.h = np.minimum(stepper.h, h - stepper.t)
        stepper.attempt()
        if h - stepper.t[0] <= 1e-15 * h:
            break
    return stepper.c[0] if stepper.active[0] else np.full(c.shape[1], np.nan)
