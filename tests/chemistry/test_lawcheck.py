"""The dimension of a law from its expression: what fits, what does not, and what is proposed."""

import pytest

from moletally.chemistry.expression import parse
from moletally.chemistry.lawcheck import GAS_CONSTANT, TEMPERATURE, Mismatch, Symbols, dimension, remedy
from moletally.chemistry.quantity import compose, parse_unit

CONCENTRATION = parse_unit("mol/L").dims
RATE = parse_unit("mol/(L h)").dims
LIKE = [parse_unit("mol/L"), parse_unit("1/h")]


def symbols(values=None, **units):
    dims = {name: parse_unit(unit).dims for name, unit in units.items()}
    dims |= {"A": CONCENTRATION, "B": CONCENTRATION, "C": CONCENTRATION, "T": TEMPERATURE, "R": GAS_CONSTANT}
    return Symbols(dims, values or {})


@pytest.mark.parametrize(
    ("law", "known"),
    [
        ("k*A", symbols(k="1/h")), ("k*A*B^0.5", symbols(k="(L/mol)^0.5/h")), ("k*A*B/(1 + K*A)^2", symbols(k="L/(mol h)", K="L/mol")),
        ("k*(A*B - C/Keq)", symbols(k="L/(mol h)", Keq="L/mol")), ("k*A^n", symbols({"n": 1.5}, k="(L/mol)^0.5/h", n="-")),
        ("k*A*exp(-E/(R*T))", symbols(k="1/h", E="kJ/mol")), ("V*A/(Km + A)", symbols(V="mol/(L h)", Km="mol/L")),
        ("k*sqrt(A)", symbols(k="(mol/L)^0.5/h")), ("k*min(A, B)", symbols(k="1/h")), ("k*A^0.1*A^0.2*A^0.7", symbols(k="1/h")),
        ("k*x(A)", symbols(k="mol/(L h)")), ("k*A^(1/2 + 1/2)", symbols(k="1/h")), ("k*abs(A - B)", symbols(k="1/h")),
        ("k*A*(T/Tr)^n", symbols({}, k="1/h", Tr="K", n="-")),
    ],
)  # fmt: skip
def test_laws_that_fit(law, known):
    assert dimension(parse(law), known) == pytest.approx(RATE)


@pytest.mark.parametrize(
    ("law", "known", "words"),
    [
        ("k*A + K", symbols(k="1/h", K="1/h"), "added"), ("k*exp(A)", symbols(k="1/h"), "exp"), ("A^B", symbols(), "exponent"),
        ("A^n", symbols({}, n="-"), "no fixed number"), ("k*max(A, k)", symbols(k="1/h"), "compares"), ("1 + K*A", symbols(K="mol/L"), "added"),
    ],
)  # fmt: skip
def test_laws_that_do_not(law, known, words):
    with pytest.raises(Mismatch, match=words):
        dimension(parse(law), known)


@pytest.mark.parametrize(
    ("law", "known", "name", "proposal"),
    [
        ("k*A*B", symbols(k="1/h"), "k", "L/(mol h)"), ("k*A^2.5", symbols(k="1/h"), "k", "L^1.5/(mol^1.5 h)"),
        ("k*A/(1 + K*A)^2", symbols(k="1/h", K="mol/L"), "K", "L/mol"), ("k*A/(1 + sqrt(K*A))", symbols(k="1/h", K="1/h"), "K", "L/mol"),
        ("k*(A - B/Keq)", symbols(k="1/h", Keq="mol/L"), "Keq", "1"), ("k*A/(1 + K*A + L*B)", symbols(k="1/h", K="L/mol", L="1/h"), "L", "L/mol"),
        ("k*A*exp(-E/(R*T))", symbols(k="1/h", E="K"), "E", "kg m^3^0.666667/(mol s^2)"),
    ],
)  # fmt: skip
def test_the_constant_to_blame_and_its_unit(law, known, name, proposal):
    found = remedy(parse(law), known, name, RATE)
    assert found is not None
    if name != "E":
        assert compose(found, LIKE) == proposal
    else:
        assert found == pytest.approx(parse_unit("J/mol").dims)


def test_a_constant_that_is_not_to_blame_is_not_blamed():
    assert remedy(parse("k*A/(1 + K*A)^2"), symbols(k="1/h", K="mol/L"), "k", RATE) is None
