"""How closely a step of an integrator has to be right, species by species."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.cutoff import Laws
from moletally.kernel.flow import Flow
from moletally.kernel.rates import Floats
from moletally.kernel.structure import Structure

__all__ = ["ABSOLUTE", "NOTHING", "Tolerance"]

# Shares of the largest concentration.
ABSOLUTE = 1e-25  # trace species are followed relatively
# A species that laws of order zero take away as it comes is the small difference of large rates; where
# supply comes to exceed them again its size is their rounding for a while.
STARVED = 1e-18
NOTHING = 1e-40  # shown as zero
LEAK = 10.0  # times the relative error, of the largest concentration
AT_FLOOR = 10.0  # times `least`, which is a tenth of the floor


@dataclass(frozen=True, slots=True)
class Tolerance:
    """Accepted error of a step: relative (explicit and stiff) times the concentration + least.

    blurred : ndarray, shape (n, S) - added for species that stand at the floor of their laws [mol/m3]
    least : ndarray, shape (n, S) - size of a concentration that is as good as none; how far below zero
        a step may end
    """

    relative: tuple[float, float]
    least: Floats
    blurred: Floats

    @classmethod
    def of(
        cls, structure: Structure, laws: Laws, scale: Floats, relative: tuple[float, float]
    ) -> "Tolerance":
        """Tolerances of n vessels; scale, shape (n, S)."""
        least = ABSOLUTE * scale
        ends = structure.finite_end[laws.edged]
        least[:, laws.edged[ends]] = 0.1 * laws.floor[:, ends]
        blurred = np.zeros_like(least)
        blurred[:, structure.starved] = STARVED * scale[:, structure.starved]
        return cls(relative, least, blurred)

    def at(self, rows: NDArray[np.intp]) -> "Tolerance":
        """The vessels in `rows`."""
        return Tolerance(self.relative, self.least[rows], self.blurred[rows])

    def missed(self, error: Floats, before: Floats, after: Floats, method: int) -> Floats:
        """Errors in units of what is accepted, shape (n, S)."""
        size = np.maximum(np.abs(before), np.abs(after))
        # Not on the way to the floor: a step that is not sure to end there would be tried for ever.
        extra = np.where(self._at_floor(before), self.blurred, 0.0)
        return np.abs(error) / (self.least + extra + self.relative[method] * size)

    def _at_floor(self, c: Floats) -> NDArray[np.bool_]:
        return np.asarray((self.blurred > 0) & (c < AT_FLOOR * self.least))

    def leaked(self, flow: Flow, before: Floats, after: Floats, h: Floats) -> Floats | None:
        """What species at the floor still gain or lose at the end of a step, in units of what is accepted.

        Shape (n,), None if there are none. A Rosenbrock method takes a law at the floor for a stiff
        spring; where supply has come to exceed it the law gives way, and the method would not notice that
        the excess of a whole step is gone.
        """
        low = self._at_floor(before)
        if not low.any():
            return None
        allowed = LEAK * self.relative[1] * self.blurred / STARVED
        gain = np.abs(flow.slope(after)) * h[:, None]
        return np.asarray(np.where(low, gain / np.where(low, allowed, 1.0), 0.0).max(axis=1))
