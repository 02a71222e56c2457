"""The command line: inputs that are set, files that are no books, new, audit, exit codes."""

import subprocess
import sys
import zipfile

import openpyxl
import pytest
from books import RANGE, near, recalc, run, tank, write

from moletally.kernel.engine import engine_name, using


def settings_book(tmp_path):
    def fill(book, sheet):
        book.add_worksheet("It's 2")
        sheet.write_formula("G2", f'=MOLE_CSTR({RANGE},,G1,"A")')
        book.define_name("tau", "=Design!$G$1")
        book.define_name("local", "=Design!$A$1:$B$2")

    return write(tmp_path / "b.xlsx", fill)


@pytest.mark.parametrize("setting", ["Design!G1=2", "design!$G$1=2.0", "tau=2", "TAU= 2", "'Design'!G1=2"])
def test_set_changes_an_input(tmp_path, setting):
    path, out = settings_book(tmp_path), tmp_path / "out.xlsx"
    code, values, _ = recalc(path, "--set", setting, "--out", out)
    assert (code, values["Design!G2"]) == (0, near(tank(2.0)[0]))
    assert openpyxl.load_workbook(out)["Design"]["G1"].value == 2
    assert openpyxl.load_workbook(path)["Design"]["G1"].value == 4


def test_set_takes_texts_and_several(tmp_path):
    code, values, _ = recalc(settings_book(tmp_path), "--set", "Design!A5=k [1/min]", "--set", "tau=2")
    assert (code, values["Design!G2"]) == (0, near(tank(2.0)[0]))  # tau follows the unit of the constants
    out = tmp_path / "out.xlsx"
    recalc(settings_book(tmp_path), "--set", "'It''s 2'!A1= x & y ", "--out", out)
    assert openpyxl.load_workbook(out)["It's 2"]["A1"].value == " x & y "


@pytest.mark.parametrize(
    ("setting", "words"),
    [("Desing!G1=2", "Did you mean 'Design'"), ("tua=2", "Did you mean 'tau'"), ("Design!G2=2", "holds a formula"), ("Design!A1:B2=1", "more than one"),
     ("local=1", "more than one"), ("Design!G1", "write it as"), ("G1=2", "name the sheet too")],
)  # fmt: skip
def test_settings_that_name_no_input(tmp_path, setting, words):
    result = run("recalc", settings_book(tmp_path), "--set", setting)
    assert result.exit_code == 2
    assert words in result.output


@pytest.mark.parametrize(
    ("name", "content", "words"),
    [("gone.xlsx", None, "there is no file"), ("text.xlsx", b"no workbook at all", "not a workbook"), ("old.xls", bytes.fromhex("d0cf11e0a1b11ae1") + b"x", "without a password"),
     ("broken.xlsx", b"PK\x03\x04 and then nothing", "can't be read"), ("binary.xlsb", b"PK", "binary")],
)  # fmt: skip
def test_files_that_are_no_books(tmp_path, name, content, words):
    path = tmp_path / name
    if content is not None:
        path.write_bytes(content)
    result = run("recalc", path)
    assert result.exit_code == 2
    assert words in result.output
    assert "Traceback" not in result.output


def test_a_zip_that_is_no_book(tmp_path):
    path = tmp_path / "b.xlsx"
    with zipfile.ZipFile(path, "w") as package:
        package.writestr("hello.txt", "x")
    assert run("recalc", path).exit_code == 2


def test_a_place_that_can_not_be_written(tmp_path):
    result = run("recalc", settings_book(tmp_path), "--out", tmp_path / "no folder" / "x.xlsx")
    assert result.exit_code == 2
    assert "can't be written" in result.output


def test_new_lists_copies_and_does_not_overwrite(tmp_path):
    listed = run("new")
    assert listed.exit_code == 0
    names = [line.split()[0] for line in listed.output.splitlines()]
    assert {"amination", "adsorbing_tube", "matrix_sheet"} <= set(names)
    book = tmp_path / "design.xlsx"
    assert run("new", "amination", book).exit_code == 0
    assert run("recalc", book).exit_code == 0
    for arguments in (
        ("amination", book),
        ("aminaton", tmp_path / "x.xlsx"),
        ("amination",),
        ("amination", tmp_path / "x.txt"),
    ):
        assert run("new", *arguments).exit_code == 2


def test_audit_goes_through_every_call(tmp_path):
    def fill(book, sheet):
        sheet.write_formula("G2", f'=MOLE_CSTR({RANGE},,G1,"A")')
        sheet.write_formula("G3", f'=1+MOLE_PFR({RANGE},,-1,"A")')

    result = run("audit", write(tmp_path / "b.xlsx", fill))
    assert result.exit_code == 1
    assert "unique (proven)" in result.output
    assert "Residence time is -1" in result.output


def test_the_installed_command_answers(tmp_path):
    path = settings_book(tmp_path)
    done = subprocess.run(
        [sys.executable, "-m", "moletally", "recalc", str(path)], capture_output=True, text=True, check=False
    )
    assert done.returncode == 0, done.stderr


def test_the_table_of_functions_ends_with_what_computes_them():
    said = run("functions").output
    assert "MOLE_CSTR" in said
    assert said.endswith(f"Computed by the {engine_name()}.\n")
    with using("reference"):
        assert run("functions").output.endswith("Computed by the reference engine (numpy).\n")
