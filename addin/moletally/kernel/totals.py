"""Totals that no reaction changes: atoms, charges, or moles of whatever the equations keep together."""

from dataclasses import dataclass
from fractions import Fraction

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.rates import Floats

__all__ = ["Totals", "conserved", "exact_coefficients"]

LARGEST_DENOMINATOR = 1000

# Of a total's terms. Methods keep linear totals exactly; what they lose is the rounding of fast reactions
# that almost cancel, and that can be much. More than this is no rounding and must show.
DRIFT = 1e-4


def exact_coefficients(nu: Floats) -> list[list[Fraction]]:
    """Coefficients as the fractions that were meant: 0.6666666666666666 is two thirds.

    A fast equilibrium multiplies the rounding of a coefficient by its rate: what it makes of a total would
    not be what the equation says.
    """
    return [[_fraction(x) for x in row] for row in nu.tolist()]


def _fraction(x: float) -> Fraction:
    near = Fraction(x).limit_denominator(LARGEST_DENOMINATOR)
    return near if float(near) == x else Fraction(x)


def conserved(nu: Floats) -> Floats:
    """Rows w with nu w = 0, shape (n, S), from nu, shape (terms, S): exact, so that zeros are zeros.

    An orthogonal basis would do for a check, but its rounding in the place of an abundant species
    would drown a total of trace species.
    """
    species = nu.shape[1]
    rows = exact_coefficients(np.unique(nu, axis=0))
    pivots: list[int] = []
    for i in range(species):
        k = next((k for k in range(len(pivots), len(rows)) if rows[k][i]), None)
        if k is None:
            continue
        top = len(pivots)
        rows[top], rows[k] = rows[k], rows[top]
        rows[top] = [x / rows[top][i] for x in rows[top]]
        for other in range(len(rows)):
            factor = rows[other][i]
            if other != top and factor:
                rows[other] = [x - factor * y for x, y in zip(rows[other], rows[top], strict=True)]
        pivots.append(i)
    free = [i for i in range(species) if i not in pivots]
    basis = np.zeros((len(free), species))
    for k, i in enumerate(free):
        basis[k, i] = 1.0
        for row, pivot in zip(rows, pivots, strict=False):
            basis[k, pivot] = float(-row[i])
    return basis


@dataclass(frozen=True, slots=True)
class Totals:
    """Totals of n vessels over time: weights, shape (totals, S), first and last, shape (n, totals).

    exchange : ndarray, shape (n,) - 1/tau of a tank [1/s], 0 for a tube: a total nears its last value
        as exp(-t/tau), whatever reacts
    """

    weights: Floats
    first: Floats
    last: Floats
    exchange: Floats

    @classmethod
    def of(cls, weights: Floats, start: Floats, feed: Floats, exchange: Floats) -> "Totals | None":
        """Totals that a vessel has, from its start and feed, shape (n, S); None if there are none."""
        weights = weights[weights.any(axis=1)]
        return cls(weights, start @ weights.T, feed @ weights.T, exchange) if len(weights) else None

    def restore(self, c: Floats, rows: NDArray[np.intp], t: Floats) -> Floats:
        """c at times t moved back onto its totals, shape (n, S): the rounding of steps must not add up.

        The move is least relative to the concentrations, so that trace species are left in peace.
        """
        w = self.weights
        fade = np.exp(-t * self.exchange[rows])[:, None]
        last = self.last[rows]
        off = last + fade * (self.first[rows] - last) - c @ w.T
        terms = np.abs(c) @ np.abs(w).T
        near = (np.abs(off) <= DRIFT * terms).all(axis=1)
        if not near.any() or not off.any():
            return c
        with np.errstate(all="ignore"):
            weighted = w * (c / np.abs(c).max(axis=1, keepdims=True))[:, None, :]
            push = np.einsum("nts,nt->ns", weighted, _least(weighted, off))
            moved = c + push * (c / np.abs(c).max(axis=1, keepdims=True))
        fine = near & np.isfinite(moved).all(axis=1)
        return np.where(fine[:, None], moved, c)


def _least(weighted: Floats, off: Floats) -> Floats:
    """Multipliers of the totals whose weighted move closes `off`, shape (n, totals)."""
    gram = np.matmul(weighted, weighted.transpose(0, 2, 1))
    size = np.sqrt(np.einsum("ntt->nt", gram))
    size = np.where(size > 0, size, 1.0)
    scaled = gram / (size[:, :, None] * size[:, None, :])
    solved = np.matmul(np.linalg.pinv(scaled, rcond=1e-12, hermitian=True), (off / size)[:, :, None])
    return np.asarray(solved[:, :, 0] / size)
