"""What the templates ask when they are recalculated here, without Excel: the calls, and their answers."""

import datetime as dt
from functools import cache
from pathlib import Path

from moletally.hosts.headless.book import open_book
from moletally.hosts.headless.calculate import calculate
from moletally.sheet.cells import OMITTED, ExcelError
from moletally.sheet.functions import call

__all__ = ["BOOKS", "answer", "as_wire", "calls_of"]

BOOKS = sorted((Path(__file__).parents[3] / "workbook_templates").glob("*.xlsx"))


@cache
def calls_of(book: Path):
    """(function, arguments, outcome) of every call in a workbook."""
    made = []

    def noted(name, arguments):
        outcome = call(name, arguments)
        made.append((name, list(arguments), outcome))
        return outcome

    calculate(open_book(book), answer=noted)
    return made


def answer(name, arguments):
    """The block that a call gives here, errors by their text."""
    return [[c.code if isinstance(c, ExcelError) else c for c in row] for row in call(name, arguments).block]


def as_wire(argument, kind="block"):
    """An argument of the sheet layer as the clients take it."""
    if argument is OMITTED:
        return {"left out": True}
    if isinstance(argument, tuple):
        return {kind: [[_cell(c) for c in row] for row in argument]}
    return _cell(argument)


def _cell(cell):
    if isinstance(cell, ExcelError):
        return {"error": cell.code}
    if isinstance(cell, dt.date):
        return {"date": dt.datetime(*cell.timetuple()[:6]).isoformat()}
    return cell
