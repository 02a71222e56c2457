"""What a worksheet function gives back: a block of cells, and a reason for each cell that is an error."""

from collections.abc import Sequence
from dataclasses import dataclass

from moletally.chemistry.errors import SheetError
from moletally.sheet.cells import Block, Cell, ExcelError

__all__ = ["Outcome", "Problem", "failed", "outcome"]


@dataclass(frozen=True, slots=True)
class Problem:
    """Why the cell at `row`, `column` (0-based in the block) shows the error `code`."""

    row: int
    column: int
    code: str
    reason: str


@dataclass(frozen=True, slots=True)
class Outcome:
    """The answer of one call: always a rectangle, with a problem for each of our errors in it."""

    block: Block
    problems: tuple[Problem, ...] = ()


def outcome(rows: Sequence[Sequence[Cell | SheetError]]) -> Outcome:
    """A block from cells; an error in it becomes a true Excel error and a problem."""
    problems = tuple(
        Problem(i, j, value.code, value.reason)
        for i, row in enumerate(rows)
        for j, value in enumerate(row)
        if isinstance(value, SheetError)
    )
    return Outcome(tuple([tuple([_shown(value) for value in row]) for row in rows]), problems)


def _shown(value: Cell | SheetError) -> Cell:
    return ExcelError(value.code) if isinstance(value, SheetError) else value


def failed(error: SheetError) -> Outcome:
    """The outcome of a call that has no answer at all."""
    return outcome([[error]])
