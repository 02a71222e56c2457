"""Derivatives of outlets against closed forms."""

import numpy as np
import pytest
from kernel_cases import case, network

from moletally.kernel.slopes import tank_slopes, tube_slopes
from moletally.kernel.tank import solve_tanks

T = np.array([350.0])
R = 8.314


def of_tank(model, feed, tau, *constants):
    numbers = (case(*feed), np.array([float(tau)]), T, np.array([constants], dtype=float).reshape(1, -1))
    return tank_slopes(model, solve_tanks(model, *numbers), *numbers)


def of_tube(model, feed, tau, *constants):
    numbers = (case(*feed), np.array([float(tau)]), T, np.array([constants], dtype=float).reshape(1, -1))
    return tube_slopes(model, *numbers)


def test_a_tank_of_first_order():
    """C = C0/(1 + k tau), k = k0 exp(-E/RT)."""
    model = network("A B", ["A -> B : k0*exp(-E/(8.314*T))*A"], "k0 E")
    k0, E, tau = 1e6, 5e4, 20.0
    k = k0 * np.exp(-E / R / T[0])
    below = 1 + k * tau
    slope = of_tank(model, (2, 0), tau, k0, E)
    assert slope.feed[0] == pytest.approx(np.array([[1 / below, 0], [k * tau / below, 1]]), rel=1e-12)
    assert slope.tau[0] == pytest.approx([-2 * k / below**2, 2 * k / below**2], rel=1e-12)
    by_k = -2 * tau / below**2
    assert slope.p[0, 0] == pytest.approx([by_k * k / k0, -by_k * k / R / T[0]], rel=1e-12)
    assert slope.T[0, 0] == pytest.approx(by_k * k * E / R / T[0] ** 2, rel=1e-12)


def test_a_tube_of_any_order():
    """C^(1-n) = C0^(1-n) + (n - 1) k tau, differentiated by hand."""
    model = network("A B", ["A -> B : k*A^n"], "k n")
    for n in (0.5, 1.5, 2.0):
        c0, k, tau, m = 2.0, 0.05, 12.0, 1 - n
        c = (c0**m - m * k * tau) ** (1 / m)
        slope = of_tube(model, (c0, 0), tau, k, n)
        assert slope.feed[0, 0, 0] == pytest.approx((c / c0) ** n, rel=1e-8)
        assert slope.tau[0, 0] == pytest.approx(-k * c**n, rel=1e-8)
        assert slope.p[0, 0, 0] == pytest.approx(-tau * c**n, rel=1e-8)
        by_m = c * ((c0**m * np.log(c0) - k * tau) / (m * c**m) - np.log(c) / m)
        assert slope.p[0, 0, 1] == pytest.approx(-by_m, rel=1e-7)


def test_a_stiff_tube():
    """A -> B -> C with k1 = 1e6, k2 = 0.1, long after A is gone: B = C0 k1/(k1 - k2) exp(-k2 tau)."""
    model = network("A B C", ["A -> B : k1*A", "B -> C : k2*B"], "k1 k2")
    k1, k2, tau = 1e6, 0.1, 5.0
    slope = of_tube(model, (1, 0, 0), tau, k1, k2)
    b = k1 / (k1 - k2) * np.exp(-k2 * tau)
    assert slope.p[0, 1, 1] == pytest.approx(b * (1 / (k1 - k2) - tau), rel=1e-7)
    assert slope.feed[0, 1, 0] == pytest.approx(b, rel=1e-7)
    assert slope.feed[0, 1, 1] == pytest.approx(np.exp(-k2 * tau), rel=1e-7)


@pytest.mark.parametrize("tau", [25.0, 45.0])
def test_past_the_end_of_a_zero_order_law(tau):
    """A: 2 - 0.1 tau + 0.05 tau, fed by D until tau = 20; at tau = 45 both are used up: B is all there was."""
    model = network("A B D", ["A -> B : k", "D -> A : 0.05"], "k")
    slope = of_tube(model, (2, 0, 1), tau, 0.1)
    if tau == 25.0:
        assert slope.p[0, :, 0] == pytest.approx([-25, 25, 0], rel=1e-5, abs=1e-6)
        assert slope.feed[0, :, 2] == pytest.approx([1, 0, 0], rel=1e-5, abs=1e-6)
    else:
        assert slope.p[0, :, 0] == pytest.approx([0, 0, 0], abs=1e-4)
        assert slope.feed[0, 1] == pytest.approx([1, 1, 1], rel=1e-5)


def test_a_species_that_nothing_brings_about_has_no_slope():
    model = network("A B X", ["A -> B : 0.1*A", "A + X -> 2 X : 0.01*A*X"])
    slope = of_tank(model, (2, 0, 0), 5)
    assert np.isnan(slope.feed[0, :, 2]).all()
    assert np.isfinite(slope.feed[0, :, :2]).all()


def test_no_volume():
    slope = of_tube(network("A B", ["A -> B : k*A"], "k"), (2, 0), 0, 0.1)
    assert slope.feed[0].tolist() == [[1, 0], [0, 1]]
    assert slope.tau[0] == pytest.approx([-0.2, 0.2], rel=1e-14)


def test_what_failed_has_no_slopes():
    model = network("A B", ["A + 2 B -> 3 B : A*B^2"])
    feed = case(60 / 11, 6 / 11)
    numbers = (feed, np.array([1 / 11]), T, np.zeros((1, 0)))
    unstable = solve_tanks(model, *numbers, start=case(4, 2))
    assert np.isnan(tank_slopes(model, unstable, *numbers).feed).all()
