"""`moletally excel` where there is no Excel, and what of it does not need Windows."""

import zipfile
from pathlib import Path

import pytest
from click.testing import CliRunner

from moletally.cli import main
from moletally.hosts.windows import settings
from moletally.hosts.windows.install import InstallError, install, is_marked, is_ours, uninstall
from moletally.hosts.windows.own_excel import code, filled, make, module_files
from moletally.hosts.windows.places import packaged_addin, places, vba_folder
from moletally.hosts.windows.registry import Location


@pytest.mark.parametrize("command", ["install", "status", "uninstall"])
def test_elsewhere_than_on_windows_a_sentence_says_what_to_do(command):
    done = CliRunner().invoke(main, ["excel", command])
    assert done.exit_code == 2
    assert "the add-in is for Excel on Windows" in done.output
    assert "moletally recalc" in done.output


def user(folder):
    return places({"APPDATA": str(folder / "Roaming"), "LOCALAPPDATA": str(folder / "Local")})


def test_settings_are_read_as_they_were_written(tmp_path):
    written = settings.Settings("1.2", "0.3", r"C:\Python\python.exe", r"C:\x = y\a.dll", "", "2")
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


def test_folders_that_install_made_go_and_others_stay(tmp_path):
    """Two folders down to the macro file were missing; Excel put a file of its own into the outer one since."""
    there = user(tmp_path)
    there.startup.mkdir(parents=True)
    there.addin.write_bytes(packaged_addin().read_bytes())
    settings.write(there, settings.Settings("1", "1", "x", "x", "", "2"))
    excels_own = there.startup.parent / "Excel15.xlb"
    excels_own.write_bytes(b"bars")
    said = uninstall(there)
    assert [p.name for p in tmp_path.rglob("*") if p.is_file()] == ["Excel15.xlb"]
    assert f"removed the empty folder {there.startup}" in said
    assert f"left alone: {there.startup.parent} holds other files" in said
    settings.write(there, settings.Settings("1", "1", "x", "x", "", "4"))
    excels_own.unlink()
    there.startup.mkdir()
    uninstall(there)
    assert list(tmp_path.iterdir()) == [tmp_path / "Local"]


def test_the_mark_is_seen(tmp_path):
    """Here, as under Wine, a stream is a file of that name."""
    assert not is_marked(tmp_path / "a.xlam")
    (tmp_path / "a.xlam:Zone.Identifier").write_text("[ZoneTransfer]\nZoneId=3\n")
    assert is_marked(tmp_path / "a.xlam")


XLSTART = r"C:\Users\Ada\AppData\Roaming\Microsoft\Excel\XLSTART"


@pytest.mark.parametrize(
    "path, subfolders, covers",
    [
        (XLSTART + "\\", False, True),
        (XLSTART.upper(), False, True),
        (XLSTART.replace("\\", "/"), False, True),
        (r"C:\Users\Ada\AppData\Roaming\Microsoft", False, False),
        (r"C:\Users\Ada\AppData\Roaming\Microsoft\\", True, True),
        (r"C:\Users\Ada\AppData\Roaming\Microsoft\Excel\XL", True, False),
        (XLSTART + r"\deeper", True, False),
        ("", True, False),
    ],
)
def test_a_trusted_location_covers_its_folder_and_if_told_what_is_below(path, subfolders, covers):
    assert Location("Location1", path, "", subfolders).covers(XLSTART) is covers


def test_only_our_entry_for_that_folder_is_ours():
    assert Location("Location1", XLSTART, "moletally").is_ours(XLSTART)
    assert not Location("Location1", "C:\\Tools", "moletally").is_ours(XLSTART)
    assert not Location("Location1", XLSTART, "IT").is_ours(XLSTART)


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
        text = filled(file.read_text(encoding="utf-8"), versions)
        assert "{xlwings}" not in text
        assert "{moletally}" not in text
        assert text.isascii()


def test_your_own_excel_is_needed_for_its_macro_file(tmp_path):
    with pytest.raises(InstallError, match="needs Excel for Windows"):
        make(vba_folder(), tmp_path / "x.xlam", {})
