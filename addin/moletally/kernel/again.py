"""One tank solved again and again: for searches that change a number and ask for the outlet."""

import numpy as np

from moletally.kernel.cases import How, TankAnswers, TankCases
from moletally.kernel.engine import engine
from moletally.kernel.program import Model
from moletally.kernel.rates import Floats
from moletally.kernel.structure import Structure, structures
from moletally.kernel.tank import solve_tanks

__all__ = ["TankAgain"]


class TankAgain:
    """A tank whose arrays are made once; a call costs little more than its solution.

    >>> tank = TankAgain(model, feed, 60.0, 300.0, constants)
    >>> tank.tau[0] = 90.0
    >>> tank.solve()
    0
    >>> tank.c
    array([...])

    feed : ndarray, shape (S,) [mol/m3]; tau : (1,) [s]; T : (1,) [K]; p : (P,) - change their entries in place
    c : ndarray, shape (S,) - the outlet of the last solution [mol/m3]; nan where it failed
    status : ndarray, shape (1,) - how it ended
    follow : bool - begin at what `c` holds (the last outlet, or what the caller has put there) with Newton's
        method and without a start-up: for a search along one branch of states. Which of several states that
        is, is then the caller's business; the balances and stability are checked all the same.
    """

    def __init__(
        self, model: Model, feed: Floats, tau: float, T: float, p: Floats, follow: bool = False
    ) -> None:
        self._model = model
        self._feed, self._p = np.array([feed], dtype=np.float64), np.array([p], dtype=np.float64)
        self.tau, self.T = np.array([tau], dtype=np.float64), np.array([T], dtype=np.float64)
        self.feed, self.p = self._feed[0], self._p[0]
        self._answers = TankAnswers.empty(1, len(self.feed))
        self.c, self.status = self._answers.c[0], self._answers.status
        self.c[:] = self.feed
        self._how = How.FROM_GUESS if follow else How.FROM_FEED
        self._numbers: tuple[bytes, ...] = ()
        self._structure: Structure | None = None
        self._prepare()

    def solve(self) -> int:
        """Solve for the numbers that the arrays hold now; returns the status."""
        if self._numbers != (self.feed.tobytes(), self.T.tobytes(), self.p.tobytes()):
            self._prepare()
        if self._bounded and self.tau[0] > 0 and not self._again():
            return 0
        return self._whole() if self._how is How.FROM_FEED else int(self.status[0])

    def _prepare(self) -> None:
        """What runs in the tank may change with the numbers."""
        self._numbers = (self.feed.tobytes(), self.T.tobytes(), self.p.tobytes())
        structure = next(structures(self._model, self._feed > 0, self.T, self._p))[0]
        if structure is not self._structure:
            self._structure, self._bounded = structure, not structure.unbounded
            cases = TankCases(self._feed, self.tau, self.T, self._p)
            self._again = engine().tank_again(structure, cases, self._answers, self._how)

    def _whole(self) -> int:
        """The long way: for answers that call for a second look."""
        whole = solve_tanks(self._model, self._feed, self.tau, self.T, self._p)
        self.c[:], self.status[:] = whole.c[0], whole.status
        return int(whole.status[0])
