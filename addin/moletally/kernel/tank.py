"""Stirred tanks: 0 = feed - c + tau nu^T r(c), the state that a start-up reaches."""

from dataclasses import replace
from functools import lru_cache
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.cases import How, Ints, TankAnswers, TankCases
from moletally.kernel.engine import engine
from moletally.kernel.program import Model
from moletally.kernel.rates import Floats
from moletally.kernel.status import Status
from moletally.kernel.structure import ZERO_ORDER, Structure, structures

__all__ = ["TankResult", "solve_tanks"]

RELIABLE = 1e-10  # estimated relative error beyond which 50 digits are called for
NEAR_ZERO = 1e-50  # of the largest concentration: where laws of order zero are cut

Bools = NDArray[np.bool_]


class TankResult(NamedTuple):
    """The answer to N tanks.

    c : ndarray, shape (N, S) - outlets [mol/m3]; nan where the case failed
    status : ndarray, shape (N,)
    unique : bool ndarray, shape (N,) - one steady state is proven
    from_transient : bool ndarray, shape (N,) - the start-up chose the state
    exhausted : bool ndarray, shape (N, S) - species that a law of order zero uses up: it is cut
    residual : ndarray, shape (N,) - largest residual relative to the sum of its balance's terms
    iterations, work : ndarray, shape (N,) - of Newton's method; evaluations of the laws
    condition : ndarray, shape (N,) - relative change of an outlet per relative change of feed and rates
    root : ndarray, shape (N, S) - the outlets before what is used up was called zero
    """

    c: Floats
    status: NDArray[np.int32]
    unique: Bools
    from_transient: Bools
    exhausted: Bools
    residual: Floats
    iterations: NDArray[np.int32]
    work: NDArray[np.int32]
    condition: Floats
    root: Floats


def solve_tanks(
    model: Model, feed: Floats, tau: Floats, T: Floats, p: Floats, start: Floats | None = None
) -> TankResult:
    """Outlets of N tanks.

    feed : ndarray, shape (N, S) [mol/m3], >= 0; tau : ndarray, shape (N,) [s], >= 0
    T : ndarray, shape (N,) [K]; p : ndarray, shape (N, P)
    start : ndarray, shape (N, S) - first contents of the vessels; None: full of feed
    """
    cases = TankCases(feed, tau, T, p, start)
    there = feed > 0
    if start is not None:
        there = there | (start > 0)
    groups = list(structures(model, there, T, p))
    if len(groups) == 1 and (tau[0] > 0 if len(tau) == 1 else tau.min() > 0):
        return _result(groups[0][0].unique, _group(model, groups[0][0], cases))
    n, species = feed.shape
    answers, unique = TankAnswers.empty(n, species), np.ones(n, dtype=np.bool_)
    answers.put(np.arange(n), _nothing_happens(feed))
    for structure, rows in groups:
        running = rows[tau[rows] > 0]
        if len(running):
            unique[running] = structure.unique
            answers.put(running, _group(model, structure, _at(cases, running)))
    no_time = ~(tau >= 0)  # nan, or less than none
    answers.status[no_time], answers.c[no_time] = Status.NOT_FINITE, np.nan
    return _result(unique, answers)


def _result(unique: bool | Bools, a: TankAnswers) -> TankResult:
    proven = unique if isinstance(unique, np.ndarray) else np.array([unique] * len(a.status))
    return TankResult(
        a.c,
        a.status,
        proven,
        a.from_start,
        a.exhausted,
        a.residual,
        a.iterations,
        a.work,
        a.condition,
        a.root,
    )


def _at(cases: TankCases, rows: Ints) -> TankCases:
    start = None if cases.start is None else cases.start[rows]
    return TankCases(cases.feed[rows], cases.tau[rows], cases.T[rows], cases.p[rows], start)


def _nothing_happens(feed: Floats) -> TankAnswers:
    n = len(feed)
    none, nought = np.zeros(n, dtype=np.int32), np.zeros(n)
    no = np.zeros(n, dtype=np.bool_)
    return TankAnswers(
        feed.copy(), none, no, no, np.zeros(feed.shape, dtype=np.bool_), nought, np.ones(n), nought, feed, none,
        none,
    )  # fmt: skip


def _group(model: Model, structure: Structure, cases: TankCases) -> TankAnswers:
    """Answers to tanks of one structure."""
    if structure.unbounded:
        return _failed(structure, cases, Status.UNBOUNDED_AT_ZERO)
    if cases.start is not None:
        cases = cases._replace(fed=_fed(structure, cases.feed))
    answers, look_again = engine().tanks(structure, cases, How.FROM_FEED)
    if not look_again:
        return answers
    _judge(structure, cases, answers)
    if answers.exhausted.any():
        _again_without(structure, cases, answers)
    if answers.faded.any():
        # What was there at the start only was washed out before it could take hold: the feed alone is left.
        rows = np.flatnonzero(answers.faded)
        part = solve_tanks(model, cases.feed[rows], cases.tau[rows], cases.T[rows], cases.p[rows])
        for name in set(TankAnswers._fields) & set(TankResult._fields):
            getattr(answers, name)[rows] = getattr(part, name)
        answers.from_start[rows] = part.from_transient
    return answers


def _failed(structure: Structure, cases: TankCases, status: Status) -> TankAnswers:
    out = _nothing_happens(cases.feed)
    out.c[:] = np.nan
    out.status[:] = status
    out.exhausted[:, structure.wanted] = True
    return out


def _fed(structure: Structure, feed: Floats) -> Bools:
    """Species that the feed alone would bring about, shape (N, S)."""
    fed = np.zeros(feed.shape, dtype=np.bool_)
    here = feed[:, structure.present] > 0
    for k, pattern in enumerate(map(tuple, here.tolist())):
        fed[k, structure.present] = structure.reached(pattern)
    return fed


def _judge(structure: Structure, cases: TankCases, answers: TankAnswers) -> None:
    """Takes tanks whose doubles lost too many digits through 50 decimals, and checks them again."""
    doubtful = ~(answers.error <= RELIABLE) | (answers.status == Status.RESIDUAL)
    for k in np.flatnonzero(doubtful & ~answers.faded).tolist():
        better = _in_decimals(structure, cases, k, answers.root[k])
        if better is not None:
            one = np.array([k])
            case = _at(cases, one)._replace(c=better[None], scale=_pick(cases.scale, one))
            checked, _ = engine().tanks(structure, case, How.CHECK_ONLY)
            answers.put(one, _kept(answers, k, checked))


def _kept(answers: TankAnswers, k: int, checked: TankAnswers) -> TankAnswers:
    """A checked answer with the history of the one it replaces."""
    one = slice(k, k + 1)
    return checked._replace(
        from_start=answers.from_start[one],
        iterations=answers.iterations[one],
        work=answers.work[one],
    )


def _pick(values: Floats | None, rows: Ints) -> Floats | None:
    return None if values is None else values[rows]


def _in_decimals(structure: Structure, cases: TankCases, k: int, root: Floats) -> Floats | None:
    here = structure.present
    c, feed = root[here], cases.feed[k][here]
    if (c[structure.starved] < NEAR_ZERO * max(cases.feed[k].max(), root.max())).any() or not (c > 0).all():
        return None
    from moletally.kernel.refine import refine  # decimals are slow to load and rarely called for

    better = refine(structure.tape, structure.nu, c, feed, float(cases.tau[k]), float(cases.T[k]), cases.p[k])
    if better is None:
        return None
    out = np.zeros(len(root))
    out[here] = better
    return out


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


def _again_without(structure: Structure, cases: TankCases, answers: TankAnswers) -> None:
    """Solves tanks whose species are used up without what vanishes with them; keeps what is as good."""
    used = answers.exhausted[:, structure.present]
    for pattern in np.unique(used[used.any(axis=1)], axis=0):
        model = _without(structure, tuple(np.flatnonzero(pattern).tolist()))
        if model is None:
            continue
        rows = np.flatnonzero((used == pattern).all(axis=1))
        gone = np.zeros(answers.c.shape[1], dtype=np.bool_)
        gone[structure.present[pattern]] = True
        feed = np.zeros((len(rows), answers.c.shape[1]))
        feed[:, structure.present] = cases.feed[np.ix_(rows, structure.present)]
        for less, part in structures(model, feed > 0, cases.T[rows], cases.p[rows]):
            if not less.unbounded and len(less.firing):
                _solve_without(less, gone, cases, answers, rows[part], feed[part])


def _solve_without(
    less: Structure, gone: Bools, cases: TankCases, answers: TankAnswers, rows: Ints, feed: Floats
) -> None:
    largest = cases.feed[rows] if cases.start is None else np.maximum(cases.feed[rows], cases.start[rows])
    top = largest.max(axis=1, initial=0.0)
    near = TankCases(
        feed, cases.tau[rows], cases.T[rows], cases.p[rows],
        scale=np.where(top > 0, top, 1.0), c=np.nan_to_num(answers.root[rows]),
    )  # fmt: skip
    found, _ = engine().tanks(less, near, How.FROM_GUESS)
    _judge(less, near, found)
    good = (found.status == Status.OK) & ~(gone & (found.c != 0)).any(axis=1)
    answers.exhausted[rows[good]] |= found.exhausted[good]
    for name in ("c", "status", "residual", "condition", "root"):
        getattr(answers, name)[rows[good]] = getattr(found, name)[good]
