"""`moletally excel` where there is no Excel, and what of it does not need Windows."""

import zipfile
from pathlib import Path

import pytest
from click.testing import CliRunner

from moletally.cli import main
from moletally.hosts.windows import settings
from moletally.hosts.windows.install import InstallError, install, is_ours, uninstall
from moletally.hosts.windows.own_excel import code, filled, make, module_files
from moletally.hosts.windows.places import packaged_addin, places, vba_folder


@pytest.mark.parametrize("command", ["install", "status", "uninstall"])
def test_elsewhere_than_on_windows_a_sentence_says_what_to_do(command):
    done = CliRunner().invoke(main, ["excel", command])
    assert done.exit_code == 2
    assert "the add-in is for Excel on Windows" in done.output
    assert "moletally recalc" in done.output


def user(folder):
    return places({"APPDATA": str(folder / "Roaming"), "LOCALAPPDATA": str(folder / "Local")})


def test_settings_are_read_as_they_were_written(tmp_path):
    written = settings.Settings("1.2", "0.3", r"C:\Python\python.exe", r"C:\x = y\a.dll", "", "yes")
    settings.write(user(tmp_path), written)
    assert settings.read(user(tmp_path)) == written
    assert settings.read(user(tmp_path / "nobody")) is None


def test_without_xlwings_nothing_is_changed(tmp_path):
    """Here xlwings is not installed: it is for Windows alone."""
    with pytest.raises(InstallError, match="xlwings is missing: run pip install"):
        install(user(tmp_path))
    assert list(tmp_path.rglob("*")) == []


def test_another_file_of_that_name_is_neither_taken_nor_removed(tmp_path):
    there = user(tmp_path)
    there.startup.mkdir(parents=True)
    with zipfile.ZipFile(there.addin, "w") as package:
        package.writestr("docProps/core.xml", "<dc:title>prices</dc:title>")
    assert not is_ours(there.addin)
    with pytest.raises(InstallError, match="another file of that name"):
        install(there)
    assert any("left alone" in line for line in uninstall(there))
    assert there.addin.exists()


def test_the_packaged_macro_file_is_known_as_ours():
    assert is_ours(packaged_addin())
    assert not is_ours(Path(__file__))


def test_the_modules_that_your_own_excel_would_import():
    files, workbook = module_files(vba_folder())
    assert workbook.name == "ThisWorkbook.cls"
    assert {"MoleFunctions.bas", "MoleLibrary.bas", "MoleEvents.cls"} <= {f.name for f in files}
    text = code(workbook.read_text(encoding="utf-8"))
    assert text.startswith("Option Explicit")
    assert "Private Sub Workbook_Open()" in text
    assert "VERSION" not in text
    assert "Attribute" not in text
    versions = {"moletally": "1.0", "xlwings": "0.1"}
    for file in files:
        assert "{xlwings}" not in filled(file.read_text(encoding="utf-8"), versions)


def test_your_own_excel_is_needed_for_its_macro_file(tmp_path):
    with pytest.raises(InstallError, match="needs Excel for Windows"):
        make(vba_folder(), tmp_path / "x.xlam", {}, "moletally")
