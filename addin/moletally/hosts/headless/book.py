"""A workbook file as it is stored: its parts, sheets, cells, names and tables; nothing is changed here."""

import datetime as dt
import re
import zipfile
from dataclasses import dataclass, field
from io import BytesIO
from pathlib import Path
from typing import Any

from moletally.hosts.headless.references import Rect, column_number, parse_area, shifted, split_sheet

__all__ = ["Book", "BookError", "FormulaCell", "Sheet", "StoredError", "Table", "Value", "open_book"]

MAIN = "{http://schemas.openxmlformats.org/spreadsheetml/2006/main}"
MAIN_FORMULA, MAIN_VALUE = MAIN + "f", MAIN + "v"
RELATED = "{http://schemas.openxmlformats.org/officeDocument/2006/relationships}id"
DATE_FORMATS = frozenset((*range(14, 23), *range(27, 37), *range(45, 48), *range(50, 59)))
DATE_CODE = re.compile(r"[ymdhs]", re.IGNORECASE)
NOT_DATE = re.compile(r"\"[^\"]*\"|\\.|\[[^\]]*\]|General", re.IGNORECASE)
MOST_BYTES = 2**30  # unpacked: a larger file is no design workbook


class BookError(Exception):
    """The workbook or the call can't be used; the text is one sentence for the user."""


@dataclass(frozen=True, slots=True)
class StoredError:
    """An error value stored in a cell."""

    code: str


Value = float | str | bool | StoredError | None


@dataclass(slots=True)
class FormulaCell:
    """A cell with a formula.

    kind : "plain", "legacy" (array entered over `area`) or "dynamic" (spills; `area` is its last extent)
    formula : as stored, without the equals sign, shared ones written out
    """

    sheet: str
    row: int
    column: int
    formula: str
    kind: str
    area: Rect
    cached: Value


@dataclass(slots=True)
class Sheet:
    """A sheet: constants and formulas by (row, column); `dates` are constants formatted as dates."""

    name: str
    part: str
    constants: dict[tuple[int, int], Value] = field(default_factory=dict)
    formulas: dict[tuple[int, int], FormulaCell] = field(default_factory=dict)
    cached: dict[tuple[int, int], Value] = field(default_factory=dict)
    dates: set[tuple[int, int]] = field(default_factory=set)


@dataclass(frozen=True, slots=True)
class Table:
    """An Excel table: its whole range and the rows its header and totals take."""

    name: str
    area: Rect
    header_rows: int
    total_rows: int
    columns: tuple[str, ...]


@dataclass(slots=True)
class Book:
    """All of a workbook file.

    parts : the packed parts as read; names : (scope or "", folded name) -> definition
    """

    path: Path
    packed: bytes
    sheets: dict[str, Sheet]
    names: dict[tuple[str, str], str]
    tables: dict[str, Table]
    date_1904: bool

    def sheet(self, name: str) -> Sheet | None:
        """A sheet by name, in any case."""
        folded = name.casefold()
        return next((s for s in self.sheets.values() if s.name.casefold() == folded), None)

    def name(self, name: str, sheet: str) -> str | None:
        """The definition of a name as seen from a sheet."""
        folded = name.casefold()
        return self.names.get((sheet.casefold(), folded)) or self.names.get(("", folded))

    def as_date(self, serial: float) -> dt.datetime | float:
        """The date a number stands for; the number itself where it is none."""
        start = dt.datetime(1904, 1, 1) if self.date_1904 else dt.datetime(1899, 12, 30)
        return start + dt.timedelta(days=serial) if 0 <= serial < 2958466 else serial


def open_book(path: Path) -> Book:
    """Read a workbook.

    Raises
    ------
    BookError
        In one sentence, for a file that is missing, of another kind, encrypted or broken.
    """
    packed = _bytes(path)
    try:
        with zipfile.ZipFile(BytesIO(packed)) as package:
            if sum(info.file_size for info in package.infolist()) > MOST_BYTES:
                raise BookError(f"{path.name} unpacks to more than 1 GiB")
            return _Reader(path, packed, package).book()
    except (
        zipfile.BadZipFile,
        KeyError,
        SyntaxError,
        ValueError,
        NotImplementedError,
        RuntimeError,
    ) as error:
        raise BookError(f"{path.name} can't be read as a workbook: {error}") from None


def _bytes(path: Path) -> bytes:
    try:
        packed = path.read_bytes()
    except FileNotFoundError:
        raise BookError(f"there is no file {path}") from None
    except OSError as error:
        raise BookError(f"{path} can't be read: {error.strerror}") from None
    if packed[:8] == bytes.fromhex("d0cf11e0a1b11ae1"):
        raise BookError(
            f"{path.name} is encrypted or of the old .xls kind: save it as .xlsx without a password"
        )
    if path.suffix.lower() == ".xlsb":
        raise BookError(f"{path.name} is a binary workbook: save it as .xlsx or .xlsm")
    if packed[:2] != b"PK":
        raise BookError(f"{path.name} is not a workbook: .xlsx and .xlsm can be read")
    return packed


class _Reader:
    """Reads the parts of a package."""

    def __init__(self, path: Path, packed: bytes, package: zipfile.ZipFile) -> None:
        self.path, self.packed, self.package = path, packed, package
        self.names = set(package.namelist())

    def xml(self, part: str) -> Any:
        from lxml import etree

        parser = etree.XMLParser(resolve_entities=False, huge_tree=True)
        return etree.fromstring(self.package.read(part), parser)

    def related(self, part: str) -> dict[str, tuple[str, str]]:
        """id -> (kind, part) of what a part refers to."""
        folder, _, name = part.rpartition("/")
        rels = f"{folder}/_rels/{name}.rels"
        found = {}
        for item in self.xml(rels) if rels in self.names else ():
            target = item.get("Target", "")
            if item.get("TargetMode") != "External":
                found[item.get("Id")] = (item.get("Type", "").rpartition("/")[2], _joined(folder, target))
        return found

    def book(self) -> Book:
        root = next((p for k, p in self.related("").values() if k == "officeDocument"), "xl/workbook.xml")
        workbook, related = self.xml(root), self.related(root)
        texts = self.shared_texts([p for k, p in related.values() if k == "sharedStrings"])
        dates = self.date_styles([p for k, p in related.values() if k == "styles"])
        sheets: dict[str, Sheet] = {}
        tables: dict[str, Table] = {}
        order: list[str] = []
        for item in workbook.iter(MAIN + "sheet"):
            kind, part = related[item.get(RELATED)]
            order.append(item.get("name"))
            if kind != "worksheet":
                continue
            sheet = Sheet(item.get("name"), part)
            _Cells(sheet, texts, dates).read(self.xml(part))
            sheets[sheet.name] = sheet
            for of, table in self.related(part).values():
                if of == "table":
                    found = self.table(sheet.name, table)
                    tables[found.name.casefold()] = found
        properties = workbook.find(MAIN + "workbookPr")
        in_1904 = properties is not None and properties.get("date1904") in ("1", "true")
        return Book(self.path, self.packed, sheets, self.defined(workbook, order), tables, in_1904)

    def defined(self, workbook: Any, order: list[str]) -> dict[tuple[str, str], str]:
        found = {}
        for item in workbook.iter(MAIN + "definedName"):
            scope = item.get("localSheetId")
            where = order[int(scope)].casefold() if scope is not None else ""
            found[where, item.get("name").casefold()] = item.text or ""
        return found

    def shared_texts(self, parts: list[str]) -> list[str]:
        return [_text(item) for part in parts for item in self.xml(part).findall(MAIN + "si")]

    def date_styles(self, parts: list[str]) -> set[str]:
        """Indices of cell styles that show a number as a date."""
        found: set[str] = set()
        for part in parts:
            root = self.xml(part)
            own = {f.get("numFmtId"): f.get("formatCode", "") for f in root.iter(MAIN + "numFmt")}
            styles = root.find(MAIN + "cellXfs")
            for i, style in enumerate(styles if styles is not None else ()):
                number = style.get("numFmtId", "0")
                code = NOT_DATE.sub("", own[number]) if number in own else ""
                if int(number) in DATE_FORMATS or DATE_CODE.search(code):
                    found.add(str(i))
        return found

    def table(self, sheet: str, part: str) -> Table:
        root = self.xml(part)
        area = parse_area(root.get("ref"))
        assert area is not None
        columns = tuple(c.get("name") for c in root.iter(MAIN + "tableColumn"))
        return Table(root.get("displayName") or root.get("name"), Rect(sheet, *area),
                     int(root.get("headerRowCount", "1")), int(root.get("totalsRowCount", "0")), columns)  # fmt: skip


def _joined(folder: str, target: str) -> str:
    if target.startswith("/"):
        return target[1:]
    parts = [p for p in folder.split("/") if p]
    for piece in target.split("/"):
        if piece == "..":
            parts.pop()
        elif piece != ".":
            parts.append(piece)
    return "/".join(parts)


def _text(item: Any) -> str:
    """Text of a rich or plain string; phonetic helps are left out."""
    pieces = [t.text or "" for t in item.iter(MAIN + "t") if t.getparent().tag != MAIN + "rPh"]
    return "".join(pieces)


class _Cells:
    """Reads the cells of one sheet."""

    def __init__(self, sheet: Sheet, texts: list[str], dates: set[str]) -> None:
        self.sheet, self.texts, self.dates = sheet, texts, dates
        self.shared: dict[str, tuple[str, int, int]] = {}

    def read(self, root: Any) -> None:
        row = column = 0
        for line in root.iter(MAIN + "row"):
            row = int(line.get("r") or row + 1)
            column = 0
            for cell in line.findall(MAIN + "c"):
                place = cell.get("r")
                column = column_number(place.rstrip("0123456789")) if place else column + 1
                self.cell(cell, row, column)
        for formula in self.sheet.formulas.values():
            self.clear_children(formula)

    def cell(self, cell: Any, row: int, column: int) -> None:
        formula = stored = None
        for child in cell:
            if child.tag == MAIN_FORMULA:
                formula = child
            elif child.tag == MAIN_VALUE:
                stored = child
        value = self.value(cell, stored)
        if formula is not None:
            self.formula(cell, formula, row, column, value)
            return
        if value is not None:
            self.sheet.constants[row, column] = value
            if isinstance(value, float) and cell.get("s") in self.dates:
                self.sheet.dates.add((row, column))

    def value(self, cell: Any, stored: Any) -> Value:
        kind = cell.get("t", "n")
        if kind == "inlineStr":
            inline = cell.find(MAIN + "is")
            return None if inline is None else _text(inline)
        if stored is None or stored.text is None:
            return "" if kind == "str" and stored is not None else None
        text = stored.text
        if kind == "s":
            return str(self.texts[int(text)])
        if kind == "b":
            return bool(text == "1")
        if kind == "e":
            return StoredError(text)
        return str(text) if kind in ("str", "d") else float(text)

    def formula(self, cell: Any, node: Any, row: int, column: int, value: Value) -> None:
        text, kind = node.text or "", node.get("t", "normal")
        if kind == "shared":
            index = node.get("si")
            if text:
                self.shared[index] = (text, row, column)
            else:
                first, top, left = self.shared[index]
                text = shifted(first, row - top, column - left)
        area = Rect(self.sheet.name, row, column, row, column)
        how = "plain"
        if kind == "array":
            found = parse_area(split_sheet(node.get("ref"))[1])
            area = Rect(self.sheet.name, *found) if found else area
            how = "dynamic" if cell.get("cm") else "legacy"
        if kind == "dataTable":
            text, how = "", "table"
        self.sheet.formulas[row, column] = FormulaCell(self.sheet.name, row, column, text, how, area, value)

    def clear_children(self, formula: FormulaCell) -> None:
        """Cells that hold the rest of an array's last result are no constants."""
        if formula.area.single:
            return
        for row in range(formula.area.top, formula.area.bottom + 1):
            for column in range(formula.area.left, formula.area.right + 1):
                if (row, column) in self.sheet.constants:
                    self.sheet.cached[row, column] = self.sheet.constants.pop((row, column))
