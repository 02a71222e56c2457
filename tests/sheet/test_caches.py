"""What is remembered never changes an answer: equal hashes are not equal cells, and every change is seen."""

from hypothesis import example, given, settings
from hypothesis import strategies as st

from moletally.chemistry.errors import SheetError
from moletally.sheet.cells import OMITTED, ExcelError
from moletally.sheet.functions import call
from moletally.sheet.reading import reactor
from moletally.sheet.reading.tables import read_tables
from moletally.sheet.request import read_request

LIST = (
    ("Reaction", "Rate", "k", "k unit", "E", "E unit", "T ref", "T ref unit"),
    ("A + B -> C", "k*A*B", 0.5, "L/(mol h)", 52.0, "kJ/mol", 60.0, "degC"),
    ("C -> D", "k*C", 0.1, "1/h", None, None, None, None),
)
FEED = (
    ("Species", "Feed", "Unit"),
    ("A", 2.0, "mol/L"),
    ("B", 3.0, "mol/L"),
    ("C", 0.0, "mol/L"),
    ("D", 0.0, "mol/L"),
)
BLOCK = (("Volume", 5.0, "L"), ("Flow", 2.0, "L/h"), ("Temperature", 70.0, "degC"))
NAMES = ("in(A)", "in(B)", "k(1)", "k(2)", "E(1)")


def swap(block, row, column, cell):
    return tuple(
        tuple(cell if (i, j) == (row, column) else c for j, c in enumerate(line))
        for i, line in enumerate(block)
    )


def fresh(block):
    """The same table as content that was never read: blank rows below it are cut off."""
    fresh.count += 1
    return block + ((None,) * len(block[0]),) * fresh.count


fresh.count = 0


def tank(reactions=LIST, feed=FEED, vessel=BLOCK, want=OMITTED):
    return call("MOLE_CSTR", [reactions, feed, vessel, want])


def reason(outcome):
    return outcome.problems[0].reason if outcome.problems else ""


# --- 1, 1.0, TRUE and "1" are equal or alike to Python, and four different cells


def test_values_of_equal_hash_are_different_cells():
    for order in ((1.0, True, 1, "1"), (True, "1", 1, 1.0)):
        answers = {repr(cell): tank(vessel=fresh(swap(BLOCK, 0, 1, cell))) for cell in order}
        again = {repr(cell): tank(vessel=swap(BLOCK, 0, 1, cell)) for cell in order}
        for found in (answers, again):
            assert "the cell holds TRUE" in reason(found["True"])
            assert found["1.0"] == found["1"] == found["'1'"] != found["True"]
            assert not found["1.0"].problems


def test_units_of_equal_hash_are_different_cells():
    """A unit 1 is a plain number; a TRUE in its place is none."""
    for cells in ((1.0, True, "1"), (True, 1.0, "1")):
        for cell in cells:
            found = reason(tank(vessel=swap(BLOCK, 0, 2, cell)))
            assert ("the cell holds TRUE" if cell is True else "Volume can't be in 1") in found, cell


def test_numbers_of_equal_hash_in_the_tables():
    for cell, words in ((1.0, ""), (True, "TRUE"), (1.0, ""), (0.0, ""), (False, "FALSE"), (0.0, "")):
        assert words in reason(tank(swap(LIST, 2, 2, cell)))
        assert words in reason(tank(feed=swap(FEED, 3, 1, cell)))
        assert bool(words) == bool(tank(swap(LIST, 2, 2, cell)).problems)


def test_bare_numbers_of_equal_hash():
    reactions, feed = (("Reaction", "k"), ("A -> B", 0.5)), (("Species", "Feed"), ("A", 2.0), ("B", 0.0))
    for cell in (2.0, True, 2, "2", ((2.0,),), ((True,),), ((2,),), -0.0, 0.0):
        found = call("MOLE_CSTR", [reactions, feed, cell])
        if "True" in repr(cell):
            assert "TRUE" in reason(found)
        else:  # A = 2/(1 + 0.5 tau)
            assert [row[0] for row in found.block] == ([1.0, 1.0] if "2" in repr(cell) else [2.0, 0.0])


# --- every change of one cell is seen, and the old answer comes back with the old cell


def test_each_change_of_one_cell_is_seen():
    first = tank()
    changes = [
        tank(swap(LIST, 1, 2, 0.6)), tank(swap(LIST, 1, 3, "L/(mol d)")), tank(swap(LIST, 1, 4, 60.0)),
        tank(swap(LIST, 1, 6, 50.0)), tank(swap(LIST, 1, 1, "k*A*B^2/B*2")), tank(feed=swap(FEED, 1, 1, 2.5)),
        tank(feed=swap(FEED, 2, 2, "mmol/L")), tank(vessel=swap(BLOCK, 0, 1, 6.0)), tank(vessel=swap(BLOCK, 0, 2, "m3")),
        tank(vessel=swap(BLOCK, 1, 1, 3.0)), tank(vessel=swap(BLOCK, 2, 1, 71.0)), tank(vessel=swap(BLOCK, 2, 2, "degF")),
        tank(vessel=(*BLOCK, ("in(A)", 1.0, "mol/L"))), tank(vessel=(*BLOCK, ("k(2)", 0.2, "1/h"))),
    ]  # fmt: skip
    assert not any(change.problems for change in changes)
    blocks = [first.block, *(change.block for change in changes)]
    assert len(set(blocks)) == len(blocks)
    assert tank() == first


def test_overrides_leave_nothing_behind():
    """Arrays that are kept for the tables are never those that a reactor's labels write into."""
    first = tank()
    for label, unit in (("in(A)", "mol/L"), ("k(1)", "L/(mol h)"), ("E(1)", "kJ/mol")):
        outcomes = {tank(vessel=(*BLOCK, (label, x, unit))).block for x in (0.7, 0.8, 0.9)}
        assert len(outcomes) == 3
        assert tank() == first


def test_a_batch_is_its_own():
    one, other = (read_request(LIST, FEED, BLOCK, OMITTED).batch for _ in range(2))
    for name in ("feed", "parameters"):
        array = getattr(one, name)
        before = array.copy()
        array += 1.0
        assert (getattr(other, name) == before).all()
        assert (getattr(read_request(LIST, FEED, BLOCK, OMITTED).batch, name) == before).all()


def test_a_fault_is_told_each_time_with_its_own_number():
    for volume in (-1.0, -2.0, 5.0, -1.0):
        found = tank(vessel=swap(BLOCK, 0, 1, volume))
        assert (f"Volume is {volume:g}" in reason(found)) == (volume < 0)
    for cell in (float("inf"), float("nan"), ExcelError("#N/A"), None, 5.0):
        assert bool(tank(vessel=swap(BLOCK, 0, 1, cell)).problems) == (cell != 5.0)


# --- first and repeated, remembered and not

WANTS = (
    OMITTED,
    "A/B",
    "100*conversion(A)",
    "flow(C) [kmol/h]",
    "tau",
    "nonsense",
    (("A", "B"), (None, "C/0")),
)
VESSELS = (
    BLOCK, (("Residence time", 2.5, "h"), BLOCK[2]), (("Space velocity", 2.0, "1/h"), BLOCK[2]),
    (("Heat", "isothermal", None), *BLOCK), (("Heat", 5.0, None), *BLOCK), (*BLOCK, ("Phase", "gas", None)),
    (("label", "value", "unit"), *BLOCK), (("Residence time [h]", "Temperature [degC]"), (1.0, 70.0), ("n/a", 70.0), (2.0, -300.0)),
    (*BLOCK[1:], (None,) * 3, ("Volume [L]", "k(2) [1/h]", None), (2.0, 0.1, None), (3.0, None, None)),
)  # fmt: skip


def test_an_answer_is_the_same_first_and_repeated():
    for vessel in VESSELS:
        for want in WANTS:
            first = tank(fresh(LIST), fresh(FEED), vessel, want)
            assert tank(vessel=vessel, want=want) == tank(vessel=vessel, want=want) == first


def test_what_was_forgotten_is_read_again():
    tables = read_tables(LIST, FEED, OMITTED)
    assert read_tables(LIST, FEED, OMITTED) is tables
    first = tank()
    for i in range(600):  # more than any of the caches between sheet and network holds
        volume = swap(BLOCK, 0, 0, "volume" + " " * (i % 100))
        assert tank(swap(LIST, 1, 2, 0.5 + 1e-6 * i), swap(FEED, 1, 1, 2.0 + 1e-6 * i), volume).block != ()
    assert read_tables(LIST, FEED, OMITTED) is not tables
    assert tank() == first


# --- a block read through what was remembered is the block read by itself

NUMBERS = st.floats(allow_nan=True) | st.sampled_from([0.0, -0.0, 1.0])
TEXTS = st.sampled_from([
    "", " ", "1", "5 L", "L", "h", "isothermal", "gas", "Volume", "volume", "Flow [L/h]", "Residence time", "Temperature", "Heat",
    "Phase", "in(A)", "k(1)", "k(9)", "E(1)", "label", "value", "unit", "Catalyst mass",
])  # fmt: skip
CELLS = st.none() | NUMBERS | TEXTS | st.booleans() | st.integers(-2, 3) | st.just(ExcelError("#N/A"))
BLOCKS = st.integers(1, 4).flatmap(
    lambda width: st.lists(
        st.tuples(TEXTS | CELLS, *[CELLS | NUMBERS] * (width - 1)), min_size=1, max_size=5
    ).map(tuple)
)


def read(how, block):
    try:
        found = how(block, NAMES)
    except SheetError as error:
        return type(error), error.reason
    rows = [row.reason if isinstance(row, SheetError) else tuple(map(repr, row)) for row in found.rows]
    layout = found.layout
    return (found.fixed, layout.columns, layout.words, layout.bare, layout.single, found.shape, rows)


@settings(max_examples=400, deadline=1000)
@given(BLOCKS, st.lists(NUMBERS, min_size=20, max_size=20))
@example((("Volume", 1.0, 1.0),), [2.0] * 20)
@example((("Heat", 1.0),), [2.0] * 20)
@example((("label", 1.0), ("Volume", 2.0)), [3.0] * 20)
@example((("Volume", 1.0), ("Volume", 2.0)), [3.0] * 20)
def test_a_block_with_other_numbers_reads_as_if_it_were_the_first(block, others):
    rest = iter(others)
    changed = tuple(tuple(next(rest) if type(cell) is float else cell for cell in row) for row in block)
    for each in (block, changed, block):
        assert repr(read(reactor.read_reactor, each)) == repr(read(reactor._read, each))
