"""How outlets change with what they depend on: derivatives by feed, residence time, temperature and parameters."""

from collections.abc import Callable
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.cases import Ints, TankCases
from moletally.kernel.engine import engine
from moletally.kernel.program import Model
from moletally.kernel.rates import Floats
from moletally.kernel.structure import Structure, structures
from moletally.kernel.tank import TankResult

__all__ = ["Slopes", "tank_slopes", "tube_slopes"]


class Slopes(NamedTuple):
    """Derivatives of the outlets of N vessels.

    feed : ndarray, shape (N, S, S) - dc_i/dfeed_k; nan for a species k that is neither fed nor made: a first
        trace of it makes another network
    tau : ndarray, shape (N, S) [mol/(m3 s)]; T : ndarray, shape (N, S) [mol/(m3 K)]
    p : ndarray, shape (N, S, P) - by each parameter
    All are nan where the outlet itself could not be given.
    """

    feed: Floats
    tau: Floats
    T: Floats
    p: Floats

    @classmethod
    def of(cls, whole: Floats) -> "Slopes":
        """From columns of feed, tau, T and p, shape (N, S, S + 2 + P)."""
        species = whole.shape[1]
        feed, tau = whole[:, :, :species], whole[:, :, species]
        return cls(feed, tau, whole[:, :, species + 1], whole[:, :, species + 2 :])


def tank_slopes(model: Model, result: TankResult, feed: Floats, tau: Floats, T: Floats, p: Floats) -> Slopes:
    """Derivatives of tanks that `solve_tanks` has solved, at its very states.

    feed (N, S), tau (N,), T (N,), p (N, P) : as they were given to `solve_tanks`
    """

    def of(structure: Structure, rows: Ints) -> Floats:
        cases = TankCases(feed[rows], tau[rows], T[rows], p[rows])
        return engine().tank_slopes(structure, cases, result.root[rows])

    return _by_structure(model, feed, tau, T, p, result.status == 0, of)


def tube_slopes(model: Model, feed: Floats, tau: Floats, T: Floats, p: Floats) -> Slopes:
    """Derivatives of tubes; arguments as for `solve_tubes`."""

    def of(structure: Structure, rows: Ints) -> Floats:
        return engine().tube_slopes(structure, TankCases(feed[rows], tau[rows], T[rows], p[rows]))

    return _by_structure(model, feed, tau, T, p, np.ones(len(tau), dtype=np.bool_), of)


def _by_structure(
    model: Model, feed: Floats, tau: Floats, T: Floats, p: Floats, solved: NDArray[np.bool_],
    of: Callable[[Structure, Ints], Floats],
) -> Slopes:  # fmt: skip
    n, species = feed.shape
    whole = np.full((n, species, species + 2 + p.shape[1]), np.nan)
    for structure, rows in structures(model, feed > 0, T, p):
        running = rows[solved[rows] & (tau[rows] > 0)]
        if len(running) and not structure.unbounded:
            whole[running] = of(structure, running)
    at_once = (tau == 0) & solved
    if at_once.any():
        whole[at_once] = _unchanged(model, feed[at_once], T[at_once], p[at_once])
    return Slopes.of(whole)


def _unchanged(model: Model, feed: Floats, T: Floats, p: Floats) -> Floats:
    """Vessels of no volume: the outlet is the feed, and changes with tau as the rates at the feed say."""
    n, species = feed.shape
    out = np.zeros((n, species, species + 2 + p.shape[1]))
    out[:, :, :species] = np.eye(species)
    out[:, :, species] = engine().evaluate(model.program, feed, T, p) @ model.stoichiometry
    return out
