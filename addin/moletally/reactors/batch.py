"""What is asked of a vessel and what it answers: arrays with a row per case."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from moletally.chemistry.network import Network
from moletally.kernel.status import Status

__all__ = ["Batch", "Floats", "Outlets"]

Floats = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Batch:
    """N cases of one isothermal vessel of constant density, all quantities in SI.

    network : Network - S species, R reactions, P parameters
    feed : ndarray, shape (N, S) - inlet concentrations [mol/m3]
    size : ndarray, shape (N,) - tau = V/q [s], or W/q [kg s/m3] where rates are per mass of catalyst
    temperature : ndarray, shape (N,) - [K]; nan where no law needs one and none is given
    parameters : ndarray, shape (N, P) - in the network's order
    start : ndarray, shape (N, S), or None - first contents of a tank [mol/m3]; None: full of feed
    flow : ndarray, shape (N,) - volumetric flow q [m3/s], nan where unknown
    density : ndarray, shape (N,) - catalyst per volume of vessel [kg/m3], nan where unknown
    """

    network: Network
    feed: Floats
    size: Floats
    temperature: Floats
    parameters: Floats
    start: Floats | None
    flow: Floats
    density: Floats

    def __len__(self) -> int:
        return len(self.size)

    @property
    def residence_time(self) -> Floats:
        """tau = V/q [s], shape (N,); nan where only a catalyst mass is known."""
        return self.size / self.density if self.network.per_mass else self.size

    @property
    def key(self) -> tuple[object, ...]:
        """Equal for batches of equal numbers: what an answer is remembered under."""
        start = None if self.start is None else self.start.tobytes()
        return (
            id(self.network), self.feed.tobytes(), self.size.tobytes(), self.temperature.tobytes(),
            self.parameters.tobytes(), start,
        )  # fmt: skip

    def at(self, rows: NDArray[np.intp]) -> "Batch":
        """The cases in `rows`."""
        start = None if self.start is None else self.start[rows]
        return Batch(
            self.network, self.feed[rows], self.size[rows], self.temperature[rows], self.parameters[rows],
            start, self.flow[rows], self.density[rows],
        )  # fmt: skip


@dataclass(frozen=True, eq=False)
class Outlets:
    """The answer to a Batch.

    concentration : ndarray, shape (N, S) - outlet [mol/m3]; nan where the case failed
    status : ndarray, shape (N,) - kernel statuses; 0 is a checked answer
    exhausted : bool ndarray, shape (N, S) - species that a law would drive below zero (it is cut there)
    exhausted_at : ndarray, shape (N, S) - tau (or W/q) of exhaustion in a tube, nan in a tank
    unique : bool ndarray, shape (N,) - True where one steady state is proven (a tube always has one)
    from_start : bool ndarray, shape (N,) - True where a start-up transient chose the state
    residual : ndarray, shape (N,) - largest balance residual over the sum of its terms
    condition : ndarray, shape (N,) - condition of the balances, nan for tubes
    work : ndarray, shape (N,) - evaluations of the rate laws
    """

    concentration: Floats
    status: NDArray[np.int32]
    exhausted: NDArray[np.bool_]
    exhausted_at: Floats
    unique: NDArray[np.bool_]
    from_start: NDArray[np.bool_]
    residual: Floats
    condition: Floats
    work: NDArray[np.int32]

    @property
    def fine(self) -> NDArray[np.bool_]:
        """Cases whose answer passed every check."""
        return np.equal(self.status, Status.OK)
