"""Plug-flow tubes against closed forms and the published stiff problems, at the edges and along profiles."""

from itertools import pairwise

import numpy as np
import pytest
from kernel_cases import case, network

from moletally.kernel.status import Status
from moletally.kernel.tube import TubeResult, solve_tubes

TIGHT = 1e-8


def tube(model, feed, tau, *constants, grid=None) -> TubeResult:
    p = np.array([constants], dtype=np.float64).reshape(1, -1)
    points = None if grid is None else np.asarray(grid, dtype=np.float64)
    return solve_tubes(model, case(*feed), np.array([float(tau)]), np.array([300.0]), p, points)


def outlet(*args, **kwargs) -> np.ndarray:
    result = tube(*args, **kwargs)
    assert result.status[0] == Status.OK, Status(result.status[0])
    return result.c[0]


@pytest.mark.parametrize("tau", [0.0, 1e-300, 1e-6, 12.0, 300.0])
def test_first_order(tau: float) -> None:
    """C = C0 exp(-k tau)."""
    c = outlet(network("A B", ["A -> B : k*A"], "k"), (2, 0), tau, 0.1)
    assert c == pytest.approx([2 * np.exp(-0.1 * tau), -2 * np.expm1(-0.1 * tau)], rel=TIGHT)


def test_complete_conversion_is_zero() -> None:
    a, b = outlet(network("A B", ["A -> B : k*A"], "k"), (2, 0), 1e12, 0.1)
    assert a == 0
    assert b == pytest.approx(2, rel=1e-15)


@pytest.mark.parametrize("order", [0.25, 0.5, 0.75, 1.5, 2, 2.5, 3, -1])
def test_general_order(order: float) -> None:
    """C^(1-n) = C0^(1-n) + (n - 1) k tau."""
    c = outlet(network("A B", [f"A -> B : k*A^({order})"], "k"), (2, 0), 12, 0.05)
    exact = (2 ** (1 - order) + (order - 1) * 0.6) ** (1 / (1 - order))
    assert c[0] == pytest.approx(exact, rel=TIGHT)


def test_half_order_ends_at_a_finite_time_and_stays_at_zero() -> None:
    """sqrt(C) = sqrt(C0) - k tau/2 until 2 sqrt(C0)/k."""
    model = network("A B", ["A -> B : k*A^0.5"], "k")
    result = tube(model, (2, 0), 30, 0.1, grid=[12, 28, 28.3, 29])
    assert result.c[0, 0] == 0
    assert result.c[0, 1] == pytest.approx(2, rel=1e-15)
    exact = [(np.sqrt(2) - 0.05 * t) ** 2 if t < 20 * np.sqrt(2) else 0 for t in (12, 28, 28.3, 29)]
    assert result.profile is not None
    assert result.profile[0, :, 0] == pytest.approx(exact, rel=1e-7, abs=0)
    assert result.exhausted_at[0, 0] == pytest.approx(20 * np.sqrt(2), rel=1e-9)
    assert np.isnan(result.exhausted_at[0, 1])


def test_zero_order_ends_and_supply_goes_on() -> None:
    """A: 2 - 0.25 tau until tau = 8; then B and C take the supply 0.05 of D at 0.1 : 0.2."""
    model = network("A B C D", ["A -> B : 0.1", "A -> C : 0.2", "D -> A : 0.05"])
    result = tube(model, (2, 0, 0, 3), 12, grid=[4, 8.5])
    assert result.profile is not None
    assert result.profile[0, 0] == pytest.approx([1, 0.4, 0.8, 2.8], rel=TIGHT)
    after = 0.05 * 4 / 3
    assert result.c[0] == pytest.approx([0, 0.8 + after, 1.6 + 2 * after, 2.4], rel=TIGHT, abs=0)
    assert result.exhausted_at[0, 0] == pytest.approx(8, rel=1e-9)


def test_supply_that_comes_to_exceed_demand_lets_a_species_return() -> None:
    """S feeds A at 0.3 + 0.2 X with X = tau; demand 1 until tau = 3.5, then A = 0.1 (tau - 3.5)^2."""
    model = network("A B X", ["0 -> A : 0.3 + 0.2*X", "A -> B : 1", "0 -> X : 1"])
    result = tube(model, (0, 0, 0), 10, grid=[2, 5])
    assert result.profile is not None
    assert result.profile[0, :, 0] == pytest.approx([0, 0.225], rel=1e-6, abs=0)
    assert result.c[0, 0] == pytest.approx(0.1 * 6.5**2, rel=1e-6)
    assert result.c[0, 1] == pytest.approx(0.3 * 3.5 + 0.1 * 3.5**2 + 6.5, rel=1e-6)


def test_negative_order_has_no_answer_beyond_its_end_and_one_before() -> None:
    """C = sqrt(C0^2 - 2 k tau) until tau = 40."""
    model = network("A B", ["A -> B : k/A"], "k")
    result = tube(model, (2, 0), 50, 0.05, grid=[0, 10, 39, 41])
    assert result.status[0] == Status.UNBOUNDED_AT_ZERO
    assert result.profile_status[0].tolist() == [0, 0, 0, Status.UNBOUNDED_AT_ZERO]
    assert result.profile is not None
    assert result.profile[0, :3, 0] == pytest.approx([2, np.sqrt(3), np.sqrt(0.1)], rel=TIGHT)
    assert np.isnan(result.profile[0, 3]).all()


def test_concentrations_that_run_away_are_told_and_harm_nothing_before() -> None:
    """A -> 2 A at A^2: 1/(1 - tau)."""
    result = tube(network("A", ["A -> 2 A : A^2"]), (1,), 1.5, grid=[0.5, 0.99, 1.01])
    assert result.profile_status[0].tolist() == [0, 0, Status.BLOW_UP]
    assert result.profile is not None
    assert result.profile[0, :2, 0] == pytest.approx([2, 100], rel=1e-7)


def test_growth_without_bound_that_takes_for_ever_is_an_answer() -> None:
    assert outlet(network("A", ["A -> 2 A : A"]), (1,), 100)[0] == pytest.approx(np.exp(100), rel=1e-7)


@pytest.mark.parametrize("feed", [(0, 0, 1), (1, 0, 0)])
def test_zero_over_zero_at_zero_feed(feed: tuple[float, ...]) -> None:
    assert outlet(network("A B C", ["A + B -> C : A*B/(A + B)"]), feed, 5).tolist() == list(feed)


def test_zero_over_zero_at_complete_conversion() -> None:
    """Equal feeds: A' = -A/2."""
    c = outlet(network("A B C", ["A + B -> C : A*B/(A + B)"]), (1, 1, 0), 5)
    assert c == pytest.approx([np.exp(-2.5), np.exp(-2.5), 1 - np.exp(-2.5)], rel=TIGHT)
    assert outlet(network("A B C", ["A + B -> C : A*B/(A + B)"]), (1, 2, 0), 1e3)[2] == pytest.approx(
        1, rel=1e-12
    )


def test_half_order_zero_feed_and_half_order_made_from_nothing() -> None:
    assert outlet(network("A B C", ["A + B -> C : A*B^0.5"]), (1, 0, 0), 5).tolist() == [1, 0, 0]
    c = outlet(network("A C D", ["A -> C : 0.5*A", "C -> D : 2*C^0.5"]), (1, 0, 0), 3)
    # C follows (A/4)^2 with a lag: s' = A/(4 s) - 1 for s = sqrt(C), integrated by a fine Taylor method.
    assert c[1] == pytest.approx(_root_of_half_order(3.0) ** 2, rel=1e-7)
    assert c.sum() == pytest.approx(1, rel=1e-14)


def _root_of_half_order(end: float) -> float:
    """s' = exp(-t/2)/(4 s) - 1 by the trapezoidal rule in C = s^2, extrapolated twice (Richardson)."""

    def trapezoid(n: int) -> float:
        # Steps in sqrt(t): C starts as t/2, and its slope as -2 sqrt(t/2).
        grid = np.linspace(0, np.sqrt(end), n + 1) ** 2
        c = 0.0
        for a, b in pairwise(grid.tolist()):
            h = b - a
            known = c + 0.5 * h * (0.5 * np.exp(-a / 2) - 2 * np.sqrt(c) + 0.5 * np.exp(-b / 2))
            root = -0.5 * h + np.sqrt(0.25 * h * h + known)  # C + h sqrt(C) = known
            c = root * root
        return c

    one, two, four = (trapezoid(n) for n in (4000, 8000, 16000))
    once, again = (4 * two - one) / 3, (4 * four - two) / 3
    assert once == pytest.approx(again, rel=1e-7)
    return float(np.sqrt(again))


def test_a_trace_of_a_trace() -> None:
    c = outlet(network("A B C", ["A -> B : ki*A", "B -> C : kp*B"], "ki kp"), (1, 0, 0), 1, 1e-16, 1e5)
    assert c[1] == pytest.approx(1e-16 / 1e5 * (1 - 1e-21), rel=1e-6)


def test_zero_feed_with_a_source() -> None:
    c = outlet(network("A", ["A -> 0 : A", "0 -> A : 2"]), (0,), 0.1)
    assert c[0] == pytest.approx(-2 * np.expm1(-0.1), rel=TIGHT)


def test_root_of_a_difference_is_refused_where_it_is_undefined() -> None:
    model = network("A B", ["A -> B : (A - B)^0.5"])
    assert tube(model, (2, 0), 1).status[0] == Status.OK
    assert tube(model, (0.5, 1), 1).status[0] == Status.NOT_FINITE


# Source: F. Mazzia, C. Magherini, Test Set for IVP Solvers, release 2.4 (Bari, 2008): rober.f, hires.f,
# pollu.f, orego.f, "computed using RADAU, rtol = atol = h0 = 1.1e-18"; digits read from stored copies.
ROBER = network("A B C", ["A -> B : 0.04*A", "2 B -> B + C : 3e7*B^2", "B + C -> A + C : 1e4*B*C"])


def test_rober() -> None:
    """Points before the end are from two other integrators that agree to 5e-10."""
    result = tube(ROBER, (1, 0, 0), 1e11, grid=[0.4, 40, 4000, 4e5, 4e7, 4e9])
    published = [2.083340149701255e-08, 8.333360770334713e-14, 9.999999791665050e-01]
    assert result.c[0] == pytest.approx(published, rel=1e-6)
    on_the_way = [
        [9.851721139e-01, 3.386395379e-05, 1.479402219e-02],
        [7.158270687e-01, 9.185534765e-06, 2.841637457e-01],
        [1.832022578e-01, 8.942371253e-07, 8.167968480e-01],
        [4.938274521e-03, 1.984994088e-08, 9.950617056e-01],
        [5.203071844e-05, 2.081335732e-10, 9.999479691e-01],
        [5.208276611e-07, 2.083311717e-12, 9.999994792e-01],
    ]
    assert result.profile is not None
    assert result.profile[0] == pytest.approx(np.array(on_the_way), rel=1e-7)
    assert result.profile[0].sum(axis=1) == pytest.approx(np.ones(6), rel=1e-14)


def test_hires() -> None:
    reactions = [
        "0 -> y1 : 0.0007", "y1 -> y2 : 1.71*y1", "y2 -> y1 : 0.43*y2", "y2 -> y4 : 8.32*y2", "y3 -> y1 : 8.32*y3",
        "y3 -> y4 : 1.71*y3", "y4 -> y3 : 0.43*y4", "y4 -> y6 : 0.69*y4", "y5 -> y3 : 0.035*y5", "y5 -> y6 : 1.71*y5",
        "y6 -> y5 : 0.43*y6", "y7 -> y5 + y8 : 0.43*y7", "y7 -> y6 + y8 : 0.69*y7", "y7 -> y8 : 0.69*y7",
        "y6 + y8 -> y7 : 280*y6*y8",
    ]  # fmt: skip
    published = [
        0.7371312573325668e-3, 0.1442485726316185e-3, 0.5888729740967575e-4, 0.1175651343283149e-2,
        0.2386356198831331e-2, 0.6238968252742796e-2, 0.2849998395185769e-2, 0.2850001604814231e-2,
    ]  # fmt: skip
    c = outlet(network("y1 y2 y3 y4 y5 y6 y7 y8", reactions), (1, 0, 0, 0, 0, 0, 0, 0.0057), 321.8122)
    assert c == pytest.approx(published, rel=1e-7)


def test_orego() -> None:
    """A limit cycle with coefficients like 77.27: its phase is sensitive."""
    model = network("x y z", ["0 -> 0 : y", "0 -> 0 : x", "0 -> 0 : x*x", "0 -> 0 : x*y", "0 -> 0 : z"])
    q = 77.27
    model.stoichiometry[:] = [
        [q, -1 / q, 0],
        [q, 0, 0.161],
        [-q * 8.375e-6, 0, 0],
        [-q, -1 / q, 0],
        [0, 1 / q, -0.161],
    ]
    published = [1.000814870318523, 1228.178521549917, 132.0554942846706]
    assert outlet(model, (1, 2, 3), 360) == pytest.approx(published, rel=1e-6)


def test_e5_keeps_traces_over_thirteen_decades() -> None:
    """Equations of e5.f; its printed endpoint breaks its own invariant y2 = y3 + y4 and is not used.

    Values: a 40-digit implicit Runge-Kutta integration made for this check, and two integrators in ln y1.
    """
    model = network(
        "a b c d",
        ["a -> b + c : 7.89e-10*a", "b + c -> 0 : 1.13e9*b*c", "a + c -> d : 1.1e7*a*c", "d -> c : 1.13e3*d"],
    )
    result = tube(model, (1.76e-3, 0, 0, 0), 1e13, grid=[1e3, 1e7, 1e11])
    assert result.c[0, 1:3] == pytest.approx([8.861233521285089e-23] * 2, rel=1e-6)
    assert result.profile is not None
    at_1000 = [1.6180769999073e-3, 1.382237030498e-10, 8.25157350068e-12, 1.29972129549e-10]
    assert result.profile[0, 0] == pytest.approx(at_1000, rel=1e-7)
    assert result.profile[0, 1, :3] == pytest.approx(
        [4.7150333630e-10, 1.81888958608e-14, 1.81888123768e-14], rel=1e-6
    )
    assert result.profile[0, 2, 1:3] == pytest.approx([1.01925825681e-20] * 2, rel=1e-6)


@pytest.mark.parametrize("model", [ROBER, network("A B C", ["A + B -> C : 0.3*A*B^0.5", "C -> A : 0.1*C"])])
def test_a_point_of_a_profile_is_the_outlet_of_that_length(model) -> None:
    """The mesh of steps does not know where it is asked."""
    feed, grid = (1.0, 0.7, 0.0), np.array([1e-9, 0.01, 0.3, 5.0, 90.0])
    result = tube(model, feed, 90, grid=grid)
    assert result.profile is not None
    for tau, point in zip(grid, result.profile[0], strict=True):
        assert tube(model, feed, tau).c[0] == pytest.approx(point, rel=1e-13, abs=0)


def test_many_cases_are_what_each_is_alone() -> None:
    rng = np.random.default_rng(5)
    model = network("A B C", ["A + B -> C : k*A*B^0.5", "C -> A + B : 0.3*C", "A -> 0 : 0.2"], "k")
    feed = np.where(rng.random((8, 3)) < 0.3, 0.0, rng.uniform(0.1, 2, (8, 3)))
    tau, T, p = 10 ** rng.uniform(-2, 1, 8), np.full(8, 300.0), 10 ** rng.uniform(-1, 2, (8, 1))
    together = solve_tubes(model, feed, tau, T, p)
    for i in range(8):
        alone = solve_tubes(model, feed[i : i + 1], tau[i : i + 1], T[:1], p[i : i + 1])
        assert together.status[i] == alone.status[0] == Status.OK
        assert together.c[i] == pytest.approx(alone.c[0], rel=1e-8, abs=1e-14)


def test_a_plain_tube_takes_few_steps() -> None:
    result = tube(network("A B C", ["A + B -> C : 0.8*A*B"]), (1, 1.5, 0), 5)
    assert result.steps[0] <= 30


@pytest.mark.parametrize("tau", [np.nan, -1.0])
def test_a_time_that_is_none_is_refused(tau: float) -> None:
    assert tube(network("A B", ["A -> B : k*A"], "k"), (2, 0), tau, 0.1).status[0] == Status.NOT_FINITE
