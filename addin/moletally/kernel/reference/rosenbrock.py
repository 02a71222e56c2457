"""Rodas5P: a Rosenbrock method of order 5 for stiff equations, L-stable, with an embedded order 4.

Written for autonomous equations c' = f(c) in the form that needs no product with the Jacobian J:

    (I/(gamma h) - J) K_i = f(c + sum_j a_ij K_j) + sum_j c_ij K_j / h,   i = 1..8

the last three stages building on one another: u_7 = u_6 + K_6, u_8 = u_7 + K_7, c_1 = u_8 + K_8, and
K_8 is the error estimate.

Reference: G. Steinebach, BIT Numer. Math. 63 (2023) 27, table of Rodas5P. The order conditions are tested.
"""

import numpy as np

from moletally.kernel.rates import Floats
from moletally.kernel.reference.flow import Flow
from moletally.kernel.reference.linear import inverse

__all__ = ["Rodas5P"]

GAMMA = 0.21193756319429014
# a_ij of stages 1 to 6 (the others follow from the last of these)
A = (
    (),
    (3.0,),
    (2.849394379747939, 0.45842242204463923),
    (-6.954028509809101, 2.489845061869568, -10.358996098473584),
    (2.8029986275628964, 0.5072464736228206, -0.3988312541770524, -0.04721187230404641),
    (-7.502846399306121, 2.561846144803919, -11.627539656261098, -0.18268767659942256, 0.030198172008377946),
)
# c_ij
C = (
    (),
    (-14.155112264123755,),
    (-17.97296035885952, -2.859693295451294),
    (147.12150275711716, -1.41221402718213, 71.68940251302358),
    (165.43517024871676, -0.4592823456491126, 42.90938336958603, -5.961986721573306),
    (24.854864614690072, -3.0009227002832186, 47.4931110020768, 5.5814197821558125, -0.6610691825249471),
    (
        30.91273214028599,
        -3.1208243349937974,
        77.79954646070892,
        34.28646028294783,
        -19.097331116725623,
        -28.087943162872662,
    ),
    (
        37.80277123390563,
        -3.2571969029072276,
        112.26918849496327,
        66.9347231244047,
        -40.06618937091002,
        -54.66780262877968,
        -9.48861652309627,
    ),
)


NOTHING = 1e-10  # of the least concentration: a species at zero is measured by what a step makes


class Rodas5P:
    """The method as the stepper knows it."""

    order = 5
    error_order = 4
    most_growth = 6.0
    evaluations = 9  # eight stages and a Jacobian

    @staticmethod
    def step(flow: Flow, c: Floats, h: Floats, least: Floats) -> tuple[Floats, Floats, Floats | None]:
        """One step of size h, shape (n,), from c, shape (n, S).

        least : ndarray, shape (n, S) - size of a concentration that is as good as none
        Returns the new c, the error estimate, and None: stiffness does not matter here.
        """
        f, jacobian = flow.linear(c)
        per_h = (1.0 / h)[:, None]
        # Unknowns relative to their own size: or rounding of the large would swamp the trace species.
        nothing = NOTHING * least
        there = np.abs(c)
        size = np.where(there > nothing, there, np.maximum(h[:, None] * np.abs(f), nothing))
        matrix = jacobian * (-size[:, None, :] / size[:, :, None])
        diagonal = np.arange(c.shape[1])
        matrix[:, diagonal, diagonal] += per_h / GAMMA
        solver = inverse(matrix) * (size[:, :, None] / size[:, None, :])
        stages: list[Floats] = []
        u = c
        for i in range(8):
            if i:
                u = c + _mix(A[i], stages) if i < 6 else u + stages[-1]
                f = flow.slope(u)
            right = f + _mix(C[i], stages) * per_h if i else f
            stages.append(np.matmul(solver, right[:, :, None])[:, :, 0])
        return u + stages[7], stages[7], None


def _mix(weights: tuple[float, ...], stages: list[Floats]) -> Floats:
    out = weights[0] * stages[0]
    for weight, stage in zip(weights[1:], stages[1:], strict=True):
        out = out + weight * stage
    return out
