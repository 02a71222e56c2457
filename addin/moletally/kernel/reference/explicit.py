"""DOP853: an explicit Runge-Kutta method of order 8 by Dormand and Prince, errors by orders 5 and 3.

Reference: E. Hairer, S. P. Nørsett, G. Wanner, Solving Ordinary Differential Equations I, 2nd ed. 1993,
section II.5 (coefficients) and II.10 (error estimate). The order conditions are tested.
"""

import numpy as np

from moletally.kernel.rates import Floats
from moletally.kernel.reference.flow import Flow

__all__ = ["DOP853"]

A = (
    np.array([]),
    np.array([0.05260015195876773]),
    np.array([0.0197250569845379, 0.0591751709536137]),
    np.array([0.02958758547680685, 0.0, 0.08876275643042054]),
    np.array([0.2413651341592667, 0.0, -0.8845494793282861, 0.924834003261792]),
    np.array([0.037037037037037035, 0.0, 0.0, 0.17082860872947386, 0.12546768756682242]),
    np.array([0.037109375, 0.0, 0.0, 0.17025221101954405, 0.06021653898045596, -0.017578125]),
    np.array(
        [
            0.03709200011850479,
            0.0,
            0.0,
            0.17038392571223998,
            0.10726203044637328,
            -0.015319437748624402,
            0.008273789163814023,
        ]
    ),
    np.array(
        [
            0.6241109587160757,
            0.0,
            0.0,
            -3.3608926294469414,
            -0.868219346841726,
            27.59209969944671,
            20.154067550477894,
            -43.48988418106996,
        ]
    ),
    np.array(
        [
            0.47766253643826434,
            0.0,
            0.0,
            -2.4881146199716677,
            -0.590290826836843,
            21.230051448181193,
            15.279233632882423,
            -33.28821096898486,
            -0.020331201708508627,
        ]
    ),
    np.array(
        [
            -0.9371424300859873,
            0.0,
            0.0,
            5.186372428844064,
            1.0914373489967295,
            -8.149787010746927,
            -18.52006565999696,
            22.739487099350505,
            2.4936055526796523,
            -3.0467644718982196,
        ]
    ),
    np.array(
        [
            2.273310147516538,
            0.0,
            0.0,
            -10.53449546673725,
            -2.0008720582248625,
            -17.9589318631188,
            27.94888452941996,
            -2.8589982771350235,
            -8.87285693353063,
            12.360567175794303,
            0.6433927460157636,
        ]
    ),
)
B = np.array(
    [
        0.054293734116568765,
        0.0,
        0.0,
        0.0,
        0.0,
        4.450312892752409,
        1.8915178993145003,
        -5.801203960010585,
        0.3111643669578199,
        -0.1521609496625161,
        0.20136540080403034,
        0.04471061572777259,
    ]
)
# Differences of the weights to those of the embedded methods of order 3 and 5.
E3 = np.array(
    [
        -0.18980075407240762,
        0.0,
        0.0,
        0.0,
        0.0,
        4.450312892752409,
        1.8915178993145003,
        -5.801203960010585,
        -0.4226823213237919,
        -0.1521609496625161,
        0.20136540080403034,
        0.02265179219836082,
    ]
)
E5 = np.array(
    [
        0.01312004499419488,
        0.0,
        0.0,
        0.0,
        0.0,
        -1.2251564463762044,
        -0.4957589496572502,
        1.6643771824549864,
        -0.35032884874997366,
        0.3341791187130175,
        0.08192320648511571,
        -0.022355307863886294,
    ]
)


class DOP853:
    """The method as the stepper knows it."""

    order = 8
    error_order = 7
    most_growth = 2.0  # a longer leap may step over the knee of an adsorption law without noticing
    evaluations = 12

    @staticmethod
    def step(flow: Flow, c: Floats, h: Floats, least: Floats) -> tuple[Floats, Floats, Floats | None]:
        """One step of size h, shape (n,), from c, shape (n, S).

        Returns the new c, the error estimate, and h times an estimate of the largest eigenvalue of the
        Jacobian, shape (n,): above 6 the method's stability limits the step.
        """
        n, species = c.shape
        stages = np.empty((12, n, species))
        stages[0] = flow.slope(c)
        step = h[:, None]
        u = c
        for i in range(1, 12):
            u = c + step * _mix(A[i], stages[:i])
            stages[i] = flow.slope(u)
        new = c + step * _mix(B, stages)
        error5, error3 = step * _mix(E5, stages), step * _mix(E3, stages)
        with np.errstate(all="ignore"):
            shrink = np.abs(error5) / np.hypot(error5, 0.1 * error3)
            change = flow.slope(new) - stages[11]
            size = np.abs(new) + np.abs(c) + least
            ratio = np.abs(change / size).max(axis=1) / np.abs((new - u) / size).max(axis=1)
        error = error5 * np.where(np.isfinite(shrink), shrink, 0.0)
        return new, error, h * np.where(np.isfinite(ratio), ratio, 0.0)


def _mix(weights: Floats, stages: Floats) -> Floats:
    return np.asarray(np.tensordot(weights, stages, 1))
