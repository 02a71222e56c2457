"""Every worksheet function, called by independent COM clients, answers as it does without Excel."""

import datetime as dt
import json
import math
import re
import uuid
from pathlib import Path

import pytest
import vbscript
from conftest import stop
from office import WITH_STAND_INS, run_basic
from recorded import BOOKS, answer, as_wire, calls_of

import build as addin
from moletally.hosts.windows.values import ERRORS, MARK
from moletally.sheet.cells import OMITTED, ExcelError
from moletally.sheet.functions import FUNCTIONS

HERE = Path(__file__).parent
MODULE = "moletally.hosts.windows.worksheet"
R = (("Reaction", "Rate", "k", "k unit"), ("A -> B", "k*A^0.5", 0.4, "mol^0.5/(L^0.5 min)"))
F = (("Species", "Feed [mol/L]"), ("A", 2.0), ("B", 0.0))
V = (("Residence time", 3.0, "min"),)


def with_rate(law, k=0.4):
    return (R[0], ("A -> B", law, k, "1/min"))


# name, arguments and the error that has to come: what to mend, no trustworthy answer, undefined, an error passed on
FAILING = [
    ("MOLE_CSTR", [with_rate("k*Q"), F, V], "#VALUE!"),
    ("MOLE_CSTR", [with_rate("k*A", None), F, V], "#VALUE!"),
    ("MOLE_CSTR", [R, F, (("Residence time", 3.0, "mol"),)], "#VALUE!"),
    ("MOLE_CSTR", [R, F, OMITTED], "#VALUE!"),
    ("MOLE_CSTR", [R, F, ((None,),)], "#VALUE!"),
    ("MOLE_CSTR", [R, F, ""], "#VALUE!"),
    ("MOLE_CSTR", [R, F, True], "#VALUE!"),
    ("MOLE_CSTR", [R, (F[0], ("A", dt.datetime(2024, 2, 29)), F[2]), V], "#VALUE!"),
    ("MOLE_PFR", [R, F, V, "B/(A - A)"], "#N/A"),
    ("MOLE_PFR", [R, (F[0], ("A", ExcelError("#DIV/0!")), F[2]), V], "#DIV/0!"),
    ("MOLE_PROFILE", [R, F, V, 0.0], "#VALUE!"),
    ("MOLE_RATES", [R, OMITTED], "#VALUE!"),
    ("MOLE_CSTR", [(R[0][:3], ("A -> B", "k/A", 3.0)), (("Species", "Feed"), *F[1:]), 2.0], "#NUM!"),
]


def close(got, expected):
    """The same cells; numbers to 1e-9: another numpy, another C library."""
    if isinstance(expected, float) and isinstance(got, int | float):
        return math.isclose(got, expected, rel_tol=1e-9, abs_tol=1e-12)
    if isinstance(expected, str):
        return re.sub(r"[^ -~]", "?", got) == re.sub(r"[^ -~]", "?", expected)
    return got == ("" if expected is None else expected)


def differing(made, got):
    """Calls whose cells are not those of a recalculation: name, what came, what was expected."""
    found = []
    for (name, arguments, _), value in zip(made, got, strict=True):
        shown, expected = without_reasons(value), answer(name, arguments)
        same = [len(row) for row in shown] == [len(row) for row in expected] and all(
            close(g, e) for gs, es in zip(shown, expected, strict=True) for g, e in zip(gs, es, strict=True)
        )
        if not same:
            found.append((name, shown, expected))
    return found


def rectangle(value):
    """A result as CallUDF gives it: one row comes flat, one cell bare."""
    if not isinstance(value, list):
        return [[value]]
    return value if isinstance(value[0], list) else [value]


def without_reasons(value):
    return [
        [c.split(MARK)[1] if isinstance(c, str) and c.startswith(MARK) else c for c in row]
        for row in rectangle(value)
    ]


def run_script(windows, server, calls, tmp_path, ranges=""):
    """The values that VBScript got for the calls; ranges : class id of the program that gives Range objects."""
    file = tmp_path / "calls.vbs"
    file.write_text(vbscript.script(MODULE, calls), encoding="ascii")
    done = windows.wine("cscript.exe", "//nologo", windows.path(file), server, ranges, timeout=300)
    values = vbscript.parsed(done.stdout)
    assert len(values) == len(calls), done.stdout[-2000:] + done.stderr[-2000:]
    return values


def run_client(windows, server, script, calls, tmp_path):
    """The values that a client in Windows Python got for the calls."""
    asked, told = tmp_path / "asked.json", tmp_path / "told.json"
    asked.write_text(json.dumps(calls), encoding="utf-8")
    client, *mode = (windows.path(HERE / "client" / script), *(["call"] if script == "ranges.py" else []))
    done = windows.python(client, *mode, server, windows.path(asked), windows.path(told), timeout=300)
    assert done.returncode == 0, (done.stdout + done.stderr)[-3000:]
    results = json.loads(told.read_text(encoding="utf-8"))
    assert all(state == "ok" for state, _ in results), results
    return [value for _, value in results]


def test_the_templates_use_every_function():
    """So that the tests below call every one."""
    assert {name for book in BOOKS for name, _, _ in calls_of(book)} == set(FUNCTIONS)


@pytest.mark.parametrize("book", BOOKS, ids=lambda b: b.stem)
def test_vbscript_gets_the_numbers_of_a_recalculation(book, windows, server, tmp_path):
    made = calls_of(book)
    calls = [(name, [as_wire(a) for a in arguments]) for name, arguments, _ in made]
    got = run_script(windows, server, calls, tmp_path)
    assert differing(made, got) == []


@pytest.mark.parametrize("book", BOOKS, ids=lambda b: b.stem)
def test_range_objects_give_the_numbers_of_a_recalculation(book, windows, server, tmp_path):
    made = calls_of(book)
    calls = [(name, [as_wire(a, "range") for a in arguments]) for name, arguments, _ in made]
    got = run_client(windows, server, "ranges.py", calls, tmp_path)
    assert differing(made, got) == []


def test_each_failing_case_gives_its_error_and_its_reason(windows, server, tmp_path):
    calls = [(name, [as_wire(a) for a in arguments]) for name, arguments, _ in FAILING]
    got = run_client(windows, server, "calls.py", calls, tmp_path)
    for (name, arguments, code), value in zip(FAILING, got, strict=True):
        cell = rectangle(value)[0][0]
        _, shown, reason = cell.split(MARK)
        assert shown == code, (name, arguments, cell)
        assert len(reason) > 20


def test_failing_cases_from_vbscript(windows, server, tmp_path):
    sendable = [f for f in FAILING if "ExcelError" not in repr(f)]
    calls = [(name, [as_wire(a) for a in arguments]) for name, arguments, _ in sendable]
    got = run_script(windows, server, calls, tmp_path)
    assert [rectangle(v)[0][0].split(MARK)[1] for v in got] == [code for _, _, code in sendable]


@pytest.mark.parametrize("book", BOOKS, ids=lambda b: b.stem)
def test_vbscript_hands_over_range_objects(book, windows, server, tmp_path):
    """As Excel does to the add-in's VBA: the objects live in one program, a second passes them to the server."""
    made = calls_of(book)
    calls = [(name, [as_wire(a, "range") for a in arguments]) for name, arguments, _ in made]
    blocks = [a for _, arguments in calls for a in arguments if isinstance(a, dict) and "range" in a]
    (tmp_path / "blocks.json").write_text(json.dumps(blocks), encoding="utf-8")
    class_id = "{" + str(uuid.uuid4()) + "}"
    giver = windows.start(
        windows.path(HERE / "client" / "ranges.py"), "serve", class_id, windows.path(tmp_path / "blocks.json")
    )
    try:
        assert b"served" in giver.stdout.readline()
        got = run_script(windows, server, calls, tmp_path, class_id)
    finally:
        stop(giver)
    assert differing(made, got) == []


def test_what_came_over_com_is_a_true_error_in_a_cell(windows, server, tmp_path):
    """From Python through COM and VBScript into the add-in's VBA, which LibreOffice runs: number and reason."""
    calls = [
        (name, [as_wire(a) for a in arguments])
        for name, arguments, _ in FAILING
        if "ExcelError" not in repr(arguments)
    ]
    came = [rectangle(value)[0][0] for value in run_script(windows, server, calls, tmp_path)]
    addin.write(tmp_path / "standin.xlam", addin.sources() | WITH_STAND_INS)
    shown = run_basic(tmp_path / "standin.xlam", [["MoleScenarios.AsShown", [text]] for text in came])
    for text, result in zip(came, shown, strict=True):
        _, code, reason = text.split(MARK)
        number = next(n for n, c in ERRORS.items() if c == code)
        assert result.split("\n") == [f"error {number}", reason]


def test_a_currency_cell_is_not_cut_to_four_decimals(windows, server, tmp_path):
    """Range.Value gives a cell formatted as currency with four decimals; the cell holds more."""
    k = 0.00003217
    reactions = {"range": [["Reaction", "Rate", "k"], ["A -> B", "k*A", {"currency": k}]]}
    feed = {"range": [["Species", "Feed"], ["A", 2.0], ["B", 0.0]]}
    (value,) = run_client(windows, server, "ranges.py", [("MOLE_CSTR", [reactions, feed, 1000.0])], tmp_path)
    assert value[0][0] == pytest.approx(2.0 / (1 + k * 1000.0), rel=1e-12)  # first-order tank, closed form


def test_several_ranges_in_one_argument_are_refused(windows, server, tmp_path):
    feed = {"range": [["Species", "Feed", "areas=2"], ["A", 2.0], ["B", 0.0]]}
    (value,) = run_client(
        windows, server, "ranges.py", [("MOLE_CSTR", [as_wire(R, "range"), feed, 1.0])], tmp_path
    )
    assert value.split(MARK)[1:] == ["#VALUE!", "MOLE_CSTR, feed: this is several ranges; give one range"]


def test_left_out_blank_and_empty_text_are_told_apart(windows, server, tmp_path):
    """A feed left out, a blank cell, "" and 0 where the feed belongs: four reasons or the same as without Excel."""
    kinds = [OMITTED, ((None,),), "", 0.0]
    calls = [
        ("MOLE_CSTR", [as_wire(R), as_wire(k, "range" if isinstance(k, tuple) else "block"), 3.0])
        for k in kinds
    ]
    got = run_client(windows, server, "ranges.py", calls, tmp_path)
    from moletally.sheet.functions import call

    for kind, value in zip(kinds, got, strict=True):
        problem = call("MOLE_CSTR", [R, kind, 3.0]).problems[0]
        assert value.split(MARK)[1:] == [problem.code, problem.reason]
