"""Many vessels in one call, against a loop of scipy; and derivatives, against differences."""

from copy import copy

import numpy as np
from kernel_single import Tolerance
from measure import Times, in_turn, line
from plain import fsolved, integrated
from problems import network

from moletally.kernel.slopes import tank_slopes, tube_slopes
from moletally.kernel.tank import solve_tanks
from moletally.kernel.tube import solve_tubes

__all__ = ["batches"]

NU = np.array([[-1.0, -1.0, 1.0, 0.0], [0.0, -1.0, -1.0, 1.0]])
P1 = network("A B C D", ["A + B -> C : k1*A*B^0.5", "C + B -> D : k2*C*B^0.5"], "k1 k2")
SAMPLE = 200  # cases of the loop that are timed; the time is scaled
STEP = 1e-6  # relative, of the differences


class _Vessels:
    """P1 with constants, feed and residence time over decades."""

    def __init__(self, n: int, spread: float) -> None:
        rng = np.random.default_rng(8)
        self.k = np.array([0.8, 0.3]) * 10 ** rng.uniform(-spread, spread, (n, 2))
        self.tau = 2.0 * 10 ** rng.uniform(-spread, spread, n)
        self.feed = np.column_stack([rng.uniform(0.3, 3.0, (n, 2)), np.zeros((n, 2))])

    def chosen(self, places: np.ndarray) -> "_Vessels":
        """Some of them."""
        other = copy(self)
        other.k, other.tau, other.feed = self.k[places], self.tau[places], self.feed[places]
        return other

    @property
    def rows(self) -> tuple[np.ndarray, ...]:
        return self.feed, self.tau, np.full(len(self.tau), 300.0), self.k

    def change(self, i: int):
        k1, k2 = self.k[i].tolist()

        def rates(c: np.ndarray) -> np.ndarray:
            a, b, c3, _ = c.tolist()
            root = max(b, 0.0) ** 0.5
            r1, r2 = k1 * a * root, k2 * c3 * root
            return np.array([-r1, -r1 - r2, r1 - r2, r2])

        return rates

    def tank(self, i: int) -> tuple[np.ndarray, bool]:
        return fsolved(
            self.change(i), self.feed[i], self.tau[i], np.maximum(self.feed[i], 1e-3 * self.feed[i].max())
        )

    def tube(self, i: int, rtol: float, atol: float) -> np.ndarray:
        return integrated(self.change(i), self.feed[i], self.tau[i], rtol, atol)


def _against_loop(ours, one, n: int, seconds: float) -> Times:
    """Times of a batch of n and of the loop, from samples of the loop that move on."""
    size, turn = min(SAMPLE, n), [0]

    def sample() -> None:
        for i in range(size):
            one((turn[0] + i) % n)
        turn[0] += size

    times = in_turn(ours, sample, seconds=seconds)
    factor = n / size
    return Times((times.seconds[0], times.seconds[1] * factor), (1.0, times.ratios[1] * factor))


def batches(tolerance: Tolerance, seconds: float, n_tanks: int, n_tubes: int) -> None:
    """The rows of the table."""
    tanks = _Vessels(n_tanks, 1.0)
    result = solve_tanks(P1, *tanks.rows)
    found = [tanks.tank(i) for i in range(n_tanks)]
    failed = sum(not says for _, says in found)
    wrong = sum(_far(c, ours) for (c, says), ours in zip(found, result.c, strict=True) if says)
    line(
        f"{n_tanks:,} tanks P1, all different, in one call",
        _against_loop(lambda: solve_tanks(P1, *tanks.rows), tanks.tank, n_tanks, seconds), "≥ 80",
        f"{np.count_nonzero(result.status)} refused; fsolve: {failed} not converged, {wrong} elsewhere",
    )  # fmt: skip
    drawn = _Vessels(2 * n_tubes, 0.7)
    lasts = np.isnan(solve_tubes(P1, *drawn.rows).exhausted_at[:, 1])
    lasting = drawn.chosen(np.flatnonzero(lasts)[:n_tubes])
    mixed = drawn.chosen(np.arange(n_tubes))
    _tubes("B lasts", "≥ 45", lasting, tolerance, seconds)
    _tubes(f"B is used up in {np.count_nonzero(~lasts[:n_tubes])}", "≥ 45", mixed, tolerance, seconds)
    _sensitivities(seconds, *tolerance[1:])


def _tubes(what: str, target: str, tubes: _Vessels, tolerance: Tolerance, seconds: float) -> None:
    n, (_, rtol, atol) = len(tubes.tau), tolerance
    result = solve_tubes(P1, *tubes.rows)
    lost = sum(_far(tubes.tube(i, rtol, atol), result.c[i]) for i in range(n))
    times = _against_loop(
        lambda: solve_tubes(P1, *tubes.rows), lambda i: tubes.tube(i, rtol, atol), n, seconds
    )
    line(
        f"{n:,} tubes P1, all different, in one call; {what}", times, target,
        f"{np.count_nonzero(result.status)} refused; LSODA (rtol {rtol:.0e}): {lost} elsewhere or no number",
    )  # fmt: skip


def _far(c: np.ndarray, other: np.ndarray) -> bool:
    """Are these two answers? (where B is used up, traces are not compared)"""
    return not bool(np.all(np.abs(c - other) <= 1e-6 * np.abs(other).max()))


def _sensitivities(seconds: float, rtol: float, atol: float) -> None:
    """Outlet and its derivatives by two feeds, tau and two constants."""
    one = _Vessels(1, 0.0)

    def moved(which: int, by: float) -> _Vessels:
        other = _Vessels(1, 0.0)
        (array, place) = ((other.feed, (0, 0)), (other.feed, (0, 1)), (other.tau, 0), (other.k, (0, 0)),
                          (other.k, (0, 1)))[which]  # fmt: skip
        array[place] *= 1 + by
        return other

    others = [moved(which, STEP) for which in range(5)]
    line(
        "tank P1 and its derivatives by 5 numbers",
        in_turn(
            lambda: tank_slopes(P1, solve_tanks(P1, *one.rows), *one.rows),
            lambda: [v.tank(0) for v in (one, *others)],
            seconds=seconds,
        ),
        remarks="ours exact, by all 8; fsolve: forward differences",
    )
    line(
        "tube P1 and its derivatives by 5 numbers",
        in_turn(
            lambda: (solve_tubes(P1, *one.rows), tube_slopes(P1, *one.rows)),
            lambda: [v.tube(0, rtol, atol) for v in (one, *others)],
            seconds=seconds,
        ),
        remarks="LSODA: forward differences, at a tolerance that leaves them two or three digits",
    )
