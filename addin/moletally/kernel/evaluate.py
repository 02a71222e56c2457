"""Rates of a program's reactions, and their exact derivatives."""

from moletally.kernel.engine import engine
from moletally.kernel.program import Program
from moletally.kernel.rates import Floats

__all__ = ["derivatives", "evaluate"]


def evaluate(program: Program, c: Floats, T: Floats, p: Floats) -> Floats:
    """Rates of all reactions.

    c : ndarray, shape (N, S) [mol/m3]; T : ndarray, shape (N,) [K]; p : ndarray, shape (N, P)
    Returns r, shape (N, R) [mol/(m3 s)]; nan or inf where a law is undefined.
    """
    return engine().evaluate(program, c, T, p)


def derivatives(program: Program, c: Floats, T: Floats, p: Floats) -> tuple[Floats, Floats, Floats, Floats]:
    """Rates and their exact derivatives: r (N, R), dr/dc (N, R, S), dr/dT (N, R), dr/dp (N, R, P)."""
    return engine().derivatives(program, c, T, p)
