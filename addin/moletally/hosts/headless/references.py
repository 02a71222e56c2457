"""Rectangles of cells and their addresses; rows and columns count from 1 as on a sheet."""

import re
from functools import lru_cache
from typing import NamedTuple

from moletally.hosts.headless.lexer import Token, tokens

__all__ = [
    "LAST_COLUMN", "LAST_ROW", "Rect", "address", "column_letters", "column_number", "parse_area",
    "quoted", "shifted", "split_sheet",
]  # fmt: skip

LAST_ROW, LAST_COLUMN = 1_048_576, 16_384

_END = re.compile(r"(\$?)([A-Za-z]{1,3})?(\$?)(\d{1,7})?")
_PLAIN_SHEET = re.compile(r"[^\W\d]\w*")


class Rect(NamedTuple):
    """A rectangle on a sheet, ends included."""

    sheet: str
    top: int
    left: int
    bottom: int
    right: int

    @property
    def single(self) -> bool:
        """Whether it is one cell."""
        return self.top == self.bottom and self.left == self.right

    @property
    def shape(self) -> tuple[int, int]:
        """Rows, columns."""
        return self.bottom - self.top + 1, self.right - self.left + 1

    def covers(self, sheet: str, row: int, column: int) -> bool:
        """Whether a cell lies inside."""
        return self.sheet == sheet and self.top <= row <= self.bottom and self.left <= column <= self.right

    def meets(self, other: "Rect") -> bool:
        """Whether two rectangles share a cell."""
        return (
            self.sheet == other.sheet and self.top <= other.bottom and other.top <= self.bottom
            and self.left <= other.right and other.left <= self.right
        )  # fmt: skip


@lru_cache(maxsize=LAST_COLUMN)
def column_letters(column: int) -> str:
    """1 -> A, 27 -> AA."""
    letters = ""
    while column:
        column, rest = divmod(column - 1, 26)
        letters = chr(65 + rest) + letters
    return letters


def column_number(letters: str) -> int:
    """The inverse of `column_letters`, in any case."""
    number = 0
    for letter in letters.upper():
        number = number * 26 + ord(letter) - 64
    return number


def quoted(sheet: str) -> str:
    """A sheet's name as it stands before the exclamation mark, quoted where a person would quote it."""
    looks_like_cell = re.fullmatch(r"[A-Za-z]{1,3}\d{1,7}|[Rr]\d*[Cc]\d*|[RrCc]", sheet)
    if _PLAIN_SHEET.fullmatch(sheet) and not looks_like_cell:
        return sheet
    return "'" + sheet.replace("'", "''") + "'"


def address(rect: Rect) -> str:
    """`Design!F5`, `'My sheet'!A1:B4`, whole columns and rows as `A:D`, `3:3`."""
    sheet = quoted(rect.sheet)
    left, right = column_letters(rect.left), column_letters(rect.right)
    if rect.single:
        return f"{sheet}!{left}{rect.top}"
    if rect.top == 1 and rect.bottom == LAST_ROW:
        return f"{sheet}!{left}:{right}"
    if rect.left == 1 and rect.right == LAST_COLUMN:
        return f"{sheet}!{rect.top}:{rect.bottom}"
    return f"{sheet}!{left}{rect.top}:{right}{rect.bottom}"


@lru_cache(maxsize=65536)
def split_sheet(text: str) -> tuple[str, str]:
    """`'My sheet'!A1` -> (`My sheet`, `A1`); no sheet -> empty text."""
    sheet, mark, rest = text.rpartition("!")
    if not mark:
        return "", text
    if sheet.startswith("'") and sheet.endswith("'"):
        sheet = sheet[1:-1].replace("''", "'")
    return sheet, rest


@lru_cache(maxsize=65536)
def parse_area(text: str) -> tuple[int, int, int, int] | None:
    """`B2:$A$1`, `A:C`, `2:2`, `B2` -> top, left, bottom, right in order; None if beyond a sheet's end."""
    first, _, second = text.partition(":")
    ends = (_END.fullmatch(first), _END.fullmatch(second or first))
    if ends[0] is None or ends[1] is None:
        return None
    rows = [int(end[4]) if end[4] else None for end in ends if end]
    columns = [column_number(end[2]) if end[2] else None for end in ends if end]
    if rows == [None, None] == columns or (not second and None in (rows[0], columns[0])):
        return None
    low_row, high_row = sorted((rows[0] or 1, rows[1] or LAST_ROW))
    low_column, high_column = sorted((columns[0] or 1, columns[1] or LAST_COLUMN))
    if high_row > LAST_ROW or high_column > LAST_COLUMN:
        return None
    return low_row, low_column, high_row, high_column


def shifted(formula: str, rows: int, columns: int) -> str:
    """A formula moved by rows and columns: its relative references follow, wrapping at the sheet's ends."""
    if not rows and not columns:
        return formula
    return "".join(_moved(piece, rows, columns) for piece in tokens(formula))


def _moved(piece: Token, rows: int, columns: int) -> str:
    if piece.kind != "reference":
        return piece.text
    sheet, mark, area = piece.text.rpartition("!")
    ends = [_moved_end(end, rows, columns) for end in area.split(":")]
    return sheet + mark + ":".join(ends)


def _moved_end(end: str, rows: int, columns: int) -> str:
    match = _END.fullmatch(end)
    if match is None:
        return end
    fixed_column, letters, fixed_row, row = match.groups()
    if letters is None:  # a whole row: its mark was read as the column's
        fixed_row, fixed_column = fixed_column or fixed_row, ""
    if letters and not fixed_column:
        letters = column_letters((column_number(letters) + columns - 1) % LAST_COLUMN + 1)
    if row and not fixed_row:
        row = str((int(row) + rows - 1) % LAST_ROW + 1)
    return f"{fixed_column}{letters or ''}{fixed_row}{row or ''}"
