"""Laws near zero concentrations, made fit for integrators.

Below a floor delta a law r of order q in species i is continued as

    r(max(c_i, delta)) g_q(c_i/delta),   g_q(u) = u ((2 - q) + (q - 1) u)

which is zero at zero, has no corner at delta and is exact for q = 1 and q = 2. A law of order zero
that consumes i has g = u and settles where it takes what is supplied: all such laws are cut by one
common factor u. (The parabola would be flat at delta, and an integrator lost where supply and demand
cross: a corner is passed once.)
A law that only reads i (order zero or less, not consuming it) keeps its value at the floor.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.rates import Bound, Floats
from moletally.kernel.structure import ZERO_ORDER, Structure

__all__ = ["FLOOR", "STEADY_FLOOR", "Laws"]

# Of the species' scale. It must be deep: beside a law of order zero that takes all that is supplied, a
# fast one of order one half would take its share at 1e-15; and a chain carrier of half order in its own
# end may run a reaction from a share of 1e-16.
FLOOR = 1e-30
# Newton's method has no steps to take care of: deep enough that what is left at it matters to nothing.
STEADY_FLOOR = 1e-60
# Where a law has no bound at zero there is no answer beyond; what counts is to get there in few steps.
ENDLESS_FLOOR = 1e-15

Ints = NDArray[np.intp]


@dataclass(frozen=True, slots=True)
class Laws:
    """The running terms of a structure, cut near zero of some species.

    bound : Bound - of n cases
    edged : ndarray - positions of the species that are cut
    floor : ndarray, shape (n, edged) - delta [mol/m3]
    factor : bool ndarray, shape (terms, edged) - where g applies
    order : ndarray, shape (terms, edged)
    """

    bound: Bound
    edged: Ints
    floor: Floats
    factor: NDArray[np.bool_]
    order: Floats

    @classmethod
    def of(
        cls, structure: Structure, edged: Ints, scale: Floats, T: Floats, p: Floats, share: float = FLOOR
    ) -> "Laws":
        """Laws of N cases; scale, shape (N, present): what the floors are a share of."""
        order = structure.order[:, edged]
        reading = (order < ZERO_ORDER) & (structure.nu[:, edged] >= 0)
        bound = Bound.of(structure.tape, T, p)
        shares = np.where(structure.endless[edged], max(ENDLESS_FLOOR, share), share)
        return cls(bound, edged, shares * scale[:, edged], ~reading, order)

    def at(self, rows: Ints) -> "Laws":
        """The cases in `rows`."""
        return Laws(self.bound.at(rows), self.edged, self.floor[rows], self.factor, self.order)

    def rates(self, c: Floats) -> Floats:
        """r, shape (n, terms), at c, shape (n, present)."""
        if not len(self.edged) or not (c[:, self.edged] < self.floor).any():
            return self.bound.rates(c)
        return np.asarray(self.bound.rates(self._lifted(c)) * self._factors(c)[0])

    def slopes(self, c: Floats) -> tuple[Floats, Floats]:
        """r and its exact derivatives dr/dc, shape (n, terms, present)."""
        if not len(self.edged) or not (c[:, self.edged] < self.floor).any():
            return self.bound.slopes(c)
        factor, slope = self._factors(c)
        r, v = self.bound.slopes(self._lifted(c))
        v = v * factor[:, :, None]
        below = (c[:, self.edged] < self.floor)[:, None, :]
        v[:, :, self.edged] = np.where(below, r[:, :, None] * slope, v[:, :, self.edged])
        return r * factor, v

    def strict(self, c: Floats) -> Floats:
        """r with nan where a root of a negative number is taken: for checking answers."""
        return self.bound.rates(self._lifted(c) if len(self.edged) else c, strict=True)

    def _lifted(self, c: Floats) -> Floats:
        lifted: Floats = c.copy()
        lifted[:, self.edged] = np.maximum(c[:, self.edged], self.floor)
        return lifted

    def _factors(self, c: Floats) -> tuple[Floats, Floats]:
        """What the laws at the floor are multiplied by, shape (n, terms), and its derivatives by c.

        A little below zero g goes on as a straight line, so that a law draws its species back. A law
        stops where two of its species are negative: their product would drive both further away.
        """
        u = np.minimum(c[:, self.edged] / self.floor, 1.0)[:, None, :]
        q, some = self.order, np.maximum(u, 0.0)
        with np.errstate(all="ignore"):
            steep = np.where(some > 0, some ** np.maximum(q, 2.0), 0.0)
            g = np.where(q > 2, steep, u * ((2 - q) + (q - 1) * some))
            dg = np.where(q > 2, q * steep / np.where(some > 0, some, 1.0), (2 - q) + 2 * (q - 1) * some)
            flat = np.abs(q) < ZERO_ORDER
            g, dg = np.where(flat, u, g), np.where(flat, 1.0, dg)
        applies = self.factor & (u < 1)
        runs = (applies & (u < 0)).sum(axis=2) < 2
        g, dg = np.where(applies, g, 1.0), np.where(applies, dg, 0.0)
        slope = np.empty_like(g)
        for k in range(len(self.edged)):
            slope[:, :, k] = np.delete(g, k, axis=2).prod(axis=2) * dg[:, :, k]
        return g.prod(axis=2) * runs, slope * runs[:, :, None] / self.floor[:, None, :]
