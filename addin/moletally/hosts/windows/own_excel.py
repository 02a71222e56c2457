"""The macro file made by the user's own Excel from the texts of its modules, for those who want no prebuilt one."""

import re
import sys
import tempfile
from pathlib import Path
from typing import Any

from moletally.hosts.windows.settings import InstallError

__all__ = ["TITLE", "code", "filled", "make", "module_files"]

TITLE = "moletally - made by your own Excel"
ADDIN_FORMAT = 55  # xlOpenXMLAddIn
ONE_SHEET = -4167  # xlWBATWorksheet
DOCUMENT = 100  # vbext_ct_Document: the modules of the workbook and of its sheets
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


def make(folder: Path, target: Path, versions: dict[str, str]) -> None:
    """Let Excel import the modules and save them as an add-in. The ribbon can't be made this way.

    Raises
    ------
    InstallError
        If Excel does not start, or does not allow it.
    """
    if sys.platform != "win32":
        raise InstallError("this needs Excel for Windows")
    import pywintypes
    import win32com.client

    try:
        excel = win32com.client.DispatchEx("Excel.Application")
    except pywintypes.com_error as error:
        raise InstallError(f"Excel does not start: {error}") from None
    try:
        excel.DisplayAlerts = False  # or Excel, unseen, would wait for an answer when it is told to end
        book = excel.Workbooks.Add(ONE_SHEET)
        try:
            components = book.VBProject.VBComponents
        except pywintypes.com_error:
            raise InstallError(TRUST) from None
        _import(folder, versions, book, components)
        _name(book, versions)
        book.SaveAs(str(target), ADDIN_FORMAT)
        book.Close(False)
    except pywintypes.com_error as error:
        raise InstallError(f"Excel could not make the macro file: {error}") from None
    finally:
        excel.Quit()


def _import(folder: Path, versions: dict[str, str], book: Any, components: Any) -> None:
    files, workbook = module_files(folder)
    with tempfile.TemporaryDirectory() as scratch:
        for file in files:
            copy = Path(scratch, file.name)
            text = filled(file.read_text(encoding="utf-8"), versions)
            copy.write_text(text, encoding="ascii", newline="\r\n")
            components.Import(str(copy))
    own = _workbook_module(book, components).CodeModule
    if (
        own.CountOfLines
    ):  # Excel's own "Option Explicit", where a user has asked for it: a second one is an error
        own.DeleteLines(1, own.CountOfLines)
    own.AddFromString(code(workbook.read_text(encoding="utf-8")).replace("\n", "\r\n"))


def _workbook_module(book: Any, components: Any) -> Any:
    """The workbook's own module: its name is another one in each language of Excel, and may not be told yet."""
    sheets = {sheet.CodeName for sheet in book.Worksheets}
    documents = [c for c in components if c.Type == DOCUMENT and c.Name not in sheets]
    return next((c for c in documents if c.Name == book.CodeName), documents[0])


def _name(book: Any, versions: dict[str, str]) -> None:
    """The sheet with what belongs together, and the title by which the file is known as ours."""
    sheet = book.Worksheets(1)
    sheet.Name = "Settings"
    for row, pair in enumerate(versions.items(), 1):
        cells = sheet.Range(f"A{row}:B{row}")
        cells.NumberFormat = "@"  # text: 0.10 must not become 0.1
        cells.Value = (pair,)
    book.BuiltinDocumentProperties("Title").Value = TITLE
