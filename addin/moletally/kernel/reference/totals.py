"""Keeps integrators on the totals that no reaction changes: the rounding of fast reactions must not add up."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.rates import Floats

__all__ = ["Totals"]

# Of a total's terms. Methods keep linear totals exactly; what they lose is the rounding of fast reactions
# that almost cancel, and that can be much. More than this is no rounding and must show.
DRIFT = 1e-4


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
