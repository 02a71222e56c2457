"""Small dense systems, many at once."""

import numpy as np

from moletally.kernel.rates import Floats

__all__ = ["inverse", "solve"]


def solve(A: Floats, b: Floats) -> Floats:
    """x of A x = b, rows scaled to size one; A, shape (n, S, S); b, x (n, S); nan where singular."""
    with np.errstate(all="ignore"):
        scale = 1.0 / np.abs(A).max(axis=2)
        try:
            x = np.linalg.solve(A * scale[:, :, None], (b * scale)[:, :, None])[:, :, 0]
        except np.linalg.LinAlgError:
            x = _one_by_one(A, b)
    return np.asarray(x)


def inverse(A: Floats) -> Floats:
    """The inverses of A, shape (n, S, S); nan where singular."""
    with np.errstate(all="ignore"):
        scale = 1.0 / np.abs(A).max(axis=2)
        try:
            return np.asarray(np.linalg.inv(A * scale[:, :, None]) * scale[:, None, :])
        except np.linalg.LinAlgError:
            unit = np.eye(A.shape[1])
            columns = [_one_by_one(A, np.broadcast_to(e, A.shape[:2])) for e in unit]
            return np.stack(columns, axis=2)


def _one_by_one(A: Floats, b: Floats) -> Floats:
    x = np.full(b.shape, np.nan)
    for k in range(len(A)):
        scale = 1.0 / np.abs(A[k]).max(axis=1)
        try:
            x[k] = np.linalg.solve(A[k] * scale[:, None], b[k] * scale)
        except np.linalg.LinAlgError:
            continue
    return x
