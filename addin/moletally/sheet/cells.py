"""Cells as every host hands them in and takes them back.

A cell is a float, a text, a bool, a date, an `ExcelError`, or None for a blank one. An argument is a
`Block` (a range, always two-dimensional), a single cell value typed into the formula, or `OMITTED`.
Omitted, blank, "" and 0 are four different things; a host that blurs them mends it before it calls.
"""

import datetime as dt
from dataclasses import dataclass
from typing import Final, TypeAlias

__all__ = ["OMITTED", "Argument", "Block", "Cell", "ExcelError", "Omitted"]


@dataclass(frozen=True, slots=True)
class ExcelError:
    """A true Excel error: `code` is its text, `#VALUE!`, `#NUM!`, `#N/A`, `#DIV/0!`, ..."""

    code: str

    def __str__(self) -> str:
        return self.code


class Omitted:
    """The type of `OMITTED`."""

    __slots__ = ()

    def __repr__(self) -> str:
        return "OMITTED"


OMITTED: Final = Omitted()  # an argument left out, or an empty place between two commas

Cell: TypeAlias = float | str | bool | dt.date | dt.datetime | ExcelError | None
Block: TypeAlias = tuple[tuple[Cell, ...], ...]
Argument: TypeAlias = Block | Cell | Omitted
