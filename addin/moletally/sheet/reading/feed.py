"""The feed table: a row per species, a column per stream, and the streams' own rows below."""

import re
from dataclasses import dataclass

from moletally.chemistry.errors import InputError, near_miss
from moletally.chemistry.tables import FeedTable, Quantity, SpeciesRow, Stream
from moletally.sheet.reading.columns import Column, Columns
from moletally.sheet.reading.grid import Grid, fold, split_header, text_of
from moletally.sheet.reading.numbers import is_blank, read_name, read_number, symbol

__all__ = ["ATTRIBUTES", "is_feed", "read_feed"]

ATTRIBUTES = ("Start", "Formula", "MW", "Cp", "Cp slope")
FEED = re.compile(r"feed(?:[\s_.]+(?P<stream>.*))?", re.IGNORECASE)
STREAM_ROWS = {"flow": "flow", "temperature": "temperature", "pressure": "pressure"}


def is_feed(header: str) -> bool:
    """True for `Feed`, `Feed [mol/L]`, `Feed acid`, but not for `Feed unit`."""
    name = split_header(header)[0]
    return FEED.fullmatch(name) is not None and fold(name) != "feedunit"


@dataclass(frozen=True, slots=True)
class _Reader:
    grid: Grid
    columns: Columns
    blank_is_zero: bool

    def quantity(self, row: int, column: Column) -> Quantity:
        """A number with its unit."""
        place = self.columns.place(row, column)
        cell = self.grid.cells[row][column.index]
        if cell is None and self.blank_is_zero:
            return Quantity(0.0, self.columns.unit(column, row), place)
        return Quantity(read_number(cell, place), self.columns.unit(column, row), place)

    def optional(self, row: int, name: str) -> Quantity | None:
        """A number that may be blank."""
        column = self.columns.by_name.get(name)
        if column is None or self.grid.cells[row][column.index] is None:
            return None
        return self.quantity(row, column)

    def shared_unit(self, row: int) -> str | None:
        """The unit in a column that serves all streams."""
        return self.text(row, "Unit") or self.text(row, "Feed unit")

    def text(self, row: int, name: str) -> str | None:
        """A text that may be blank."""
        column = self.columns.by_name.get(name)
        return None if column is None else text_of(
            self.grid.cells[row][column.index], self.columns.place(row, column))  # fmt: skip


def read_feed(grid: Grid, blank_is_zero: bool = False) -> FeedTable:
    """Species in order, their streams, and what is known of each.

    blank_is_zero : in a species-and-reaction table a blank feed is none; in a feed table it is an error
    """
    grid.check_rows()
    columns = Columns(grid, ("Species", "Feed", "Unit", "Feed unit", *ATTRIBUTES))
    streams = [c for c in columns.by_name.values() if is_feed(c.header)]
    _check_headers(grid, columns, streams)
    reader = _Reader(grid, columns, blank_is_zero)
    last = _species_end(grid, columns)
    rows = tuple(_species_row(reader, i, streams) for i in range(1, last))
    _check_names(rows)
    below = _stream_rows(reader, last, streams)
    return FeedTable(
        rows, tuple(Stream(_stream_name(c), columns.place(0, c), **below.get(c.name, {})) for c in streams)
    )


def _stream_name(column: Column) -> str:
    match = FEED.fullmatch(split_header(column.header)[0])
    return (match and match["stream"]) or "feed"


def _check_headers(grid: Grid, columns: Columns, streams: list[Column]) -> None:
    known = {"Species", "Unit", "Feed unit", *ATTRIBUTES, *(c.name for c in streams)}
    for column in columns.by_name.values():
        if column.name not in known:
            hint = near_miss(column.name, ["Species", "Feed", *ATTRIBUTES])
            raise InputError(f"unknown column {column.name!r}. {hint}", columns.place(0, column))
    for name, there in (("Species", "Species" in columns.by_name), ("Feed", bool(streams))):
        if not there:
            raise InputError(f"the header row has no column {name!r}", grid.place(0, 0, ""))
    seen: set[str] = set()
    for stream in streams:
        name = fold(_stream_name(stream))
        if name in seen:
            raise InputError(f"the stream {_stream_name(stream)!r} stands twice", columns.place(0, stream))
        seen.add(name)


def _species_end(grid: Grid, columns: Columns) -> int:
    """Index of the first row below the species."""
    index = columns.by_name["Species"].index
    for i in range(1, len(grid.cells)):
        cell = grid.cells[i][index]
        if isinstance(cell, str) and fold(split_header(cell)[0]) in STREAM_ROWS:
            return i
    return len(grid.cells)


def _species_row(reader: _Reader, row: int, streams: list[Column]) -> SpeciesRow:
    column = reader.columns.by_name["Species"]
    place = reader.columns.place(row, column)
    return SpeciesRow(
        name=symbol(reader.grid.cells[row][column.index], place),
        feed=tuple(_amount(reader, row, stream) for stream in streams),
        place=place,
        start=reader.optional(row, "Start"),
        formula=reader.text(row, "Formula"),
        molar_mass=reader.optional(row, "MW"),
        heat_capacity=reader.optional(row, "Cp"),
        heat_capacity_slope=reader.optional(row, "Cp slope"),
    )


def _amount(reader: _Reader, row: int, stream: Column) -> Quantity:
    """The feed of a species; a column `Unit` holds the unit of all streams."""
    found = reader.quantity(row, stream)
    shared = reader.shared_unit(row)
    if shared is None:
        return found
    if found.unit and found.unit != shared:
        raise InputError(f"two units, {found.unit!r} and {shared!r}", found.place)
    return Quantity(found.value, shared, found.place)


def _check_names(rows: tuple[SpeciesRow, ...]) -> None:
    seen: dict[str, SpeciesRow] = {}
    for row in rows:
        if row.name in seen:
            raise InputError(
                f"the species {row.name!r} stands twice (first in row {seen[row.name].place.row})", row.place
            )
        seen[row.name] = row


def _stream_rows(reader: _Reader, first: int, streams: list[Column]) -> dict[str, dict[str, Quantity]]:
    """Flow, temperature and pressure of each stream, by column name."""
    found: dict[str, dict[str, Quantity]] = {stream.name: {} for stream in streams}
    grid, index = reader.grid, reader.columns.by_name["Species"].index
    units = {stream.unit_column for stream in streams} | {
        reader.columns.by_name[name].index for name in ("Unit", "Feed unit") if name in reader.columns.by_name
    }
    theirs = {index, *(stream.index for stream in streams), *units}
    for i in range(first, len(grid.cells)):
        place = grid.place(i, index, "Species")
        label, unit = split_header(read_name(grid.cells[i][index], place))
        key = STREAM_ROWS.get(fold(label))
        if key is None:
            raise InputError(f"{label!r} stands below the rows of the streams: species come first", place)
        for j, cell in enumerate(grid.cells[i]):
            if j not in theirs and not is_blank(cell):
                raise InputError(
                    f"nothing belongs here: {label} is a row of the streams", grid.place(i, j, "")
                )
        for stream in streams:
            cell, where = grid.cells[i][stream.index], grid.place(i, stream.index, label)
            if cell is None:
                continue
            if key in found[stream.name]:
                raise InputError(f"{label} stands twice", where)
            found[stream.name][key] = Quantity(
                read_number(cell, where), _stream_unit(reader, i, stream, unit), where
            )
    return found


def _stream_unit(reader: _Reader, row: int, stream: Column, behind: str | None) -> str | None:
    """The unit of a stream's quantity: behind its label or in a column of units, not the feed's header."""
    own = reader.shared_unit(row)
    if own is None and stream.unit_column is not None:
        own = text_of(reader.grid.cells[row][stream.unit_column], reader.columns.place(row, stream))
    if own and behind and own != behind:
        raise InputError(f"two units, {behind!r} and {own!r}", reader.columns.place(row, stream))
    return own or behind
