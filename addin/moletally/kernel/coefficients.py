"""From rates of terms to what each species gains: r is netted per reaction before it is spread."""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.rates import Floats

__all__ = ["Coefficients"]


class Coefficients(NamedTuple):
    """Stoichiometry of terms, and of the reactions they belong to.

    Near equilibrium the terms of a reaction almost cancel. Their difference is exact, and its error goes
    to all species in the ratio of the equation; 5 r1 - 5 r2 would round each product on its own, and a
    fast reaction would make a little of what it can't make.

    nu : ndarray, shape (terms, S) - sign of the term times coefficient
    net : ndarray, shape (terms, reactions) - sign of each term in its reaction
    reactions : ndarray, shape (reactions, S)
    """

    nu: Floats
    net: Floats
    reactions: Floats

    @classmethod
    def of(cls, nu: Floats, sign: Floats, owner: NDArray[np.intp]) -> "Coefficients":
        """From terms with their signs, shape (terms,), and the reaction each belongs to."""
        owners = owner.tolist()
        names = sorted(set(owners))  # np.unique would import numpy.ma, half as slow as numpy itself
        net = np.zeros((len(nu), len(names)))
        for term, name in enumerate(owners):
            net[term, names.index(name)] = sign[term]
        first = [owners.index(name) for name in names]
        return cls(nu, net, nu[first] * sign[first, None])

    def gain(self, r: Floats) -> Floats:
        """nu^T r, shape (n, S), from rates of terms, shape (n, terms)."""
        out: Floats = (r @ self.net) @ self.reactions
        return out

    def traffic(self, r: Floats) -> Floats:
        """The sum of the sizes of all terms, shape (n, S)."""
        out: Floats = np.abs(r) @ np.abs(self.nu)
        return out

    def jacobian(self, v: Floats) -> Floats:
        """nu^T dr/dc, shape (n, S, S), from derivatives of terms, shape (n, terms, S)."""
        return np.asarray(np.matmul(self.reactions.T, np.matmul(self.net.T, v)))
