"""What an engine is asked and what it answers: arrays with a row per case, a column per species of the model."""

from enum import IntEnum
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.rates import Floats

__all__ = ["How", "Ints", "TankAnswers", "TankCases", "TubeAnswers"]

Ints = NDArray[np.intp]


class How(IntEnum):
    """How tanks are to be solved; the numbers are those of the compiled kernel."""

    FROM_FEED = 0  # the state that a start-up reaches
    FROM_GUESS = 1  # the state that Newton's method reaches from `c`; no start-up
    CHECK_ONLY = 2  # `c` is the state, exact to the last digit: only check it


class TankCases(NamedTuple):
    """N tanks of one structure.

    feed (N, S) [mol/m3], tau (N,) [s] > 0, T (N,) [K], p (N, P)
    start : (N, S) - first contents; None: full of feed
    fed : bool (N, S) - species that the feed alone brings about; None: all that are present
    scale : (N,) - what counts as much [mol/m3]; None: the largest concentration of feed and start
    c : (N, S) - for How.FROM_GUESS and How.CHECK_ONLY
    """

    feed: Floats
    tau: Floats
    T: Floats
    p: Floats
    start: Floats | None = None
    fed: NDArray[np.bool_] | None = None
    scale: Floats | None = None
    c: Floats | None = None


class TankAnswers(NamedTuple):
    """Their answers; see TankResult for most.

    faded : bool (N,) - what was there at the start only has been washed out: not solved
    error : (N,) - estimated relative error of an outlet, before it was judged
    root : (N, S) - the outlet before it was judged and tidied up
    """

    c: Floats
    status: NDArray[np.int32]
    from_start: NDArray[np.bool_]
    faded: NDArray[np.bool_]
    exhausted: NDArray[np.bool_]
    residual: Floats
    condition: Floats
    error: Floats
    root: Floats
    iterations: NDArray[np.int32]
    work: NDArray[np.int32]

    @classmethod
    def empty(cls, n: int, species: int) -> "TankAnswers":
        """Room for n answers, in three blocks: a single tank is solved faster than eleven arrays are made."""
        wide = n * species
        reals = np.empty(2 * wide + 3 * n)
        counts = np.empty((3, n), dtype=np.int32)
        marks = np.empty(wide + 2 * n, dtype=np.bool_)
        rest = reals[2 * wide :]
        return cls(
            reals[:wide].reshape(n, species), counts[0], marks[wide : wide + n], marks[wide + n :],
            marks[:wide].reshape(n, species), rest[:n], rest[n : 2 * n], rest[2 * n :],
            reals[wide : 2 * wide].reshape(n, species), counts[1], counts[2],
        )  # fmt: skip

    def put(self, rows: Ints, part: "TankAnswers") -> None:
        """Write the answers of some rows."""
        for name in self._fields:
            getattr(self, name)[rows] = getattr(part, name)


class TubeAnswers(NamedTuple):
    """Answers of N tubes at M residence times each.

    c (N, M, S), status (N, M), exhausted_at (N, S) [s] or nan, steps (N,), work (N,)
    """

    c: Floats
    status: NDArray[np.int32]
    exhausted_at: Floats
    steps: NDArray[np.int32]
    work: NDArray[np.int32]

    @classmethod
    def empty(cls, n: int, points: int, species: int) -> "TubeAnswers":
        """Room for n answers."""
        return cls(
            np.empty((n, points, species)), np.empty((n, points), dtype=np.int32), np.empty((n, species)),
            np.empty(n, dtype=np.int32), np.empty(n, dtype=np.int32),
        )  # fmt: skip

    def put(self, rows: Ints, part: "TubeAnswers") -> None:
        """Write the answers of some rows."""
        for name in self._fields:
            getattr(self, name)[rows] = getattr(part, name)
