"""How closely a step of an integrator has to be right, species by species."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.rates import Floats
from moletally.kernel.reference.cutoff import LOW, Laws
from moletally.kernel.reference.flow import Flow
from moletally.kernel.structure import Structure

__all__ = ["ABSOLUTE", "NOTHING", "Tolerance"]

# Shares of the largest concentration.
ABSOLUTE = 1e-25  # trace species are followed relatively
NOTHING = 1e-40  # shown as zero
# A species that laws of order zero take away as it comes is the small difference of large rates: where
# supply comes to match them its size is their rounding.
STARVED = 1e-18
ROUNDING = 1e-15  # of half order: the root of its concentration is such a difference
FALLS = 1e-6  # of all rates that make or take it: a species that loses more is on its way to zero
SHARE_OF_DEPTH = 0.1
LEAK = 10.0  # times the relative error, of the largest concentration


@dataclass(frozen=True, slots=True)
class Tolerance:
    """Accepted error of a step: relative (explicit and stiff) times the concentration + least.

    least : ndarray, shape (n, S) - size of a concentration that is as good as none; how far below zero
        a step may end [mol/m3]
    scale : ndarray, shape (n, S) - the largest concentration
    ends, starved : bool ndarray, shape (S,) - species that laws of order below one use up; of order zero
    """

    relative: tuple[float, float]
    least: Floats
    scale: Floats
    ends: NDArray[np.bool_]
    starved: NDArray[np.bool_]

    @classmethod
    def of(
        cls, structure: Structure, laws: Laws, scale: Floats, relative: tuple[float, float]
    ) -> "Tolerance":
        """Tolerances of n vessels; scale, shape (n, S)."""
        least = ABSOLUTE * scale
        ends = structure.finite_end
        near = ends[laws.edged]
        least[:, laws.edged[near]] = SHARE_OF_DEPTH * laws.depth[:, near]
        starved = np.isin(np.arange(scale.shape[1]), structure.starved)
        return cls(relative, least, scale, ends, starved)

    def at(self, rows: NDArray[np.intp]) -> "Tolerance":
        """The vessels in `rows`."""
        return Tolerance(self.relative, self.least[rows], self.scale[rows], self.ends, self.starved)

    def missed(self, flow: Flow, error: Floats, before: Floats, after: Floats, method: int) -> Floats:
        """Errors in units of what is accepted, shape (n, S)."""
        size = np.maximum(np.abs(before), np.abs(after))
        accepted = self.least + self.relative[method] * size
        if self.ends.any():
            accepted = accepted + self.ends * ROUNDING * np.sqrt(size * self.scale)
        if self.starved.any():
            # Not on the way to zero: a step that is not sure to end there would be tried for ever.
            net, gross = flow.balance(before)
            accepted = accepted + self.starved * (net >= -FALLS * gross) * STARVED * self.scale
        return np.abs(error) / accepted

    def _low(self, c: Floats) -> NDArray[np.bool_]:
        return np.asarray(self.starved & (c < LOW / SHARE_OF_DEPTH * self.least))

    def leaked(self, flow: Flow, before: Floats, after: Floats, h: Floats) -> Floats | None:
        """What species near zero still gain or lose at the end of a step, in units of what is accepted.

        Shape (n,), None if there are none. A Rosenbrock method takes a law of order zero that is cut for a
        stiff spring; where supply has come to exceed it the law gives way, and the method would not notice
        that the excess of a whole step is gone.
        """
        low = self._low(before)
        if not low.any():
            return None
        gain = np.abs(flow.slope(after)) * h[:, None] / (LEAK * self.relative[1] * self.scale)
        net, gross = flow.balance(before)
        rises = (net > FALLS * gross) & (net * h[:, None] > LOW / SHARE_OF_DEPTH * self.least)
        gain = np.where(rises & (after < before), np.inf, gain)
        return np.asarray(np.where(low, gain, 0.0).max(axis=1))
