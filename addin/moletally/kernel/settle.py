"""From a root to an answer: last digits, exhausted species, stability, and the checks all must pass."""

from dataclasses import dataclass, replace
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.cutoff import LOW, STEADY_DEPTH, Laws
from moletally.kernel.program import Model
from moletally.kernel.rates import Floats
from moletally.kernel.refine import refine
from moletally.kernel.stability import growth, invaded
from moletally.kernel.status import Status
from moletally.kernel.steady import CLOSED, EPSILON, NOTHING, Tanks, newton, polish
from moletally.kernel.structure import ZERO_ORDER, Structure, structures

__all__ = ["Settled", "settle"]

RELIABLE = 1e-10  # estimated relative error beyond which 50 digits are called for
BELIEVED = 1e-8  # and beyond which, if they fail, the answer is withheld
INVARIANT = 1e-9  # of the sum of a total's terms

Ints = NDArray[np.intp]
Bools = NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class Settled:
    """Answers of n tanks; c and exhausted, shape (n, S of all species), the others (n,), as in TankResult."""

    c: Floats
    status: NDArray[np.int_]
    exhausted: Bools
    residual: Floats
    condition: Floats
    growth: Floats


def settle(structure: Structure, tanks: Tanks, c: Floats, T: Floats, p: Floats) -> Settled:
    """Check roots c, shape (n, present), of n tanks, and put them into all species."""
    answer = _settle(structure, tanks, c, T, p, structure.unique)
    for pattern in np.unique(answer.exhausted[answer.exhausted.any(axis=1)], axis=0):
        rows = np.flatnonzero((answer.exhausted == pattern).all(axis=1))
        gone = tuple(np.flatnonzero(pattern[structure.present]).tolist())
        model = _without(structure, gone)
        if model is not None:
            _settle_again(model, structure, answer, rows, tanks, c, T, p)
    return answer


def _settle(structure: Structure, tanks: Tanks, c: Floats, T: Floats, p: Floats, unique: bool) -> Settled:
    polished = polish(tanks, c, _gone(structure, tanks, c))
    c, error, residual = polished.c, polished.error, polished.residual
    for k in np.flatnonzero(~(error <= RELIABLE)).tolist():
        better = _in_decimals(structure, tanks, k, c[k], T, p)
        if better is not None:
            c[k], error[k] = better, 0.0
    rate, swing, unstable = growth(tanks, c)
    status = np.zeros(len(c), dtype=np.int_)
    status[~(error <= BELIEVED)] = Status.ILL_CONDITIONED
    status[~(residual <= CLOSED)] = Status.RESIDUAL
    status[unstable] = np.where(swing[unstable] > 0, Status.OSCILLATES, Status.UNSTABLE)
    if not unique:
        status[invaded(structure, c, tanks.tau, T, p)] = Status.UNSTABLE
    gone = _gone(structure, tanks, c)
    c = np.where(gone | (c <= tanks.nothing), 0.0, c)
    status[~np.isfinite(tanks.laws.strict(c)).all(axis=1)] = Status.NOT_FINITE
    status[~(c >= 0).all(axis=1)] = Status.NEGATIVE
    status[_totals_lost(structure, c, tanks.feed)] = Status.INVARIANT
    everything = np.zeros((len(c), structure.terms.model.program.n_species))
    everything[:, structure.present] = np.where((status == Status.OK)[:, None], c, np.nan)
    everything[status != Status.OK] = np.nan
    exhausted = np.zeros(everything.shape, dtype=np.bool_)
    exhausted[:, structure.present] = gone
    exhausted[:, structure.wanted] = True
    return Settled(everything, status, exhausted, residual, polished.condition, rate)


def _in_decimals(
    structure: Structure, tanks: Tanks, k: int, c: Floats, T: Floats, p: Floats
) -> Floats | None:
    laws = tanks.laws
    if (c[laws.edged] < LOW * laws.depth[k]).any():
        return None
    return refine(structure.tape, structure.nu, c, tanks.feed[k], float(tanks.tau[k]), float(T[k]), p[k])


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


@lru_cache(maxsize=512)
def _without(structure: Structure, gone: tuple[int, ...]) -> Model | None:
    """The model less the terms that vanish with the species used up; None if there are none.

    Near zero such a term still takes a share, one of order one half 1e-30 times its constant.
    """
    keep = ~(structure.order[:, list(gone)] > ZERO_ORDER).any(axis=1)
    if keep.all():
        return None
    terms, kept = structure.terms.model, structure.firing[keep]
    program = replace(
        terms.program, segments=terms.program.segments[kept], outputs=terms.program.outputs[kept]
    )
    return Model(program, terms.stoichiometry[kept])


def _settle_again(
    model: Model, structure: Structure, answer: Settled, rows: Ints, tanks: Tanks, c: Floats, T: Floats,
    p: Floats,
) -> None:  # fmt: skip
    """Solve the tanks in `rows` without those terms, from where they are; keep what is as good."""
    feed, start = np.zeros((2, len(rows), model.program.n_species))
    feed[:, structure.present], start[:, structure.present] = tanks.feed[rows], c[rows]
    scale = tanks.nothing[rows] / NOTHING
    gone = answer.exhausted[rows] & np.isin(np.arange(feed.shape[1]), structure.present)
    for less, part in structures(model, feed > 0, T[rows], p[rows]):
        here = rows[part]
        if less.unbounded or not len(less.firing):
            continue
        size = np.broadcast_to(scale[part], (len(part), len(less.present)))
        laws = Laws.of(less, less.starved, size, T[here], p[here], STEADY_DEPTH)
        fewer = Tanks(
            laws, less.coefficients, feed[np.ix_(part, less.present)], tanks.tau[here], tanks.nothing[here]
        )
        roots = newton(fewer, np.maximum(start[np.ix_(part, less.present)], tanks.nothing[here]))
        found = _settle(less, fewer, roots.c, T[here], p[here], unique=True)
        good = roots.settled & (found.status == Status.OK) & ~(gone[part] & (found.c != 0)).any(axis=1)
        answer.exhausted[here[good]] |= found.exhausted[good]
        for name in ("c", "status", "residual", "condition", "growth"):
            getattr(answer, name)[here[good]] = getattr(found, name)[good]
