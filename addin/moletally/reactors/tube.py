"""The plug-flow tube of constant density: dC/dtau = nu^T r(C), C(0) = C_feed."""

from collections import defaultdict

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.tube import solve_tubes
from moletally.reactors.batch import Batch, Floats, Outlets

__all__ = ["pfr", "profile"]


def pfr(batch: Batch) -> Outlets:
    """Outlets of N tubes; cases that differ in length alone are one integration."""
    n, species = batch.feed.shape
    out = _Collector(n, species)
    single, shared = _groups(batch)
    if len(single):
        part = batch.at(single)
        answer = solve_tubes(batch.network.model, part.feed, part.size, part.temperature, part.parameters)
        out.put(single, answer.c, answer.status, answer.exhausted_at, answer.work)
    for rows in shared:
        lengths, place = np.unique(batch.size[rows], return_inverse=True)
        c, status, exhausted_at, work = _along(batch.at(rows[:1]), lengths)
        out.put(rows, c[place], status[place], exhausted_at, np.full(len(rows), work))
    return out.outlets(batch.size)


def profile(batch: Batch, grid: Floats) -> tuple[Floats, NDArray[np.int32], Floats]:
    """One tube along its length.

    batch : one case; grid : ndarray, shape (M,), rising - tau [s] (or W/q) of each point
    Returns concentrations, shape (M, S), the status of each point, shape (M,), and the tau of exhaustion
    of each species, shape (S,), nan where it lasts.
    """
    c, status, exhausted_at, _ = _along(batch, grid)
    return c, status, exhausted_at


def _along(batch: Batch, grid: Floats) -> tuple[Floats, NDArray[np.int32], Floats, int]:
    answer = solve_tubes(
        batch.network.model, batch.feed, grid[-1:], batch.temperature, batch.parameters, grid=grid
    )
    assert answer.profile is not None
    return answer.profile[0], answer.profile_status[0], answer.exhausted_at[0], int(answer.work[0])


def _groups(batch: Batch) -> tuple[NDArray[np.intp], list[NDArray[np.intp]]]:
    """Rows of cases that stand alone, and groups of rows that differ in length alone."""
    if len(batch) == 1:
        return np.zeros(1, dtype=np.intp), []
    rows = defaultdict(list)
    for i in range(len(batch)):
        rows[batch.feed[i].tobytes(), batch.temperature[i].tobytes(), batch.parameters[i].tobytes()].append(i)
    groups = [np.array(g, dtype=np.intp) for g in rows.values()]
    single = [g for g in groups if len(g) == 1]
    return np.concatenate(single) if single else np.zeros(0, dtype=np.intp), [g for g in groups if len(g) > 1]


class _Collector:
    """Gathers the groups' answers row by row."""

    def __init__(self, n: int, species: int) -> None:
        self.c = np.full((n, species), np.nan)
        self.status = np.zeros(n, dtype=np.int32)
        self.exhausted_at = np.full((n, species), np.nan)
        self.work = np.zeros(n, dtype=np.int32)

    def put(self, rows: NDArray[np.intp], c: Floats, status: NDArray[np.int32], exhausted_at: Floats,
            work: NDArray[np.int32]) -> None:  # fmt: skip
        self.c[rows], self.status[rows] = c, status
        self.exhausted_at[rows], self.work[rows] = exhausted_at, work

    def outlets(self, size: Floats) -> Outlets:
        n = len(self.status)
        with np.errstate(invalid="ignore"):
            exhausted = self.exhausted_at <= size[:, None]
        return Outlets(
            concentration=self.c,
            status=self.status,
            exhausted=exhausted,
            exhausted_at=np.where(exhausted, self.exhausted_at, np.nan),
            unique=np.ones(n, dtype=np.bool_),
            from_start=np.zeros(n, dtype=np.bool_),
            residual=np.full(n, np.nan),
            condition=np.full(n, np.nan),
            work=self.work,
        )
