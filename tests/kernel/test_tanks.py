"""Stirred tanks against closed forms and published states, at the edges and with several states."""

import numpy as np
import pytest
from kernel_cases import case, network

from moletally.kernel.status import Status
from moletally.kernel.tank import TankResult, solve_tanks

CLOSED_FORM = 1e-11


def tank(model, feed, tau, *constants, start=None) -> TankResult:
    p = np.array([constants], dtype=np.float64).reshape(1, -1)
    first = None if start is None else case(*start)
    return solve_tanks(model, case(*feed), np.array([float(tau)]), np.array([300.0]), p, first)


def outlet(*args, **kwargs) -> np.ndarray:
    result = tank(*args, **kwargs)
    assert result.status[0] == Status.OK, Status(result.status[0])
    return result.c[0]


@pytest.mark.parametrize("tau", [1e-300, 1e-6, 1.0, 12.0, 1e6, 1e12])
def test_first_order(tau: float) -> None:
    """C = C0/(1 + k tau)."""
    c = outlet(network("A B", ["A -> B : k*A"], "k"), (2, 0), tau, 0.1)
    assert c == pytest.approx([2 / (1 + 0.1 * tau), 2 * 0.1 * tau / (1 + 0.1 * tau)], rel=CLOSED_FORM)


def test_half_order_stays_above_zero() -> None:
    """A quadratic in the root of C: s^2 + k tau s - C0 = 0."""
    c = outlet(network("A B", ["A -> B : k*A^0.5"], "k"), (2, 0), 30, 0.1)
    root = (-3 + np.sqrt(9 + 8)) / 2
    assert c[0] == pytest.approx(root**2, rel=CLOSED_FORM)


@pytest.mark.parametrize("order", [0.25, 0.75, 1.5, 2.5, 3.0])
def test_a_general_order_closes_its_own_balance(order: float) -> None:
    c = outlet(network("A B", [f"A -> B : k*A^{order}"], "k"), (2, 0), 12, 0.05)
    assert 2 - c[0] == pytest.approx(12 * 0.05 * c[0] ** order, rel=1e-12)


def test_series_and_parallel() -> None:
    """A -> B -> C, 2 A -> D: C_A from its quadratic, C_B = (C_B0 + k1 tau C_A)/(1 + k2 tau)."""
    model = network("A B C D", ["A -> B : 0.5*A", "B -> C : 0.2*B", "2 A -> D : 0.1*A^2"])
    a, b, c, d = outlet(model, (3, 0, 0, 0), 4)
    exact = (-(1 + 2) + np.sqrt(9 + 4 * 0.8 * 3)) / (2 * 0.8)
    assert [a, b] == pytest.approx([exact, 2 * exact / 1.8], rel=CLOSED_FORM)
    assert a + b + c + 2 * d == pytest.approx(3, rel=1e-14)


def test_zero_order_is_cut_to_the_feed() -> None:
    model = network("A B", ["A -> B : k"], "k")
    assert outlet(model, (2, 0), 12, 0.1) == pytest.approx([0.8, 1.2], rel=CLOSED_FORM)
    result = tank(model, (2, 0), 25, 0.1)
    assert result.c[0].tolist() == pytest.approx([0, 2], rel=1e-14)
    assert result.c[0, 0] == 0.0
    assert result.exhausted.tolist() == [[True, False]]


def test_two_laws_of_order_zero_share_one_factor_of_feed_and_supply() -> None:
    """A: 2 fed, 12 * 0.05 supplied by D; taken by B and C at 0.1 : 0.2."""
    model = network("A B C D", ["A -> B : 0.1", "A -> C : 0.2", "D -> A : 0.05"])
    c = outlet(model, (2, 0, 0, 3), 12)
    assert c == pytest.approx([0, 2.6 / 3, 5.2 / 3, 2.4], rel=1e-13, abs=0)


def test_a_species_used_up_stops_its_other_laws_entirely() -> None:
    """Order zero takes all of A; the fast half-order law beside it gets nothing. What B would make is gone too."""
    model = network("A B C D", ["A -> B : 1", "A -> C : 1e5*A^0.5", "C -> D : 2*C^0.5"])
    c = outlet(model, (1e-4, 0, 0, 0), 1e4)
    assert c.tolist() == pytest.approx([0, 1e-4, 0, 0], rel=1e-12, abs=0)


def test_order_zero_in_a_species_that_is_not_there() -> None:
    result = tank(network("A B", ["A -> B : 2"]), (0, 1), 5)
    assert result.c.tolist() == [[0, 1]]
    assert result.exhausted.tolist() == [[True, False]]


def test_negative_order_has_the_root_that_a_start_up_reaches_or_none() -> None:
    """C^2 - C0 C + k tau = 0 has two roots for C0^2 > 4 k tau, and none beyond."""
    model = network("A B", ["A -> B : k/A"], "k")
    assert outlet(model, (2, 0), 12, 0.05)[0] == pytest.approx(1 + np.sqrt(0.4), rel=CLOSED_FORM)
    assert tank(model, (2, 0), 50, 0.05).status[0] == Status.UNBOUNDED_AT_ZERO


def test_a_product_that_brakes_without_bound_still_starts() -> None:
    """A -> B at k A/B from B = 0: B^2 = k tau A."""
    a, b = outlet(network("A B", ["A -> B : k*A/B"], "k"), (2, 0), 3, 0.5)
    assert b * b == pytest.approx(1.5 * a, rel=1e-12)


def test_an_inhibitor_of_negative_order_that_is_not_there_has_no_answer() -> None:
    assert tank(network("A B C", ["A -> C : A/B"]), (2, 0, 0), 3).status[0] == Status.UNBOUNDED_AT_ZERO


@pytest.mark.parametrize("feed", [(0, 0, 1), (1, 0, 0), (0, 1, 0)])
def test_zero_over_zero_at_zero_feed(feed: tuple[float, ...]) -> None:
    c = outlet(network("A B C", ["A + B -> C : A*B/(A + B)"]), feed, 5)
    assert c.tolist() == list(feed)


def test_half_order_product_that_is_made_from_nothing() -> None:
    """C: 0 = k1 tau A - C - k2 tau sqrt(C), a quadratic in the root."""
    c = outlet(network("A C D", ["A -> C : 0.5*A", "C -> D : 2*C^0.5"]), (1, 0, 0), 3)
    root = -3 + np.sqrt(9 + 1.5 / 2.5)
    assert c[:2] == pytest.approx([1 / 2.5, root**2], rel=CLOSED_FORM)


def test_trace_species_are_right_relatively() -> None:
    c = outlet(network("A B C", ["A -> B : ki*A", "B -> C : kp*B"], "ki kp"), (1, 0, 0), 1, 1e-25, 1e5)
    assert c[1] == pytest.approx(1e-25 / (1 + 1e5), rel=1e-12)


def test_no_residence_time_returns_the_feed() -> None:
    assert tank(network("A B", ["A -> B : 1/A"]), (0.5, 3), 0).c.tolist() == [[0.5, 3]]


def test_fast_equilibrium_beside_slow_loss_keeps_its_digits() -> None:
    """A -> 2/3 B at 1e12 A, B -> 3/2 A at 2.5e11 B, B -> C at k B; solved by hand for the net extent x.

    x = tau (r1 - 3/2 r2): A = 1 - x, B = (2/3) x/(1 + k tau), and r1 - 3/2 r2 = x/tau. Sums in doubles
    lose four digits here, and coefficients rounded to doubles as many.
    """
    k, tau = 1e-3, 1e3
    reactions = ["A -> 0.6666666666666666 B : 1e12*A", "B -> 1.5 A : 2.5e11*B", "B -> C : 1e-3*B"]
    a, b, c = outlet(network("A B C", reactions), (1, 0, 0), tau)
    x = 1 / (1 + 0.375 * (2 / 3) / (1 + k * tau) + 1e-12 / tau)
    assert [a, b, c] == pytest.approx([1 - x, x / 3, x / 3], rel=1e-12)


# Source of feeds and equations: F. Mazzia, C. Magherini, Test Set for IVP Solvers, release 2.4 (Bari, 2008),
# files rober.f, hires.f. The tank states are 50-digit Newton solutions of the same equations, computed
# independently of this engine.
ROBER = network("A B C", ["A -> B : 0.04*A", "2 B -> B + C : 3e7*B^2", "B + C -> A + C : 1e4*B*C"])
ROBER_TANK = {
    1: (0.970444317969328, 3.13710646753747e-5, 0.0295243109659963),
    100: (0.725402313990667, 9.5670984614088e-6, 0.274588118910872),
    1e4: (0.280412982338209, 1.54874730983299e-6, 0.719585468914481),
    1e6: (0.0427706942841723, 1.78627090805467e-7, 0.957229127088737),
    1e11: (0.000144306574973563, 5.77308609800027e-10, 0.999855692847718),
}


@pytest.mark.parametrize("tau", ROBER_TANK)
def test_rober_tank(tau: float) -> None:
    result = tank(ROBER, (1, 0, 0), tau)
    assert result.unique[0]
    assert result.c[0] == pytest.approx(ROBER_TANK[tau], rel=1e-12)


def test_hires_tank() -> None:
    reactions = [
        "0 -> y1 : 0.0007", "y1 -> y2 : 1.71*y1", "y2 -> y1 : 0.43*y2", "y2 -> y4 : 8.32*y2", "y3 -> y1 : 8.32*y3",
        "y3 -> y4 : 1.71*y3", "y4 -> y3 : 0.43*y4", "y4 -> y6 : 0.69*y4", "y5 -> y3 : 0.035*y5", "y5 -> y6 : 1.71*y5",
        "y6 -> y5 : 0.43*y6", "y7 -> y5 + y8 : 0.43*y7", "y7 -> y6 + y8 : 0.69*y7", "y7 -> y8 : 0.69*y7",
        "y6 + y8 -> y7 : 280*y6*y8",
    ]  # fmt: skip
    model = network("y1 y2 y3 y4 y5 y6 y7 y8", reactions)
    expected = [
        0.08520335867241, 0.0164630218451775, 0.00558160814947546, 0.12009581285859, 0.140014029285503,
        0.595122464138741, 0.00563540570254467, 6.45942974553348e-5,
    ]  # fmt: skip
    assert outlet(model, (1, 0, 0, 0, 0, 0, 0, 0.0057), 10) == pytest.approx(expected, rel=1e-12)


# A + 2 B -> 3 B, k = 1, tau = 1/11, feed 60/11 and 6/11: (B - 1)(B - 2)(B - 3) = 0, eigenvalues -11 and
# -11 + 12 B - 3 B^2. Multiplied out by hand.
CUBIC = network("A B", ["A + 2 B -> 3 B : A*B^2"])
CUBIC_FEED = (60 / 11, 6 / 11)


@pytest.mark.parametrize(
    ("start", "b"),
    [(None, 1), ((5, 1), 1), ((0, 6), 3), ((4.01, 1.99), 1), ((3.99, 2.01), 3), ((0, 0.001), 1)],
)
def test_of_three_states_the_one_that_the_start_reaches(start: tuple[float, float] | None, b: float) -> None:
    result = tank(CUBIC, CUBIC_FEED, 1 / 11, start=start)
    assert result.c[0] == pytest.approx([6 - b, b], rel=1e-12)
    assert result.from_transient[0]
    assert not result.unique[0]


def test_a_start_on_the_unstable_state_is_refused() -> None:
    assert tank(CUBIC, CUBIC_FEED, 1 / 11, start=(4, 2)).status[0] == Status.UNSTABLE


def test_autocatalysis_with_decay_ends_as_the_start_says() -> None:
    """Source: Gray and Scott, Chem. Eng. Sci. 39 (1984) 1087: (1 - a) a = (1 + kappa T)^2/T, or a = 1.

    kappa = 1/40, T = 100: the upper state has 1 - a = 1/2 + sqrt(1/4 - 12.25/100) and is stable.
    """
    model = network("A B C", ["A + 2 B -> 3 B : A*B^2", "B -> C : 0.025*B"])
    assert outlet(model, (1, 0, 0), 100).tolist() == [1, 0, 0]
    assert outlet(model, (1, 0, 0), 100, start=(1, 1e-3, 0)).tolist() == [1, 0, 0]
    lit = outlet(model, (1, 0, 0), 100, start=(1, 1, 0))
    assert lit[0] == pytest.approx(0.5 - np.sqrt(0.25 - 0.1225), rel=1e-10)


@pytest.mark.parametrize(
    ("start", "u"), [(None, 10.3875793279), ((0.1, 0), 0.261938798622), ((7.2, 12), 0.261938798622)]
)
def test_inhibited_law_with_three_states(start: tuple[float, float] | None, u: float) -> None:
    """(u0 - u)(1 + u)^2 = theta u with u0 = 20, theta = 120: a cubic; 7.35048187347 between is unstable."""
    c = outlet(network("U P", ["U -> P : U/(1 + U)^2"]), (20, 0), 120, start=start)
    assert c[0] == pytest.approx(u, rel=1e-11)


def test_sterile_feed() -> None:
    """A + B -> 2 B: washed out for k A0 tau < 1, else B = A0 - 1/(k tau), and B = 0 is no resting place."""
    model = network("A B", ["A + B -> 2 B : A*B"])
    assert tank(model, (1, 0), 4).status[0] == Status.UNSTABLE
    assert outlet(model, (1, 0), 4, start=(1, 1e-9)) == pytest.approx([0.25, 0.75], rel=1e-11)
    assert outlet(model, (1, 0), 0.5).tolist() == [1, 0]
    assert outlet(model, (1, 0), 0.5, start=(1, 0.3)).tolist() == [1, 0]


@pytest.mark.parametrize(("T", "ends"), [(166.25, "oscillating"), (205.0, "washed out")])
def test_a_state_that_swings_is_no_outlet(T: float, ends: str) -> None:
    """Source: Gray and Scott (1984): at kappa = 1/40 the lit state is lost where b^2 < kappa (Hopf).

    x = 1 - a solves x (1 - x) = (1 + kappa T)^2/T, b = x/(1 + kappa T); the trace of its Jacobian is
    kappa - b^2. A little beyond, a start near it ends on a cycle; further on it is washed out.
    """
    kappa = 0.025
    model = network("A B C", ["A + 2 B -> 3 B : A*B^2", "B -> C : 0.025*B"])
    x = 0.5 + np.sqrt(0.25 - (1 + kappa * T) ** 2 / T)
    b = x / (1 + kappa * T)
    assert kappa > b * b
    result = tank(model, (1, 0, 0), T, start=(1 - x, 1.001 * b, 0))
    if ends == "oscillating":
        assert result.status[0] == Status.OSCILLATES
    else:
        assert result.c[0].tolist() == [1, 0, 0]


def test_a_root_of_a_negative_number_is_no_answer() -> None:
    model = network("A B", ["A -> B : 0.01*(A - 1)^0.5"])
    assert tank(model, (2, 0), 1).status[0] == Status.OK
    assert tank(model, (0.5, 0), 1).status[0] != Status.OK


def test_many_cases_are_what_each_is_alone() -> None:
    rng = np.random.default_rng(1)
    model = network("A B C", ["A + B -> C : k*A*B^0.5", "C -> A + B : 0.3*C"], "k")
    feed = np.where(rng.random((40, 3)) < 0.3, 0.0, rng.uniform(0.1, 2, (40, 3)))
    tau, T, p = 10 ** rng.uniform(-2, 3, 40), np.full(40, 300.0), rng.uniform(0.1, 5, (40, 1))
    together = solve_tanks(model, feed, tau, T, p)
    for i in range(40):
        alone = solve_tanks(model, feed[i : i + 1], tau[i : i + 1], T[:1], p[i : i + 1])
        assert together.c[i] == pytest.approx(alone.c[0], rel=1e-12, abs=0)
        assert together.status[i] == alone.status[0] == Status.OK


def test_a_proven_tank_takes_few_iterations() -> None:
    result = tank(network("A B C", ["A + B -> C : 0.8*A*B^0.5"]), (1, 1.5, 0), 5)
    assert result.unique[0]
    assert result.iterations[0] <= 8
    assert result.residual[0] < 1e-14


@pytest.mark.parametrize("tau", [np.nan, -1.0])
def test_a_time_that_is_none_is_refused(tau: float) -> None:
    assert tank(network("A B", ["A -> B : k*A"], "k"), (2, 0), tau, 0.1).status[0] == Status.NOT_FINITE
