"""Stirred tanks of one structure: from feeds to checked outlets."""

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.cases import How, Ints, TankAnswers, TankCases
from moletally.kernel.depth import STEADY_DEPTH
from moletally.kernel.rates import Floats
from moletally.kernel.reference.cutoff import Laws
from moletally.kernel.reference.settle import Settled, settle
from moletally.kernel.reference.stability import invaded
from moletally.kernel.reference.startup import start_up
from moletally.kernel.reference.steady import NOTHING, Tanks, newton
from moletally.kernel.status import Status
from moletally.kernel.structure import Structure

__all__ = ["solve"]

FIRST_GUESSES = (1e-3, 1e-9)  # of the largest concentration, for species that are not fed
BRIEFEST = 1e-50  # s: no residence time above it is brief
BRIEF = 1e-100  # of the feed: a conversion that is exact to first order
NOWHERE = 1.0  # mol/m3: the scale of a vessel into which nothing is fed, for want of another


def solve(structure: Structure, cases: TankCases, how: How) -> TankAnswers:
    """Answers to N tanks."""
    return _Group(structure, cases, how).solve()


class _Group:
    """Tanks of one structure; `out` has a row for each."""

    def __init__(self, structure: Structure, cases: TankCases, how: How) -> None:
        self.structure, self.cases, self.how = structure, cases, how
        n, species = cases.feed.shape
        self.out = TankAnswers.empty(n, species)
        for array in (self.out.status, self.out.from_start, self.out.faded, self.out.exhausted):
            array[:] = 0
        for floats in (self.out.residual, self.out.error, self.out.root):
            floats[:] = 0.0
        self.out.condition[:] = 1.0
        for count in (self.out.iterations, self.out.work):
            count[:] = 0
        self.out.c[:] = cases.feed
        self.out.exhausted[:, structure.wanted] = True

    def solve(self) -> TankAnswers:
        """Settle every row."""
        structure, out, cases = self.structure, self.out, self.cases
        here = structure.present
        feed = np.ascontiguousarray(cases.feed[:, here])
        start = feed if cases.start is None else cases.start[:, here]
        scale = np.broadcast_to(self._scale()[:, None], feed.shape)
        c = feed.copy()
        tanks = Tanks(
            Laws.of(structure, structure.starved, scale, cases.T, cases.p, STEADY_DEPTH),
            structure.coefficients,
            feed,
            cases.tau,
            NOTHING * scale[:, :1],
        )
        if not len(structure.firing):
            if not structure.unique:
                self._fail(
                    np.flatnonzero(invaded(structure, c, cases.tau, cases.T, cases.p)), Status.UNSTABLE
                )
            return out
        left = self._hardly_changed(feed) if self.how is How.FROM_FEED else np.arange(len(c))
        if self.how is How.FROM_FEED:
            self._states(tanks, c, scale, start, left)
        else:
            assert cases.c is not None
            c[:] = cases.c[:, here]
        if self.how is How.FROM_GUESS:
            roots = newton(tanks, np.maximum(c, tanks.nothing))
            c[:] = roots.c
            out.iterations[:] = roots.iterations
            self._fail(np.flatnonzero(~roots.settled), Status.NOT_CONVERGED)
        good = left[(out.status[left] == Status.OK) & ~out.faded[left]]
        if len(good):
            exact = self.how is How.CHECK_ONLY
            lasting = structure.unique or self.how is How.FROM_GUESS
            self._keep(
                good, settle(structure, tanks.at(good), c[good], cases.T[good], cases.p[good], exact, lasting)
            )
        out.c[out.faded] = np.nan
        return out

    def _scale(self) -> Floats:
        cases = self.cases
        if cases.scale is not None:
            return cases.scale
        both = cases.feed if cases.start is None else np.maximum(cases.feed, cases.start)
        largest = both.max(axis=1, initial=0.0)
        return np.where(largest > 0, largest, NOWHERE)

    def _hardly_changed(self, feed: Floats) -> Ints:
        """Answers tanks of so short a residence time that products of products would underflow; the others."""
        structure, cases, out = self.structure, self.cases, self.out
        everyone = np.arange(len(feed))
        if not (cases.tau < BRIEFEST).any():
            return everyone
        rows = np.flatnonzero(cases.tau < BRIEFEST)
        largest = feed[rows].max(axis=1, initial=0.0)
        scale = np.broadcast_to(np.where(largest > 0, largest, NOWHERE)[:, None], feed[rows].shape)
        laws = Laws.of(structure, structure.edged, scale, cases.T[rows], cases.p[rows])
        with np.errstate(all="ignore"):
            extent = cases.tau[rows, None] * laws.rates(feed[rows])
            brief = (np.abs(extent) < BRIEF * largest[:, None]).all(axis=1) & (largest > 0)
            out.c[np.ix_(rows[brief], structure.present)] += structure.coefficients.gain(extent[brief])
        return np.setdiff1d(everyone, rows[brief])

    def _keep(self, rows: Ints, answer: Settled) -> None:
        out = self.out
        out.c[rows], out.status[rows], out.root[rows] = answer.c, answer.status, answer.root
        out.exhausted[rows] |= answer.exhausted
        out.residual[rows], out.condition[rows], out.error[rows] = (
            answer.residual,
            answer.condition,
            answer.error,
        )

    def _fail(self, rows: Ints, status: int | NDArray[np.int_]) -> None:
        self.out.status[rows] = status
        self.out.c[rows] = np.nan

    def _states(self, tanks: Tanks, c: Floats, scale: Floats, start: Floats, left: Ints) -> None:
        """Writes steady states into c."""
        structure, out, cases = self.structure, self.out, self.cases
        for guess in FIRST_GUESSES if structure.unique else ():
            part = tanks.at(left)
            roots = newton(part, np.maximum(part.feed, guess * scale[left]))
            out.iterations[left] += roots.iterations
            out.work[left] += 2 * roots.iterations
            c[left[roots.settled]] = roots.c[roots.settled]
            left = left[~roots.settled]
            if not len(left):
                return
        T, p = cases.T[left], cases.p[left]
        fed = np.ones((len(left), c.shape[1]), dtype=np.bool_)
        if cases.fed is not None:
            fed = cases.fed[np.ix_(left, structure.present)]
        laws = Laws.of(structure, structure.edged, scale[left], T, p)
        rest = start_up(structure, tanks.at(left), laws, start[left], fed)
        out.from_start[left] = True
        out.iterations[left] += rest.iterations
        out.work[left] += rest.work
        c[left] = rest.c
        out.faded[left] = rest.faded
        lost = (rest.status != Status.OK) & ~rest.faded
        self._fail(left[lost], rest.status[lost])
