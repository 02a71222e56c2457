"""MMULT, MINVERSE and MDETERM, which the engine lacks, from numpy."""

from collections.abc import Callable
from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["FUNCTIONS"]

VALUE = {"type": "Error", "kind": "Value"}
NUM = {"type": "Error", "kind": "Num"}
SINGULAR = 1e-15  # reciprocal condition below which an inverse has no digits


def _matrix(value: Any) -> NDArray[np.float64] | None:
    """Numbers only, as in a spreadsheet: a text or an empty cell is no matrix."""
    rows = value if isinstance(value, list) else [[value]]
    if not all(isinstance(v, int | float) and not isinstance(v, bool) for row in rows for v in row):
        return None
    return np.array(rows, dtype=np.float64)


def _multiply(one: Any, other: Any) -> Any:
    a, b = _matrix(one), _matrix(other)
    if a is None or b is None or a.shape[1] != b.shape[0]:
        return VALUE
    return (a @ b).tolist()


def _inverse(value: Any) -> Any:
    a = _matrix(value)
    if a is None or a.shape[0] != a.shape[1]:
        return VALUE
    if not np.linalg.cond(a) < 1 / SINGULAR:
        return NUM
    return np.linalg.inv(a).tolist()


def _determinant(value: Any) -> Any:
    a = _matrix(value)
    if a is None or a.shape[0] != a.shape[1]:
        return VALUE
    return float(np.linalg.det(a))


FUNCTIONS: dict[str, Callable[..., Any]] = {"MMULT": _multiply, "MINVERSE": _inverse, "MDETERM": _determinant}
