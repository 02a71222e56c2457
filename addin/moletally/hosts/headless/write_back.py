"""Results go back into the file: only values of formula cells and of what they fill are written.

A sheet's part is edited as text, cell by cell; all else in it, and every other part, stays byte for byte.
"""

import os
import re
import tempfile
import zipfile
from collections import defaultdict
from collections.abc import Iterable, Mapping
from io import BytesIO
from pathlib import Path
from xml.sax.saxutils import escape

from moletally.hosts.headless.book import Book, StoredError, Value
from moletally.hosts.headless.calculate import Result
from moletally.hosts.headless.references import column_letters, column_number

__all__ = ["patched", "save"]

Cells = dict[tuple[int, int], Value]

CELL = re.compile(
    rb"<(?P<p>\w+:)?c(?P<attributes>(?:\s+[\w:]+\s*=\s*(?:\"[^\"]*\"|'[^']*'))*)\s*(?:/>|>(?P<inside>.*?)</(?:\w+:)?c>)",
    re.DOTALL,
)
ROW = re.compile(
    rb"<(?P<p>\w+:)?row(?P<attributes>(?:\s+[\w:]+\s*=\s*(?:\"[^\"]*\"|'[^']*'))*)\s*(?:/>|>(?P<inside>.*?)</(?:\w+:)?row>)",
    re.DOTALL,
)
DATA = re.compile(rb"<(?P<p>\w+:)?sheetData(?:\s*/>|>(?P<inside>.*?)</(?:\w+:)?sheetData>)", re.DOTALL)
ATTRIBUTE = re.compile(rb"\s+([\w:]+)\s*=\s*(\"[^\"]*\"|'[^']*')")
FORMULA = re.compile(rb"<(?:\w+:)?f\b.*?(?:/>|</(?:\w+:)?f>)", re.DOTALL)
VALUE = re.compile(rb"<(?:\w+:)?(?:v|is)\b[^>]*?(?:/>|>.*?</(?:\w+:)?(?:v|is)>)", re.DOTALL)
REF = re.compile(rb"(\bref\s*=\s*)(\"[^\"]*\"|'[^']*')")


def patched(book: Book, results: Iterable[Result], inputs: Mapping[tuple[str, int, int], Value]) -> bytes:
    """The packed workbook with the results in it.

    inputs : constants that were set, by sheet, row and column
    """
    edits = _edits(book, results, inputs)
    out = BytesIO()
    with zipfile.ZipFile(BytesIO(book.packed)) as old, zipfile.ZipFile(out, "w") as new:
        for info in old.infolist():
            data = old.read(info)
            edit = edits.get(info.filename)
            new.writestr(info, data if edit is None else edit.apply(data), info.compress_type)
    return out.getvalue()


def save(data: bytes, path: Path) -> None:
    """Write a file so that it is whole or not there at all."""
    handle, name = tempfile.mkstemp(dir=path.parent, prefix=f".{path.name}.")
    try:
        with os.fdopen(handle, "wb") as file:
            file.write(data)
            file.flush()
            os.fsync(file.fileno())
        os.chmod(name, path.stat().st_mode & 0o777 if path.exists() else 0o666 & ~_umask())
        os.replace(name, path)
    except BaseException:
        os.unlink(name)
        raise


def _umask() -> int:
    mask = os.umask(0)
    os.umask(mask)
    return mask


class _Edit:
    """What changes in one sheet's part."""

    def __init__(self) -> None:
        self.values: Cells = {}
        self.areas: dict[tuple[int, int], str] = {}
        self.constants: set[tuple[int, int]] = set()

    def apply(self, data: bytes) -> bytes:
        match = DATA.search(data)
        if match is None:
            return data
        prefix = match["p"] or b""
        inside = self.rows(match["inside"] or b"", prefix)
        if inside == (match["inside"] or b""):
            return data
        return (
            data[: match.start()]
            + b"<%ssheetData>%s</%ssheetData>" % (prefix, inside, prefix)
            + data[match.end() :]
        )

    def rows(self, inside: bytes, prefix: bytes) -> bytes:
        """The rows with their cells edited; rows that a spill needs and that are not there are put in."""
        wanted: dict[int, Cells] = defaultdict(dict)
        for (row, column), value in self.values.items():
            wanted[row][row, column] = value
        out: list[bytes] = []
        left = sorted(wanted, reverse=True)
        at = number = 0
        for match in ROW.finditer(inside):
            out.append(inside[at : match.start()])
            at = match.end()
            number = int(_attribute(match["attributes"], b"r") or number + 1)
            while left and left[-1] < number:
                missing = left.pop()
                out.append(self.new_row(missing, wanted.pop(missing), prefix))
            if left and left[-1] == number:
                left.pop()
            cells = wanted.pop(number, None)
            out.append(match[0] if cells is None else self.row(match, number, cells, prefix))
        out.append(inside[at:])
        out += [self.new_row(row, wanted[row], prefix) for row in sorted(wanted)]
        return b"".join(out)

    def new_row(self, row: int, cells: Cells, prefix: bytes) -> bytes:
        made = b"".join(
            _new_cell(row, c, v, prefix)
            for (_, c), v in sorted(cells.items(), key=lambda x: x[0])
            if v is not None
        )
        return b'<%srow r="%d">%s</%srow>' % (prefix, row, made, prefix) if made else b""

    def row(self, match: "re.Match[bytes]", number: int, cells: Cells, prefix: bytes) -> bytes:
        inside = match["inside"] or b""
        left = {column: value for (_, column), value in cells.items()}
        out: list[bytes] = []
        at = column = 0
        for cell in CELL.finditer(inside):
            out.append(inside[at : cell.start()])
            at = cell.end()
            place = _attribute(cell["attributes"], b"r")
            column = column_number(place.rstrip("0123456789")) if place else column + 1
            before = sorted(c for c in left if c < column)
            out += [_new_cell(number, missing, left.pop(missing), prefix) for missing in before]
            out.append(self.cell(cell, number, column, left.pop(column)) if column in left else cell[0])
        out.append(inside[at:])
        out += [_new_cell(number, c, left[c], prefix) for c in sorted(left)]
        body = b"".join(out)
        if body == inside:
            return match[0]
        return b"<%srow%s>%s</%srow>" % (prefix, match["attributes"], body, prefix)

    def cell(self, match: "re.Match[bytes]", row: int, column: int, value: Value) -> bytes:
        prefix, inside = match["p"] or b"", match["inside"] or b""
        formula = FORMULA.search(inside)
        kept = formula[0] if formula else b""
        area = self.areas.get((row, column))
        if area is not None:
            kept = REF.sub(lambda m: m[1] + b'"%s"' % area.encode(), kept, count=1)
        if self.same(match, inside, value) and kept == (formula[0] if formula else b""):
            return match[0]
        kind, stored = _stored(value, prefix, inline=not formula and (row, column) in self.constants)
        attributes = b"".join(m[0] for m in ATTRIBUTE.finditer(match["attributes"]) if m[1] != b"t")
        rest = VALUE.sub(b"", inside[formula.end() :] if formula else inside)
        body = kept + stored + rest
        if not body:
            return b"<%sc%s%s/>" % (prefix, attributes, kind)
        return b"<%sc%s%s>%s</%sc>" % (prefix, attributes, kind, body, prefix)

    @staticmethod
    def same(match: "re.Match[bytes]", inside: bytes, value: Value) -> bool:
        """True where the cell holds this number already, however it is written."""
        stored = VALUE.search(inside)
        if (
            stored is None
            or (_attribute(match["attributes"], b"t") or "n") != "n"
            or not isinstance(value, float)
        ):
            return False
        text = re.sub(rb"<[^>]*>", b"", stored[0])
        try:
            return float(text) == value
        except ValueError:
            return False


def _edits(
    book: Book, results: Iterable[Result], inputs: Mapping[tuple[str, int, int], Value]
) -> dict[str, _Edit]:
    edits: dict[str, _Edit] = defaultdict(_Edit)
    for result in results:
        if result.stale:
            continue
        edit, cell, area = edits[book.sheets[result.cell.sheet].part], result.cell, result.area
        if cell.kind == "dynamic" and area != cell.area:
            last = f"{column_letters(area.right)}{area.bottom}"
            first = f"{column_letters(cell.column)}{cell.row}"
            edit.areas[cell.row, cell.column] = first if area.single else f"{first}:{last}"
            old = book.sheets[cell.sheet].cached
            gone = ((r, c) for r in range(cell.area.top, cell.area.bottom + 1)
                    for c in range(cell.area.left, cell.area.right + 1))  # fmt: skip
            edit.values.update({place: None for place in gone if place in old})
        for i, line in enumerate(result.block):
            for j, value in enumerate(line):
                edit.values[cell.row + i, cell.column + j] = value
    for (sheet, row, column), value in inputs.items():
        edit = edits[book.sheets[sheet].part]
        edit.values[row, column] = value
        edit.constants.add((row, column))
    return edits


def _attribute(attributes: bytes, name: bytes) -> str | None:
    for match in ATTRIBUTE.finditer(attributes):
        if match[1] == name:
            return match[2][1:-1].decode()
    return None


def _new_cell(row: int, column: int, value: Value, prefix: bytes) -> bytes:
    if value is None:
        return b""
    kind, stored = _stored(value, prefix, inline=True)
    return b'<%sc r="%s%d"%s>%s</%sc>' % (prefix, column_letters(column).encode(), row, kind, stored, prefix)


def _stored(value: Value, prefix: bytes, inline: bool) -> tuple[bytes, bytes]:
    """The t attribute and the value element of a cell; a text without a formula is stored inline."""
    if value is None:
        return b"", b""
    if isinstance(value, bool):
        return b' t="b"', b"<%sv>%d</%sv>" % (prefix, value, prefix)
    if isinstance(value, float):
        return b"", b"<%sv>%s</%sv>" % (prefix, _number(value), prefix)
    if isinstance(value, StoredError):
        # A blocked spill is an error of a newer kind: files hold #VALUE! in its place.
        code = "#VALUE!" if value.code in ("#SPILL!", "#CALC!") else value.code
        return b' t="e"', b"<%sv>%s</%sv>" % (prefix, code.encode(), prefix)
    text = escape("".join(c for c in value if c >= " " or c in "\t\n\r")).encode()
    space = b' xml:space="preserve"' if value != value.strip() else b""
    if inline:
        return b' t="inlineStr"', b"<%sis><%st%s>%s</%st></%sis>" % (
            prefix,
            prefix,
            space,
            text,
            prefix,
            prefix,
        )
    return b' t="str"', b"<%sv>%s</%sv>" % (prefix, text, prefix)


def _number(value: float) -> bytes:
    text = repr(value)
    return (text[:-2] if text.endswith(".0") else text).encode()
