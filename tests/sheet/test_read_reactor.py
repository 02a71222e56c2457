"""The reactor argument in its four forms, and the want: what is read, and what a bad cell costs."""

import datetime as dt
from math import isnan

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from moletally.chemistry.errors import InputError, SheetError
from moletally.sheet.cells import OMITTED, ExcelError
from moletally.sheet.reading.numbers import CellFault
from moletally.sheet.reading.reactor import read_reactor
from moletally.sheet.reading.wants import read_wants

KNOWN = ("k(1)", "K_A", "in(A)", "in([2-pentene])")


def reactor(argument):
    return read_reactor(argument, KNOWN)


def reasons(rows):
    return [row.reason if isinstance(row, SheetError) else row for row in rows]


# --- omitted, blank, "" and 0 are four different things


@pytest.mark.parametrize(
    ("argument", "words"),
    [
        (OMITTED, "the reactor is missing: give a residence time"),
        (None, "the reactor is blank"),
        (((None,),), "the reactor is blank"),
        (((None, None), (None, None)), "the reactor is blank"),
        ("", r'the reactor is an empty text \(""\)'),
        ((("",),), r'the reactor is an empty text \(""\)'),
    ],
)
def test_a_reactor_that_is_not_there(argument, words):
    with pytest.raises(InputError, match=words):
        reactor(argument)


@pytest.mark.parametrize("argument", [0.0, 0, ((0.0,),), "0"])
def test_zero_is_a_residence_time(argument):
    read = reactor(argument)
    assert (read.rows, read.shape, read.layout.bare, read.single) == (((0.0,),), None, True, True)


@pytest.mark.parametrize(
    ("argument", "words"),
    [
        (True, "the cell holds TRUE, where a number belongs"),
        (dt.date(2026, 3, 1), "contains a date"),
        ("1,5", "decimal mark"),
        ("5 min", "'5 min' is a text"),
        ((("–5",),), r"Reactor row 1 \(column 1\).*minus"),
    ],
)
def test_a_number_that_is_none(argument, words):
    with pytest.raises(InputError, match=words):
        reactor(argument)


def test_an_error_value_alone_is_passed_on():
    with pytest.raises(CellFault) as caught:
        reactor(ExcelError("#REF!"))
    assert caught.value.code == "#REF!"


# --- a range of numbers


def test_a_range_keeps_its_shape_and_a_bad_cell_costs_its_own_case():
    read = reactor(((1.0, "0.5 ", 3.0), (ExcelError("#N/A"), None, "n/a")))
    assert read.shape == (2, 3)
    assert read.rows[:3] == ((1.0,), (0.5,), (3.0,))
    assert reasons(read.rows)[3:] == [
        "Reactor row 2 (column 1): the cell holds #N/A: mend it there",
        "Reactor row 2 (column 2): the cell is blank, where a number belongs (write 0 if zero is meant)",
        "Reactor row 2 (column 3): 'n/a' is a text, where a number belongs",
    ]
    assert read.rows[3].code == "#N/A"


def test_a_range_may_begin_with_a_bad_cell():
    read = reactor(((None, 2.0),))
    assert read.shape == (1, 2)
    assert "is blank" in read.rows[0].reason
    assert read.rows[1] == (2.0,)


def test_a_whole_column_ends_with_its_last_number():
    read = reactor(((1.0,), (None,), (3.0,), *((None,),) * 1_048_573))
    assert read.shape == (3, 1)
    assert "is blank" in read.rows[1].reason


def test_a_residence_time_with_a_unit_needs_its_label():
    for block in (((5.0, "min"),), ((5.0, "min"), (6.0, "min")), (("5", "min"),)):
        with pytest.raises(InputError, match=r"needs its label: Residence time \| 5 \| min"):
            reactor(block)


# --- a block of labels


def test_a_block_in_any_order_with_units_behind_or_beside():
    read = reactor((
        ("temperature", 25.0, "degC"), ("RESIDENCE_TIME [min]", "5 ", None), ("Phase", "liquid", None),
        ("in([2-pentene]) [mol/L]", 1.0, None), ("k(1)", 2.0, "1/h"), ("K_A", 0.0, None), ("Pressure", None, "bar"),
        ("Cross-section", 1.0, "m^2"),
    ))  # fmt: skip
    assert {k: q if isinstance(q, str) else (q.value, q.unit) for k, q in read.fixed.items()} == {
        "Temperature": (25.0, "degC"), "Residence time": (5.0, "min"), "Phase": "liquid",
        "in([2-pentene])": (1.0, "mol/L"), "k(1)": (2.0, "1/h"), "K_A": (0.0, None), "Cross-section": (1.0, "m^2"),
    }  # fmt: skip
    assert (read.rows, read.single, read.layout.bare) == (((),), True, False)


@pytest.mark.parametrize(
    ("block", "words"),
    [
        ((("Residense time", 5.0, "min"),), "unknown label 'Residense time'. Did you mean 'Residence time'"),
        ((("K_B", 5.0),), "unknown label 'K_B'. Did you mean 'K_A'"),
        ((("Volume", 5.0, "L"), (None, 2.0, "L/min")), r"row 2 \(column 1\): a label is missing"),
        ((("Volume", 5.0, "L"), (3.0, 2.0, "L/min"), ("Flow", 1.0, None)), "row 2.*a label is missing"),
        ((("Volume", 5.0, "L", "or so"),), r"\(column 4\): more than label, value and unit"),
        ((("Volume", "5 L", None),), r"Reactor row 1, Volume \(column 2\): '5 L' is a text"),
        ((("Volume", dt.date(2026, 1, 2), "L"),), "contains a date"),
        ((("Volume", 5.0, "L"), (None, None, None), ("Flow", 2.0, "L/min")), "row 3.*blank row inside a block"),
        ((("Volume", 5.0), (None, None), ("Flow [L/min]", None), (1.0, None), (None, None), (2.0, None)), "more than one blank row"),
        ((("Volume", 5.0), (None, None), ("volume [L]", None), (1.0, None)), "row 3.*'Volume' stands twice"),
        ((("Volume", "Heat"), (1.0, 2.0)), "Heat can't change from case to case"),
        ((("Volume", None), (1.0, 2.0)), "column 2.*no header"),
        ((("Volume",), (1.0,), (None,), (2.0,)), "row 3.*a blank row inside the table of cases"),
        ((("Volume", 1.0), (None, None), ("Flow", None)), "header row but no case"),
    ],
)  # fmt: skip
def test_block_and_case_complaints(block, words):
    with pytest.raises(InputError, match=words):
        reactor(block)


def test_an_error_value_in_a_block_takes_all():
    for block in (
        (("Volume", ExcelError("#DIV/0!"), "L"),),
        ((ExcelError("#DIV/0!"), 5.0, "L"), ("Volume", 5.0, "L")),
        (("Phase", "liquid", None), (ExcelError("#DIV/0!"), 5.0, "L"), ("Volume", 5.0, "L")),
        (("Volume", 5.0, ExcelError("#DIV/0!")),),
        ((ExcelError("#DIV/0!"), "Volume"), (1.0, 2.0)),
    ):
        with pytest.raises(CellFault, match="#DIV/0!"):
            reactor(block)


# --- a table of cases


def test_a_bad_cell_costs_its_own_case():
    read = reactor((
        ("Heat", "isothermal", None), (None, None, None),
        ("Residence time [h]", "in(A) [mol/L]", "K_A"),
        (1.0, None, "3"), ("n/a", 2.0, 3.0), (1.0, ExcelError("#NUM!"), 3.0), (1.0, True, 3.0),
    ))  # fmt: skip
    assert read.fixed == {"Heat": "isothermal"}
    assert [(c.label, c.unit) for c in read.layout.columns] == [
        ("Residence time", "h"),
        ("in(A)", "mol/L"),
        ("K_A", None),
    ]
    first, *rest = read.rows
    assert first[0] == 1.0
    assert isnan(first[1])
    assert first[2] == 3.0
    assert reasons(rest) == [
        "Reactor row 5, Residence time (column 1): 'n/a' is a text, where a number belongs",
        "Reactor row 6, in(A) (column 2): the cell holds #NUM!: mend it there",
        "Reactor row 7, in(A) (column 2): the cell holds TRUE, where a number belongs",
    ]
    assert not read.single


def test_a_bad_first_cell_does_not_turn_cases_into_a_block():
    read = reactor((("Volume [L]",), (1.0,), ("n/a",), (3.0,)))
    assert (read.rows[0], read.rows[2]) == ((1.0,), (3.0,))
    assert "row 3" in read.rows[1].reason


# --- what was typed is what is read


@settings(max_examples=80, deadline=None)
@given(
    st.lists(st.tuples(*[st.none() | st.floats(-1e300, 1e300)] * 3), min_size=1, max_size=6), st.booleans()
)
def test_cases_come_back_as_they_were_typed(values, below_a_block):
    head = (("Residence time [min]", "Temperature [degC]", "K_A"),)
    if all(all(v is None for v in row) for row in values) or values[-1] == (None,) * 3:
        values = [*values, (1.0, 2.0, 3.0)]
    values = [row if any(v is not None for v in row) else (0.0, None, None) for row in values]
    block = ((("Phase", "liquid", None), (None,) * 3) if below_a_block else ()) + head + tuple(values)
    got = reactor(block).rows
    assert [tuple(None if isnan(v) else v for v in row) for row in got] == values


# --- want


def test_no_want():
    assert read_wants(OMITTED) is read_wants(None) is read_wants("") is read_wants(((None, ""),)) is None


def test_wants_keep_their_shape_and_fail_alone():
    wants = read_wants((("A/B ", None), (2.0, ExcelError("#N/A")), (dt.date(2026, 1, 2), "C")))
    assert wants.shape == (3, 2)
    assert (wants.texts[0], wants.texts[1], wants.texts[5]) == ("A/B", None, "C")
    assert "row 2 (column 1): the cell holds the number 2" in wants.texts[2].reason
    assert wants.texts[3].code == "#N/A"
    assert "contains a date" in wants.texts[4].reason


# --- anything in any cell

CELLS = st.one_of(
    st.none(),
    st.floats(),
    st.text(max_size=8),
    st.text("[](){}kK1 ./", max_size=300),
    st.booleans(),
    st.dates(),
    st.just(ExcelError("#N/A")),
    st.sampled_from(["", "Volume", "Volume [L]", "Flow", "Residence time", "in(A) [mol/L]", "k(1)", "Heat", "L", "1,5"]),
)  # fmt: skip
BLOCKS = st.integers(1, 4).flatmap(
    lambda width: st.lists(st.tuples(*[CELLS] * width), min_size=1, max_size=7).map(tuple)
)


@settings(max_examples=300, deadline=1000)
@given(BLOCKS | CELLS)
def test_any_reactor_is_read_or_refused_in_words(argument):
    for read in (reactor, read_wants):
        try:
            read(argument)
        except SheetError as error:
            assert error.reason
