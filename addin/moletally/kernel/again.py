"""One vessel solved again and again: for searches that change a number and ask for the outlet."""

import numpy as np

from moletally.kernel.cases import CHANGED, Again, How, TankAnswers, TankCases, TubeAnswers
from moletally.kernel.engine import engine
from moletally.kernel.program import Model
from moletally.kernel.rates import Floats
from moletally.kernel.structure import Structure, structures
from moletally.kernel.tank import solve_tanks
from moletally.kernel.tube import solve_tubes

__all__ = ["TankAgain", "TubeAgain"]


class _VesselAgain:
    """Arrays that are made once, and the function that solves for what they hold.

    feed : ndarray, shape (S,) [mol/m3]; tau : (1,) [s]; T : (1,) [K]; p : (P,) - change their entries in place
    c : ndarray, shape (S,) - the outlet of the last solution [mol/m3]; nan where it failed
    status : ndarray, shape (1,) - how it ended
    """

    c: Floats
    status: np.ndarray
    _again: Again

    def __init__(self, model: Model, feed: Floats, tau: float, T: float, p: Floats) -> None:
        self._model = model
        self._feed, self._p = np.array([feed], dtype=np.float64), np.array([p], dtype=np.float64)
        self.tau, self.T = np.array([tau], dtype=np.float64), np.array([T], dtype=np.float64)
        self.feed, self.p = self._feed[0], self._p[0]
        self._cases = TankCases(self._feed, self.tau, self.T, self._p)
        self._prepare()

    def _prepare(self) -> None:
        """What runs in the vessel may change with the numbers."""
        structure = next(structures(self._model, self._feed > 0, self.T, self._p))[0]
        self._bounded = not structure.unbounded
        self._again = self._make(structure)

    def _make(self, structure: Structure) -> Again:
        raise NotImplementedError


class TankAgain(_VesselAgain):
    """A tank to be solved again and again.

    >>> tank = TankAgain(model, feed, 60.0, 300.0, constants)
    >>> tank.tau[0] = 90.0
    >>> tank.solve()
    0
    >>> tank.c
    array([...])

    follow : bool - begin at what `c` holds (the last outlet, or what the caller has put there) with Newton's
        method and without a start-up: for a search along one branch of states. Which of several states that
        is, is then the caller's business; the balances and stability are checked all the same.
    """

    def __init__(
        self, model: Model, feed: Floats, tau: float, T: float, p: Floats, follow: bool = False
    ) -> None:
        self._answers = TankAnswers.empty(1, len(feed))
        self.c, self.status = self._answers.c[0], self._answers.status
        self.c[:] = feed
        self._how = How.FROM_GUESS if follow else How.FROM_FEED
        super().__init__(model, feed, tau, T, p)

    def solve(self) -> int:
        """Solve for the numbers that the arrays hold now; returns the status."""
        if self._bounded and self.tau[0] > 0:
            code = self._again()
            if code == 0:
                return 0
            if code == CHANGED:
                self._prepare()
                return self.solve()
            if self._how is How.FROM_GUESS:
                return int(self.status[0])
        whole = solve_tanks(self._model, self._feed, self.tau, self.T, self._p)
        self.c[:], self.status[:] = whole.c[0], whole.status
        return int(whole.status[0])

    def _make(self, structure: Structure) -> Again:
        return engine().tank_again(structure, self._cases, self._answers, self._how)


class TubeAgain(_VesselAgain):
    """A tube to be solved again and again; used as `TankAgain`."""

    def __init__(self, model: Model, feed: Floats, tau: float, T: float, p: Floats) -> None:
        self._answers = TubeAnswers.empty(1, 1, len(feed))
        self.c, self.status = self._answers.c[0, 0], self._answers.status[0]
        super().__init__(model, feed, tau, T, p)

    def solve(self) -> int:
        """Solve for the numbers that the arrays hold now; returns the status."""
        if self._bounded:
            code = self._again()
            if code == CHANGED:
                self._prepare()
                return self.solve()
            return int(self.status[0])
        whole = solve_tubes(self._model, self._feed, self.tau, self.T, self._p)
        self.c[:], self.status[:] = whole.c[0], whole.status
        return int(whole.status[0])

    def _make(self, structure: Structure) -> Again:
        return engine().tube_again(structure, self._cases, self._answers)
