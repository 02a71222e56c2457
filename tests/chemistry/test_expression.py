"""The grammar of rate laws and wants: what is read, what is refused and where the caret points."""

import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from moletally.chemistry.equations import parse_equation
from moletally.chemistry.errors import InputError, SheetError
from moletally.chemistry.evaluate import evaluate
from moletally.chemistry.expression import parse, split_unit

VALUES = {"a": 2.0, "b": 3.0, "k_1": 5.0, "2-pentene": 7.0, "x y": 11.0, "é": 13.0}


def value(text):
    def no_call(node):
        raise AssertionError(node)

    return float(evaluate(parse(text), lambda n: VALUES[n.text], no_call))


@pytest.mark.parametrize(
    ("text", "result"),
    [
        ("a + b*k_1", 17.0), ("(a + b)*k_1", 25.0), ("a - b - k_1", -6.0), ("a/b/k_1", 2 / 15), ("a^b", 8.0), ("a^-b", 0.125),
        ("-(a^b)", -8.0), ("(-a)^2", 4.0), ("-a*b", -6.0), ("2*-a", -4.0), ("a*b^0.5", 2 * math.sqrt(3)), ("1e-3*a", 2e-3),
        (".5*a", 1.0), ("sqrt(a)", math.sqrt(2)), ("exp(ln(b))", 3.0), ("log10(1000)", 3.0), ("abs(a - b)", 1.0),
        ("min(a, b, k_1)", 2.0), ("max(a, b)", 3.0), ("[2-pentene]*a", 14.0), ("[x y]", 11.0), ("é", 13.0), ("a·b", 6.0), ("a − b", -1.0),
        ("  a  ", 2.0), ("((a))", 2.0),
    ],
)  # fmt: skip
def test_what_is_read(text, result):
    assert value(text) == pytest.approx(result, rel=1e-15)


@pytest.mark.parametrize(
    ("text", "words", "caret"),
    [
        ("-a^b", "parenthes", None), ("a^b^k_1", "parenthes", None), ("2a", r"2\*a", None), ("a**b", r"\^", None), ("0,5*a", "decimal point", None),
        ("log(a)", "ln .natural. or log10", None), ("foo(a)", "unknown function", 0), ("a b", "operator", 2), ("a +", "expected|missing|end", 3), ("(a", "not closed", 0),
        ("a)", "without its", 1), ("max(a)", "at least 2", 0), ("", "empty", None), ("a & b", "&|character|can", 2), ("k(a)", "unknown function", 0),
    ],
)  # fmt: skip
def test_what_is_refused(text, words, caret):
    with pytest.raises(InputError, match=words) as caught:
        parse(text)
    lines = caught.value.what.split("\n")
    if caret is not None:
        assert lines[-1].index("^") == lines[-2].index(text) + caret


def test_depth_and_length_are_bounded():
    for text in ("(" * 2000 + "a" + ")" * 2000, "a+" * 5000 + "a", "-" * 3000 + "a", "a^" * 100 + "a"):
        with pytest.raises(InputError):
            parse(text)


@pytest.mark.parametrize(
    ("text", "parts"),
    [("flow(A) [kmol/h]", ("flow(A)", "kmol/h")), ("[2-pentene]", ("[2-pentene]", None)), ("A/[2-pentene]", ("A/[2-pentene]", None)),
     ("[coolant temperature] [degC]", ("[coolant temperature]", "degC")), ("A [mol/L]", ("A", "mol/L")), ("A/B", ("A/B", None))],
)  # fmt: skip
def test_a_unit_behind_a_want(text, parts):
    assert split_unit(text) == parts


@pytest.mark.parametrize(
    ("text", "left", "right", "both_ways"),
    [
        ("A + 0.5 B -> C + 2 D", {"A": 1, "B": 0.5}, {"C": 1, "D": 2}, False), ("2A = 2 B", {"A": 2}, {"B": 2}, True),
        ("A <-> B", {"A": 1}, {"B": 1}, True), ("A ⇌ B", {"A": 1}, {"B": 1}, True), ("A <=> B", {"A": 1}, {"B": 1}, True),
        ("A → B", {"A": 1}, {"B": 1}, False), ("A => B", {"A": 1}, {"B": 1}, False), ("0 -> B", {}, {"B": 1}, False),
        ("A -> 0", {"A": 1}, {}, False), ("A + A -> B", {"A": 2}, {"B": 1}, False), ("[2-pentene] -> X_1", {"2-pentene": 1}, {"X_1": 1}, False),
        ("A + B -> A + C", {"A": 1, "B": 1}, {"A": 1, "C": 1}, False), ("1.5e-3 A -> B", {"A": 1.5e-3}, {"B": 1}, False),
    ],
)  # fmt: skip
def test_equations(text, left, right, both_ways):
    equation = parse_equation(text)
    assert (dict(equation.left), dict(equation.right), equation.reversible) == (left, right, both_ways)


@pytest.mark.parametrize(
    "text",
    [
        "A + -> B",
        "A B -> C",
        "A",
        "",
        "A -> B -> C",
        "-2 A -> B",
        "A ++ B -> C",
        "0,5 A -> B",
        "0 -> 0",
        "A <- B",
        "+ A -> B",
    ],
)
def test_equations_that_are_none(text):
    with pytest.raises(InputError):
        parse_equation(text)


TEXT = st.text(alphabet="abTRk_12.e+-*/^()[], ·−→<>=0", max_size=30) | st.text(max_size=15)


@settings(max_examples=400, deadline=500)
@given(TEXT)
def test_any_text_is_read_or_refused(text):
    for read in (parse, parse_equation, split_unit):
        try:
            read(text)
        except SheetError as error:
            assert error.reason
