"""The species-and-reaction table: species in rows and reactions in columns, or turned on its side.

It is read on its side: a header row `Species | A | B | … | Rate | k | …`, then the rows of the feed
(`Feed [mol/L]`, `Start`, …), then a row per reaction with its coefficients and quantities.
"""

from moletally.chemistry.equations import write_equation
from moletally.chemistry.errors import InputError
from moletally.chemistry.tables import Equation, FeedTable, ReactionRow, ReactionTable
from moletally.sheet.reading.columns import Columns
from moletally.sheet.reading.feed import ATTRIBUTES, is_feed, read_feed
from moletally.sheet.reading.grid import Grid, fold, split_header
from moletally.sheet.reading.numbers import is_blank, number_text, read_name, read_number, symbol
from moletally.sheet.reading.reactions import QUANTITIES, Numbers, read_constants_of_row, read_rate

__all__ = ["is_matrix", "read_matrix"]

FIRST_QUANTITIES = ("rate", "k", "k0")
SPECIES_KEYS = frozenset(
    fold(name) for name in (*ATTRIBUTES, *(f"{a} unit" for a in ATTRIBUTES), "Unit", "Feed unit")
)


def is_matrix(grid: Grid) -> bool:
    """True for a table whose first header is `Species`."""
    first = grid.cells[0][0]
    return isinstance(first, str) and fold(split_header(first)[0]) == "species"


def read_matrix(grid: Grid, numbers: Numbers) -> tuple[ReactionTable, FeedTable | None]:
    """Reactions and the feed of the table; None where it has no Feed column."""
    grid.check_rows()
    side = _on_its_side(grid)
    side.check_rows()
    names = _species(side)
    after = _first_reaction(side)
    feed = None
    head = Grid(side.table, tuple(row[: len(names) + 1] for row in side.cells[:after]), side.turned)
    if any(is_feed(_label(head, i)) for i in range(1, after)):
        feed = read_feed(head.turn(), blank_is_zero=True)
        if len(feed.streams) > 1:
            raise InputError("one Feed column only: for several streams give a feed table as second argument",
                             side.place(1, 0, "Feed"))  # fmt: skip
    _check_corner(side, after, len(names) + 1)
    columns = Columns(side, QUANTITIES, first=len(names) + 1)
    rows = tuple(_reaction(side, i, names, columns, numbers) for i in range(after, len(side.cells)))
    if not rows:
        raise InputError("the table has no reaction column", side.place(0, 0, ""))
    _check_labels(rows)
    return ReactionTable(rows), feed


def _check_corner(side: Grid, after: int, first: int) -> None:
    """Raise at what stands where a species' column crosses a reaction's quantity: it belongs to neither."""
    for i in range(1, after):
        for j in range(first, len(side.cells[0])):
            if not is_blank(side.cells[i][j]):
                raise InputError(
                    f"nothing belongs here: {_label(side.turn(), j)!r} is a quantity of the reactions"
                    " (the flow of the feed stands in the reactor's block)",
                    side.place(i, j, ""),
                )


def _check_labels(rows: tuple[ReactionRow, ...]) -> None:
    seen: set[str] = set()
    for row in rows:
        if row.label in seen:
            raise InputError(
                f"the reaction {row.label!r} stands twice: give each a name of its own", row.place
            )
        seen.add(row.label)


def _on_its_side(grid: Grid) -> Grid:
    """Turned so that the reactions are rows."""
    down = [_label(grid, i) for i in range(len(grid.cells))]
    turned = grid.turn()
    across = [_label(turned, j) for j in range(len(turned.cells))]
    for recognised in (is_feed, lambda label: _key(label) in FIRST_QUANTITIES):
        in_rows, in_columns = any(map(recognised, down[1:])), any(map(recognised, across[1:]))
        if in_rows != in_columns:
            quantities = recognised is not is_feed
            return turned if in_rows == quantities else grid
    raise InputError("no row named Rate, k or k0 ends the species: is it a species-and-reaction table?",
                     grid.place(0, 0, ""))  # fmt: skip


def _label(grid: Grid, row: int) -> str:
    cell = grid.cells[row][0]
    return cell if isinstance(cell, str) else ""


def _key(label: str) -> str:
    return fold(split_header(label)[0])


def _species(side: Grid) -> list[str]:
    names: list[str] = []
    for j in range(1, len(side.cells[0])):
        cell = side.cells[0][j]
        if isinstance(cell, str) and _key(cell) in FIRST_QUANTITIES:
            return names
        place = side.place(0, j, "Species")
        name = symbol(cell, place)
        if name in names:
            raise InputError(f"the species {name!r} stands twice", place)
        names.append(name)
    raise InputError("no row named Rate, k or k0 ends the species", side.place(0, 0, ""))


def _first_reaction(side: Grid) -> int:
    """Index of the first row that is a reaction, after the feed and what belongs to the species."""
    for i in range(1, len(side.cells)):
        label = _label(side, i)
        if not (is_feed(label) or _key(label) in SPECIES_KEYS):
            return i
    return len(side.cells)


def _reaction(side: Grid, row: int, names: list[str], columns: Columns, numbers: Numbers) -> ReactionRow:
    place = side.place(row, 0, "")
    label = side.cells[row][0]
    text = (
        number_text(label)
        if isinstance(label, float | int) and not isinstance(label, bool)
        else read_name(label, place)
    )
    left: dict[str, float] = {}
    right: dict[str, float] = {}
    for j, name in enumerate(names, start=1):
        cell = side.cells[row][j]
        value = 0.0 if cell is None else read_number(cell, side.place(row, j, text))
        if value:
            (left if value < 0 else right)[name] = abs(value)
    constants = read_constants_of_row(columns, row, numbers, ("Rate",))
    reversible = any(name == "Keq" for name, _ in constants)
    if not left and not right:
        raise InputError(f"the reaction {text!r} has no coefficient", place)
    equation = Equation(
        tuple(left.items()), tuple(right.items()), reversible, write_equation(left, right, reversible)
    )
    rate = columns.by_name.get("Rate")
    rate_place = columns.place(row, rate) if rate else place
    return ReactionRow(text, equation, read_rate(columns, row), constants, place, rate_place)
