"""Every call of ours in a book, audited: MOLE_AUDIT with the arguments the call has on its sheet."""

from collections.abc import Iterator
from dataclasses import dataclass

from moletally.hosts.headless.book import Book
from moletally.hosts.headless.calculate import calculate
from moletally.hosts.headless.references import Rect, address
from moletally.sheet.cells import Argument
from moletally.sheet.functions import call

__all__ = ["CallAudit", "audit_book"]


@dataclass(frozen=True, slots=True)
class CallAudit:
    """The findings of one call: (level, where, what) rows, the verdict first."""

    cell: str
    function: str
    rows: tuple[tuple[str, str, str], ...]


def audit_book(book: Book) -> Iterator[CallAudit]:
    """Audit every call in the order of the book."""
    calculation = calculate(book)
    for result in calculation.results:
        place = Rect(
            result.cell.sheet, result.cell.row, result.cell.column, result.cell.row, result.cell.column
        )
        for asked in result.asked:
            yield CallAudit(address(place), asked.function, _rows(asked.function, asked.arguments))
        if result.stale and result.calls:
            yield CallAudit(
                address(place), result.calls[0], (("stop", address(place), f"stale: {result.stale}"),)
            )


def _rows(name: str, args: tuple[Argument, ...]) -> tuple[tuple[str, str, str], ...]:
    given = args if name == "MOLE_AUDIT" else (name.removeprefix("MOLE_"), *args)
    block = call("MOLE_AUDIT", given).block
    return tuple((str(row[0]), str(row[1]), str(row[2])) for row in block if len(row) == 3)
