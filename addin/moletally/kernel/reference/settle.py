"""From a root to an answer: last digits, exhausted species, stability, and the checks all must pass."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.rates import Floats
from moletally.kernel.reference.stability import growth, invaded
from moletally.kernel.reference.steady import CLOSED, EPSILON, Tanks, polish
from moletally.kernel.status import Status
from moletally.kernel.structure import ZERO_ORDER, Structure

__all__ = ["Settled", "settle"]

BELIEVED = 1e-8  # estimated relative error beyond which the answer is withheld
INVARIANT = 1e-9  # of the sum of a total's terms

Bools = NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class Settled:
    """Answers of n tanks; c, root and exhausted, shape (n, S of all species), the others (n,)."""

    c: Floats
    root: Floats
    status: NDArray[np.int32]
    exhausted: Bools
    residual: Floats
    condition: Floats
    error: Floats


def settle(
    structure: Structure, tanks: Tanks, c: Floats, T: Floats, p: Floats, exact: bool, lasting: bool
) -> Settled:
    """Check roots c, shape (n, present), of n tanks, and put them into all species.

    exact : the roots are right to the last digit and stay as they are
    lasting : no species that is absent could grow, or that does not matter
    """
    polished = polish(tanks, c, _gone(structure, tanks, c))
    error, residual = polished.error, polished.residual
    if exact:
        error = np.zeros_like(error)
    else:
        c = polished.c
    root = c
    _, swing, unstable = growth(tanks, c)
    status = np.zeros(len(c), dtype=np.int32)
    status[~(error <= BELIEVED)] = Status.ILL_CONDITIONED
    status[~(residual <= CLOSED)] = Status.RESIDUAL
    status[unstable] = np.where(swing[unstable] > 0, Status.OSCILLATES, Status.UNSTABLE)
    if not lasting:
        status[invaded(structure, c, tanks.tau, T, p)] = Status.UNSTABLE
    gone = _gone(structure, tanks, c)
    c = np.where(gone | (c <= tanks.nothing), 0.0, c)
    status[~np.isfinite(tanks.laws.strict(c)).all(axis=1)] = Status.NOT_FINITE
    status[~(c >= 0).all(axis=1)] = Status.NEGATIVE
    status[_totals_lost(structure, c, tanks.feed)] = Status.INVARIANT
    whole, roots = np.zeros((2, len(c), structure.terms.model.program.n_species))
    whole[:, structure.present], roots[:, structure.present] = c, root
    whole[status != Status.OK] = np.nan
    exhausted = np.zeros(whole.shape, dtype=np.bool_)
    exhausted[:, structure.present] = gone
    return Settled(whole, roots, status, exhausted, residual, polished.condition, error)


def _gone(structure: Structure, tanks: Tanks, c: Floats) -> Bools:
    """Species that laws of order zero use up, shape (n, present).

    So low that those laws are cut and take most of it, or below the rounding of what they take.
    """
    gone = np.zeros(c.shape, dtype=np.bool_)
    if not len(structure.starved):
        return gone
    r, low = tanks.laws.rates(c), tanks.laws.low(c)
    flat = np.abs(structure.order) < ZERO_ORDER
    for k, i in enumerate(tanks.laws.edged.tolist()):
        takes = np.maximum(-structure.nu[:, i], 0.0)
        taken = tanks.tau * (r @ (takes * flat[:, i]))
        other = tanks.tau * (r @ (takes * ~flat[:, i]))
        below = low[:, k] & (taken >= other)
        gone[:, i] = below | (c[:, i] + other < 4.0 * EPSILON * taken)
    return gone


def _totals_lost(structure: Structure, c: Floats, feed: Floats) -> Bools:
    w = structure.conserved[:, structure.present].T
    with np.errstate(all="ignore"):
        lost = np.abs((c - feed) @ w) > INVARIANT * ((np.abs(c) + feed) @ np.abs(w))
    return np.asarray(lost.any(axis=1))
