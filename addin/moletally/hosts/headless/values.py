"""Values on their way between a file, the engine and our functions."""

import datetime as dt
from typing import Any

from moletally.hosts.headless.book import Book, StoredError, Value
from moletally.hosts.headless.references import Rect
from moletally.hosts.headless.rewrite import OMITTED_MARK
from moletally.sheet.cells import OMITTED, Argument, Cell, ExcelError

__all__ = ["CODES", "KINDS", "argument", "from_engine", "to_engine"]

CODES = {
    "Div": "#DIV/0!", "Na": "#N/A", "Name": "#NAME?", "Num": "#NUM!", "Ref": "#REF!", "Null": "#NULL!",
    "Value": "#VALUE!", "Spill": "#SPILL!", "Calc": "#CALC!",
}  # fmt: skip
KINDS = {code: kind for kind, code in CODES.items()}
AS_THEY_ARE = frozenset({float, str, bool, type(None)})  # what the engine hands in and a cell may be
EPOCH = dt.datetime(1899, 12, 30)


def from_engine(value: Any) -> Value:
    """A value as it is stored in a file; dates are serial numbers."""
    match value:
        case {"kind": kind}:
            return StoredError(CODES.get(str(kind), "#VALUE!"))
        case bool() | str() | None:
            return value
        case int() | float():
            return float(value)
        case dt.datetime():
            return (value - EPOCH) / dt.timedelta(days=1)
        case dt.date():
            return float((dt.datetime(value.year, value.month, value.day) - EPOCH).days)
        case dt.time():
            return (value.hour * 3600 + value.minute * 60 + value.second) / 86400
        case dt.timedelta():
            return value / dt.timedelta(days=1)
    return StoredError("#VALUE!")


def to_engine(value: Value | Cell) -> Any:
    """A value as the engine takes it."""
    if isinstance(value, StoredError | ExcelError):
        return {"type": "Error", "kind": KINDS.get(value.code, "Value")}
    return value


def argument(value: Any, area: Rect | None, book: Book) -> Argument:
    """An argument of one of our functions; `area` is its range if it is a plain one.

    Numbers that the sheet shows as dates arrive as dates: they are no concentrations.
    """
    if value == OMITTED_MARK:
        return OMITTED
    if isinstance(value, list):
        block = tuple(map(_row, value))
    elif area is not None:
        block = ((_cell(value),),)
    else:
        return _cell(value)
    return _dated(block, area, book)


def _dated(block: tuple[tuple[Cell, ...], ...], area: Rect | None, book: Book) -> Argument:
    sheet = book.sheets.get(area.sheet) if area is not None else None
    if area is None or sheet is None or not sheet.dates:
        return block
    return tuple(
        tuple(
            book.as_date(cell)
            if isinstance(cell, float) and (area.top + i, area.left + j) in sheet.dates
            else cell
            for j, cell in enumerate(row)
        )
        for i, row in enumerate(block)
    )


def _row(values: list[Any]) -> tuple[Cell, ...]:
    return tuple(values) if AS_THEY_ARE.issuperset(map(type, values)) else tuple(map(_cell, values))


def _cell(value: Any) -> Cell:
    if isinstance(value, dict):
        return ExcelError(CODES.get(str(value.get("kind")), "#VALUE!"))
    if isinstance(value, bool | str | dt.date | None):
        return value
    return float(value) if isinstance(value, int | float) else str(value)
