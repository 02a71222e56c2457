"""From tables to a network: default laws, parameters in SI, what is refused and in which words."""

import math
import re

import numpy as np
import pytest
from chemistry_records import Tables
from hypothesis import given, settings
from hypothesis import strategies as st

from moletally.chemistry.errors import InputError
from moletally.kernel.evaluate import evaluate

R = 8.31446261815324  # J/(mol K), exact


def rate(tables, c, T=300.0, species="A B C D", **options):
    """Rates in SI at concentrations in SI."""
    network = tables.network(species, **options)
    vector, _ = network.values(tuple(tables.numbers))
    c = np.array([c + [0.0] * (len(species.split()) - len(c))])
    return evaluate(network.model.program, c, np.array([T]), vector[None, :])[0]


# -- default laws ---------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("equation", "given", "law"),
    [
        ("A + 2 B -> C", {"k": (1, "L^2/(mol^2 h)")}, "k*A*B^2"),
        ("A + 0.5 B -> C", {"k": (1, "L^0.5/(mol^0.5 h)")}, "k*A*B^0.5"),
        ("0 -> B", {"k": (1, "mol/(L h)")}, "k"),
        ("A <-> B", {"k": (1, "1/h"), "Keq": (2, "-")}, "k*(A - B/Keq)"),
        ("A <-> B + C", {"k": (1, "1/h"), "Keq": (2, "mol/L")}, "k*(A - B*C/Keq)"),
        ("0 <-> B", {"k": (1, "mol/(L h)"), "Keq": (2, "mol/L")}, "k*(1 - B/Keq)"),
        ("A + B -> A + C", {"k": (1, "L/(mol h)")}, "k*A*B"),
        ("A -> B", {"k": (1, "mol/(L h bar)")}, "k*p(A)"),
        ("A <-> 2 B", {"k": (1, "mol/(L h bar)"), "Keq": (1, "bar")}, "k*(p(A) - p(B)^2/Keq)"),
        ("A -> B", {"k": (1, "mol/(kg_cat h bar)")}, "k*p(A)"),
    ],
)
def test_a_blank_rate_is_mass_action(equation, given, law):
    network = Tables().reaction(equation, **given).network()
    assert network.reactions[0].law.text == law
    assert any(law in finding.text for finding in network.findings)


def test_names_that_need_brackets_get_them():
    network = Tables().reaction("[2-pentene] + T -> C", k=(1, "L/(mol h)")).network("2-pentene T C")
    assert network.reactions[0].law.text == "k*[2-pentene]*[T]"


def test_stoichiometry_is_net():
    network = Tables().reaction("A + B -> 2 B + 0.5 C", k=(1, "L/(mol h)")).network("A B C")
    assert network.model.stoichiometry.tolist() == [[-1.0, 1.0, 0.5]]


# -- numbers --------------------------------------------------------------------------------------


def test_numbers_are_si_and_labelled_as_in_a_table_of_cases():
    tables = Tables().reaction("A -> B", k=(6, "1/min"))
    tables.reaction("A + B -> C", "k*A*B/(1 + K_B*B)", k=(3.6, "L/(mol h)"), K_B=(2, "L/mol"))
    assert tables.values() == pytest.approx({"k(1)": 0.1, "k(2)": 1e-6, "K_B(2)": 2e-3}, rel=1e-14)
    assert tables.network().time_units == ("h", "min")


def test_a_row_wins_over_the_shared_table():
    tables = Tables().reaction("A -> B", "kk*A", kk=(1, "1/s")).reaction("B -> C", "kk*B")
    tables.constant("kk", (2, "1/s"))
    assert rate(tables, [10.0, 100.0]).tolist() == [10.0, 200.0]


def test_without_units_numbers_go_through_untouched():
    tables = Tables().reaction("A -> B", k=(6, None))
    assert tables.values(with_units=False) == {"k(1)": 6.0}


@pytest.mark.parametrize(
    ("t_ref", "T", "ratio"),
    [
        # E = 50 kJ/mol; ratios by hand from k exp(-E/R (1/T - 1/Tref)), 12 digits, exact R
        ((300, "K"), 310.0, 1.90908785421),
        ((27, "degC"), 310.15, 1.90787458133),
        ((80.6, "degF"), 310.15, 1.90787458133),
    ],
)
def test_rate_constants_follow_arrhenius_from_a_reference(t_ref, T, ratio):
    tables = Tables().reaction("A -> B", k=(1, "1/s"), E=(50, "kJ/mol"), T_ref=t_ref)
    assert rate(tables, [1.0], T)[0] == pytest.approx(ratio, rel=1e-10)


@pytest.mark.parametrize(
    "energy", [(50, "kJ/mol"), (50000 / R, "K"), (50 / 4.184, "kcal/mol"), (50e3 / 2.326, "BTU/lbmol")]
)
def test_energies_in_any_unit_and_as_e_over_r(energy):
    """kcal thermochemical and BTU/lbmol = 2.326 J/mol by NIST SP 811."""
    tables = Tables().reaction("A -> B", k0=(1e9, "1/s"), E=energy)
    assert rate(tables, [1.0], 320.0)[0] == pytest.approx(1e9 * math.exp(-50e3 / (R * 320.0)), rel=1e-13)


def test_two_points_of_a_rate_constant():
    """k(300 K) = 0.01 and k(320 K) = 0.05 1/s: E/R = ln 5/(1/300 - 1/320), so k(310 K) = 0.0229487329359."""
    e = math.log(5.0) / (1 / 300 - 1 / 320)
    tables = Tables().reaction("A -> B", k=(0.01, "1/s"), E=(e, "K"), T_ref=(300, "K"))
    assert rate(tables, [1.0], 310.0)[0] == pytest.approx(0.0229487329359, rel=1e-11)


def test_equilibrium_and_adsorption_follow_van_t_hoff():
    tables = Tables().reaction(
        "A <-> B", k=(1, "1/s"), Keq=(4, "-"), dH=(-30, "kJ/mol"), Keq_T_ref=(300, "K")
    )
    keq = 4 * math.exp(30e3 / R * (1 / 340 - 1 / 300))
    assert rate(tables, [1.0, 0.5], 340.0)[0] == pytest.approx(1 - 0.5 / keq, rel=1e-13)
    tables = Tables().reaction("A -> B", "k*A/(1 + K*A)", k=(1, "1/s"))
    tables.constant("K", (2e3, "L/mol"), (-40, "kJ/mol"), (25, "degC"))
    big = 2 * math.exp(40e3 / R * (1 / 340 - 1 / 298.15))
    assert rate(tables, [1.0], 340.0)[0] == pytest.approx(1 / (1 + big), rel=1e-13)


def test_temperature_and_gas_constant_in_a_law():
    tables = Tables().reaction("A -> B", "k*A*(T/Tr)^n*exp(-Ea/(R*T))", k=(1, "1/s"), Tr=(300, "K"), n=(0.5, "-"),
                               Ea=(10, "kJ/mol"))  # fmt: skip
    expected = math.sqrt(330 / 300) * math.exp(-10e3 / (R * 330))
    assert rate(tables, [1.0], 330.0)[0] == pytest.approx(expected, rel=1e-14)
    assert tables.network().needs_temperature


def test_functions_of_a_law():
    law = "k*max(A - B, 0)*min(A, B, C)/abs(B - A) + k*sqrt(A^2)*10^(-1)*log10(A/B)*ln(exp(x(A)))"
    tables = Tables().reaction("A -> B", law, k=(1, "1/s"))
    a, b, c = 9.0, 4.0, 7.0
    expected = (a - b) * b / (a - b) + a * 0.1 * math.log10(a / b) * a / (a + b + c)
    assert rate(tables, [a, b, c], species="A B C")[0] == pytest.approx(expected, rel=1e-14)


# -- units of laws --------------------------------------------------------------------------------

ORDERS = st.sampled_from([0.0, 0.5, 1.0, 1.5, 2.0, 2.5, 3.0, -1.0])
VOLUMES, AMOUNTS, TIMES = (
    {"L": 1e-3, "m3": 1.0, "ft3": 0.3048**3},
    {"mol": 1.0, "kmol": 1e3, "lbmol": 453.59237},
    {"s": 1.0, "min": 60.0, "h": 3600.0},
)


@settings(max_examples=150, deadline=None)
@given(
    ORDERS,
    ORDERS,
    ORDERS,
    st.sampled_from(sorted(VOLUMES)),
    st.sampled_from(sorted(AMOUNTS)),
    st.sampled_from(sorted(TIMES)),
    st.booleans(),
)
def test_the_order_of_a_law_and_the_unit_of_its_k_must_agree(
    a, b, implied, volume, amount, time, as_constant
):
    """k in (volume/amount)^(n-1)/time passes exactly when n is the order, and converts by its definition."""
    unit = f"({volume}/{amount})^{implied - 1:g}/{time}"
    extra = {"n": (a, "-")} if as_constant else {}
    law = f"k*A^{'n' if as_constant else f'({a:g})'}*B^({b:g})"
    tables = Tables().reaction("A + B -> C", law, k=(1, unit), **extra)
    if a + b == implied:
        si = (VOLUMES[volume] / AMOUNTS[amount]) ** (implied - 1) / TIMES[time]
        assert tables.values()["k(1)"] == pytest.approx(si, rel=1e-12)
    else:
        with pytest.raises(InputError, match="k has the unit"):
            tables.network()


@pytest.mark.parametrize(
    ("law", "given", "words"),
    [
        ("k*A*B", {"k": (1, "1/h")}, r"k has the unit 1/h \(order 1\), but the law is of order 2 .* give k in L/\(mol h\)"),
        ("k*A", {"k": (1, "L/(mol min)")}, r"order 2.*order 1.*1/min"),
        ("k*A", {"k": (1, None)}, r"k has no unit.*order 1"),
        ("k*A/(1 + K*A)^2", {"k": (1, "1/h"), "K": (1, "mol/L")}, r"K has the unit mol/L .* give K in L/mol"),
        ("k*A/(1 + K*A)^2", {"k": (1, "L/(mol h)"), "K": (1, "L/mol")}, r"k has the unit L/\(mol h\)"),
        ("k*A/(Km + A)", {"k": (1, "mol/(L h)"), "Km": (1, "1/h")}, r"Km has the unit 1/h .* give Km in mol/L"),
        ("k*A*exp(-Ea/T)", {"k": (1, "1/h"), "Ea": (1, "kJ/mol")}, r"Ea has the unit kJ/mol .* give Ea in K"),
        ("k*A^n", {"k": (1, "1/h"), "n": (2, None)}, "order 1.*order 2"),
        ("k*A/(0.8 + A)", {"k": (1, "mol/(L h)")}, "A number in a law has no unit"),
        ("k*A^A", {"k": (1, "1/h")}, "exponent"),
        ("k*exp(A)", {"k": (1, "mol/(L h)")}, r"exp\(\) is taken of a quantity with a unit"),
        ("k*p(A)", {"k": (1, "1/h")}, r"give k in mol/\(L h bar\)"),
    ],
)  # fmt: skip
def test_a_constant_in_the_wrong_unit_is_named_and_the_right_one_proposed(law, given, words):
    with pytest.raises(InputError, match=words):
        Tables().reaction("A + B -> C", law, **given).network()


def test_keq_has_the_unit_of_its_change_in_moles():
    for unit, fits in (("mol/L", True), ("L/mol", False), ("-", False), ("1/h", False)):
        tables = Tables().reaction("A <-> B + C", k=(1, "1/h"), Keq=(1, unit))
        if fits:
            assert tables.values()["Keq(1)"] == 1000.0
        else:
            with pytest.raises(InputError, match=r"Keq has .* give Keq in mol/L"):
                tables.network()


def test_an_order_is_held_by_the_units_that_were_checked_with_it():
    network = Tables().reaction("A -> B", "k*A^n", k=(1, "L/(mol h)"), n=(2, "-")).network()
    (order,) = (p for p in network.parameters.items if p.name == "n")
    assert order.wrong(2.0) == ""
    assert "is an order" in order.wrong(1.0)
    free = Tables().reaction("A -> B", "k*A*(A/C)^n", k=(1, "1/h"), n=(2, "-")).network()
    assert all(p.wrong(1.0) == "" for p in free.parameters.items)


@pytest.mark.parametrize(("unit", "per_mass"), [("1/s", False), ("m3/(kg s)", True), ("L/(kg_cat h)", True)])
def test_the_unit_of_k_decides_what_a_rate_is_per(unit, per_mass):
    assert Tables().reaction("A -> B", k=(1, unit)).network().per_mass is per_mass


def test_rates_per_volume_and_per_mass_do_not_mix():
    with pytest.raises(InputError, match=r"B -> C is per mass of catalyst, that of A -> B per volume"):
        Tables().reaction("A -> B", k=(1, "1/s")).reaction("B -> C", k=(1, "L/(kg s)")).network()


# -- what is refused ------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("equation", "rate", "given", "words"),
    [
        ("A -> B", "", {}, "k of reaction 1 is missing"),
        ("A -> B", "", {"k": (1, "1/h"), "k0": (1, "1/h")}, "both k and k0"),
        ("A <-> B", "", {"k": (1, "1/h")}, "give Keq, or type its Rate"),
        ("A -> Z", "", {"k": (1, "1/h")}, "species 'Z' has no row in the feed"),
        ("A -> С", "", {"k": (1, "1/h")}, "cyrillic capital letter es, there it is latin capital letter c"),
        ("A -> B", "k*b", {"k": (1, "1/h")}, "unknown name 'b'.*'B'"),
        ("A -> B", "k*B₂", {"k": (1, "1/h")}, "unknown name 'B₂'"),
        ("A -> B", "k*A", {"k": (1, "1/h"), "K_A": (1, "L/mol")}, "constant 'K_A' stands in no law"),
        ("A -> B", "k*A/(1 + K_A*A)", {"k": (1, "1/h"), "KA": (1, "L/mol")}, "unknown name 'K_A'.*'KA'"),
        ("A -> B", "k*A", {"k": (1, "1/h"), "B": (1, "1/h")}, "both a species and a constant"),
        ("A -> B", "k*A", {"k": (1, "1/h"), "T": (1, "K")}, "T stands for the temperature"),
        ("A -> B", "k*A", {"k": (1, "1/h"), "E": (50, "kJ/mol")}, "E needs T ref"),
        ("A -> B", "k*A", {"k": (1, "1/h"), "E": (50, None), "T_ref": (300, "K")}, "has no unit: it always needs one"),
        ("A -> B", "k*A", {"k": (1, "1/h"), "E": (50, "kJ/mol"), "T_ref": (25, None)}, "no unit: it always needs one, such as degC or K"),
        ("A -> B", "k*A", {"k": (1, "1/h"), "E": (50, "degC"), "T_ref": (300, "K")}, "E.1. can't be in degC"),
        ("A -> B", "k*A", {"k": (1, "1/h"), "E": (50, "kJ"), "T_ref": (300, "K")}, "can't be in kJ"),
        ("A -> B", "k*exp(-E/(R*T))*A", {"k": (1, "1/h"), "E": (50, "kJ/mol"), "T_ref": (300, "K")}, "column E acts through k"),
        ("A -> B", "k*A", {"k0": (1, "1/h")}, "pre-exponential: it needs E"),
        ("A <-> B", "", {"k": (1, "1/h"), "Keq": (1, "-"), "dH": (9, "kJ/mol")}, "dH needs Keq T ref"),
        ("A -> B", "k*A", {"k": (1, "1/h"), "dH": (9, "kJ")}, "dH can't be in kJ"),
        ("A -> B", "kk*A", {"k": (1, "1/h"), "kk": (1, "1/h")}, "'k' stands in no law"),
        ("A -> B", "k*A", {"k": (1, "1/fortnite")}, "no unit that is known"),
    ],
)  # fmt: skip
def test_what_is_refused_and_why(equation, rate, given, words):
    with pytest.raises(InputError, match=words) as caught:
        Tables().reaction(equation, rate, **given).network()
    assert caught.value.place is not None
    assert caught.value.place.table == "Reactions"


@pytest.mark.parametrize(
    ("given", "words"),
    [
        ({"k": (-1, "1/h"), "Keq": (1, "-")}, "rate constant is not negative"),
        ({"k": (1e308, "1/ms"), "Keq": (1, "-")}, "too large or too small to compute with"),
        ({"k": (1e-323, "1/h"), "Keq": (1, "-")}, "too large or too small to compute with"),
        ({"k": (1, "1/h"), "Keq": (0, "-")}, "equilibrium constant is more than 0"),
        ({"k": (1, "1/h"), "Keq": (-2, "-")}, "equilibrium constant is more than 0"),
        (
            {"k": (1, "1/h"), "Keq": (1, "-"), "E": (9, "kJ/mol"), "T_ref": (-300, "degC")},
            "below absolute zero",
        ),
    ],
)
def test_numbers_that_can_not_be(given, words):
    with pytest.raises(InputError, match=words):
        Tables().reaction("A <-> B", **given).values()


def test_species_called_t_and_r_take_brackets():
    with pytest.raises(InputError, match=r"write \[T\]"):
        Tables().reaction("T -> R", "k*T", k=(1, "1/h")).network("T R")
    network = Tables().reaction("T -> R", "k*[T]", k=(1, "1/h")).network("T R")
    assert network.needs_temperature is None


def test_a_species_called_k_needs_a_typed_rate():
    with pytest.raises(InputError, match="Rate has to be typed"):
        Tables().reaction("A -> B").network("A B k")


def test_r_needs_units_throughout():
    tables = Tables().reaction("A -> B", "k*exp(-Ea/(R*T))*A", k=(1, None), Ea=(5e4, None))
    with pytest.raises(InputError, match=r"R is 8\.314"):
        tables.network(with_units=False)


def test_mole_fractions_need_moles():
    tables = Tables().reaction("A -> B", "k*x(A)", k=(1, "kg/(m3 h)"))
    with pytest.raises(InputError, match="count moles"):
        tables.network(mass_basis=True, feed_units=("g/L",))


def test_a_shared_constant_without_a_law_or_an_energy():
    with pytest.raises(InputError, match="'Kx' stands in no Rate"):
        Tables().reaction("A -> B", k=(1, "1/h")).constant("Kx", (1, "L/mol")).network()
    with pytest.raises(InputError, match="kk is a pre-exponential"):
        Tables().reaction("A -> B", "kk*A").constant("kk", (1, "1/h"), pre_exponential=True).network()


# -- remarks --------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("tables", "words"),
    [
        (Tables().reaction("2 A -> B", k=(1, "L/(mol h)")), "A disappears at 2·r"),
        (Tables().reaction("A -> 3 B", k=(1, "1/h")), "B forms at 3·r"),
        (Tables().reaction("A -> A", k=(1, "1/h")), "changes nothing"),
        (Tables().reaction("A + B -> B + A", k=(1, "L/(mol h)")), "changes nothing"),
        (Tables().reaction("A -> B", k=(1, "1/h")).reaction("A -> B", k=(2, "1/h")), "the rates add"),
        (Tables().reaction("A -> B", k=(0, "1/h")), "switched off"),
        (Tables().reaction("A -> B", k=(1, "1/h"), E=(50, "J/mol"), T_ref=(300, "K")), "E/R is 6.014 K, outside 500 to 60000 K"),
        (Tables().reaction("A -> B", k=(1, "1/h"), E=(5e5, "kcal/mol"), T_ref=(300, "K")), "is the unit of E right"),
        (Tables().reaction("A -> B", k=(1, "1/h"), E=(50, "kJ/mol"), T_ref=(25, "K")), "T ref.* 25 K: is its unit right"),
    ],
)  # fmt: skip
def test_what_the_audit_remarks(tables, words):
    assert any(re.search(words, text) for text in tables.remarks()), tables.remarks()


def test_no_energy_is_no_slip():
    tables = Tables().reaction("A -> B", "k*A", k=(1, "1/h"), E=(0, "kJ/mol"), T_ref=(300, "K"))
    assert tables.remarks() == []


def test_only_exponents_make_networks_of_their_own():
    def network(keq, n):
        tables = Tables().reaction("A -> B", "k*A^n - k*A^n*B/(Keq*A)", k=(1, "L/(mol h)"), n=(n, "-"))
        return tables.constant("Keq", (keq, "-")).network()

    assert network(2.0, 2.0) is network(3.0, 2.0)
    with pytest.raises(InputError, match="order"):
        network(2.0, 1.0)


PIECES = st.sampled_from(
    [
        "k",
        "A",
        "B",
        "n",
        "K",
        "T",
        "R",
        "(",
        ")",
        "+",
        "-",
        "*",
        "/",
        "^",
        "0",
        "1",
        "0.5",
        "2",
        "exp(",
        "ln(",
        "sqrt(",
        "max(",
        "min(",
        ",",
        "p(A)",
        "x(B)",
        "[T]",
        "Keq",
        "E",
    ]
)
UNITS = st.sampled_from(
    ["1/h", "L/(mol h)", "L/mol", "-", None, "K", "kJ/mol", "degC", "bar", "mol/L", "x", "m^0.5"]
)


@settings(max_examples=400, deadline=1000)
@given(
    st.lists(PIECES, max_size=14),
    UNITS,
    UNITS,
    UNITS,
    st.floats(allow_nan=False, allow_infinity=False),
    st.booleans(),
)
def test_any_law_and_unit_gives_a_network_or_one_of_our_errors(pieces, k, n, shared, number, with_units):
    tables = Tables().reaction("A + B -> C", " ".join(pieces), k=(number, k), n=(number, n))
    tables.constant("K", (number, shared))
    try:
        network = tables.network(with_units=with_units)
        vector, _ = network.values(tuple(tables.numbers))
    except InputError as error:
        assert error.reason
        return
    assert len(vector) == len(network.parameters.items)
    rates = evaluate(network.model.program, np.ones((1, 4)), np.array([300.0]), vector[None, :])
    assert rates.shape == (1, 1)
