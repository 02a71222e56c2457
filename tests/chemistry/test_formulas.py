"""Formulas, atom balances and mass balances."""

import pytest
from chemistry_records import Tables, feed
from hypothesis import given, settings
from hypothesis import strategies as st

from moletally.chemistry.errors import InputError
from moletally.chemistry.formulas import atoms, check_formulas


@pytest.mark.parametrize(
    ("formula", "expected"),
    [
        ("C2H6O", {"C": 2, "H": 6, "O": 1}),
        ("CH3CH2OH", {"C": 2, "H": 6, "O": 1}),
        ("Co", {"Co": 1}),
        ("CO", {"C": 1, "O": 1}),
        ("Ca(OH)2", {"Ca": 1, "O": 2, "H": 2}),
        ("Fe4[Fe(CN)6]3", {"Fe": 7, "C": 18, "N": 18}),
        ("CuSO4.5H2O", {"Cu": 1, "S": 1, "O": 9, "H": 10}),
        ("CuSO4·5H2O", {"Cu": 1, "S": 1, "O": 9, "H": 10}),
        ("SO4^2-", {"S": 1, "O": 4, "charge": -2}),
        ("NH4+", {"N": 1, "H": 4, "charge": 1}),
        ("D2O", {"D": 2, "O": 1}),
    ],
)
def test_atoms_of_a_formula(formula, expected):
    assert dict(atoms(formula)) == expected


@pytest.mark.parametrize("formula", ["", "c2", "C2H6O)", "(CH3", "2", "C-H", "Xx2", "h2o", "C" * 300, "()2"])
def test_texts_that_are_no_formula(formula):
    with pytest.raises(InputError, match="formula"):
        atoms(formula)


def check(equation, formulas=None, masses=None):
    columns = {
        name: ({"formula": formulas[name]} if formulas else {})
        | ({"molar_mass": (masses[name], "g/mol")} if masses else {})
        for name in (formulas or masses)
    }
    table = feed(dict.fromkeys(columns, 1.0), columns=columns)
    network = Tables().reaction(equation, "k", k=(1, "mol/(L h)")).network(" ".join(columns))
    return check_formulas(network, table)


BURN = {"M": "CH4", "O": "O2", "D": "CO2", "W": "H2O"}


def test_atoms_that_do_not_balance_are_named():
    with pytest.raises(InputError, match=r"H: 4 -> 2, O: 2 -> 3") as caught:
        check("M + O -> D + W", BURN)
    assert str(caught.value.place) == "Reactions row 2"
    assert check("M + 2 O -> D + 2 W", BURN) == []


def test_a_third_may_be_written_with_three_digits():
    formulas = {"M": "O2", "O": "O3"}
    assert check("M -> 0.667 O", formulas) == []
    with pytest.raises(InputError, match=r"O: 2 -> 1\.98"):
        check("M -> 0.66 O", formulas)


def test_charge_is_balanced_too():
    with pytest.raises(InputError, match=r"charge: 1 -> 0"):
        check("A -> B", {"A": "Na+", "B": "Na"})


def test_species_without_formula_are_not_checked():
    assert check("M + O -> D + W", {**BURN, "W": None}) == []


def test_masses_are_a_doubt_not_an_error():
    assert check("A + B -> C", masses={"A": 30.0, "B": 20.0, "C": 50.1}) == []
    (doubt,) = check("A + B -> C", masses={"A": 30.0, "B": 20.0, "C": 30.0})
    assert "50 -> 30 g" in doubt.text


@settings(max_examples=200, deadline=500)
@given(st.text(alphabet="CHONaClFe()[]0123456789.·^+-", max_size=25) | st.text(max_size=8))
def test_any_text_is_a_formula_or_refused(text):
    try:
        counts = dict(atoms(text))
    except InputError:
        return
    assert all(count > 0 for name, count in counts.items() if name != "charge")
