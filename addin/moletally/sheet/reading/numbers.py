"""One cell as a number or a name; what looks like one but is not is an error that says what it is."""

import datetime as dt
import re

from moletally.chemistry.errors import InputError, Place, SheetError
from moletally.sheet.cells import Cell, ExcelError

__all__ = [
    "LONGEST",
    "CellFault",
    "check_length",
    "is_blank",
    "number_text",
    "quoted",
    "read_name",
    "read_number",
    "refuse_odd",
    "symbol",
]

PLAIN = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?", re.ASCII)
DECIMAL_COMMA = re.compile(r"[+-]?[\d.\s]*\d,\d+([eE][+-]?\d+)?|[+-]?\d{1,3}(,\d{3})+(\.\d*)?", re.ASCII)
OTHER_MINUS = "−–—‐‑"
LONGEST = 200  # characters of a header, label or name


class CellFault(SheetError):
    """An error value in an input cell: it is passed on as it stands."""

    def __init__(self, what: str, place: Place | None = None, code: str = "#VALUE!") -> None:
        super().__init__(what, place)
        self.args = (what, place, code)
        self.code = code

    def at(self, place: Place) -> "CellFault":
        """The same fault with its place."""
        return self if self.place else CellFault(self.what, place, self.code)


def is_blank(cell: Cell) -> bool:
    """True for an empty cell and for one that shows nothing: `=""`, blanks."""
    return cell is None or (isinstance(cell, str) and not cell.strip())


def number_text(number: float) -> str:
    """A number that stands where a text belongs, with all its digits: a Rate of 0.123456789, a unit 1."""
    return str(int(number)) if abs(number) < 1e15 and number == int(number) else repr(number)


def quoted(text: str) -> str:
    """A text of the user's as a reason shows it: a cell may hold 32,767 characters."""
    return repr(text if len(text) <= LONGEST else text[: LONGEST - 1] + "…")


def check_length(text: str, place: Place, what: str) -> str:
    """The text, unless it is too long for a header or name."""
    if len(text) > LONGEST:
        raise InputError(f"a text of {len(text)} characters, where {what} belongs ({LONGEST} at most)", place)
    return text


def refuse_odd(cell: Cell, place: Place, what: str) -> None:
    """Raise for error values, dates and booleans, where `what` ("a number", "a name") belongs."""
    if isinstance(cell, ExcelError):
        raise CellFault(f"the cell holds {cell.code}: mend it there", place, cell.code)
    if isinstance(cell, bool):
        raise InputError(f"the cell holds {'TRUE' if cell else 'FALSE'}, where {what} belongs", place)
    if isinstance(cell, dt.date):
        raise InputError(
            f"the cell contains a date ({cell:%Y-%m-%d}), where {what} belongs: format it as text"
            " and type it again",
            place,
        )


def read_number(cell: Cell, place: Place) -> float:
    """A finite number; texts count where they can mean one number only.

    Raises
    ------
    CellFault
        The cell holds an error value.
    InputError
        The cell is blank or holds a text, date or boolean; the message says which and what to do.
    """
    if isinstance(cell, float | int) and not isinstance(cell, bool):
        if cell - cell == 0:
            return float(cell)
        raise InputError("the number is not finite", place)
    refuse_odd(cell, place, "a number")
    if cell is None:
        raise InputError("the cell is blank, where a number belongs (write 0 if zero is meant)", place)
    assert isinstance(cell, str)
    text = cell.strip()
    if not text:
        raise InputError(
            'the cell holds an empty text (""), where a number belongs: clear it, or let its formula give one',
            place,
        )
    if PLAIN.fullmatch(text):
        return read_number(float(text), place)
    raise InputError(_why_not(cell, text), place)


def _why_not(cell: str, text: str) -> str:
    if DECIMAL_COMMA.fullmatch(text):
        return f"{quoted(cell)} is a text, not a number: which is its decimal mark? Type it as a number"
    if text[0] in OTHER_MINUS and PLAIN.fullmatch(text[1:]):
        return f"{quoted(cell)} is a text: its minus is another character. Type it again with a plain -"
    return f"{quoted(cell)} is a text, where a number belongs"


def read_name(cell: Cell, place: Place) -> str:
    """A name: a text without the blanks around it.

    Raises
    ------
    CellFault, InputError
        As for `read_number`; a number is no name.
    """
    refuse_odd(cell, place, "a name")
    if isinstance(cell, float | int):
        raise InputError(
            f"the cell holds the number {number_text(cell)}, where a name belongs: type it as a text", place
        )
    if cell is None or not (isinstance(cell, str) and cell.strip()):
        raise InputError("the cell is blank, where a name belongs", place)
    return " ".join(cell.split())


def symbol(cell: Cell, place: Place) -> str:
    """The name of a species or constant; the brackets it wears in expressions may stand here too."""
    name = check_length(read_name(cell, place), place, "a name")
    inside = name[1:-1].strip()
    return inside if inside and name[0] == "[" and name[-1] == "]" and not set(inside) & set("[]") else name
