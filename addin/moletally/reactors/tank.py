"""The stirred tank of constant density: 0 = C_feed - C + tau nu^T r(C)."""

import numpy as np

from moletally.kernel.tank import solve_tanks
from moletally.reactors.batch import Batch, Outlets

__all__ = ["cstr"]


def cstr(batch: Batch) -> Outlets:
    """Outlets of N stirred tanks.

    The state is the one that a start-up from `batch.start` reaches; where a published criterion proves
    that a network's tank has one steady state at the most, it is that one.
    """
    answer = solve_tanks(
        batch.network.model, batch.feed, batch.size, batch.temperature, batch.parameters, batch.start
    )
    return Outlets(
        concentration=answer.c,
        status=answer.status,
        exhausted=answer.exhausted,
        exhausted_at=np.full_like(answer.c, np.nan),
        unique=answer.unique,
        from_start=answer.from_transient,
        residual=answer.residual,
        condition=answer.condition,
        work=answer.work,
    )
