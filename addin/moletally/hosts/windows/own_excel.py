"""The macro file made by the user's own Excel from the texts of its modules, for those who want no prebuilt one."""

import re
import sys
from pathlib import Path

from moletally.hosts.windows.install import InstallError

__all__ = ["code", "make", "module_files"]

ADDIN_FORMAT = 55  # xlOpenXMLAddIn
TRUST = (
    "Excel does not let programs write macros. To allow it for this once: File, Options, Trust Center, "
    'Trust Center Settings, Macro Settings, tick "Trust access to the VBA project object model", and run this '
    "again; untick it afterwards."
)
HEADER = re.compile(r"\AVERSION .*?\nEND\n", re.DOTALL)


def module_files(folder: Path) -> tuple[list[Path], Path]:
    """The modules to import, and the text that belongs into the workbook's own module."""
    files = sorted([*folder.glob("*.bas"), *folder.glob("*.cls")])
    workbook = folder / "ThisWorkbook.cls"
    return [f for f in files if f != workbook], workbook


def code(text: str) -> str:
    """The code of a module file, without the header and attributes that only an import takes."""
    return re.sub(r"^Attribute .*\n", "", HEADER.sub("", text), flags=re.MULTILINE)


def filled(text: str, versions: dict[str, str]) -> str:
    """A module's text with the versions in their places."""
    for name, version in versions.items():
        text = text.replace("{" + name + "}", version)
    return text


def make(folder: Path, target: Path, versions: dict[str, str], title: str) -> None:
    """Let Excel import the modules and save them as an add-in. The ribbon can't be made this way.

    Raises
    ------
    InstallError
        If Excel does not start, or does not allow it.
    """
    if sys.platform != "win32":
        raise InstallError("this needs Excel for Windows")
    import tempfile

    import pywintypes
    import win32com.client

    files, workbook = module_files(folder)
    try:
        excel = win32com.client.DispatchEx("Excel.Application")
    except pywintypes.com_error as error:
        raise InstallError(f"Excel does not start: {error}") from None
    try:
        book = excel.Workbooks.Add()
        try:
            components = book.VBProject.VBComponents
        except pywintypes.com_error:
            raise InstallError(TRUST) from None
        with tempfile.TemporaryDirectory() as scratch:
            for file in files:
                copy = Path(scratch, file.name)
                copy.write_text(
                    filled(file.read_text(encoding="utf-8"), versions), encoding="ascii", newline="\r\n"
                )
                components.Import(str(copy))
        own = components.Item(book.CodeName or "ThisWorkbook").CodeModule
        own.AddFromString(code(workbook.read_text(encoding="utf-8")))
        sheet = book.Worksheets(1)
        sheet.Name = "Settings"
        for row, pair in enumerate(versions.items(), 1):
            sheet.Range(f"A{row}:B{row}").NumberFormat = "@"
            sheet.Range(f"A{row}:B{row}").Value = (pair,)
        book.BuiltinDocumentProperties("Title").Value = title
        book.SaveAs(str(target), ADDIN_FORMAT)
        book.Close(False)
    finally:
        excel.Quit()
