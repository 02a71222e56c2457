"""Totals that no reaction changes: atoms, charges, or moles of whatever the equations keep together."""

from fractions import Fraction

import numpy as np

from moletally.kernel.rates import Floats

__all__ = ["conserved", "exact_coefficients"]

LARGEST_DENOMINATOR = 1000


def exact_coefficients(nu: Floats) -> list[list[Fraction]]:
    """Coefficients as the fractions that were meant: 0.6666666666666666 is two thirds.

    A fast equilibrium multiplies the rounding of a coefficient by its rate: what it makes of a total would
    not be what the equation says.
    """
    return [[_fraction(x) for x in row] for row in nu.tolist()]


def _fraction(x: float) -> Fraction:
    near = Fraction(x).limit_denominator(LARGEST_DENOMINATOR)
    return near if float(near) == x else Fraction(x)


def conserved(nu: Floats) -> Floats:
    """Rows w with nu w = 0, shape (n, S), from nu, shape (terms, S): exact, so that zeros are zeros.

    An orthogonal basis would do for a check, but its rounding in the place of an abundant species
    would drown a total of trace species.
    """
    species = nu.shape[1]
    rows = exact_coefficients(np.array(sorted(set(map(tuple, nu.tolist())))).reshape(-1, species))
    pivots: list[int] = []
    for i in range(species):
        k = next((k for k in range(len(pivots), len(rows)) if rows[k][i]), None)
        if k is None:
            continue
        top = len(pivots)
        rows[top], rows[k] = rows[k], rows[top]
        rows[top] = [x / rows[top][i] for x in rows[top]]
        for other in range(len(rows)):
            factor = rows[other][i]
            if other != top and factor:
                rows[other] = [
                    x - factor * y if y else x for x, y in zip(rows[other], rows[top], strict=True)
                ]
        pivots.append(i)
    free = [i for i in range(species) if i not in pivots]
    basis = np.zeros((len(free), species))
    for k, i in enumerate(free):
        basis[k, i] = 1.0
        for row, pivot in zip(rows, pivots, strict=False):
            basis[k, pivot] = float(-row[i])
    return basis
