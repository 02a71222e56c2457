"""The tables of one call, whatever their layout: reactions, feed, constants."""

import marshal
from dataclasses import dataclass
from functools import cached_property, lru_cache
from typing import Any

from moletally.chemistry.errors import InputError, Place
from moletally.chemistry.tables import ConstantRow, FeedTable, ReactionTable
from moletally.sheet.cells import OMITTED, Argument
from moletally.sheet.reading.constants import read_constants
from moletally.sheet.reading.feed import read_feed
from moletally.sheet.reading.grid import Grid, is_empty
from moletally.sheet.reading.matrix import is_matrix, read_matrix
from moletally.sheet.reading.reactions import Numbers, read_list

__all__ = ["Tables", "read_tables"]

MOST_ROWS = 2000  # of a range that is remembered: whole columns would fill the memory


@dataclass(frozen=True, eq=False)
class Tables:
    """What the tables say; `numbers` fills the slots of `reactions` and `constants`."""

    reactions: ReactionTable
    constants: tuple[ConstantRow, ...]
    feed: FeedTable
    numbers: tuple[float, ...]

    @cached_property
    def labels(self) -> tuple[str, ...]:
        """Labels of these tables that a reactor may carry: in(A), K_A, k(2)."""
        labels = [f"in({name})" for name in self.feed.names] + [row.name for row in self.constants]
        for number, row in enumerate(self.reactions.rows, start=1):
            labels += [f"{name}({number})" for name, _ in row.constants]
            labels += [name for name, _ in row.constants if name not in labels]
        return tuple(labels)


def read_tables(reactions: Argument, feed: Argument, constants: Argument) -> Tables:
    """Read a reactions table with a feed table, or a species-and-reaction table in either orientation.

    Tables that were read lately are remembered: the cells of a sheet ask many questions of the same ones.

    Raises
    ------
    SheetError
        With the place: table, row and column of the range, header.
    """
    plain: list[Any] = []
    for argument in (reactions, feed, constants):
        if isinstance(argument, tuple) and len(argument) > MOST_ROWS:
            return _read(reactions, feed, constants)
        plain.append(... if argument is OMITTED else argument)
    try:
        # Bytes, because TRUE and 1 are equal as cells but not as content; version 2 does not depend on identity.
        key = marshal.dumps(plain, 2)
    except ValueError:  # dates and error values: rare, and refused anyway
        return _read(reactions, feed, constants)
    return _remembered(key)


@lru_cache(maxsize=256)
def _remembered(key: bytes) -> Tables:
    reactions, feed, constants = (OMITTED if a is ... else a for a in marshal.loads(key))
    return _read(reactions, feed, constants)


def _read(reactions: Argument, feed: Argument, constants: Argument) -> Tables:
    if is_empty(reactions):
        raise InputError("the reactions are missing: give the range of their table", Place("Reactions"))
    numbers = Numbers()
    grid = Grid.of("Reactions", reactions)
    own: FeedTable | None = None
    if is_matrix(grid):
        table, own = read_matrix(grid, numbers)
    else:
        table = read_list(grid, numbers)
    given = own if is_empty(feed) else read_feed(Grid.of("Feed", feed))
    if given is None:
        raise InputError(
            "the feed is missing: give the range of the feed table as second argument", Place("Feed")
        )
    rows = () if is_empty(constants) else read_constants(Grid.of("Constants", constants), numbers)
    return Tables(table, rows, given, tuple(numbers.values))
