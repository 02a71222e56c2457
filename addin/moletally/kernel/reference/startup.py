"""The start-up of a tank: dc/dt = (feed - c)/tau + nu^T r(c) from its first contents until it rests.

Which of several steady states a tank has is decided here. A root of Newton's method is only taken
where the start-up comes to coincide with it.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.depth import DEPTH, STEADY_DEPTH
from moletally.kernel.rates import Floats
from moletally.kernel.reference import steady
from moletally.kernel.reference.creep import creep
from moletally.kernel.reference.cutoff import LOW, Laws
from moletally.kernel.reference.flow import Flow
from moletally.kernel.reference.stability import growth
from moletally.kernel.reference.steady import Tanks, newton
from moletally.kernel.reference.stepping import STIFF, Stepper
from moletally.kernel.reference.tolerance import ABSOLUTE, Tolerance
from moletally.kernel.reference.totals import Totals
from moletally.kernel.status import Status
from moletally.kernel.structure import Structure

__all__ = ["Rest", "start_up"]

RELATIVE = 1e-6  # error of a step: enough to stay on the right side of a divide
MOST_STEPS = 1500
NOTHING = 1e-10  # of the least concentration: where Newton's method begins for a species at zero
LOOK_EVERY = 4  # attempts between two looks for the state ahead
SLOW = 0.3  # relative change per residence time below which a look is worth its cost
LATE = 3.0  # residence times after which a look is worth it anyway
COINCIDES = 1e-4  # relative distance at which a start-up has arrived
DEPARTURE = 45.0  # doublings of e after which rounding would have left an unstable state
SWINGS = 8  # turning points without rest that tell oscillation from slowness
VANISHING = 1e-5  # of the largest concentration: where a law of negative order is about to end

Ints = NDArray[np.intp]


@dataclass(frozen=True, slots=True)
class Rest:
    """Where start-ups ended: c (n, S), status (n,), iterations (n,) of Newton's method, work (n,).

    faded : bool ndarray, shape (n,) - what was there at the start only has been washed out
    """

    c: Floats
    status: NDArray[np.int_]
    faded: NDArray[np.bool_]
    iterations: NDArray[np.int_]
    work: NDArray[np.int_]


def start_up(structure: Structure, tanks: Tanks, laws: Laws, start: Floats, fed: NDArray[np.bool_]) -> Rest:
    """Follow n start-ups from `start`, shape (n, S).

    tanks : Tanks - the steady balances; laws : Laws - their laws, made fit for integrators
    fed : bool ndarray, shape (n, S) - species that the feed alone brings about
    """
    return _StartUp(structure, tanks, laws, start, fed).run()


class _StartUp:
    def __init__(
        self, structure: Structure, tanks: Tanks, laws: Laws, start: Floats, fed: NDArray[np.bool_]
    ) -> None:
        self.structure, self.tanks, self.fed = structure, tanks, fed
        n = len(start)
        self.scale = tanks.nothing / steady.NOTHING
        scale = np.broadcast_to(self.scale, start.shape)
        self.least = ABSOLUTE * scale
        self.near = np.zeros(start.shape)
        self.near[:, laws.edged] = LOW * laws.depth
        self.flow = Flow(laws, tanks.coefficients, tanks.feed, 1.0 / tanks.tau[:, None])
        tolerance = Tolerance.of(structure, laws, scale, (RELATIVE, RELATIVE))
        exchange = 1.0 / tanks.tau
        totals = Totals.of(structure.conserved[:, structure.present], start, tanks.feed, exchange)
        self.stepper = Stepper(self.flow, start, tolerance, MOST_STEPS, STIFF, totals)
        self.rest = Rest(
            start.copy(),
            np.full(n, Status.WORK_CAP),
            np.zeros(n, dtype=np.bool_),
            np.zeros(n, dtype=np.int_),
            np.zeros(n, dtype=np.int_),
        )
        self.unstable_until = np.full(n, np.inf)
        self.swings = np.zeros(n, dtype=np.int_)
        self.direction = np.zeros(start.shape)

    def run(self) -> Rest:
        """Step until every tank rests or is given up."""
        stepper, tries = self.stepper, 0
        while stepper.active.any():
            before = stepper.c.copy()
            for stride in stepper.attempt():
                self._count_swings(stride.rows, before)
            tries += 1
            if tries % LOOK_EVERY == 0:
                self._look()
        self._explain()
        stuck = (Status.WORK_CAP, Status.OSCILLATES, Status.STEP_TOO_SMALL)
        for row in np.flatnonzero(np.isin(self.rest.status, stuck) & ~self.rest.faded):
            self._creep_on(np.array([row]))
        self.rest.work[:] += stepper.work
        return self.rest

    def _count_swings(self, rows: Ints, before: Floats) -> None:
        move = np.sign(self.stepper.c[rows] - before[rows])
        turned = (move * self.direction[rows] < 0).any(axis=1)
        self.swings[rows] += turned
        self.direction[rows] = move

    def _look(self) -> None:
        """Where a start-up has become slow, ask Newton's method for the state ahead."""
        stepper = self.stepper
        rows = np.flatnonzero(stepper.active)
        self._stop_endless(rows)
        self._stop_faded(rows)
        rows = np.flatnonzero(stepper.active)
        if not len(rows):
            return
        c = stepper.c[rows]
        tau = self.tanks.tau[rows]
        with np.errstate(all="ignore"):
            speed = np.abs(self.flow.at(rows).slope(c)) * tau[:, None]
            slow = (speed <= SLOW * np.abs(c) + self.near[rows] + self.least[rows]).all(axis=1)
        slow |= stepper.t[rows] > LATE * tau
        rows = rows[slow]
        if not len(rows):
            return
        roots = newton(self.tanks.at(rows), self._guess(rows), most=30)
        self.rest.iterations[rows] += roots.iterations
        self.rest.work[rows] += roots.iterations
        gap = np.abs(roots.c - stepper.c[rows])
        close = roots.settled & (gap <= COINCIDES * roots.c + self.near[rows] + self.least[rows]).all(axis=1)
        if close.any():
            self._arrive(rows[close], roots.c[close])

    def _guess(self, rows: Ints) -> Floats:
        """Where Newton's method begins: cut species as deep below the integrator's depth as they are in it."""
        c = self.stepper.c[rows]
        c = np.where(c > 0, c, NOTHING * self.least[rows])
        low = np.zeros(c.shape, dtype=np.bool_)
        edged = self.flow.laws.edged
        low[:, edged] = self.flow.laws.at(rows).low(c) & np.isin(edged, self.structure.starved)
        return np.where(low, c * (STEADY_DEPTH / DEPTH), c)

    def _arrive(self, rows: Ints, c: Floats) -> None:
        """Take stable states; wait at unstable ones until rounding must have carried the tank away."""
        stepper = self.stepper
        rate, _, unstable = growth(self.tanks.at(rows), c)
        with np.errstate(all="ignore"):
            until = stepper.t[rows] + DEPARTURE / rate
        self.unstable_until[rows] = np.where(unstable, np.minimum(self.unstable_until[rows], until), np.inf)
        stuck = unstable & (stepper.t[rows] >= self.unstable_until[rows])
        for which, status in ((~unstable, Status.OK), (stuck, Status.UNSTABLE)):
            self.rest.c[rows[which]] = c[which]
            self.rest.status[rows[which]] = status
            stepper.active[rows[which]] = False

    def _creep_on(self, row: Ints) -> None:
        """Take up one tank where the integrator got stuck; a state it oscillates about stays refused."""
        tanks = self.tanks.at(row)
        far, iterations = creep(tanks, self._guess(row))
        self.rest.iterations[row] += iterations
        self.rest.work[row] += 2 * iterations
        if not np.isfinite(far).all():
            return
        _, swing, unstable = growth(tanks, far)
        found = Status.OK if not unstable[0] else Status.OSCILLATES if swing[0] > 0 else Status.UNSTABLE
        self.rest.c[row], self.rest.status[row] = far, found

    def _stop_endless(self, rows: Ints) -> None:
        laws, structure = self.flow.laws, self.structure
        if not len(laws.edged) or not len(rows):
            return
        ends = structure.endless[laws.edged]
        gone = (laws.at(rows).low(self.stepper.c[rows]) & ends).any(axis=1)
        self.rest.status[rows[gone]] = Status.UNBOUNDED_AT_ZERO
        self.stepper.active[rows[gone]] = False

    def _stop_faded(self, rows: Ints) -> None:
        faded = ((self.stepper.c[rows] < self.least[rows]) & ~self.fed[rows]).any(axis=1)
        faded &= self.stepper.t[rows] > 20.0 * self.tanks.tau[rows]
        self.rest.faded[rows[faded]] = True
        self.stepper.active[rows[faded]] = False

    def _explain(self) -> None:
        """Why the others did not come to rest."""
        stepper, status = self.stepper, self.rest.status
        failed = stepper.status != Status.OK
        status[failed] = stepper.status[failed]
        status[failed & (status == Status.WORK_CAP) & (self.swings >= SWINGS)] = Status.OSCILLATES
        ends = self.structure.endless
        gone = (stepper.c[:, ends] < VANISHING * self.scale).any(axis=1)
        status[failed & gone] = Status.UNBOUNDED_AT_ZERO
