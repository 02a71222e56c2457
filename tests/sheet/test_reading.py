"""Tables as they are typed: layouts that mean the same, and complaints that name their cell."""

import datetime as dt

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from moletally.chemistry.errors import InputError, Place, SheetError
from moletally.sheet.cells import OMITTED, ExcelError
from moletally.sheet.reading.grid import fold, split_header
from moletally.sheet.reading.numbers import CellFault, read_number
from moletally.sheet.reading.reactor import read_reactor
from moletally.sheet.reading.tables import read_tables

MATRIX = (
    ("Species", "Feed [mol/L]", "step 1", "step 2"),
    ("Am", 6.0, -1.0, None),
    ("Ox", 1.5, -1.0, -1.0),
    ("Mono", 0.0, 1.0, -1.0),
    ("Di", None, None, 1.0),
    ("Rate", None, "k*Am*Ox", "k*Mono*Ox"),
    ("k", None, 0.8, 1.9),
    ("k unit", None, "L/(mol h)", "L/(mol h)"),
)
LIST = (
    ("Reaction", "Rate", "k [L/(mol h)]"),
    ("Am + Ox -> Mono", "k*Am*Ox", 0.8),
    ("Mono + Ox -> Di", "k*Mono*Ox", 1.9),
)
FEED = (("Species", "Feed [mol/L]"), ("Am", 6.0), ("Ox", 1.5), ("Mono", 0.0), ("Di", 0.0))
PLACE = Place("Feed", 2, 2, "Feed")


def content(tables):
    """What a table says, without where it says it."""
    return (
        [(sorted(r.equation.left), sorted(r.equation.right), r.rate,
          [(name, tables.numbers[n.slot], n.unit) for name, n in r.constants]) for r in tables.reactions.rows],
        [(s.name, [(q.value, q.unit) for q in s.feed]) for s in tables.feed.species],
    )  # fmt: skip


def turned(block):
    return tuple(zip(*block, strict=True))


def wide(block, columns=3, rows=1000):
    """The same as a range of whole columns would arrive."""
    width = len(block[0]) + columns
    return tuple((*row, *(None,) * columns) for row in block) + ((None,) * width,) * rows


@pytest.mark.parametrize(
    "reactions, feed",
    [(MATRIX, OMITTED), (turned(MATRIX), OMITTED), (MATRIX, FEED), (turned(MATRIX), None), (wide(MATRIX), OMITTED)],
)  # fmt: skip
def test_all_layouts_say_the_same(reactions, feed):
    assert content(read_tables(reactions, feed, OMITTED)) == content(read_tables(LIST, wide(FEED), OMITTED))


@pytest.mark.parametrize(
    "text, parts",
    [("Feed [mol/L]", ("Feed", "mol/L")), ("Feed (mol/L)", ("Feed", "mol/L")), ("k [L/(mol h)]", ("k", "L/(mol h)")),
     ("k (L/(mol h))", ("k", "L/(mol h)")), ("in(A) [mol/L]", ("in(A)", "mol/L")), ("in(A)", ("in(A)", None)),
     ("k(2)", ("k(2)", None)), ("k(2) [1/h]", ("k(2)", "1/h")), ("  Feed   acid ", ("Feed acid", None)),
     ("Void fraction [-]", ("Void fraction", "-"))],
)  # fmt: skip
def test_headers_and_their_units(text, parts):
    assert split_header(text) == parts


def test_fixed_headers_fold_but_big_and_small_k_differ():
    assert fold("T ref") == fold("Tref") == fold("t_REF") == fold("T.ref")
    assert fold("k") != fold("K")


@pytest.mark.parametrize(
    "cell, value", [(2.0, 2.0), (3, 3.0), ("0.1 ", 0.1), (" 1e-3", 1e-3), ("-.5", -0.5), ("+2.", 2.0)]
)
def test_cells_that_are_numbers(cell, value):
    assert read_number(cell, PLACE) == value


@pytest.mark.parametrize(
    "cell, words",
    [("1,5", "decimal mark"), ("1.234,5", "decimal mark"), ("1,234", "decimal mark"), ("–0.1", "minus"),
     ("≈0.1", "is a text"), ("n/a", "is a text"), (None, "blank"), ("", "empty text"), (True, "TRUE"),
     (dt.datetime(2026, 3, 1), "contains a date"), (float("nan"), "not finite"), ("1e999", "not finite"), ("0x10", "is a text"),
     ("1_000", "is a text"), ("٣", "is a text")],
)  # fmt: skip
def test_cells_that_are_no_numbers_say_what_they_are(cell, words):
    with pytest.raises(InputError, match=words) as caught:
        read_number(cell, PLACE)
    assert str(caught.value).startswith("Feed row 2, Feed (column 2): ")


def test_error_values_are_passed_on():
    with pytest.raises(CellFault, match="#DIV/0!") as caught:
        read_number(ExcelError("#DIV/0!"), PLACE)
    assert caught.value.code == "#DIV/0!"


def replaced(block, row, column, cell):
    return tuple(
        tuple(cell if (i, j) == (row, column) else c for j, c in enumerate(line))
        for i, line in enumerate(block)
    )


@pytest.mark.parametrize(
    "reactions, feed, words",
    [
        (LIST, OMITTED, "feed is missing"),
        (replaced(LIST, 0, 1, "Rat"), FEED, "meant to be 'Rate'"),
        (OMITTED, FEED, "reactions are missing"),
        (((None,),), FEED, "reactions are missing"),
        (replaced(LIST, 0, 0, "Reacton"), FEED, "no column 'Reaction'"),
        (replaced(LIST, 2, 0, dt.datetime(2026, 3, 1)), FEED, r"Reactions row 3, Reaction \(column 1\): the cell contains a date"),
        (replaced(LIST, 2, 2, "1,9"), FEED, r"Reactions row 3, k \(column 3\)"),
        ((*LIST[:2], (None, None, None), LIST[2]), FEED, "row 3.*blank row inside"),
        (LIST, replaced(FEED, 2, 1, None), r"Feed row 3, Feed \(column 2\): the cell is blank"),
        (LIST, replaced(FEED, 2, 0, "Am"), "'Am' stands twice"),
        (LIST, replaced(FEED, 2, 0, True), "TRUE"),
        (LIST, replaced(FEED, 0, 1, "Food"), "unknown column 'Food'. Did you mean 'Feed'"),
        (LIST, replaced(FEED, 3, 1, ExcelError("#N/A")), "#N/A"),
        (replaced(MATRIX, 2, 2, "x"), OMITTED, "row 3.*column 3.*'x' is a text"),
        (MATRIX[:5], OMITTED, "Rate, k or k0"),
        ((("Reaction", "k", "k"), ("A -> B", 1.0, 2.0)), FEED, "stands twice"),
    ],
)  # fmt: skip
def test_complaints_name_the_cell(reactions, feed, words):
    with pytest.raises(SheetError, match=words):
        read_tables(reactions, feed, OMITTED)


KNOWN = {"k(1)", "K_A", "in(Am)"}


def reactor(argument):
    return read_reactor(argument, KNOWN)


def test_reactor_forms():
    assert reactor(2.5).rows == ((2.5,),)
    assert reactor(((1.0, 2.0), (3.0, 4.0))).shape == (2, 2)
    block = reactor(
        (("Label", "Value", "Unit"), ("volume", 5.0, "L"), ("Flow [L/min]", 2.0, None), ("Heat", None, None))
    )
    assert {label: q.unit for label, q in block.fixed.items()} == {"Volume": "L", "Flow": "L/min"}
    cases = reactor(
        (("Phase", "liquid", None), (None, None, None), ("Residence time [h]", "in(Am) [mol/L]", "K_A"),
         (1.0, 2.0, 3.0), (ExcelError("#N/A"), 1.0, 2.0), (None, 3.0, "1,5"))
    )  # fmt: skip
    assert [c.unit for c in cases.layout.columns] == ["h", "mol/L", None]
    assert cases.rows[0] == (1.0, 2.0, 3.0)
    assert cases.rows[1].code == "#N/A"
    assert "row 6" in cases.rows[2].reason


@pytest.mark.parametrize(
    "argument, words",
    [(None, "reactor"), (OMITTED, "is missing"), (((None, None),), "is blank"), ("", "reactor"),
     ((("Volum", 1.0),), "Did you mean 'Volume'"), ((("Volume", 1.0), ("volume [L]", 2.0)), "stands twice"),
     ((("Volume [L]", 1.0, "m3"),), "two units"), ("ten", "'ten' is a text"),
     ((("Volume", "1,5", "L"),), "decimal mark")],
)  # fmt: skip
def test_reactor_complaints(argument, words):
    with pytest.raises(SheetError, match=words):
        reactor(argument)


CELLS = st.one_of(
    st.none(), st.floats(allow_nan=False), st.text(max_size=12), st.booleans(), st.datetimes(), st.just(ExcelError("#REF!")),
    st.sampled_from(["k", "Feed", "Species", "Rate", "A -> B", "Unit", "k unit", "Flow", "T ref", "Value"]),
)  # fmt: skip


@settings(max_examples=150, deadline=1000)
@given(st.sampled_from([MATRIX, LIST, FEED]), st.integers(0, 7), st.integers(0, 3), CELLS)
def test_any_cell_is_read_or_refused_in_words(table, row, column, cell):
    broken = replaced(table, row % len(table), column % len(table[0]), cell)
    for arguments in ((broken, FEED, OMITTED), (LIST, broken, OMITTED), (LIST, FEED, broken)):
        try:
            read_tables(*arguments)
        except SheetError as error:
            assert error.reason


@settings(max_examples=150, deadline=1000)
@given(st.lists(st.lists(CELLS, min_size=3, max_size=3), min_size=1, max_size=5))
def test_any_reactor_is_read_or_refused_in_words(rows):
    try:
        reactor(tuple(map(tuple, rows)))
    except SheetError as error:
        assert error.reason
