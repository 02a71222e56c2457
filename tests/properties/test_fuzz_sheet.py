"""Any text in any cell of any table gives an answer or one of our errors, soon and in words."""

import datetime as dt
import math
import time

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from moletally.sheet.cells import OMITTED, ExcelError
from moletally.sheet.functions import DEFECT, call

MATRIX = (
    ("Species", "Feed [mol/L]", "step 1", "step 2"), ("Am", 6.0, -1.0, None), ("Ox", 1.5, -1.0, -1.0), ("Mono", 0.0, 1.0, -1.0),
    ("Di", 0.0, None, 1.0), ("Rate", None, "k*Am*Ox", "k*Mono*Ox"), ("k", None, 0.8, 1.9), ("k unit", None, "L/(mol h)", "L/(mol h)"),
)  # fmt: skip
LIST = (
    ("Reaction", "Rate", "k", "k unit", "E [kJ/mol]", "T ref [degC]", "Keq", "Keq unit"),
    ("Am + Ox -> Mono", "k*Am*Ox^n/(1 + K*Am)", 0.8, "L/(mol h)", 50.0, 25.0, None, None),
    ("Mono + Ox <-> Di", "", 1.9, "L/(mol h)", None, None, 3.0, "L/mol"),
    ("Di -> Am", "k*Di", 0.1, "1/h", None, None, None, None),
)  # fmt: skip
FEED = (
    ("Species", "Feed [mol/L]", "Start [mol/L]", "MW [g/mol]"), ("Am", 6.0, None, 50.0), ("Ox", 1.5, None, 40.0), ("Mono", 0.0, None, 90.0),
    ("Di", 0.0, 0.1, 130.0), ("Flow [L/min]", 2.0, None, None),
)  # fmt: skip
CONSTANTS = (
    ("Name", "Value", "Unit", "dH [kJ/mol]", "T ref [K]"),
    ("K", 0.5, "L/mol", -20.0, 300.0),
    ("n", 1.0, "-", None, None),
)
BLOCK = (("Temperature", 40.0, "degC"), ("Volume", 100.0, "L"))
CASES = (
    ("Temperature", 40.0, "degC"),
    (None,) * 3,
    ("Residence time [h]", "in(Am) [mol/L]", "k(2) [L/(mol h)]"),
    (1.0, 2.0, None),
    (2.0, None, 0.0),
)
WANTS = (("Am", "flow(Am)"), ("tau", "x(Di)"))

CALLS = [
    [MATRIX, OMITTED, 2.0, "conversion(Ox)", OMITTED],
    [LIST, FEED, BLOCK, WANTS, CONSTANTS],
    [LIST, FEED, CASES, OMITTED, CONSTANTS],
]
TELLING = [
    "k", "T", "R", "K", "Am", "0 -> Am", "Am -> 0", "Am <-> Ox", "k*Am", "exp(Am*1000)", "1/(Am-Ox)", "k*Am^-2", "ln(Am)", "sqrt(Am-3)",
    "k*Am^Ox", "max(Am,Ox)*k", "mol/L", "kg/L", "1/s", "degC", "barg", "[x", "((((", "1e308*1e308", "Am^1000", "k*Am^0.001", "Feed", "Start",
    "Species", "Rate", "k0", "Keq", "Flow", "in(Am)", "Phase", "gas", "Unit", "T ref", "2 Am + 3 Ox -> 5 Di", "Am->Am", "conversion(Am)", "Am/Di",
    "x(Am)", "p(Am)", "tau", "duty", "temperature [degC]", "flow(Am) [kg/h]", "yield(Di,Am)", "名前", "\x00", "1,5", "Am^2.5*k", "k*Am^0*Ox^0.5", "k*(Am-Ox)",
]  # fmt: skip
CELLS = st.one_of(
    st.sampled_from(TELLING), st.text(alphabet="kAmOx*+-/^()[]., 0123456789TRe→", max_size=12), st.text(max_size=8), st.none(), st.just(""),
    st.floats(allow_nan=False), st.sampled_from([0.0, -1.0, 1e300, 1e-300, 5.0]), st.booleans(), st.just(dt.datetime(2026, 3, 1)), st.just(ExcelError("#N/A")),
)  # fmt: skip


def asked(function, arguments):
    """The arguments of a function from those of an outlet."""
    reactions, feed, reactor, want, constants = arguments
    return {
        "MOLE_PROFILE": [reactions, feed, reactor, 5.0, want, constants],
        "MOLE_AUDIT": ["PFR", *arguments],
        "MOLE_RATES": [
            reactions,
            feed,
            reactor if isinstance(reactor, tuple) and reactor is BLOCK else OMITTED,
            constants,
        ],
    }.get(function, arguments)


def check(function, arguments):
    begun = time.perf_counter()
    outcome = call(function, asked(function, arguments))
    assert time.perf_counter() - begun < 3.0  # a second on a quiet machine
    cells = [cell for row in outcome.block for cell in row]
    assert all(len(row) == len(outcome.block[0]) for row in outcome.block)
    assert all(math.isfinite(cell) for cell in cells if isinstance(cell, float))
    assert len(outcome.problems) == sum(isinstance(cell, ExcelError) for cell in cells)
    for problem in outcome.problems:
        assert problem.reason
        assert DEFECT not in problem.reason, problem.reason
    return outcome


FUNCTIONS = ["MOLE_CSTR", "MOLE_PFR", "MOLE_PROFILE", "MOLE_RATES", "MOLE_AUDIT"]


@settings(max_examples=600, deadline=None, derandomize=True)
@given(
    st.sampled_from(FUNCTIONS),
    st.integers(0, 2),
    st.lists(
        st.tuples(st.integers(0, 4), st.integers(0, 99), st.integers(0, 99), CELLS), min_size=1, max_size=2
    ),
)
def test_any_cell_in_any_table(function, which, changes):
    arguments = list(CALLS[which])
    for place, row, column, cell in changes:
        table = arguments[place]
        if isinstance(table, tuple):
            i, j = row % len(table), column % len(table[0])
            arguments[place] = tuple(
                tuple(cell if (r, c) == (i, j) else x for c, x in enumerate(line))
                for r, line in enumerate(table)
            )
        else:
            arguments[place] = cell
    check(function, arguments)


@pytest.mark.parametrize("function", FUNCTIONS)
@pytest.mark.parametrize("which", [0, 1, 2])
def test_the_same_tables_untouched_give_numbers(function, which):
    outcome = check(function, CALLS[which])
    refused = function == "MOLE_PROFILE" and which == 2  # a profile is of one case
    needs_temperature = function == "MOLE_RATES" and which == 2
    assert bool(outcome.problems) == (refused or needs_temperature)


@settings(max_examples=100, deadline=None, derandomize=True)
@given(
    st.floats(1e-3, 1e3),
    st.floats(1e-3, 1e3),
    st.floats(0.0, 1e3),
    st.sampled_from(["MOLE_CSTR", "MOLE_PFR"]),
)
def test_valid_tables_give_numbers(k, fed, tau, function):
    table = (*MATRIX[:6], ("k", None, k, 1.9), MATRIX[7])
    table = (table[0], ("Am", fed, -1.0, None), *table[2:])
    assert not check(function, [table, OMITTED, tau, "Am", OMITTED]).problems
