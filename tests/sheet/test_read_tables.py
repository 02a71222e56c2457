"""Tables at their edges: what is typed beside, twice, empty or in another layout."""

import datetime as dt
import pickle

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from moletally.chemistry.errors import InputError, SheetError
from moletally.sheet.cells import OMITTED, ExcelError
from moletally.sheet.reading.numbers import CellFault
from moletally.sheet.reading.tables import read_tables

LIST = (("Reaction", "Rate", "k [1/h]"), ("A -> B", "k*A", 0.8), ("B -> C", "k*B", 1.9))
FEED = (("Species", "Feed [mol/L]"), ("A", 6.0), ("B", 0.0), ("C", 0.0))
CONSTANTS = (("Name", "Value", "Unit"), ("K_A", 0.5, "L/mol"), ("n", 1.5, "-"))
MATRIX = (
    ("Species", "Feed [mol/L]", "s1", "s2"),
    ("A", 6.0, -1.0, None),
    ("B", 0.0, 1.0, -1.0),
    ("C", 0.0, None, 1.0),
    ("Rate", None, "k*A", "k*B"),
    ("k [1/h]", None, 0.8, 1.9),
)


def replaced(block, row, column, cell):
    return tuple(
        tuple(cell if (i, j) == (row, column) else c for j, c in enumerate(line))
        for i, line in enumerate(block)
    )


def turned(block):
    return tuple(zip(*block, strict=True))


def constants_of(tables, row):
    return {name: (tables.numbers[n.slot], n.unit) for name, n in tables.reactions.rows[row].constants}


# --- headers and their units


@pytest.mark.parametrize("header", ["T ref", "Tref", "t_ref", "T.REF", " T  ref "])
def test_a_fixed_header_in_any_spelling(header):
    tables = read_tables((("reaction", "K", "k", f"{header} [degC]"), ("A -> B", 3.0, 2.0, 25.0)), FEED, None)
    assert constants_of(tables, 0) == {"K": (3.0, None), "k": (2.0, None), "T ref": (25.0, "degC")}


@pytest.mark.parametrize("header", ["k unit", "k_unit", "k Unit", "kunit"])
def test_units_in_a_column_of_their_own(header):
    block = (("Reaction", "k", header), ("A -> B", 2.0, "1/h"), ("B -> C", 3.0, "1/min"))
    tables = read_tables(block, FEED, None)
    assert [constants_of(tables, i)["k"] for i in (0, 1)] == [(2.0, "1/h"), (3.0, "1/min")]


def test_a_unit_in_the_row_next_to_one_in_the_header():
    block = (("Reaction", "k [1/h]", "k unit"), ("A -> B", 2.0, None), ("B -> C", 3.0, "1/h"))
    assert constants_of(read_tables(block, FEED, None), 0)["k"] == (2.0, "1/h")
    with pytest.raises(InputError, match=r"Reactions row 3, k \(column 2\): two units, '1/h' in the header"):
        read_tables(replaced(block, 2, 2, "1/min"), FEED, None)


def test_a_blank_column_takes_no_units_away():
    block = (("Name", "Value", "Unit", None, "E [kJ/mol]"), ("K_A", 0.5, "L/mol", None, -30.0))
    row = read_tables(LIST, FEED, block).constants[0]
    assert (row.value.unit, row.energy.unit) == ("L/mol", "kJ/mol")


def test_a_unit_of_one_may_be_typed_as_a_number():
    assert read_tables(LIST, FEED, replaced(CONSTANTS, 2, 2, 1.0)).constants[1].value.unit == "1"


def test_a_rate_typed_as_a_number_keeps_its_digits():
    assert (
        read_tables(replaced(LIST, 1, 1, 0.123456789012), FEED, None).reactions.rows[0].rate
        == "0.123456789012"
    )


def test_names_may_wear_the_brackets_of_expressions():
    feed = (("Species", "Feed"), ("[2-pentene]", 1.0), ("A ", 2.0), ("B", 0.0))
    assert read_tables(LIST, feed, None).feed.names == ("2-pentene", "A", "B")


# --- an error value takes all cells, before anything else is wrong


@pytest.mark.parametrize("code", ["#N/A", "#DIV/0!", "#REF!"])
@pytest.mark.parametrize("table", range(3))
def test_an_error_value_is_passed_on_from_any_table(table, code):
    arguments = [LIST, FEED, CONSTANTS]
    for row, line in enumerate(arguments[table]):
        for column in range(len(line)):
            broken = list(arguments)
            broken[table] = replaced(broken[table], row, column, ExcelError(code))
            with pytest.raises(CellFault, match=code) as caught:
                read_tables(*broken)
            assert caught.value.code == code
            assert (caught.value.place.row, caught.value.place.column) == (row + 1, column + 1)


def test_a_fault_says_its_cell_and_survives_a_process():
    with pytest.raises(CellFault) as caught:
        read_tables(LIST, replaced(FEED, 2, 1, ExcelError("#N/A")), None)
    assert caught.value.reason == "Feed row 3, Feed (column 2): the cell holds #N/A: mend it there"
    again = pickle.loads(pickle.dumps(caught.value))
    assert (again.code, again.reason) == (caught.value.code, caught.value.reason)


# --- omitted, blank, "" and 0 are four different things


def test_a_blank_constant_is_one_the_row_does_not_have():
    assert constants_of(read_tables(replaced(LIST, 2, 2, None), FEED, None), 1) == {}
    assert constants_of(read_tables(replaced(LIST, 2, 2, 0.0), FEED, None), 1) == {"k": (0.0, "1/h")}


@pytest.mark.parametrize(
    ("reactions", "feed", "constants", "where"),
    [
        (replaced(LIST, 2, 2, ""), FEED, None, r"Reactions row 3, k \(column 3\)"),
        (replaced(MATRIX, 1, 3, ""), None, None, r"Reactions row 2, s2 \(column 4\)"),
        (replaced(MATRIX, 5, 3, " "), None, None, r"Reactions row 6, k \(column 4\)"),
        (LIST, replaced(FEED, 2, 1, ""), None, r"Feed row 3, Feed \(column 2\)"),
        (LIST, FEED, replaced(CONSTANTS, 1, 1, ""), r"Constants row 2, Value \(column 2\)"),
    ],
)
def test_an_empty_text_is_no_number_and_no_blank(reactions, feed, constants, where):
    with pytest.raises(InputError, match=where + ": the cell holds an empty text"):
        read_tables(reactions, feed, constants)


def test_rows_that_show_nothing_at_the_end_are_dropped():
    longer = (*FEED, ("", ""), (None, " "), (None, None))
    assert read_tables(LIST, longer, None).feed.names == ("A", "B", "C")


# --- whole columns


def test_whole_columns():
    block = tuple((*row, None) for row in LIST) + ((None,) * 4,) * (1_048_576 - len(LIST))
    assert len(read_tables(block, FEED, None).reactions.rows) == 2


def test_a_table_of_hundreds():
    """200 species and 500 reactions, as columns of a species-and-reaction table."""
    names = [f"S{i}" for i in range(200)]
    head = ("Species", "Feed", *(f"r{j}" for j in range(500)))
    rows = [
        (name, 1.0, *(-1.0 if j % 200 == i else 1.0 if (j + 7) % 200 == i else None for j in range(500)))
        for i, name in enumerate(names)
    ]
    block = (head, *rows, ("k", None, *(float(j + 1) for j in range(500))))
    for layout in (block, turned(block)):
        tables = read_tables(layout, None, None)
        assert tables.feed.names == tuple(names)
        assert tables.reactions.rows[499].equation.left == (("S99", 1.0),)
        assert tables.numbers[499] == 500.0


# --- what stands where nothing belongs


@pytest.mark.parametrize(
    ("reactions", "feed", "constants", "words"),
    [
        (replaced(MATRIX, 5, 1, 3.0), None, None, r"row 6 \(column 2\): nothing belongs here: 'k \[1/h\]'"),
        (replaced(turned(MATRIX), 1, 5, 3.0), None, None, r"row 2 \(column 6\): nothing belongs here"),
        ((*MATRIX[:2], (None,) * 4, *MATRIX[2:]), None, None, "row 3.*blank row inside"),
        (replaced(MATRIX, 0, 3, "s1"), None, None, "row 1.*'s1' stands twice"),
        (replaced(MATRIX, 0, 3, None), None, None, "blank, where a name belongs"),
        (replaced(MATRIX, 3, 0, "A"), None, None, "row 4.*'A' stands twice"),
        (replaced(replaced(MATRIX, 1, 2, None), 2, 2, 0.0), None, None, "'s1' has no coefficient"),
        (replaced(MATRIX, 5, 0, None), None, None, r"row 6.*the row has no header"),
        ((*MATRIX, ("Reaction", None, "A -> B", "B -> C")), None, None, "Reaction.*'A -> B' is a text"),
        (tuple((*row, f"Feed b{i}" if not i else None) for i, row in enumerate(MATRIX)), None, None, "has no coefficient"),
        (tuple((row[0], row[1], "Feed b" if not i else row[1], *row[2:]) for i, row in enumerate(MATRIX)), None, None,
         "one Feed column only"),
        ((("Reaction", "Rate [mol/(L h)]", "k"), ("A -> B", "k*A", 1.0)), FEED, None, "a Rate has no unit of its own"),
        ((("Reaction", "k", None), ("A -> B", 1.0, 2.0)), FEED, None, r"row 1 \(column 3\): the column has no header"),
        ((("Reaction", "k"),), FEED, None, "no reaction"),
        (LIST, (*FEED, ("Flow [L/min]", 2.0), ("D", 1.0)), None, "row 6.*'D' stands below the rows of the streams"),
        (LIST, (*FEED, ("Flow", 2.0), ("flow", 1.0)), None, r"row 6, flow \(column 2\): flow stands twice"),
        (LIST, (("Species", "Feed", "MW"), ("A", 6.0, None), ("Flow", 2.0, 9.0)), None,
         r"row 3 \(column 3\): nothing belongs here"),
        (LIST, (("Species", "Feed acid", "feed ACID"), ("A", 1.0, 2.0)), None, "stream 'ACID' stands twice"),
        (LIST, (("Species", "Amount"), ("A", 1.0)), None, "unknown column 'Amount'"),
        (LIST, (("Species", "MW"), ("A", 1.0)), None, "no column 'Feed'"),
        (LIST, FEED, (("Name", "Wert"), ("K_A", 1.0)), "unknown column 'Wert'"),
        (LIST, FEED, (("Name", "SE"), ("K_A", 1.0)), "no column 'Value'"),
        (LIST, FEED, replaced(CONSTANTS, 2, 0, "K_A"), "'K_A' stands twice"),
        (LIST, FEED, replaced(CONSTANTS, 1, 1, None), "K_A has no value"),
        (LIST, FEED, (("Name", "Value", "Value0"), ("K_A", 1.0, 2.0)), "both a Value and a Value0"),
        (LIST, FEED, (("Name", "Value", "E", "dH"), ("K_A", 1.0, 2.0, 3.0)), "both E and dH"),
        (LIST, FEED, (("Name", "Value [1]", "Unit"), ("K_A", 1.0, "L/mol")), "two units of K_A"),
    ],
)  # fmt: skip
def test_complaints_at_the_edges(reactions, feed, constants, words):
    with pytest.raises(InputError, match=words):
        read_tables(reactions, feed, constants)


@pytest.mark.parametrize(
    ("cell", "words"),
    [
        (dt.datetime(2026, 3, 1), r"the cell contains a date \(2026-03-01\), where a name belongs: format it as text"),
        (dt.date(2026, 12, 1), "contains a date"),
        (True, "the cell holds TRUE, where a name belongs"),
        (200000.0, "the cell holds the number 200000, where a name belongs"),
        (None, "blank, where a name belongs"),
    ],
)  # fmt: skip
@pytest.mark.parametrize("where", ["reaction", "species", "matrix", "constant"])
def test_names_that_were_turned_into_something_else(where, cell, words):
    """MAR1, TRUE, 2E5 typed as a name: what a sheet makes of them is no name any more."""
    arguments = {
        "reaction": (replaced(LIST, 1, 0, cell), FEED, None),
        "species": (LIST, replaced(FEED, 1, 0, cell), None),
        "matrix": (replaced(MATRIX, 1, 0, cell), None, None),
        "constant": (LIST, FEED, replaced(CONSTANTS, 1, 0, cell)),
    }[where]
    with pytest.raises(InputError, match=words):
        read_tables(*arguments)


def test_a_coefficient_that_became_a_date():
    with pytest.raises(InputError, match=r"Reactions row 2, s1 \(column 3\): the cell contains a date"):
        read_tables(replaced(MATRIX, 1, 2, dt.date(2026, 1, 2)), None, None)


# --- the feed: streams, units, what is known of a species


def test_streams_with_their_rows():
    feed = (
        ("Species", "Feed acid [mol/L]", "Feed_base", "Unit", "Start [mol/L]", "Formula", "MW", "MW unit"),
        ("A", 1.0, 0.0, "mol/L", None, "C2H6O", 46.0, "g/mol"),
        ("B", 0.0, 2.0, "mol/L", 0.5, None, None, None),
        ("Flow [L/min]", 3.0, 4.0, None, None, None, None, None),
        ("Temperature", 20.0, None, "degC", None, None, None, None),
    )
    table = read_tables(LIST, feed, None).feed
    acid, base = table.streams
    assert (acid.name, base.name) == ("acid", "base")
    assert (acid.flow.value, acid.flow.unit, base.flow.value) == (3.0, "L/min", 4.0)
    assert (acid.temperature.value, acid.temperature.unit, base.temperature) == (20.0, "degC", None)
    a, b = table.species
    assert [(q.value, q.unit) for q in a.feed] == [(1.0, "mol/L"), (0.0, "mol/L")]
    assert (a.formula, a.molar_mass.value, a.molar_mass.unit, a.start) == ("C2H6O", 46.0, "g/mol", None)
    assert (b.start.value, b.start.unit, b.molar_mass) == (0.5, "mol/L", None)


def test_the_unit_of_a_flow_is_not_that_of_the_feed():
    flow = read_tables(LIST, (*FEED, ("Flow", 2.0)), None).feed.streams[0].flow
    assert (flow.value, flow.unit) == (2.0, None)
    with pytest.raises(InputError, match="two units, 'L/min' and 'L/h'"):
        read_tables(
            LIST, (("Species", "Feed", "Unit"), ("A", 1.0, "mol/L"), ("Flow [L/min]", 2.0, "L/h")), None
        )


def test_a_feed_table_overrides_the_feed_of_a_matrix():
    tables = read_tables(MATRIX, replaced(FEED, 1, 1, 9.0), None)
    assert tables.feed.species[0].feed[0].value == 9.0


def test_units_of_a_matrix_in_lines_of_their_own():
    block = tuple((*row[:2], extra, *row[2:]) for row, extra in
                  zip(MATRIX, ("Feed unit", "mol/L", "mol/L", "mol/L", None, None), strict=True))  # fmt: skip
    block = replaced(block, 0, 1, "Feed")
    for layout in (block, turned(block)):
        feed = read_tables(layout, None, None).feed
        assert [(q.feed[0].value, q.feed[0].unit) for q in feed.species] == [
            (6.0, "mol/L"),
            (0.0, "mol/L"),
            (0.0, "mol/L"),
        ]


def test_a_matrix_with_keq_runs_backwards():
    block = (*MATRIX, ("Keq", None, None, 4.0))
    assert [r.equation.reversible for r in read_tables(block, None, None).reactions.rows] == [False, True]


# --- any reactions, in every layout, are the same records

NAMES = st.text("ABCxyz_", min_size=1, max_size=4).filter(lambda s: s.casefold() not in ("k", "k0"))


@st.composite
def networks(draw):
    species = draw(st.lists(NAMES, min_size=2, max_size=5, unique=True))
    count = draw(st.integers(1, 4))
    coefficient = st.sampled_from([-2.0, -1.0, -0.5, 0.0, 0.5, 1.0, 3.0])
    nu = [[draw(coefficient) for _ in species] for _ in range(count)]
    for row in nu:
        row[0], row[-1] = -1.0, 1.0  # a reaction has two sides
    k = [draw(st.floats(0, 1e9)) for _ in range(count)]
    energy = [draw(st.none() | st.floats(0, 1e5)) for _ in range(count)]
    return species, nu, k, energy


def side(species, row, sign):
    return " + ".join(f"{abs(n)} [{s}]" for s, n in zip(species, row, strict=True) if n * sign > 0)


@settings(max_examples=80, deadline=None)
@given(networks())
def test_every_layout_gives_the_same_records(network):
    species, nu, k, energy = network
    table = (
        ("Reaction", "k [1/h]", "E [kJ/mol]"),
        *(
            (f"{side(species, n, -1)} -> {side(species, n, 1)}", a, e)
            for n, a, e in zip(nu, k, energy, strict=True)
        ),
    )
    feed = (("Species", "Feed"), *((s, 1.0) for s in species))
    matrix = (
        ("Species", "Feed", *(f"r{j}" for j in range(len(nu)))),
        *((s, 1.0, *(n[i] or None for n in nu)) for i, s in enumerate(species)),
        ("k [1/h]", None, *k),
        ("E [kJ/mol]", None, *energy),
    )

    def content(tables):
        rows = tables.reactions.rows
        return (
            [(sorted(r.equation.left), sorted(r.equation.right)) for r in rows],
            [constants_of(tables, i) for i in range(len(rows))],
            tables.feed.names,
        )

    expected = (
        [(sorted((s, -v) for s, v in zip(species, n, strict=True) if v < 0),
          sorted((s, v) for s, v in zip(species, n, strict=True) if v > 0)) for n in nu],
        [{"k": (a, "1/h")} | ({} if e is None else {"E": (e, "kJ/mol")}) for a, e in zip(k, energy, strict=True)],
        tuple(species),
    )  # fmt: skip
    for arguments in ((table, feed), (matrix, OMITTED), (turned(matrix), OMITTED), (matrix, feed)):
        assert content(read_tables(*arguments, OMITTED)) == expected


# --- anything in any cell

CELLS = st.one_of(
    st.none(),
    st.floats(),
    st.text(max_size=8),
    st.text("[](){}kK1 ./", max_size=300),
    st.booleans(),
    st.dates(),
    st.sampled_from(["", "Species", "Reaction", "Feed", "Feed a", "Feed unit", "Unit", "Rate", "k", "k0", "k unit",
                     "Keq", "Name", "Value", "Value0", "E", "Flow", "Start", "MW unit", "A -> B", "A", "1,5"]),
)  # fmt: skip
BLOCKS = st.integers(1, 5).flatmap(
    lambda width: st.lists(st.tuples(*[CELLS] * width), min_size=1, max_size=6).map(tuple)
)


@settings(max_examples=300, deadline=1000)
@given(BLOCKS, BLOCKS, BLOCKS)
def test_any_blocks_are_read_or_refused_in_words(first, second, third):
    for arguments in (
        (first, second, third),
        (first, FEED, OMITTED),
        (LIST, second, third),
        (LIST, FEED, third),
    ):
        try:
            tables = read_tables(*arguments)
        except SheetError as error:
            assert error.reason
        else:
            assert all(value - value == 0 for value in tables.numbers)


@pytest.mark.parametrize("piece", ["A", "(a)", "[", "((", "1", " k", "+", "A -> B ", "."])
def test_a_cell_full_to_the_brim_is_refused_in_a_short_sentence(piece):
    brim = piece * (32767 // len(piece))
    for row, column in ((0, 1), (1, 0), (1, 1), (1, 2)):
        for arguments in ((replaced(LIST, row, column, brim), FEED), (LIST, replaced(FEED, row, min(column, 1), brim)),
                          (replaced(MATRIX, row, column, brim), None)):  # fmt: skip
            try:
                read_tables(*arguments, None)
            except SheetError as error:
                assert len(error.reason) < 1000
