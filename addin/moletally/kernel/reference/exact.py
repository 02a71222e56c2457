"""Balances in twice the digits, where fast reactions almost cancel.

In 0 = feed - c + sum_j tau nu_j r_j the terms of a fast equilibrium may exceed the rest by many
decades; summed in doubles their rounding hides the slow part. Products and sums are exact here
(Dekker, Numer. Math. 18 (1971) 224; Knuth's two-sum), so that only the rates themselves are rounded:
each by a relative 1e-16, the same in every balance, as if its constant were off by as much.
"""

import numpy as np

from moletally.kernel.rates import Floats

__all__ = ["balance"]

SPLITTER = 134217729.0  # 2^27 + 1


def balance(nu: Floats, finer: Floats, extent: Floats, feed: Floats, c: Floats) -> Floats:
    """feed - c + nu^T extent, correctly rounded but for the last bits; shape (n, S).

    nu, finer : ndarray, shape (terms, S) - coefficients, and what was lost when they were rounded
    extent : ndarray, shape (n, terms) - tau r [mol/m3]
    """
    with np.errstate(all="ignore"):
        total, rest = _two_sum(feed, -c)
        for j in range(nu.shape[0]):
            product = extent[:, j, None] * nu[j]
            lost = _product_error(extent[:, j, None], nu[j], product)
            total, more = _two_sum(total, product)
            rest = rest + (more + lost + extent[:, j, None] * finer[j])
        return total + rest


def _two_sum(a: Floats, b: Floats) -> tuple[Floats, Floats]:
    s = a + b
    t = s - a
    return s, (a - (s - t)) + (b - t)


def _halves(a: Floats) -> tuple[Floats, Floats]:
    t = SPLITTER * a
    high = t - (t - a)
    return high, a - high


def _product_error(a: Floats, b: Floats, product: Floats) -> Floats:
    """What a*b lost in rounding; 0 where the splitting overflows."""
    a_high, a_low = _halves(a)
    b_high, b_low = _halves(b)
    error = ((a_high * b_high - product) + a_high * b_low + a_low * b_high) + a_low * b_low
    return np.where(np.isfinite(error), error, 0.0)
