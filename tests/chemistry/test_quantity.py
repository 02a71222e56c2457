"""Units in the trade's writing. Factors: NIST SP 811 (2008), exact unless a comment says otherwise."""

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from moletally.chemistry.errors import InputError, Place
from moletally.chemistry.quantity import ONE, compose, parse_unit, to_si
from moletally.chemistry.tables import Quantity

R = 8.31446261815324  # J/(mol K), exact


@pytest.mark.parametrize(
    ("text", "factor"),
    [
        ("ft3/lbmol", 6.24279605761446e-5), ("lbmol/ft3", 16018.463374), ("lbmol/(ft3 h)", 4.44957315943),
        ("gal", 3.785411784e-3), ("ft3", 28.316846592e-3), ("bbl", 0.158987294928), ("psi", 6894.75729317),
        ("BTU/lbmol", 2.326), ("BTU/(h ft2 degR)", 5.67826334111), ("BTU/(lb degR)", 4186.8), ("kcal", 4184.0),
        ("cP", 0.001), ("lb/(ft2 h)", 0.001356229899), ("atm", 101325.0), ("bar", 1e5), ("kPa", 1e3),
        ("L/mol", 1e-3), ("m3/kmol", 1e-3), ("(L/mol)^0.5/min", 1e-3**0.5 / 60), ("gpm", 6.30901964e-5),
        ("mol/L", 1e3), ("kmol/m3", 1e3), ("mmol/L", 1.0), ("d", 86400.0), ("kWh", 3.6e6), ("degR", 5 / 9),
    ],
)  # fmt: skip
def test_factors(text, factor):
    assert parse_unit(text).factor == pytest.approx(factor, rel=1e-11)


@pytest.mark.parametrize(
    ("unit", "expected"),
    [
        ("L atm/(mol K)", 0.082057366081), ("L bar/(mol K)", 0.0831446261815), ("L kPa/(mol K)", 8.31446261815),
        ("L Torr/(mol K)", 62.3635982215), ("cal/(mol K)", 1.98720425864), ("cal_IT/(mol K)", 1.98587527901),
        ("BTU/(lbmol degR)", 1.98587527901), ("ft3 atm/(lbmol degR)", 0.730240507295),
        ("ft3 psi/(lbmol degR)", 10.731577089), ("ft lbf/(lbmol degR)", 1545.34710082),
    ],
)  # fmt: skip
def test_the_gas_constant_in_units_of_the_trade(unit, expected):
    """CODATA 2018 product k_B N_A with the factors of NIST SP 811."""
    assert R / parse_unit(unit).factor == pytest.approx(expected, rel=1e-11)


@pytest.mark.parametrize(
    ("text", "value", "si"),
    [("degC", 25.0, 298.15), ("°C", 0.0, 273.15), ("degF", 100.0, 310.927777778), ("K", 300.0, 300.0),
     ("barg", 3.0, 401325.0), ("psia", 14.695948775513, 101325.0), ("psig", 0.0, 101325.0)],
)  # fmt: skip
def test_shifted_zeros(text, value, si):
    unit = parse_unit(text)
    assert unit.to_si(value) == pytest.approx(si, rel=1e-11)
    assert unit.from_si(unit.to_si(value)) == pytest.approx(value, abs=1e-9)


@pytest.mark.parametrize(
    "texts",
    [("L/(mol min)", "L/mol/min", "L mol^-1 min^-1", "L·mol⁻¹·min⁻¹", "L/(mol*min)", "L mol-1 min-1"),
     ("1/h", "h-1", "h^-1", "1/hr", "h⁻¹"), ("m3", "m^3", "m³"), ("-", "1", ""), ("mol/(kg_cat s)", "mol/(kg s)")],
)  # fmt: skip
def test_writings_of_one_unit(texts):
    units = [parse_unit(t) for t in texts]
    assert all(
        u.factor == pytest.approx(units[0].factor, rel=1e-15) and u.dims == units[0].dims for u in units
    )


@pytest.mark.parametrize(
    ("text", "words"),
    [("C", "degC"), ("F", "degF"), ("R", "degR"), ("L/mol h", "two ways"), ("mol/L*h", "two ways"), ("M", "mol/L"),
     ("Nm3", "reference state"), ("Nm3/h", "reference state"), ("scf", "reference state"), ("foo", "no unit"),
     ("degC/min", "shifted zero"), ("mol/(L", "closing"), ("5 mol", "missing"), ("[x", "can't be read"), ("%", "fraction"),
     ("x" * 500, "longer")],
)  # fmt: skip
def test_what_is_refused_and_why(text, words):
    with pytest.raises(InputError, match=words):
        parse_unit(text)


def test_a_general_unit_comes_from_the_general_library():
    assert parse_unit("furlong/fortnight").factor == pytest.approx(201.168 / 1209600, rel=1e-5)


def test_time_units_are_remembered_as_written():
    assert parse_unit("L/(mol min)").time_units == ("min",)
    assert parse_unit("mol/L").time_units == ()


@pytest.mark.parametrize(
    ("dims", "like", "text"),
    [((-1, 3, -1, 0, 0), ("mol/L", "1/h"), "L/(mol h)"), ((-0.5, 1.5, -1, 0, 0), ("mol/L", "1/min"), "L^0.5/(mol^0.5 min)"),
     ((1, -3, -1, 0, 0), ("lbmol/ft3", "1/h"), "lbmol/(ft^3 h)"), ((0, 0, -1, 0, 0), ("mol/L", "1/h"), "1/h")],
)  # fmt: skip
def test_proposals_speak_the_users_units(dims, like, text):
    proposed = compose(dims, [parse_unit(u) for u in like])
    assert proposed == text
    assert parse_unit(proposed).dims == pytest.approx(dims)


def test_a_quantity_of_another_kind_is_refused():
    with pytest.raises(InputError, match="Volume can't be in min: it takes a unit such as L"):
        to_si(Quantity(1.0, "min", Place("Reactor")), (0, 3, 0, 0, 0), True, "Volume")
    with pytest.raises(InputError, match="Volume has no unit"):
        to_si(Quantity(1.0, None, Place("Reactor")), (0, 3, 0, 0, 0), True, "Volume")
    assert to_si(Quantity(2.0, None, Place("Reactor")), ONE, True, "n") == 2.0


@settings(max_examples=300, deadline=1000)
@given(st.text(alphabet="molLhsdegCkK/()^*· -+.0123456789½²⁻[]%µ", max_size=20) | st.text(max_size=10))
def test_any_text_is_a_unit_or_refused(text):
    try:
        unit = parse_unit(text)
    except InputError:
        return
    assert unit.factor > 0
