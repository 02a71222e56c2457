"""Inputs that real sheets hold: each ends in an answer or in an error that says what to mend.

The list is common practice of careful spreadsheet work; H numbers follow the project's own list of cases.
"""

import datetime as dt

import pytest

from moletally.sheet.cells import OMITTED, ExcelError
from moletally.sheet.functions import DEFECT, call

LIST = (
    ("Reaction", "Rate", "k", "k unit"),
    ("A + B -> C", "k*A*B", 0.5, "L/(mol h)"),
    ("C -> D", "k*C", 0.1, "1/h"),
)
FEED = (("Species", "Feed [mol/L]"), ("A", 2.0), ("B", 3.0), ("C", 0.0), ("D", 0.0))


def swap(block, row, column, cell):
    return tuple(
        tuple(cell if (i, j) == (row, column) else c for j, c in enumerate(line))
        for i, line in enumerate(block)
    )


def tank(reactions=LIST, fed=FEED, reactor=2.0, want=OMITTED, constants=OMITTED):
    return call("MOLE_CSTR", [reactions, fed, reactor, want, constants])


def refused(outcome, *words, code="#VALUE!"):
    """The whole call is one error whose reason holds all the words."""
    assert len(outcome.problems) == sum(isinstance(c, ExcelError) for row in outcome.block for c in row) >= 1
    problem = outcome.problems[0]
    assert problem.code == code
    assert DEFECT not in problem.reason
    for word in words:
        assert word in problem.reason, problem.reason


def audit(*arguments):
    return [row[2] for row in call("MOLE_AUDIT", ["CSTR", *arguments]).block]


def test_h01_nothing_fed():
    zero = (FEED[0], *((name, 0.0) for name, _ in FEED[1:]))
    assert [row[0] for row in tank(fed=zero).block] == [0.0] * 4
    refused(tank(fed=zero, want="conversion(A)"), "A is not fed", code="#N/A")
    refused(tank(fed=zero, want="selectivity(C, D)"), "no D is formed", code="#N/A")
    refused(tank(fed=zero, want="A/B"), "division by zero", code="#N/A")


def test_h02_a_blank_rate_constant_is_not_zero():
    refused(tank(swap(LIST, 2, 2, None)), "row 3", "k of reaction 2 is missing")
    assert tank(swap(LIST, 2, 2, 0.0)).block[3][0] == 0.0
    assert any("k(2) is 0" in text for text in audit(swap(LIST, 2, 2, 0.0), FEED, 2.0))


def test_h03_a_negative_rate_constant():
    refused(tank(swap(LIST, 1, 2, -0.5)), "row 2", "not negative", "other way round")


def test_h03_a_negative_order_is_legal():
    outcome = tank((LIST[0], ("A -> C", "k*A^(-1)", 0.05, "mol^2/(L^2 h)")), FEED[:2] + FEED[3:4])
    assert not outcome.problems


def test_h04_atoms_that_do_not_balance():
    fed = (
        ("Species", "Feed [mol/L]", "Formula"),
        ("Me", 1.0, "CH4"),
        ("Ox", 1.0, "O2"),
        ("Dox", 0.0, "CO2"),
        ("W", 0.0, "H2O"),
    )
    burn = (("Reaction", "Rate", "k [L/(mol h)]"), ("Me + Ox -> Dox + W", "k*Me*Ox", 1.0))
    refused(tank(burn, fed), "H: 4 -> 2", "O: 2 -> 3")
    right = swap(burn, 1, 0, "Me + 2 Ox -> Dox + 2 W")
    assert not tank(right, fed).problems


def test_h04_masses_that_do_not_balance_are_a_doubt():
    fed = (
        ("Species", "Feed [mol/L]", "MW [g/mol]"),
        ("A", 2.0, 50.0),
        ("B", 3.0, 40.0),
        ("C", 0.0, 80.0),
        ("D", 0.0, 80.0),
    )
    assert any("masses do not balance" in text for text in audit(LIST, fed, 2.0))


def test_h05_a_unit_of_k_that_is_not_of_the_law():
    refused(tank(swap(LIST, 1, 3, "1/h")), "k has the unit 1/h", "order 1", "order 2", "give k in L/(mol h)")
    refused(tank(swap(LIST, 2, 3, "L/(mol h)")), "order 2", "order 1", "give k in 1/h")
    refused(tank(swap(LIST, 1, 3, None)), "no unit", "L/(mol h)")


def test_h05_a_fractional_order():
    half = (LIST[0], ("A + B -> C", "k*A*B^0.5", 0.5, "L/(mol h)"), LIST[2])
    refused(tank(half), "order 1.5", "L^0.5/(mol^0.5 h)")
    assert not tank(swap(half, 1, 3, "(L/mol)^0.5/h")).problems


def test_h05_a_constant_in_a_denominator():
    law = (("Reaction", "Rate", "k [1/h]", "K_A [mol/L]"), ("A -> C", "k*A/(1 + K_A*A)^2", 1.0, 0.2))
    refused(tank(law), "K_A has the unit mol/L", "give K_A in L/mol")


@pytest.mark.parametrize(
    "name, words",
    [("Bb", "Did you mean 'B'"), ("b", "Did you mean 'B'"), ("С", "only look like others"), ("B₂", "B₂")],
)
def test_h06_a_species_that_is_not_there(name, words):
    refused(tank(swap(LIST, 1, 1, f"k*A*{name}")), "row 2, Rate", words)
    refused(tank(swap(LIST, 1, 0, f"A + {name} -> C")), "row 2, Reaction", words)


def test_h06_blanks_around_a_name_do_not_count():
    assert tank(fed=swap(FEED, 2, 0, " B ")).block == tank().block


@pytest.mark.parametrize(
    "reactor",
    [-1.0, (("Volume", -1.0, "L"), ("Flow", 1.0, "L/h")), (("Volume", 1.0, "L"), ("Flow", 0.0, "L/h"))],
)
def test_h07_negative_sizes(reactor):
    refused(tank(reactor=reactor), "it must be")


def test_h07_no_residence_time_returns_the_feed():
    assert [row[0] for row in tank(reactor=0.0).block] == [2.0, 3.0, 0.0, 0.0]


def test_h08_rows_that_stand_twice():
    refused(tank(fed=(*FEED, ("A", 1.0))), "'A' stands twice")
    assert any("stands twice" in text for text in audit((*LIST, LIST[1]), FEED, 2.0))


def test_h09_a_huge_residence_time():
    decay = (("Reaction", "k"), ("A -> B", 0.1))
    fed = (("Species", "Feed"), ("A", 2.0), ("B", 0.0))
    assert call("MOLE_CSTR", [decay, fed, 1e12, "A"]).block[0][0] == pytest.approx(
        2.0 / (1 + 1e11), rel=1e-10
    )
    assert call("MOLE_PFR", [decay, fed, 1e12, "A"]).block[0][0] == 0.0


def test_h10_h11_exhaustion_is_told():
    fed = (("Species", "Feed [mol/L]"), ("A", 2.0), ("B", 0.0))
    zero = (("Reaction", "Rate", "k"), ("A -> B", "k", 0.1))
    zero = (("Reaction", "Rate", "k [mol/(L min)]"), ("A -> B", "k", 0.1))
    rows = call("MOLE_AUDIT", ["PFR", zero, fed, 25.0]).block
    assert any(row[1] == "A" and "used up at tau = 20 min" in row[2] for row in rows)
    absent = (("Reaction", "Rate", "k [mol/(L min)]"), ("B -> A", "k", 0.1))
    assert [row[0] for row in call("MOLE_CSTR", [absent, fed, 25.0]).block] == [2.0, 0.0]


@pytest.mark.parametrize(
    "cell, words",
    [
        ("1,5", "decimal mark"),
        ("n/a", "is a text"),
        ("–0.1", "minus"),
        (True, "TRUE"),
        (dt.datetime(2026, 3, 1), "date"),
    ],
)
def test_h12_h13_cells_that_are_no_numbers(cell, words):
    refused(tank(fed=swap(FEED, 1, 1, cell)), "Feed row 2, Feed (column 2)", words)


def test_h12_numbers_as_texts_count_where_they_are_plain():
    assert tank(fed=swap(FEED, 1, 1, "2.0 ")).block == tank().block


def test_h13_a_name_that_became_a_date():
    refused(tank(fed=swap(FEED, 1, 0, dt.datetime(2026, 3, 1))), "contains a date")


ARRHENIUS = (
    ("Reaction", "Rate", "k [L/(mol h)]", "E [kJ/mol]", "T ref [degC]"),
    ("A + B -> C", "k*A*B", 0.5, 50.0, 25.0),
)
FED3 = FEED[:4]


def test_h14_temperatures_always_have_a_unit():
    refused(
        tank(ARRHENIUS, FED3, (("Residence time", 2.0, "h"), ("Temperature", 25.0, None))),
        "Temperature",
        "degC",
    )
    header = (("Reaction", "Rate", "k [L/(mol h)]", "E [kJ/mol]", "T ref"), *ARRHENIUS[1:])
    refused(
        tank(header, FED3, (("Residence time", 2.0, "h"), ("Temperature", 25.0, "degC"))), "T ref", "no unit"
    )


def test_h15_energies_of_unlikely_size_and_without_unit():
    hot = (("Residence time", 2.0, "h"), ("Temperature", 26.0, "degC"))
    header = (("Reaction", "Rate", "k [L/(mol h)]", "E [J/mol]", "T ref [degC]"), *ARRHENIUS[1:])
    assert any("outside 500 to 60000 K" in text for text in audit(header, FED3, hot))
    header = (("Reaction", "Rate", "k [L/(mol h)]", "E", "T ref [degC]"), *ARRHENIUS[1:])
    refused(tank(header, FED3, hot), "E(1) has no unit", "kJ/mol")


def test_h17_feeds_below_zero():
    assert any("taken as 0" in text for text in audit(LIST, swap(FEED, 3, 1, -1e-12), 2.0))
    refused(tank(fed=swap(FEED, 3, 1, -0.1)), "negative")


def test_h18_a_blank_row_inside_and_whole_columns():
    refused(tank(fed=(*FEED[:3], (None, None), *FEED[3:])), "row 4", "blank row")
    assert tank(fed=FEED + ((None, None),) * 5000).block == tank().block


def test_h19_errors_pass_through_and_empty_text_is_no_blank():
    refused(tank(fed=swap(FEED, 2, 1, ExcelError("#DIV/0!"))), "Feed row 3", "#DIV/0!", code="#DIV/0!")
    refused(tank(fed=swap(FEED, 2, 1, "")), "Feed row 3", "empty text")
    refused(tank(fed=swap(FEED, 2, 1, None)), "Feed row 3", "blank")


def test_h20_sources_null_reactions_and_catalysts():
    source = (("Reaction", "Rate", "k [mol/(L h)]"), ("0 -> A", "k", 0.5))
    assert call("MOLE_CSTR", [source, (FEED[0], ("A", 0.0)), 2.0]).block[0][0] == pytest.approx(
        1.0, rel=1e-12
    )
    assert any("changes nothing" in text for text in audit((*LIST, ("A -> A", "k*A", 1.0, "1/h")), FEED, 2.0))
    catalysed = (("Reaction", "k [L/(mol h)]"), ("A + D -> C + D", 0.5))
    fed = (FEED[0], ("A", 2.0), ("D", 1.0), ("C", 0.0))
    assert call("MOLE_CSTR", [catalysed, fed, 2.0, "A"]).block[0][0] == pytest.approx(1.0, rel=1e-12)


def test_h21_a_temperature_or_its_reference_is_missing():
    refused(tank(ARRHENIUS, FED3), "needs a temperature")
    refused(
        tank(
            tuple(row[:4] for row in ARRHENIUS),
            FED3,
            (("Residence time", 2.0, "h"), ("Temperature", 25.0, "degC")),
        ),
        "needs T ref",
    )


@pytest.mark.parametrize("keq", [0.0, -1.0])
def test_h22_equilibrium_constants_that_can_not_be(keq):
    both = (("Reaction", "k [1/h]", "Keq"), ("A <-> C", 1.0, keq))
    refused(tank(both, (FEED[0], ("A", 1.0), ("C", 0.0))), "Keq", "more than 0")


def test_h22_an_equilibrium_without_its_constant():
    refused(tank((("Reaction", "k [1/h]"), ("A <-> C", 1.0)), (FEED[0], ("A", 1.0), ("C", 0.0))), "give Keq")


def test_h25_the_state_is_named_with_how_sure_it_is():
    cubic = (("Reaction", "Rate", "k"), ("A + 2 B -> 3 B", "k*A*B^2", 1.0))
    fed = (("Species", "Feed"), ("A", 60 / 11), ("B", 6 / 11))
    assert any("not proven" in text for text in audit(cubic, fed, 1 / 11))
    assert "unique (proven)" in audit(LIST, FEED, 2.0)


def test_h27_extreme_sizes():
    outcome = tank(swap(swap(LIST, 1, 2, 1e-100), 2, 2, 1e100))
    assert outcome.block[2][0] == pytest.approx(6e-200, rel=1e-9)  # k1 A B/k2 with A and B as fed
    beyond = tank(swap(swap(LIST, 1, 2, 1e-300), 2, 2, 1e300))
    assert beyond.block[2][0] == 0.0  # 6e-600 mol/L, as near as a floating-point number comes


def test_h28_a_flow_given_twice():
    fed = (*FEED, ("Flow [L/h]", 10.0))
    refused(
        tank(fed=fed, reactor=(("Volume", 20.0, "L"), ("Flow", 5.0, "L/h"))),
        "Flow is given with the feed too",
        "differs",
    )
    agreed = tank(fed=fed, reactor=(("Volume", 20.0, "L"), ("Flow", 10.0, "L/h")))
    same = tank(fed=fed, reactor=(("Residence time", 2.0, "h"),))
    assert [row[0] for row in agreed.block] == pytest.approx([row[0] for row in same.block], rel=1e-14)
    clash = (("Volume", 20.0, "L"), ("Residence time", 3.0, "h"))
    refused(tank(fed=fed, reactor=clash), "do not agree")


def test_h29_gauge_pressures_are_read_as_such():
    outcome = tank(
        reactor=(("Residence time", 2.0, "h"), ("Pressure", 3.0, "barg")),
        want=(("pressure [bar]", "pressure"),),
    )
    assert outcome.block == ((pytest.approx(4.01325), pytest.approx(3.0)),)


def test_h30_the_same_inputs_give_the_same_bits():
    assert tank().block == tank().block


def test_h31_species_with_the_names_of_temperature_and_gas_constant():
    law = (("Reaction", "Rate", "k [1/h]"), ("[T] -> [R]", "k*[T]", 1.0))
    fed = (FEED[0], ("T", 1.0), ("R", 0.0))
    assert call("MOLE_CSTR", [law, fed, 1.0, "[T]"]).block[0][0] == pytest.approx(0.5, rel=1e-12)
    refused(call("MOLE_CSTR", [swap(law, 1, 1, "k*T"), fed, 1.0]), "write [T]")
    refused(call("MOLE_CSTR", [law, fed, 1.0, "R"]), "write [R]")
    assert not call("MOLE_CSTR", [swap(law, 1, 1, None), fed, 1.0]).problems


def test_h32_many_rows():
    n = 60
    chain = (("Reaction", "k [1/h]"), *((f"s{i} -> s{i + 1}", 1.0 + i) for i in range(n)))
    fed = (FEED[0], *((f"s{i}", float(i == 0)) for i in range(n + 1)))
    column = [row[0] for row in call("MOLE_CSTR", [chain, fed, 1.0]).block]
    assert sum(column) == pytest.approx(1.0, rel=1e-12)
    assert column[0] == pytest.approx(0.5, rel=1e-12)


@pytest.mark.parametrize(
    "label, value, words",
    [("Phase", "gas", "not solved by this version yet"), ("Heat", "adiabatic", "not solved by this version yet"),
     ("Phase", "plasma", "it takes liquid, gas")],
)  # fmt: skip
def test_models_of_later_versions_say_so(label, value, words):
    refused(tank(reactor=(("Residence time", 2.0, "h"), (label, value, None))), words)


def test_a_label_that_is_not_used_is_a_note():
    assert any(
        "UA is not used here" in t
        for t in audit(LIST, FEED, (("Residence time", 2.0, "h"), ("UA", 5.0, "W/K")))
    )


def test_units_everywhere_or_nowhere():
    refused(tank(fed=(("Species", "Feed"), *FEED[1:])), "no unit")
    plain = (("Reaction", "k"), ("A + B -> C", 0.5))
    refused(call("MOLE_CSTR", [plain, FED3, 2.0]), "k has no unit", "give k in")
    refused(
        call("MOLE_CSTR", [plain, (("Species", "Feed"), *FED3[1:]), (("Residence time", 2.0, "h"),)]),
        "no unit",
    )


def test_a_bare_residence_time_takes_the_one_time_unit_of_the_constants():
    mixed = swap(LIST, 2, 3, "1/min")
    refused(tank(mixed), "have several (h, min)", "Residence time | value | unit")
    minutes = tank(reactor=(("Residence time", 120.0, "min"),)).block
    assert [row[0] for row in minutes] == [pytest.approx(row[0], rel=1e-12) for row in tank().block]


def test_many_species():
    """1100 species, most of them only passing through, and a chain of 120: closed forms."""
    fed = (("Species", "Feed"), *((f"S{i}", 1.0) for i in range(1100)))
    one = (("Reaction", "Rate", "k"), ("S0 -> S1", "k*S0", 0.5))
    assert call("MOLE_CSTR", [one, fed, 1.0, "S0"]).block[0][0] == pytest.approx(1 / 1.5, rel=1e-12)
    chain = (("Reaction", "Rate", "k"), *((f"S{i} -> S{i + 1}", f"k*S{i}", 0.5) for i in range(119)))
    fed = (("Species", "Feed"), *((f"S{i}", float(i == 0)) for i in range(120)))
    assert call("MOLE_CSTR", [chain, fed, 1.0, "S5"]).block[0][0] == pytest.approx(0.5**5 / 1.5**6, rel=1e-11)
