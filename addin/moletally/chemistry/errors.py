"""What a worksheet user can cause and mend: errors and findings that carry fields, worded last."""

from collections.abc import Iterable
from dataclasses import dataclass
from difflib import get_close_matches
from enum import StrEnum

__all__ = ["Finding", "InputError", "Level", "NoAnswer", "Place", "SheetError", "Undefined", "near_miss"]


@dataclass(frozen=True, slots=True)
class Place:
    """Where something stands: a table, and a row and column of its range (1-based, 0 = the whole)."""

    table: str
    row: int = 0
    column: int = 0
    header: str = ""

    def __str__(self) -> str:
        parts = [self.table]
        if self.row:
            parts.append(f"row {self.row}")
        text = " ".join(parts)
        if self.header:
            text += f", {self.header}"
        if self.column:
            text += f" (column {self.column})"
        return text


class Level(StrEnum):
    """How much a finding matters, worst first."""

    STOP = "stop"
    DOUBT = "doubt"
    NOTE = "note"
    FINE = "fine"


@dataclass(frozen=True, slots=True)
class Finding:
    """A remark on a table or an answer; `text` says what and what to do."""

    level: Level
    where: str
    text: str


class SheetError(Exception):
    """Base of all errors that end in a cell: `code` is the cell's error, `reason` the words beside it."""

    code = "#VALUE!"

    def __init__(self, what: str, place: Place | None = None) -> None:
        super().__init__(what, place)  # keeps the error picklable
        self.what = what
        self.place = place

    @property
    def reason(self) -> str:
        """Where, what, and what to do."""
        return f"{self.place}: {self.what}" if self.place else self.what

    def __str__(self) -> str:
        return self.reason

    def at(self, place: Place) -> "SheetError":
        """The same error with its place, filled in by the caller who knows it."""
        return self if self.place else type(self)(self.what, place)


class InputError(SheetError):
    """Mend the input: `#VALUE!`."""


class NoAnswer(SheetError):
    """There is no trustworthy answer: `#NUM!`."""

    code = "#NUM!"


class Undefined(SheetError):
    """The quantity is undefined, 0/0: `#N/A`."""

    code = "#N/A"


def near_miss(name: str, known: Iterable[str]) -> str:
    """A hint to append to "unknown …": the nearest known name, or the list of a few."""
    names = list(known)
    folded = {n.casefold(): n for n in names}
    near = folded.get(name.casefold()) or next(iter(get_close_matches(name, names, n=1, cutoff=0.5)), None)
    if near is not None:
        return f"Did you mean {near!r}?"
    shown = ", ".join(names[:12]) + (", …" if len(names) > 12 else "")
    return f"Known: {shown}." if names else ""
