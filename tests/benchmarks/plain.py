"""The plain way: scipy as a user writes it, with a rate law in Python."""

import numpy as np
from scipy.integrate import solve_ivp
from scipy.optimize import fsolve

__all__ = ["chain_rates", "plain_tank", "plain_tube"]


def chain_rates(species):
    """s0 -> s1 -> ...; first step of order one half and second of order two, the rest of order one."""
    n = species - 1
    k = 0.5 + 0.1 * np.arange(n)
    nu = np.zeros((n, species))
    nu[np.arange(n), np.arange(n)] = -1.0
    nu[np.arange(n), np.arange(n) + 1] = 1.0

    def change(c):
        r = k * c[:-1]
        r[0] = k[0] * np.sqrt(max(c[0], 0.0))
        if n > 1:
            r[1] = k[1] * c[1] ** 2
        return r @ nu

    return change


def plain_tank(change, feed, tau):
    """fsolve from the feed."""
    return fsolve(lambda c: feed - c + tau * change(c), feed, xtol=1e-10)


def plain_tube(change, feed, tau):
    """LSODA at a tolerance that gives about 1e-8."""
    return solve_ivp(lambda _, c: change(c), (0.0, tau), feed, method="LSODA", rtol=1e-9, atol=1e-12).y[:, -1]
