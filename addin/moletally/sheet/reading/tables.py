"""The tables of one call, whatever their layout: reactions, feed, constants."""

import marshal
from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property, lru_cache
from typing import Any, TypeVar

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
    return _tables(*[... if a is OMITTED else a for a in (reactions, feed, constants)])


Read = TypeVar("Read")


def _by_content(read: Callable[..., Read]) -> Callable[..., Read]:
    """`read`, which remembers what it made of the same content."""
    remembered = lru_cache(maxsize=256)(lambda key: read(*marshal.loads(key)))

    def by_content(*arguments: Any) -> Read:
        for argument in arguments:
            if type(argument) is tuple and len(argument) > MOST_ROWS:
                return read(*arguments)
        try:
            # Bytes, because TRUE and 1 are equal as cells but not as content; version 2 does not depend on identity.
            key = marshal.dumps(arguments, 2)
        except ValueError:  # dates and error values: rare, and refused anyway
            return read(*arguments)
        return remembered(key)

    return by_content


@_by_content
def _tables(*arguments: Any) -> Tables:
    """The tables of a call; what is left out comes as an ellipsis, which can be written as bytes."""
    reactions, feed, constants = (OMITTED if a is ... else a for a in arguments)
    if is_empty(reactions):
        raise InputError("the reactions are missing: give the range of their table", Place("Reactions"))
    table, own, values = _reactions(reactions)
    given = own if is_empty(feed) else _feed(feed)
    if given is None:
        raise InputError(
            "the feed is missing: give the range of the feed table as second argument", Place("Feed")
        )
    numbers = Numbers(values)
    rows = () if is_empty(constants) else read_constants(Grid.of("Constants", constants), numbers)
    return Tables(table, rows, given, tuple(numbers.values))


@_by_content
def _reactions(argument: Argument) -> tuple[ReactionTable, FeedTable | None, tuple[float, ...]]:
    """The reactions, the feed if their table holds it, and their numbers."""
    numbers = Numbers()
    grid = Grid.of("Reactions", argument)
    if is_matrix(grid):
        return (*read_matrix(grid, numbers), tuple(numbers.values))
    return read_list(grid, numbers), None, tuple(numbers.values)


@_by_content
def _feed(argument: Argument) -> FeedTable:
    return read_feed(Grid.of("Feed", argument))
