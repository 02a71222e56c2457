"""The plain way: scipy as a user writes it, with a rate law in Python."""

from collections.abc import Callable

import numpy as np
from scipy.integrate import solve_ivp
from scipy.optimize import fsolve

__all__ = [
    "Change", "as_arrays", "as_expressions", "chain_rates", "fsolved", "integrated", "law_text", "plain_tank",
    "plain_tube",
]  # fmt: skip

RTOL, ATOL = 1e-9, 1e-12  # of LSODA on the chain: gives about 1e-8

Change = Callable[[np.ndarray], np.ndarray]


def law_text(law: str) -> str:
    """A rate law as Python writes it."""
    return law.strip().replace("^", "**")


def as_expressions(names: list[str], laws: list[str], nu: np.ndarray) -> Change:
    """dc/dt as plain expressions of plain floats, one line per reaction and species, as from a paper.

    A root of a slightly negative concentration would be a complex number: it is kept from that.
    """
    text = "\n".join(f" r{j} = {_guarded(law, names)}" for j, law in enumerate(laws))
    sums = ", ".join(_sum(nu[:, i]) for i in range(len(names)))
    scope: dict[str, Callable] = {}
    exec(f"def of_scalars({', '.join(names)}):\n{text}\n return [{sums}]", scope)
    of_scalars = scope["of_scalars"]

    def change(c: np.ndarray) -> np.ndarray:
        return np.array(of_scalars(*c.tolist()))

    change.of_scalars = of_scalars
    return change


def _guarded(law: str, names: list[str]) -> str:
    for name in names:
        law = law.replace(f"{name}**0.5", f"max({name}, 0.0)**0.5")
    return law


def _sum(column: np.ndarray) -> str:
    parts = [
        f"{x:+g}*r{j}".replace("1*r", "r") if abs(x) == 1 else f"{x:+g}*r{j}"
        for j, x in enumerate(column)
        if x
    ]
    return " ".join(parts) or "0.0"


def as_arrays(names: list[str], laws: list[str], nu: np.ndarray) -> Change:
    """dc/dt as an array of rates times the matrix of coefficients."""
    scope: dict[str, object] = {"np": np, "nu": nu}
    exec(f"def change(c):\n {', '.join(names)} = c\n return np.array([{', '.join(laws)}]) @ nu", scope)
    return scope["change"]


def fsolved(change: Change, feed: np.ndarray, tau: float, guess: np.ndarray) -> tuple[np.ndarray, bool]:
    """A tank's outlet, and whether fsolve says that it has converged."""
    c, _, code, _ = fsolve(lambda c: feed - c + tau * change(c), guess, xtol=1e-10, full_output=True)
    return c, code == 1


def integrated(
    change: Change, feed: np.ndarray, tau: float, rtol: float, atol: float, method: str = "LSODA"
) -> np.ndarray:
    """A tube's outlet."""
    return solve_ivp(lambda _, c: change(c), (0.0, tau), feed, method=method, rtol=rtol, atol=atol).y[:, -1]


def chain_rates(species: int) -> Change:
    """s0 -> s1 -> ...; first step of order one half and second of order two, the rest of order one."""
    n = species - 1
    k = 0.5 + 0.1 * np.arange(n)
    nu = np.zeros((n, species))
    nu[np.arange(n), np.arange(n)] = -1.0
    nu[np.arange(n), np.arange(n) + 1] = 1.0

    def change(c: np.ndarray) -> np.ndarray:
        r = k * c[:-1]
        r[0] = k[0] * np.sqrt(max(c[0], 0.0))
        if n > 1:
            r[1] = k[1] * c[1] ** 2
        return r @ nu

    return change


def plain_tank(change: Change, feed: np.ndarray, tau: float) -> np.ndarray:
    """A tank of the chain, from its feed."""
    return fsolved(change, feed, tau, feed)[0]


def plain_tube(change: Change, feed: np.ndarray, tau: float) -> np.ndarray:
    """A tube of the chain."""
    return integrated(change, feed, tau, RTOL, ATOL)
