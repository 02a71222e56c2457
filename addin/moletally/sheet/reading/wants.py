"""The want argument: a text, or a range of texts with a result of the same shape."""

from dataclasses import dataclass
from functools import lru_cache

from moletally.chemistry.errors import InputError, Place, SheetError
from moletally.sheet.cells import Argument, Cell
from moletally.sheet.reading.grid import as_block, is_empty
from moletally.sheet.reading.numbers import is_blank, refuse_odd

__all__ = ["Wants", "read_wants", "want_place"]


@dataclass(frozen=True, slots=True)
class Wants:
    """Texts in reading order (None: a blank cell, an error: a cell that is no text) and their shape."""

    texts: tuple[str | SheetError | None, ...]
    shape: tuple[int, int]


def read_wants(argument: Argument) -> Wants | None:
    """None where the argument is left out or blank."""
    if isinstance(argument, str):
        return _one(argument)
    if is_empty(argument):
        return None
    block = as_block(argument, Place("want"))
    shape = (len(block), len(block[0]))
    cells = [cell for row in block for cell in row]
    return Wants(tuple(_text(cell, want_place(i, shape)) for i, cell in enumerate(cells)), shape)


@lru_cache(maxsize=4096)
def _one(text: str) -> Wants | None:
    return Wants((text.strip(),), (1, 1)) if text.strip() else None


def want_place(index: int, shape: tuple[int, int]) -> Place:
    """Where a want stands in its range."""
    row, column = divmod(index, shape[1])
    return Place("want") if shape == (1, 1) else Place("want", row + 1, column + 1)


def _text(cell: Cell, place: Place) -> str | SheetError | None:
    if is_blank(cell):
        return None
    try:
        refuse_odd(cell, place, "a text")
    except SheetError as error:
        return error
    if isinstance(cell, str):
        return cell.strip()
    return InputError(f"the cell holds the number {cell:g}, where a text such as A/B belongs", place)
