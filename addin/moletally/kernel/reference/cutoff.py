"""Laws near zero concentrations, made fit for integrators and for Newton's method.

Within a depth delta of zero a law r of order q < 1 in a species i that it consumes is continued as

    r(c_i + delta) c_i/(c_i + delta)

which is zero at zero, exact for q = 1, and for c_i >> delta differs from r by delta/c_i. A law of order
zero settles where it takes what is supplied, all such laws of a species cut by one common factor; one
of order one half fades out smoothly. (Joining a parabola or a line to r at a floor is simpler and
fails: integrators get lost at the seam when supply comes to match demand there.) A law that only reads
i, of order zero or less, is r(c_i + delta); one of order q > 1 has the factor to the power q: exact.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.depth import DEPTH, ENDLESS_DEPTH
from moletally.kernel.rates import Bound, Floats, tape_of
from moletally.kernel.structure import ZERO_ORDER, Structure

__all__ = ["LOW", "Laws"]

FAR = 1e16  # depths from zero at which the difference is rounding
LOW = 1e6  # depths from zero within which a law of order zero no longer gets all it asks for

Ints = NDArray[np.intp]


@dataclass(frozen=True, slots=True)
class Laws:
    """The running terms of a structure, cut near zero of some species.

    bound : Bound - of n cases
    edged : ndarray - positions of the species whose laws are cut
    depth : ndarray, shape (n, edged) - delta [mol/m3]
    power : ndarray, shape (terms, edged) - of the factor; 0 where a law only reads the species
    """

    bound: Bound
    edged: Ints
    depth: Floats
    power: Floats

    @classmethod
    def of(
        cls, structure: Structure, edged: Ints, scale: Floats, T: Floats, p: Floats, share: float = DEPTH
    ) -> "Laws":
        """Laws of N cases; scale, shape (N, present): what the depths are a share of."""
        order = structure.order[:, edged]
        reading = (order < ZERO_ORDER) & (structure.nu[:, edged] >= 0)
        bound = Bound.of(structure.tape, T, p)
        shares = np.where(structure.endless[edged], max(ENDLESS_DEPTH, share), share)
        return cls(bound, edged, shares * scale[:, edged], np.where(reading, 0.0, np.maximum(order, 1.0)))

    def at(self, rows: Ints) -> "Laws":
        """The cases in `rows`."""
        return Laws(self.bound.at(rows), self.edged, self.depth[rows], self.power)

    def low(self, c: Floats) -> NDArray[np.bool_]:
        """Where c, shape (n, present), is as good as zero for a law of order zero; shape (n, edged)."""
        return np.asarray(c[:, self.edged] < LOW * self.depth)

    def rates(self, c: Floats) -> Floats:
        """r, shape (n, terms), at c, shape (n, present)."""
        if self._far(c):
            return self.bound.rates(c)
        return np.asarray(self.bound.rates(self._lifted(c)) * self._factors(c)[0])

    def slopes(self, c: Floats) -> tuple[Floats, Floats]:
        """r and its exact derivatives dr/dc, shape (n, terms, present)."""
        if self._far(c):
            return self.bound.slopes(c)
        factor, slope = self._factors(c)
        r, v = self.bound.slopes(self._lifted(c))
        below = np.zeros(c.shape, dtype=np.bool_)
        below[:, self.edged] = c[:, self.edged] < 0
        v = np.where(below[:, None, :], 0.0, v) * factor[:, :, None]
        v[:, :, self.edged] += r[:, :, None] * slope
        return r * factor, v

    def by_constants(self, structure: Structure, c: Floats, T: Floats, p: Floats) -> Floats:
        """Derivatives by temperature and parameters, shape (n, terms, 1 + P)."""
        program, here = structure.terms.model.program, len(structure.present)
        leaves = (*structure.present.tolist(), *range(program.temperature, program.first_literal))
        tape = tape_of(program, tuple(structure.firing.tolist()), leaves)
        state, factor = c, np.ones((1, 1))
        if not self._far(c):
            state, factor = self._lifted(c), self._factors(c)[0]
        _, v = Bound.of(tape, T, p).slopes(np.concatenate([state, T[:, None], p], axis=1))
        return np.asarray(v[:, :, here:] * factor[:, :, None])

    def strict(self, c: Floats) -> Floats:
        """r with nan where a root of a negative number is taken: for checking answers."""
        return self.bound.rates(self._lifted(c), strict=True)

    def _far(self, c: Floats) -> bool:
        return not len(self.edged) or not bool((c[:, self.edged] < FAR * self.depth).any())

    def _lifted(self, c: Floats) -> Floats:
        lifted: Floats = c.copy()
        lifted[:, self.edged] = np.maximum(c[:, self.edged], 0.0) + self.depth
        return lifted

    def _factors(self, c: Floats) -> tuple[Floats, Floats]:
        """What the lifted laws are multiplied by, shape (n, terms), and its derivatives by c of edged species.

        A little below zero c/(c + delta) goes on as a straight line, so that a law draws its species back.
        A law stops where two of its species are negative: their product would drive both further away.
        """
        edge, depth = c[:, self.edged], self.depth
        negative = edge < 0
        whole = np.where(negative, depth, edge + depth)
        share = (edge / whole)[:, None, :]
        rise = (depth / whole**2)[:, None, :]
        q = self.power
        some = np.maximum(share, 0.0)
        with np.errstate(all="ignore"):
            g = np.where(q == 1, share, some**q)
            dg = np.where(q == 1, 1.0, np.where(q > 1, q * some ** (q - 1.0), 0.0)) * rise
        runs = ((q > 0) & negative[:, None, :]).sum(axis=2) < 2
        slope = np.empty_like(g)
        for k in range(len(self.edged)):
            slope[:, :, k] = np.delete(g, k, axis=2).prod(axis=2) * dg[:, :, k]
        return g.prod(axis=2) * runs, slope * runs[:, :, None]
