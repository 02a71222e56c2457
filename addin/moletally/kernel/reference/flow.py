"""The equations that integrators follow: dc/dt = nu^T r(c) + (feed - c)/tau."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.coefficients import Coefficients
from moletally.kernel.rates import Floats
from moletally.kernel.reference.cutoff import Laws

__all__ = ["Flow"]


@dataclass(frozen=True, slots=True)
class Flow:
    """n vessels: tubes (no exchange) or tanks in their start-up.

    laws : Laws - of n cases; coefficients : Coefficients - of their terms
    feed : ndarray, shape (n, S), or None for tubes; exchange : ndarray, shape (n, 1) - 1/tau [1/s]
    """

    laws: Laws
    coefficients: Coefficients
    feed: Floats | None = None
    exchange: Floats | None = None

    def at(self, rows: NDArray[np.intp]) -> "Flow":
        """The cases in `rows`."""
        if self.feed is None or self.exchange is None:
            return Flow(self.laws.at(rows), self.coefficients)
        return Flow(self.laws.at(rows), self.coefficients, self.feed[rows], self.exchange[rows])

    def slope(self, c: Floats) -> Floats:
        """dc/dt, shape (n, S)."""
        out = self.coefficients.gain(self.laws.rates(c))
        if self.feed is not None and self.exchange is not None:
            out += (self.feed - c) * self.exchange
        return out

    def balance(self, c: Floats) -> tuple[Floats, Floats]:
        """dc/dt and the sum of the sizes of its terms, shape (n, S)."""
        r = self.laws.rates(c)
        net, gross = self.coefficients.gain(r), self.coefficients.traffic(r)
        if self.feed is not None and self.exchange is not None:
            net += (self.feed - c) * self.exchange
            gross += (self.feed + np.abs(c)) * self.exchange
        return net, gross

    def linear(self, c: Floats) -> tuple[Floats, Floats]:
        """dc/dt and its Jacobian, shape (n, S, S)."""
        r, v = self.laws.slopes(c)
        out = self.coefficients.gain(r)
        jacobian = self.coefficients.jacobian(v)
        if self.feed is not None and self.exchange is not None:
            out += (self.feed - c) * self.exchange
            diagonal = np.arange(c.shape[1])
            jacobian[:, diagonal, diagonal] -= self.exchange
        return out, jacobian
