"""The integrators' tables against the order conditions, and their order on a problem with a known answer."""

from itertools import combinations_with_replacement
from math import prod

import numpy as np
import pytest
from kernel_cases import network

from moletally.kernel.reference import explicit, rosenbrock
from moletally.kernel.reference.cutoff import Laws
from moletally.kernel.reference.flow import Flow
from moletally.kernel.structure import structures

ROUNDING = 2e-13  # the tables have 16 digits


def trees(order: int) -> list[tuple]:
    """All rooted trees with that many nodes: a tree is the sorted tuple of its branches."""
    if order == 1:
        return [()]
    found = set()
    for split in partitions(order - 1):
        pools = [trees(k) for k in sorted(set(split))]
        counts = [split.count(k) for k in sorted(set(split))]
        combos = [()]
        for pool, count in zip(pools, counts, strict=True):
            combos = [a + b for a in combos for b in combinations_with_replacement(pool, count)]
        found |= {tuple(sorted(c)) for c in combos}
    return sorted(found)


def partitions(n: int, largest: int | None = None) -> list[list[int]]:
    if n == 0:
        return [[]]
    return [[k, *rest] for k in range(min(n, largest or n), 0, -1) for rest in partitions(n - k, k)]


def nodes(tree: tuple) -> int:
    return 1 + sum(map(nodes, tree))


def density(tree: tuple) -> int:
    return nodes(tree) * prod(map(density, tree))


def worst(weights: np.ndarray, weigh, order: int) -> float:
    """Largest violation of b^T Phi(t) = 1/gamma(t) over all trees of an order (Butcher)."""
    return max(abs(float(weights @ weigh(t)) - 1 / density(t)) for t in trees(order))


def test_there_are_as_many_trees_as_butcher_counts() -> None:
    assert [len(trees(k)) for k in range(1, 9)] == [1, 1, 2, 4, 9, 20, 48, 115]


def runge_kutta(tree: tuple) -> np.ndarray:
    a = np.zeros((12, 12))
    for i, row in enumerate(explicit.A):
        a[i, :i] = row
    return prod((a @ runge_kutta(t) for t in tree), start=np.ones(12))


@pytest.mark.parametrize("order", range(1, 9))
def test_dop853_has_order_8(order: int) -> None:
    assert worst(explicit.B, runge_kutta, order) < ROUNDING * 100


@pytest.mark.parametrize(("weights", "highest"), [(explicit.E5, 5), (explicit.E3, 3)])
def test_dop853_estimates_errors_by_methods_of_order_5_and_3(weights: np.ndarray, highest: int) -> None:
    for order in range(1, highest + 1):
        assert worst(explicit.B - weights, runge_kutta, order) < ROUNDING * 100
    assert worst(explicit.B - weights, runge_kutta, highest + 1) > 1e-5


def test_dop853_is_the_table_that_is_public_elsewhere() -> None:
    """Source: dop853_coefficients.py of scipy."""
    from scipy.integrate._ivp import dop853_coefficients as public

    for i, row in enumerate(explicit.A):
        assert np.array_equal(row, public.A[i, :i])
    assert np.array_equal(explicit.B, public.B)
    assert np.array_equal(explicit.E3, public.E3[:12])
    assert np.array_equal(explicit.E5, public.E5[:12])


def rodas() -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """alpha, alpha + Gamma, b and the embedded b from the table's transformed form.

    With U = Gamma K: Gamma^-1 = I/gamma - C, alpha = A Gamma, b = m Gamma
    (Hairer and Wanner, Solving ODEs II, section IV.7).
    """
    a, c = np.zeros((8, 8)), np.zeros((8, 8))
    for i in range(8):
        c[i, :i] = rosenbrock.C[i]
        if i < 6:
            a[i, :i] = rosenbrock.A[i]
    a[6], a[7] = a[5], a[5]
    a[6, 5] = a[7, 5] = a[7, 6] = 1.0
    m = a[7].copy()
    m[7] = 1.0
    gamma = np.linalg.inv(np.eye(8) / rosenbrock.GAMMA - c)
    return a @ gamma, a @ gamma + gamma, m @ gamma, a[7] @ gamma


def rosenbrock_weight(tree: tuple) -> np.ndarray:
    """A node with one branch has alpha + Gamma, one with more has alpha."""
    alpha, beta, _, _ = rodas()
    if len(tree) == 1:
        return beta @ rosenbrock_weight(tree[0])
    return prod((alpha @ rosenbrock_weight(t) for t in tree), start=np.ones(8))


@pytest.mark.parametrize("order", range(1, 6))
def test_rodas5p_has_order_5(order: int) -> None:
    assert worst(rodas()[2], rosenbrock_weight, order) < ROUNDING


@pytest.mark.parametrize("order", range(1, 5))
def test_rodas5p_estimates_errors_by_a_method_of_order_4(order: int) -> None:
    embedded = rodas()[3]
    assert worst(embedded, rosenbrock_weight, order) < ROUNDING
    assert worst(embedded, rosenbrock_weight, 5) > 1e-5


def test_rodas5p_damps_what_is_infinitely_stiff() -> None:
    """R(z) = 1 + z b^T (I - z beta)^-1 1 goes to 0: L-stable."""
    _, beta, b, _ = rodas()
    assert abs(1 - b @ np.linalg.solve(beta, np.ones(8))) < 1e-11


@pytest.mark.parametrize(
    ("method", "steps"), [(explicit.DOP853, (2, 4, 8)), (rosenbrock.Rodas5P, (16, 32, 64, 128))]
)
def test_the_error_falls_with_the_step_to_the_power_of_the_order(
    method: type, steps: tuple[int, ...]
) -> None:
    """A + B -> C with k = 1, A = 2, B = 1 to t = 2: A B-excess law ln(A/B) = ln 2 + t, solved by hand."""
    model = network("A B", ["A + B -> 0 : A*B"])
    feed, T, p = np.array([[2.0, 1.0]]), np.array([300.0]), np.zeros((1, 0))
    (structure, _), *_ = structures(model, feed > 0, T, p)
    flow = Flow(Laws.of(structure, structure.edged, feed, T, p), structure.coefficients)
    ratio = 2 * np.exp(2.0)
    exact = ratio / (ratio - 1)
    errors = []
    for n in steps:
        c = feed
        for _ in range(n):
            c, _, _ = method.step(flow, c, np.array([2.0 / n]), 1e-30 * feed)
        errors.append(abs(c[0, 0] - exact))
    slope = -np.polyfit(np.log(steps), np.log(errors), 1)[0]
    assert slope > method.order - 0.7
