"""Plug-flow tubes: dc/dtau = nu^T r(c), c(0) = feed, at any number of residence times."""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.cases import TubeAnswers
from moletally.kernel.engine import engine
from moletally.kernel.program import Model
from moletally.kernel.rates import Floats
from moletally.kernel.status import Status
from moletally.kernel.structure import Structure, structures

__all__ = ["TubeResult", "solve_tubes"]


class TubeResult(NamedTuple):
    """The answer to N tubes.

    c : ndarray, shape (N, S) - outlets [mol/m3]; nan where the case failed
    profile : ndarray, shape (N, M, S), or None - at the points of the grid; nan beyond a failure
    status : ndarray, shape (N,); profile_status : ndarray, shape (N, M)
    exhausted_at : ndarray, shape (N, S) - tau at which a law uses a species up; nan where it lasts
    steps, work : ndarray, shape (N,) - steps tried, evaluations of the laws
    """

    c: Floats
    profile: Floats | None
    status: NDArray[np.int32]
    profile_status: NDArray[np.int32]
    exhausted_at: Floats
    steps: NDArray[np.int32]
    work: NDArray[np.int32]


def solve_tubes(
    model: Model, feed: Floats, tau: Floats, T: Floats, p: Floats, grid: Floats | None = None
) -> TubeResult:
    """Outlets of N tubes, and their profiles.

    feed : ndarray, shape (N, S) [mol/m3], >= 0; tau : ndarray, shape (N,) [s], >= 0
    T : ndarray, shape (N,) [K]; p : ndarray, shape (N, P)
    grid : ndarray, shape (M,) or (N, M) - residence times of a profile [s]
    """
    n = len(feed)
    asked = np.asarray(tau, dtype=np.float64)[:, None]
    if grid is not None:
        asked = np.concatenate([np.broadcast_to(grid, (n, np.shape(grid)[-1])), asked], axis=1)
    groups = list(structures(model, feed > 0, T, p))
    if len(groups) == 1:
        answers = _group(groups[0][0], feed, asked, T, p)
    else:
        answers = TubeAnswers.empty(n, asked.shape[1], feed.shape[1])
        for structure, rows in groups:
            answers.put(rows, _group(structure, feed[rows], asked[rows], T[rows], p[rows]))
    points, status = answers.c, answers.status
    profile = None if grid is None else points[:, :-1]
    return TubeResult(
        points[:, -1],
        profile,
        status[:, -1],
        status[:, :-1],
        answers.exhausted_at,
        answers.steps,
        answers.work,
    )


def _group(structure: Structure, feed: Floats, asked: Floats, T: Floats, p: Floats) -> TubeAnswers:
    """Answers to tubes of one structure."""
    if not structure.unbounded:
        return engine().tubes(structure, feed, asked, T, p)
    out = TubeAnswers.empty(len(feed), asked.shape[1], feed.shape[1])
    out.c[:] = np.where(asked[:, :, None] > 0, np.nan, feed[:, None, :])
    out.status[:] = np.where(asked > 0, Status.UNBOUNDED_AT_ZERO, Status.OK)
    out.exhausted_at[:] = np.nan
    out.exhausted_at[:, structure.wanted] = 0.0
    out.steps[:], out.work[:] = 0, 0
    return out
