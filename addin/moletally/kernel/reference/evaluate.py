"""Rates and derivatives of whole programs in numpy."""

import numpy as np

from moletally.kernel.program import Program
from moletally.kernel.rates import Bound, Floats, tape_of

__all__ = ["derivatives", "evaluate"]


def evaluate(program: Program, c: Floats, T: Floats, p: Floats) -> Floats:
    """Rates of all reactions.

    c : ndarray, shape (N, S) [mol/m3]; T : ndarray, shape (N,) [K]; p : ndarray, shape (N, P)
    Returns r, shape (N, R) [mol/(m3 s)]; nan or inf where a law is undefined.
    """
    everything = tuple(range(program.n_species))
    tape = tape_of(program, tuple(range(program.n_reactions)), everything)
    return Bound.of(tape, T, p).rates(c, strict=True)


def derivatives(program: Program, c: Floats, T: Floats, p: Floats) -> tuple[Floats, Floats, Floats, Floats]:
    """Rates and their exact derivatives: r (N, R), dr/dc (N, R, S), dr/dT (N, R), dr/dp (N, R, P)."""
    leaves = tuple(range(program.first_literal))
    tape = tape_of(program, tuple(range(program.n_reactions)), leaves)
    everything = np.concatenate([c, T[:, None], p], axis=1)
    bound = Bound.of(tape, T, p)
    # Temperature and parameters are leaves here: the prelude belongs to the path and must not be cut off.
    r, jacobian = bound.slopes(everything)
    species = program.n_species
    return r, jacobian[:, :, :species], jacobian[:, :, species], jacobian[:, :, species + 1 :]
