"""The ready workbooks: rebuilt they are the committed ones, and they answer to a changed input."""

import json
import os
import re
import subprocess
import sys
from pathlib import Path
from zipfile import ZipFile

import pytest
from openpyxl import load_workbook

ROOT = Path(__file__).parents[1]
BOOKS = sorted((ROOT / "workbook_templates").glob("*.xlsx"))
NUMBER = re.compile(r"-?\d+(?:\.\d+)?(?:[eE][-+]?\d+)?")
NAMES = [book.name for book in BOOKS]


def run(*arguments: str) -> subprocess.CompletedProcess[str]:
    """Python on the command line, in the top folder."""
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}
    return subprocess.run(
        [sys.executable, *arguments], cwd=ROOT, env=environment, capture_output=True, text=True, check=False
    )


def recalculate(book: Path, *options: str) -> dict[str, object]:
    """Value by cell of a recalculation in which nothing may fail."""
    done = run("-m", "moletally", "recalc", str(book), "--json", *options)
    report = json.loads(done.stdout)
    assert done.returncode == 0, report["problems"]
    assert report["problems"] == []
    return {cell["cell"]: cell["value"] for cell in report["cells"]}


def flat(value: object) -> list[object]:
    """The cells of a value that may be a block."""
    return [cell for row in value for cell in row] if isinstance(value, list) else [value]


def test_all_templates_are_there():
    assert NAMES == ["adsorbing_tube.xlsx", "amination.xlsx", "matrix_sheet.xlsx"]


@pytest.fixture(scope="module")
def rebuilt(tmp_path_factory) -> Path:
    folder = tmp_path_factory.mktemp("templates")
    done = run("-m", "workbook_templates.build", "--to", str(folder))
    assert done.returncode == 0, done.stdout + done.stderr
    return folder


@pytest.mark.parametrize("book", BOOKS, ids=NAMES)
def test_rebuilding_gives_the_committed_book(book, rebuilt):
    """Part by part; numbers may differ by the rounding of another processor."""
    with ZipFile(book) as committed, ZipFile(rebuilt / book.name) as built:
        assert built.namelist() == committed.namelist()
        for part in committed.namelist():
            was, now = committed.read(part).decode(), built.read(part).decode()
            if was != now:
                assert NUMBER.sub("#", now) == NUMBER.sub("#", was), part
                values = [float(n) for n in NUMBER.findall(was)]
                assert [float(n) for n in NUMBER.findall(now)] == pytest.approx(values, rel=1e-9, abs=1e-12)


@pytest.mark.parametrize("book", BOOKS, ids=NAMES)
def test_every_call_has_a_number_or_a_text(book):
    values = recalculate(book)
    assert len(values) >= 8
    cells = [cell for value in values.values() for cell in flat(value)]
    assert all(isinstance(cell, float | int | str) for cell in cells)
    assert not [cell for cell in cells if isinstance(cell, str) and cell.startswith("#")]


@pytest.mark.parametrize("book", BOOKS, ids=NAMES)
def test_stored_values_are_those_of_a_recalculation(book):
    """A reader without the functions shows what they would answer."""
    stored = load_workbook(book, data_only=True)
    for address, value in recalculate(book).items():
        sheet, cell = address.split("!")
        assert stored[sheet][cell].value == pytest.approx(flat(value)[0])


@pytest.mark.parametrize("book", BOOKS, ids=NAMES)
def test_no_stored_cell_is_an_error(book):
    for sheet in load_workbook(book, data_only=True):
        faults = [cell.coordinate for row in sheet.iter_rows() for cell in row if cell.data_type == "e"]
        assert not faults, f"{sheet.title}: {faults}"


# Closed by arithmetic, not by the solver: atoms go in and come out.
CLOSING = {
    "amination.xlsx": ["L22", "M22", "L23", "M23"],
    "adsorbing_tube.xlsx": ["L20", "L21"],
    "matrix_sheet.xlsx": ["L19", "M19", "L20", "M20"],
}


@pytest.mark.parametrize("book", BOOKS, ids=NAMES)
def test_balances_close(book):
    design = load_workbook(book, data_only=True)["Design"]
    assert [design[cell].value for cell in CLOSING[book.name]] == pytest.approx(
        [0] * len(CLOSING[book.name]), abs=1e-8
    )


@pytest.mark.parametrize(
    "name, change",
    [
        ("amination.xlsx", "Oxide_feed=2.8"),
        ("amination.xlsx", "Vessel_temperature=80"),
        ("adsorbing_tube.xlsx", "Bed_temperature=105"),
        ("adsorbing_tube.xlsx", "Water_feed=0.5"),
        ("matrix_sheet.xlsx", "Total_time=5"),
    ],
)
def test_a_changed_input_changes_every_outlet(name, change):
    book = ROOT / "workbook_templates" / name
    before, after = recalculate(book), recalculate(book, "--set", change)
    calls = [
        cell for cell in before if cell.startswith(("Design", "Profile")) and isinstance(before[cell], list)
    ]
    assert calls
    assert not [cell for cell in calls if before[cell] == after[cell]]


@pytest.mark.parametrize("book", BOOKS, ids=NAMES)
def test_the_file_keeps_to_the_schema(book):
    done = run("-m", "openxml_audit", str(book))
    assert done.returncode == 0, done.stdout + done.stderr


@pytest.mark.parametrize("book", BOOKS, ids=NAMES)
def test_the_notes_say_what_engineers_have_to_know(book):
    notes = load_workbook(book)["Notes"]
    text = " ".join(str(cell.value) for row in notes.iter_rows() for cell in row if cell.value)
    assert "Invented data" in text
    assert "licensed engineer" in text
    assert "local codes" in text


def test_the_spare_rows_take_a_species_and_a_reaction():
    book = ROOT / "workbook_templates" / "amination.xlsx"
    typed = {
        "B18": "Waste", "C18": "0", "B9": "2 Oxide -> Waste", "C9": "k*Oxide^2", "D9": "0.001",
        "E9": "L/(mol min)", "F9": "60", "G9": "70",
    }  # fmt: skip
    options = [text for cell, value in typed.items() for text in ("--set", f"Design!{cell}={value}")]
    outlet = [row[0] for row in recalculate(book, *options)["Design!L6"]]
    assert len(outlet) == 6
    # Oxide is where it went: one per mono, two per di, three per tri, two per waste.
    assert outlet[1] + outlet[2] + 2 * outlet[3] + 3 * outlet[4] + 2 * outlet[5] == pytest.approx(3.5)
    assert outlet[5] > 0
