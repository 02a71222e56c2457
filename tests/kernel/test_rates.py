"""Rate-law programs: values and exact derivatives, for one case and for many, at the edges of laws."""

from decimal import Decimal, localcontext

import numpy as np
import pytest
from kernel_cases import case, network

from moletally.kernel.decimals import DECIMALS, DIGITS
from moletally.kernel.evaluate import derivatives, evaluate
from moletally.kernel.program import Builder, Op
from moletally.kernel.rates import Bound, tape_of
from moletally.kernel.structure import everything

LAWS = [
    "k*A*B^0.5/(1 + K*A)^2",
    "k*exp(-900/T)*A^1.5 - B/K",
    "k*sqrt(A*B) + ln(1 + K*A)",
    "min(k*A, B)*max(A, K*B)",
    "abs(A - B)*k + log10(A + K)",
    "k*A^K",
    "-(A/(B + K))",
]


@pytest.mark.parametrize("law", LAWS)
def test_derivatives_are_those_of_central_differences(law: str) -> None:
    model = network("A B", [f"A -> B : {law}"], "k K")
    c, T, p = case(1.3, 0.7), np.array([320.0]), case(2.0, 1.7)
    r, by_c, by_T, by_p = derivatives(model.program, c, T, p)
    point = np.concatenate([c[0], T, p[0]])
    exact = np.concatenate([by_c[0, 0], by_T[0], by_p[0, 0]])

    def rate(x: np.ndarray) -> float:
        return float(evaluate(model.program, x[None, :2], x[2:3], x[None, 3:])[0, 0])

    assert r[0, 0] == pytest.approx(rate(point), rel=1e-14)
    for k, size in enumerate(point):
        step = np.zeros(5)
        step[k] = 1e-5 * size
        difference = (rate(point + step) - rate(point - step)) / (2 * step[k])
        assert exact[k] == pytest.approx(difference, rel=1e-8, abs=1e-9)


@pytest.mark.parametrize("law", LAWS)
def test_one_case_and_many_give_the_same(law: str) -> None:
    """One case runs on floats, many on arrays."""
    model = network("A B", [f"A -> B : {law}"], "k K")
    rng = np.random.default_rng(3)
    c, T, p = rng.uniform(0.1, 2, (5, 2)), rng.uniform(280, 400, 5), rng.uniform(0.5, 2, (5, 2))
    bound = Bound.of(everything(model.program), T, p)
    r, v = bound.slopes(c)
    for i in range(5):
        one_r, one_v = bound.at(np.array([i])).slopes(c[i : i + 1])
        assert one_r[0] == pytest.approx(r[i], rel=1e-14)
        assert one_v[0] == pytest.approx(v[i], rel=1e-13, abs=1e-15)


def test_decimals_run_the_same_program() -> None:
    """k A^1.5/(1 + K A) at A = 4, k = 0.5, K = 1/4: 0.5 * 8/2 = 2 exactly."""
    program = network("A", ["A -> 0 : k*A^1.5/(1 + K*A)"], "k K").program
    tape = everything(program)
    registers = [Decimal(0)] * (program.n_registers + 1)
    registers[0], registers[1], registers[2], registers[3] = (
        Decimal(4),
        Decimal(300),
        Decimal("0.5"),
        Decimal("0.25"),
    )
    registers[program.first_literal : program.first_temporary] = [
        Decimal(x) for x in program.literals.tolist()
    ]
    with localcontext(DIGITS):
        tape.run(tape.prelude, registers, DECIMALS)
        tape.run(tape.body, registers, DECIMALS)
    assert abs(registers[tape.outputs[0]] - 2) < Decimal("1e-45")


@pytest.mark.parametrize(
    ("law", "a"),
    [
        ("1/A", 0.0),
        ("ln(A)", 0.0),
        ("A/(A + B)", 0.0),
        ("(A - 1)^0.5", 0.5),
        ("sqrt(A - 1)", 0.5),
        ("exp(1e4/A)", 1.0),
    ],
)
@pytest.mark.parametrize("cases", [1, 3])
def test_where_a_law_is_undefined_it_is_not_finite_and_nothing_is_raised(
    law: str, a: float, cases: int
) -> None:
    program = network("A B", [f"A -> B : {law}"]).program
    c = np.tile([a, 0.0], (cases, 1))
    r = evaluate(program, c, np.full(cases, 300.0), np.zeros((cases, 0)))
    assert not np.isfinite(r).any()


def test_integrators_see_an_odd_continuation_of_fractional_powers() -> None:
    tape = everything(network("A", ["A -> 0 : A^0.5"]).program)
    for cases in (1, 2):
        bound = Bound.of(tape, np.full(cases, 300.0), np.zeros((cases, 0)))
        r, v = bound.slopes(np.full((cases, 1), -4.0))
        assert r[0, 0] == -2.0
        assert v[0, 0, 0] == 0.25


def test_a_subexpression_shared_by_two_laws_is_in_both_derivatives() -> None:
    """r1 = (A B)^2, r2 = (A B): the second law's tape begins in the first."""
    b = Builder(2, 0)
    product = b.apply(Op.MUL, b.species(0), b.species(1))
    b.rate(b.apply(Op.MUL, product, product))
    b.rate(product)
    program = b.finish()
    _, v = Bound.of(everything(program), np.array([300.0]), np.zeros((1, 0))).slopes(case(2.0, 3.0))
    assert v[0].tolist() == [[36.0, 24.0], [3.0, 2.0]]


def test_a_tape_computes_only_what_is_asked_for() -> None:
    program = network("A B", ["A -> B : 2*A", "B -> A : 3*B"]).program
    assert len(tape_of(program, (1,), (1,)).body) == 1
