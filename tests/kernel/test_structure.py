"""What is known of a network before a number is computed: terms, presence, orders at zero, uniqueness."""

import numpy as np
import pytest
from kernel_cases import network

from moletally.kernel.structure import Structure, structures
from moletally.kernel.terms import split

T = np.array([300.0])


def structure(
    species: str, reactions: list[str], feed: list[float], parameters: str = "", *values: float
) -> Structure:
    model = network(species, reactions, parameters)
    p = np.array([values], dtype=np.float64).reshape(1, -1)
    ((found, rows),) = structures(model, np.array([feed]) > 0, T, p)
    assert rows.tolist() == [0]
    return found


@pytest.mark.parametrize(
    ("law", "signs"),
    [
        ("k*(A*B - C/K)", [1, -1]),
        ("(k*A - K*B)/(1 + A)^2", [1, -1]),
        ("(k + K*C)*A*B", [1, 1]),
        ("-(A - B)*C", [-1, 1]),
        ("A*B", [1]),
        ("(A - B)^2", [1]),
    ],
)
def test_a_law_is_split_where_its_sum_is_taken_last(law: str, signs: list[int]) -> None:
    terms = split(network("A B C", [f"A + B -> C : {law}"], "k K"))
    assert terms.sign.tolist() == signs
    assert terms.model.stoichiometry.tolist() == [[-s, -s, s] for s in signs]


def test_a_law_whose_terms_cancel_at_zero_stays_whole() -> None:
    """1 - exp(-A) is of first order in A, though 1 and exp(-A) are not."""
    s = structure("A B", ["A -> B : 1 - exp(-A)"], [1, 0])
    assert s.order.tolist() == [[1.0, 0.0]]
    assert not len(s.starved)


def test_species_neither_fed_nor_made_are_absent_and_their_laws_rest() -> None:
    s = structure("A B C D", ["A -> B : A", "B + C -> D : B*C", "B -> A : 0.5*B"], [1, 0, 0, 0])
    assert s.present.tolist() == [0, 1]
    assert s.absent.tolist() == [2, 3]
    assert len(s.firing) == 2


def test_a_rate_constant_of_zero_makes_nothing() -> None:
    s = structure("A B C", ["A -> B : k*A", "B -> C : B"], [1, 0, 0], "k", 0.0)
    assert s.present.tolist() == [0]


@pytest.mark.parametrize(
    ("law", "order"),
    [
        ("A^0.5", 0.5),
        ("A/(1 + A)", 1),
        ("1/(1 + A)", 0),
        ("A^2/(A + 1/A)", 3),
        ("1/A", -1),
        ("A^n", 1.7),
        ("A*exp(-A)", 1),
    ],
)
def test_the_order_in_a_vanishing_species(law: str, order: float) -> None:
    s = structure("A B", [f"A -> B : {law}"], [1, 0], "n", 1.7)
    assert s.order[0, 0] == pytest.approx(order)


def test_an_order_depends_on_what_else_is_there() -> None:
    """A/(A + B) is of first order in A beside B, and of order zero without."""
    assert structure("A B C", ["A -> C : A/(A + B)"], [1, 1, 0]).order[0, 0] == 1
    assert structure("A B C", ["A -> C : A/(A + B)"], [1, 0, 0]).order[0, 0] == 0


def test_a_law_of_order_zero_wants_a_species_that_is_not_there() -> None:
    s = structure("A B", ["A -> B : 2"], [0, 1])
    assert s.wanted.tolist() == [0]
    assert not len(s.firing)


@pytest.mark.parametrize(
    ("reactions", "unique"),
    [
        # Monotone laws that each species only brakes.
        (["A -> B : 2*A"], True),
        (["A + B -> C : 2*A*B", "C + B -> A : 3*C*B^0.5"], True),
        (["A -> B : 2*A/(3 + A)"], True),
        (["A + B -> C : 2*(A*B - C/3)"], True),
        (["A -> B : 2"], True),
        (["A -> C : 4e-2*A", "2 C -> C + B : 3e7*C^2", "C + B -> A + B : 1e4*C*B"], True),
        # Several states are known: D. Gray and Scott, Chem. Eng. Sci. 38 (1983) 29; A/(1 + A)^2 is a
        # cubic with three roots at kt = 120, K A0 = 20; A + B -> 2 B may be washed out or not.
        (["A + 2 B -> 3 B : A*B^2"], False),
        (["A + 2 B -> 3 B : A*B^2", "B -> C : 0.025*B"], False),
        (["A -> B : A/(1 + A)^2"], False),
        (["A + B -> 2 B : A*B"], False),
        (["A -> B : 1/A"], False),
        # A logarithm is not looked into.
        (["A -> B : ln(1 + A)"], False),
    ],
)
def test_uniqueness_is_proven_where_it_holds_and_never_where_it_does_not(
    reactions: list[str], unique: bool
) -> None:
    assert structure("A B C", reactions, [1.0, 1.0, 1.0]).unique is unique


def test_powers_prove_more_than_signs() -> None:
    """A -> B at A/B, B -> A at B/A: signs leave a minor open, its value 1*1 - (-1)(-1) closes it.

    nu of the two is parallel, so the minor does not count; that each product brakes its own making does.
    With A + B -> C at A^2/B beside C -> A + B at C the minors of exponents are needed: -1*(2 - 1) < 0.
    """
    assert structure("A B", ["A -> B : A/B", "B -> A : B/A"], [1.0, 1.0]).unique
    # One term, nu = (-1, -1, 1), exponents (2, -1, 0): 1 + tau (2 v/a - v/b) may vanish.
    assert not structure("A B C", ["A + B -> C : A^2/B", "C -> A + B : C"], [1.0, 1.0, 1.0]).unique


def test_totals_are_exact_and_thirds_are_thirds() -> None:
    s = structure("A B C", ["3 A -> 2 B : A", "B -> 1.5 C : B"], [1, 0, 0])
    (weights,) = s.conserved
    assert weights / weights[0] == pytest.approx([1, 1.5, 1], abs=1e-15)
    s = structure("A B C", ["A -> 0.6666666666666666 B : A"], [1, 0, 0])
    assert s.conserved @ s.terms.model.stoichiometry[0] == pytest.approx(0, abs=1e-15)


def test_cases_of_one_make_share_a_structure() -> None:
    model = network("A B", ["A -> B : k*A"], "k")
    feed = np.array([[1.0, 0.0], [0.0, 1.0], [2.0, 0.0], [3.0, 0.0]])
    p = np.array([[1.0], [1.0], [2.0], [0.0]])
    groups = sorted(rows.tolist() for _, rows in structures(model, feed > 0, np.full(4, 300.0), p))
    assert groups == [[0, 2], [1], [3]]
