"""The tables of one call, whatever their layout: reactions, feed, constants."""

from dataclasses import dataclass

from moletally.chemistry.errors import InputError, Place
from moletally.chemistry.tables import ConstantRow, FeedTable, ReactionTable
from moletally.sheet.cells import Argument
from moletally.sheet.reading.constants import read_constants
from moletally.sheet.reading.feed import read_feed
from moletally.sheet.reading.grid import Grid, is_empty
from moletally.sheet.reading.matrix import is_matrix, read_matrix
from moletally.sheet.reading.reactions import Numbers, read_list

__all__ = ["Tables", "read_tables"]


@dataclass(frozen=True, slots=True)
class Tables:
    """What the tables say; `numbers` fills the slots of `reactions` and `constants`."""

    reactions: ReactionTable
    constants: tuple[ConstantRow, ...]
    feed: FeedTable
    numbers: tuple[float, ...]


def read_tables(reactions: Argument, feed: Argument, constants: Argument) -> Tables:
    """Read a reactions table with a feed table, or a species-and-reaction table in either orientation.

    Raises
    ------
    SheetError
        With the place: table, row and column of the range, header.
    """
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
