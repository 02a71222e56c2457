"""A range without what is empty around it, and the place of each of its cells."""

import re
from dataclasses import dataclass
from functools import lru_cache

from moletally.chemistry.errors import InputError, Place
from moletally.sheet.cells import Argument, Block, Cell, ExcelError, Omitted
from moletally.sheet.reading.numbers import LONGEST, check_length, is_blank, number_text, refuse_odd

__all__ = ["Grid", "as_block", "fold", "is_empty", "split_header", "text_of", "trimmed"]
BEHIND = re.compile(
    r"(?P<name>.*?)\s*(?:\[(?P<square>[^\[\]]*)\]|\((?P<round>[^()]*(?:\([^()]*\)[^()]*)*)\))"
)


@lru_cache(maxsize=4096)
def fold(text: str) -> str:
    """A fixed header as it is compared: without case, blanks, `_` and `.`; `K` is not `k`."""
    bare = "".join(c for c in text if c not in " _.\t\n\u00a0")
    return bare if bare in ("k", "K") else bare.casefold()


@lru_cache(maxsize=4096)
def split_header(text: str) -> tuple[str, str | None]:
    """`Feed [mol/L]` -> (`Feed`, `mol/L`); `in(A)`, `k(2)` and `b(A)` keep their parentheses."""
    stripped = " ".join(text.split())
    match = BEHIND.fullmatch(stripped) if len(stripped) <= LONGEST else None
    if match is None or not match["name"]:
        return stripped, None
    if match["square"] is not None:
        return match["name"], match["square"].strip() or None
    # `in(A)` is a label of its own, `Feed (mol/L)` and `k(1/h)` a name and a unit.
    return (stripped, None) if _is_label(match["name"], match["round"]) else (match["name"], match["round"])


def _is_label(name: str, inside: str) -> bool:
    return name in ("in", "b", "p", "x") or inside.strip().isdigit()


def is_empty(argument: Argument) -> bool:
    """True for an argument that is left out, a blank cell, an empty text or a range of such."""
    if isinstance(argument, Omitted):
        return True
    if isinstance(argument, tuple):
        return all(map(_is_blank_row, argument))
    return is_blank(argument)


def as_block(argument: Argument, place: Place) -> Block:
    """A range; a single cell is one of 1 x 1."""
    if isinstance(argument, Omitted):
        raise InputError("the argument is missing", place)
    return argument if isinstance(argument, tuple) else ((argument,),)


def trimmed(block: Block) -> Block:
    """Without blank rows at the end and blank columns at the right."""
    last = len(block)
    while last and _is_blank_row(block[last - 1]):
        last -= 1
    width = max((_width(row) for row in block[:last]), default=0)
    return tuple(row[:width] for row in block[:last])


def _is_blank_row(row: tuple[Cell, ...]) -> bool:
    # Counted first: a whole column is a million such rows.
    return row.count(None) == len(row) or all(map(is_blank, row))


def _width(row: tuple[Cell, ...]) -> int:
    width = len(row)
    while width and is_blank(row[width - 1]):
        width -= 1
    return width


@dataclass(frozen=True, slots=True)
class Grid:
    """A trimmed table; `turned` if rows and columns were exchanged to read it."""

    table: str
    cells: Block
    turned: bool = False

    @classmethod
    def of(cls, table: str, argument: Argument) -> "Grid":
        """The grid of an argument; a table has a header row and no blank row inside."""
        place = Place(table)
        block = as_block(argument, place)
        cells = trimmed(block)
        if not cells:
            raise InputError("the range is empty", place)
        grid = cls(table, cells)
        grid.check_errors()
        return grid

    def turn(self) -> "Grid":
        """Rows and columns exchanged."""
        return Grid(self.table, tuple(zip(*self.cells, strict=True)), not self.turned)

    def check_errors(self) -> None:
        """Raise at the first error value: it takes all cells, whatever else is wrong with the table."""
        for i, row in enumerate(self.cells):
            for j, cell in enumerate(row):
                if isinstance(cell, ExcelError):
                    head = self.cells[0][j] if i else None
                    name = split_header(head)[0] if isinstance(head, str) else ""
                    refuse_odd(cell, self.place(i, j, name), "a table")

    def check_rows(self) -> None:
        """Raise at the first blank row inside."""
        for i, row in enumerate(self.cells):
            if _is_blank_row(row):
                line = "column" if self.turned else "row"
                raise InputError(f"a blank {line} inside the table: delete it, or end the range above it",
                                 self.place(i, 0, ""))  # fmt: skip

    def place(self, row: int, column: int, header: str) -> Place:
        """The place of a cell, counted in the range as it was given."""
        if self.turned:
            return Place(self.table, column + 1, row + 1, header)
        return Place(self.table, row + 1, column + 1, header)

    def headers(self) -> list[str]:
        """The header row as texts; blank headers over blank columns are skipped with ""."""
        return [self.header(0, j) for j in range(len(self.cells[0]))]

    def header(self, row: int, column: int) -> str:
        """A header or label cell as text."""
        cell = self.cells[row][column]
        place = self.place(row, column, "")
        if is_blank(cell):
            if any(not is_blank(line[column]) for line in self.cells[row + 1 :]):
                raise InputError(f"the {'row' if self.turned else 'column'} has no header", place)
            return ""
        refuse_odd(cell, place, "a header")
        if isinstance(cell, float | int):
            return number_text(cell)
        assert isinstance(cell, str)
        return check_length(cell, place, "a header")


def text_of(cell: Cell, place: Place) -> str | None:
    """A free text such as a unit or a formula; None if blank."""
    if is_blank(cell):
        return None
    if isinstance(cell, float | int) and not isinstance(cell, bool):
        return number_text(cell)
    refuse_odd(cell, place, "a text")
    assert isinstance(cell, str)
    return cell.strip()
