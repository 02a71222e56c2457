"""Cell values between COM and the sheet layer.

What Excel hands over as a VARIANT, and what pywin32 makes of it:

    empty cell       None                     number          float
    text             str                      formatted as    Decimal of 4 decimals: the range is read again,
    TRUE, FALSE      bool                     a currency      exactly, by Value2
    date             pywintypes' datetime     error           int, the COM error code of Excel
    array            nested tuples            left out        the default of the argument, or LEFT_OUT

Back goes a rectangle of numbers, texts and booleans. pywin32 can't send a true error (every VT_ERROR leaves
as "missing argument"), so an error travels as the text MARK code MARK reason, and the add-in's VBA makes the
true error of it and keeps the reason.
"""

import datetime as dt
from decimal import Decimal
from typing import Any, Final

from moletally.sheet.cells import OMITTED, Argument, Block, Cell, ExcelError
from moletally.sheet.outcome import Outcome

__all__ = ["LEFT_OUT", "MARK", "argument", "exact", "has_currency", "marked", "variants"]

MARK: Final = "\x01"  # no cell can hold it
LEFT_OUT: Final = MARK + "left out"  # what the add-in's VBA sends for an argument that was left out
ERROR_BASE: Final = -2146828288  # 0x800A0000: Excel's errors as COM codes
ERRORS: Final = {
    2000: "#NULL!", 2007: "#DIV/0!", 2015: "#VALUE!", 2023: "#REF!", 2029: "#NAME?", 2036: "#NUM!",
    2042: "#N/A", 2043: "#GETTING_DATA", 2045: "#SPILL!", 2046: "#CONNECT!", 2047: "#BLOCKED!",
    2048: "#UNKNOWN!", 2049: "#FIELD!", 2050: "#CALC!",
}  # fmt: skip


def argument(value: Any, *, is_range: bool) -> Argument:
    """What the sheet layer takes for a raw COM value; a range is a block even if it is one cell."""
    if isinstance(value, tuple | list):
        rows = value if value and isinstance(value[0], tuple | list) else [value]
        return tuple(tuple(_cell(v) for v in row) for row in rows)
    if value == LEFT_OUT:
        return OMITTED
    return ((_cell(value),),) if is_range else _cell(value)


def _cell(value: Any) -> Cell:
    if value is None or isinstance(value, bool | str | float):
        return value
    if isinstance(value, int):
        code = value - ERROR_BASE
        return ExcelError(ERRORS[code]) if code in ERRORS else float(value)
    if isinstance(value, dt.datetime):
        return dt.datetime(value.year, value.month, value.day, value.hour, value.minute, value.second)
    if isinstance(value, Decimal):
        return float(value)
    return ExcelError("#VALUE!")  # an object: nothing a cell can hold


def has_currency(value: Any) -> bool:
    """True if a cell of a raw COM value was cut to the four decimals of a currency."""
    if isinstance(value, tuple | list):
        return any(has_currency(v) for v in value)
    return isinstance(value, Decimal)


def exact(value: Any, value2: Any) -> Any:
    """`value` with each currency replaced by the number that the cell holds."""
    if isinstance(value, tuple | list):
        return tuple(exact(v, w) for v, w in zip(value, value2, strict=True))
    return value2 if isinstance(value, Decimal) else value


def marked(code: str, reason: str) -> str:
    """An error and its reason as they travel to the add-in."""
    return f"{MARK}{code}{MARK}{reason}"


def variants(outcome: Outcome) -> list[list[float | str | bool]]:
    """The rectangle that leaves; blank cells are empty text, as a blank would show as 0 in a cell."""
    reasons = {(p.row, p.column): p.reason for p in outcome.problems}
    return _plain(outcome.block, reasons)


def _plain(block: Block, reasons: dict[tuple[int, int], str]) -> list[list[float | str | bool]]:
    def plain(cell: Cell, at: tuple[int, int]) -> float | str | bool:
        if cell is None:
            return ""
        if isinstance(cell, ExcelError):
            return marked(
                cell.code, reasons.get(at, f"an input of this formula holds {cell.code}: mend it there")
            )
        if isinstance(cell, bool | str):
            return cell
        return cell.isoformat() if isinstance(cell, dt.date) else float(cell)

    return [[plain(cell, (i, j)) for j, cell in enumerate(row)] for i, row in enumerate(block)]
