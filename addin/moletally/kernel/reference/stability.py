"""Does a steady tank come back when it is disturbed? Eigenvalues of d(dc)/dt = (nu^T V - I/tau) dc."""

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.rates import Bound, Floats
from moletally.kernel.reference.steady import Tanks
from moletally.kernel.structure import Structure, everything

__all__ = ["growth", "invaded"]

TRACE = 1e-20  # of the largest concentration: a disturbance by species that are absent
ROUNDING = 1e-13  # of the matrix: an eigenvalue smaller than that has no sign


def growth(tanks: Tanks, c: Floats) -> tuple[Floats, Floats, NDArray[np.bool_]]:
    """Largest real part of the eigenvalues [1/s], its imaginary part, and whether it is surely positive.

    c : ndarray, shape (n, S) - steady states, > 0
    """
    _, v = tanks.laws.slopes(c)
    with np.errstate(all="ignore"):
        matrix = tanks.coefficients.jacobian(v) * (c[:, None, :] / c[:, :, None])
        return _largest(matrix, 1.0 / tanks.tau)


def invaded(structure: Structure, c: Floats, tau: Floats, T: Floats, p: Floats) -> NDArray[np.bool_]:
    """True where a trace of the absent species would grow: the state without them is no resting place.

    c : ndarray, shape (n, S) - steady states of the present species
    """
    model, absent = structure.terms.model, structure.absent
    if not len(absent) or not len(c):
        return np.zeros(len(c), dtype=np.bool_)
    state = np.empty((len(c), model.program.n_species))
    state[:, structure.present] = c
    largest = c.max(axis=1, keepdims=True, initial=0.0)
    state[:, absent] = TRACE * np.where(largest > 0, largest, 1.0)
    _, v = Bound.of(everything(model.program), T, p).slopes(state)
    v[:, structure.held] = 0.0
    with np.errstate(all="ignore"):
        matrix = np.matmul(model.stoichiometry[:, absent].T, v[:, :, absent])
        return _largest(matrix, 1.0 / tau)[2]


def _largest(matrix: Floats, dilution: Floats) -> tuple[Floats, Floats, NDArray[np.bool_]]:
    finite = np.asarray(np.isfinite(matrix).all(axis=(1, 2)))
    values = np.linalg.eigvals(np.where(finite[:, None, None], matrix, 0.0))
    first = np.asarray(values.real.argmax(axis=1))[:, None]
    top = np.take_along_axis(values, first, axis=1)[:, 0]
    rate = np.where(finite, top.real - dilution, np.nan)
    noise = ROUNDING * np.abs(matrix).max(axis=(1, 2)) + 1e-9 * dilution
    return rate, np.abs(top.imag), np.asarray(rate > noise)
