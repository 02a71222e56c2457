"""Where the plain way fails: what an integrator or a root finder from a library gets wrong, case by case.

Judges are closed forms, or one-dimensional integrals and roots by scipy.
"""

import numpy as np
import pytest
from kernel_cases import case, network
from scipy.integrate import quad
from scipy.optimize import brentq

from moletally.kernel.status import Status
from moletally.kernel.tank import solve_tanks
from moletally.kernel.tube import solve_tubes

T, NO_PARAMETERS = np.array([300.0]), np.zeros((1, 0))


def tank(model, feed, tau, start=None):
    first = None if start is None else case(*start)
    return solve_tanks(model, case(*feed), np.array([float(tau)]), T, NO_PARAMETERS, first)


def tube(model, feed, tau, grid=None):
    return solve_tubes(model, case(*feed), np.array([float(tau)]), T, NO_PARAMETERS, grid)


def test_a_half_order_species_that_is_not_fed_is_not_there():
    model = network("A B", ["A -> B : 3*A^0.5"])
    for solve in (tank, tube):
        result = solve(model, (0, 1), 10)
        assert result.status[0] == Status.OK
        assert result.c[0].tolist() == [0, 1]


@pytest.mark.parametrize("trace", [1e-10, 1e-20, 1e-30])
def test_a_trace_is_as_right_as_the_rest(trace):
    """S -> U beside A -> B: each by itself; the trace is neither lost nor made of rounding."""
    model = network("A B S U", ["A -> B : 0.3*A", "S -> U : 0.7*S"])
    assert tank(model, (1, 0, trace, 0), 5).c[0, 2] == pytest.approx(trace / 4.5, rel=1e-12, abs=0)
    assert tube(model, (1, 0, trace, 0), 5).c[0, 2] == pytest.approx(trace * np.exp(-3.5), rel=1e-7, abs=0)


def test_a_trace_of_half_order_is_solved_relatively():
    """x^2 + k tau x = C0 with x = sqrt(C): C far below any absolute floor."""
    model = network("A B S U", ["A -> B : 0.3*A", "S -> U : 2*S^0.5"])
    c = tank(model, (1, 0, 1e-20, 0), 5).c[0, 2]
    root = 2e-20 / (10 + np.sqrt(100 + 4e-20))
    assert c == pytest.approx(root**2, rel=1e-12, abs=0)


# A -> B whose heat stays in the vessel: T = 300 + 180 X, k = 1e-3 exp(E/R (1/300 - 1/T)) 1/s, E/R = 9000 K
HOT = network("A B", ["A -> B : 1e-3*exp(9000*(1/300 - 1/(480 - 180*A)))*A"])


def hot_rate(x):
    return 1e-3 * np.exp(9000 * (1 / 300 - 1 / (300 + 180 * x))) * (1 - x)


def test_the_states_of_a_tank_that_heats_itself():
    """Cold start, hot start, and the middle state, which no start-up reaches."""
    tau = 5.0
    grid = np.linspace(0, 1, 4001)
    balance = grid - tau * hot_rate(grid)
    places = np.flatnonzero(np.diff(np.sign(balance)))
    roots = [brentq(lambda x: x - tau * hot_rate(x), grid[k], grid[k + 1], xtol=1e-15) for k in places]
    assert len(roots) == 3
    cold, middle, hot = roots
    assert tank(HOT, (1, 0), tau).c[0, 1] == pytest.approx(cold, rel=1e-9, abs=0)
    assert tank(HOT, (1, 0), tau, start=(0, 1)).c[0, 1] == pytest.approx(hot, rel=1e-9)
    assert tank(HOT, (1, 0), tau, start=(1 - middle - 0.01, middle + 0.01)).c[0, 1] == pytest.approx(
        hot, rel=1e-9
    )
    assert tank(HOT, (1, 0), tau, start=(1 - middle + 0.01, middle - 0.01)).c[0, 1] == pytest.approx(
        cold, rel=1e-9
    )


def test_a_tube_that_ignites():
    """tau = integral of dX/r: the rate rises a thousandfold within a few per cent of the length."""
    for x in (0.1, 0.5, 0.9, 0.999):
        tau, _ = quad(lambda y: 1 / hot_rate(y), 0, x, epsabs=0, epsrel=1e-12, limit=200)
        slope = hot_rate(x)
        assert tube(HOT, (1, 0), tau).c[0, 1] == pytest.approx(x, abs=1e-8 * max(1, slope * tau))


def test_points_along_a_tube_are_as_right_as_its_end():
    """A -> B -> C, closed form, at 300 points: in the non-stiff and in the stiff part of the way."""
    for k1, k2 in ((2.0, 0.3), (1e5, 0.3)):
        model = network("A B C", [f"A -> B : {k1!r}*A", f"B -> C : {k2!r}*B"])
        grid = np.geomspace(1e-6, 20, 300)
        result = tube(model, (1, 0, 0), 20, grid)
        assert (result.profile_status == Status.OK).all()
        b = k1 / (k1 - k2) * np.exp(-k2 * grid) * -np.expm1(-(k1 - k2) * grid)
        assert result.profile[0, :, 1] == pytest.approx(b, rel=1e-8, abs=0)


@pytest.mark.parametrize("tau", [0.0, 1e-300, 1e12])
def test_no_time_and_endless_time(tau):
    """A + B -> C of order one half and one, C -> D: nothing has happened yet, or all has."""
    model = network("A B C D", ["A + B -> C : 2*A^0.5*B", "C -> D : 0.1*C"])
    for solve in (tank, tube):
        result = solve(model, (1, 2, 0, 0), tau)
        assert result.status[0] == Status.OK
        done = [1, 2, 0, 0] if tau < 1 else [0, 1, 0, 1]
        assert result.c[0] == pytest.approx(done, abs=1e-9)


def test_work_is_capped_in_steps_not_in_seconds():
    """An oscillator over so many periods that no one would wait for the last; always the same count."""
    model = network("X Y Z", ["0 -> X : 1.0", "X -> Z : X", "2 X + Y -> 3 X : X^2*Y", "X -> Y : 3*X"])
    first, second = (tube(model, (1, 1, 0), 1e6) for _ in range(2))
    assert first.status[0] == Status.WORK_CAP
    assert first.steps[0] == second.steps[0] == 12000
    assert first.work[0] <= 30 * 12000
