"""The reactions table, a row per reaction; and the row's quantities, which other layouts share."""

from collections.abc import Iterable
from difflib import get_close_matches

from moletally.chemistry.equations import parse_equation
from moletally.chemistry.errors import InputError, SheetError, near_miss
from moletally.chemistry.tables import Number, ReactionRow, ReactionTable
from moletally.sheet.reading.columns import Column, Columns
from moletally.sheet.reading.grid import Grid, text_of
from moletally.sheet.reading.numbers import read_name, read_number

__all__ = ["QUANTITIES", "Numbers", "read_constants_of_row", "read_list", "read_rate"]

QUANTITIES = ("Rate", "k", "k0", "E", "T ref", "Keq", "Keq T ref", "dH", "dH T ref")
TABLE = "Reactions"


class Numbers:
    """The numbers of a call's reactions and constants, in slots: structure apart from value."""

    def __init__(self, before: Iterable[float] = ()) -> None:
        self.values: list[float] = list(before)

    def put(self, columns: Columns, column: Column, row: int) -> Number:
        """Read the number of a column in a row."""
        place = columns.place(row, column)
        unit = columns.unit(column, row)
        self.values.append(read_number(columns.grid.cells[row][column.index], place))
        return Number(len(self.values) - 1, unit, place)


def read_list(grid: Grid, numbers: Numbers) -> ReactionTable:
    """A table with a column `Reaction`."""
    grid.check_rows()
    columns = Columns(grid, ("Reaction", *QUANTITIES))
    equations = columns.by_name.get("Reaction")
    if equations is None:
        hint = near_miss("Reaction", columns.by_name)
        raise InputError(f"the header row has no column 'Reaction'. {hint}", grid.place(0, 0, ""))
    rows = []
    for i in range(1, len(grid.cells)):
        place = columns.place(i, equations)
        text = read_name(grid.cells[i][equations.index], place)
        try:
            equation = parse_equation(text)
        except SheetError as error:
            raise error.at(place) from None
        rows.append(
            ReactionRow(
                label=str(i),
                equation=equation,
                rate=read_rate(columns, i),
                constants=read_constants_of_row(columns, i, numbers, ("Reaction", "Rate")),
                place=place,
                rate_place=columns.place(i, columns.by_name.get("Rate", equations)),
            )
        )
    if not rows:
        raise InputError("the table has a header row but no reaction", grid.place(0, 0, ""))
    return ReactionTable(tuple(rows))


def read_rate(columns: Columns, row: int) -> str:
    """The rate law as typed; "" where it is blank or has no column."""
    column = columns.by_name.get("Rate")
    if column is None:
        return ""
    if column.unit or column.unit_column is not None:
        raise InputError(
            "a Rate has no unit of its own, it follows from those of its constants: leave the unit out",
            columns.grid.place(0, column.index, column.header),
        )
    return text_of(columns.grid.cells[row][column.index], columns.place(row, column)) or ""


def read_constants_of_row(
    columns: Columns, row: int, numbers: Numbers, texts: tuple[str, ...]
) -> tuple[tuple[str, Number], ...]:
    """The numbers of a row by name; a blank cell is a constant that this row does not have.

    texts : the columns that hold no numbers
    An empty text is not blank: a formula was to give a number there, and it gave none.
    """
    cells = columns.grid.cells[row]
    return tuple(
        (column.name, _number(columns, column, row, numbers))
        for column in columns.by_name.values()
        if column.name not in texts and cells[column.index] is not None
    )


def _number(columns: Columns, column: Column, row: int, numbers: Numbers) -> Number:
    """A constant's number; where a text stands under a header that is almost `Rate`, the header is to blame."""
    try:
        return numbers.put(columns, column, row)
    except InputError as error:
        if not get_close_matches(column.name.casefold(), ("rate",), cutoff=0.6):
            raise
        raise InputError(
            f"{error.what}. Is the header {column.name!r} meant to be 'Rate'?", error.place
        ) from None
