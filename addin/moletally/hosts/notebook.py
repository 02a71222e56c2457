"""The worksheet functions from Python: tables as DataFrames in, results as DataFrames out."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING, TypeAlias

from moletally.chemistry.errors import SheetError
from moletally.sheet.cells import OMITTED, Argument, Block, Cell, ExcelError
from moletally.sheet.functions import call
from moletally.sheet.outcome import Outcome

if TYPE_CHECKING:
    import pandas as pd

__all__ = ["BalanceError", "audit", "profile", "rates", "solve"]

Table: TypeAlias = "pd.DataFrame | Sequence[Sequence[object]]"
Reactor: TypeAlias = "float | Sequence[float] | Mapping[str, object] | pd.DataFrame"


class BalanceError(SheetError):
    """A call that has no answer in any of its cells; the message is the reason a cell would give."""


def solve(
    kind: str,
    reactions: Table,
    feed: Table | None,
    reactor: Reactor,
    want: str | Sequence[str] | None = None,
    constants: Table | None = None,
) -> pd.DataFrame:
    """Outlet of a vessel: a row per case, a column per species or want.

    Parameters
    ----------
    kind : "CSTR" or "PFR"
    reactions, feed, constants : DataFrame (its columns are the header row) or rows of cells
    reactor : residence time, a sequence of them, {label: value or (value, unit)}, or a DataFrame of cases
    want : text or texts, such as "Mono/Di"; None: outlet concentration of every species, in the feed's unit

    Returns
    -------
    DataFrame; a failed cell is NaN and its reason is listed in `attrs["problems"]`

    Raises
    ------
    BalanceError
        If no cell has an answer; the message says where, what and what to do.
    """
    wants = None if want is None else (want,) if isinstance(want, str) else tuple(want)
    arguments = [_table(reactions), _optional(feed), _reactor(reactor)]
    # One row of wants and a table of cases give a rectangle with a row per case.
    asked: Argument = OMITTED if wants is None else (wants,)
    outcome = call(f"MOLE_{kind.upper()}", [*arguments, asked, _optional(constants)])
    columns = list(wants) if wants is not None else _species(feed if feed is not None else reactions)
    block = outcome.block
    if len(columns) != len(block[0]) and len(block[0]) == 1:
        block = (tuple(row[0] for row in block),)
    elif len(columns) == 1 and len(block) == 1:
        block = tuple((cell,) for cell in block[0])
    return _frame(outcome, block, columns)


def profile(
    reactions: Table,
    feed: Table | None,
    reactor: Reactor,
    points: int = 51,
    want: str | Sequence[str] | None = None,
    constants: Table | None = None,
) -> pd.DataFrame:
    """Concentrations along a tube: a row per point; arguments as for `solve`."""
    wants: Argument = OMITTED if want is None else ((want,) if isinstance(want, str) else tuple(want),)
    outcome = call(
        "MOLE_PROFILE",
        [_table(reactions), _optional(feed), _reactor(reactor), float(points), wants, _optional(constants)],
    )
    return _headed(outcome)


def rates(
    reactions: Table, at: Table | None, reactor: Reactor | None = None, constants: Table | None = None
) -> pd.DataFrame:
    """Rates of the reactions and of the species at the concentrations in `at`."""
    block = OMITTED if reactor is None else _reactor(reactor)
    return _headed(call("MOLE_RATES", [_table(reactions), _optional(at), block, _optional(constants)]))


def audit(
    kind: str,
    reactions: Table,
    feed: Table | None,
    reactor: Reactor,
    want: str | Sequence[str] | None = None,
    constants: Table | None = None,
) -> pd.DataFrame:
    """What was read, assumed, checked and found doubtful; columns level, where, what."""
    import pandas as pd

    wants: Argument = OMITTED if want is None else ((want,) if isinstance(want, str) else tuple(want),)
    arguments = [kind, _table(reactions), _optional(feed), _reactor(reactor), wants, _optional(constants)]
    return pd.DataFrame(list(call("MOLE_AUDIT", arguments).block), columns=["level", "where", "what"])


def _cell(value: object) -> Cell:
    """A Python value as a cell: numbers of any kind are floats, missing ones blank."""
    import pandas as pd

    if value is None or (isinstance(value, float) and value != value) or value is pd.NaT:
        return None
    if isinstance(value, bool | str):
        return value
    if hasattr(value, "item"):  # numpy scalars
        return _cell(value.item())
    return float(value) if isinstance(value, int | float) else str(value)


def _table(table: Table) -> Block:
    import pandas as pd

    if isinstance(table, pd.DataFrame):
        head: tuple[Cell, ...] = tuple(str(c) for c in table.columns)
        return (head, *(tuple(_cell(v) for v in row) for row in table.itertuples(index=False, name=None)))
    return tuple(tuple(_cell(v) for v in row) for row in table)


def _optional(table: Table | None) -> Argument:
    return OMITTED if table is None else _table(table)


def _reactor(reactor: Reactor) -> Argument:
    import pandas as pd

    if isinstance(reactor, Mapping):
        return tuple(
            (label, *((_cell(v) for v in value) if isinstance(value, tuple) else (_cell(value), None)))
            for label, value in reactor.items()
        )
    if isinstance(reactor, pd.DataFrame):
        return _table(reactor)
    if isinstance(reactor, int | float):
        return float(reactor)
    return tuple((_cell(value),) for value in reactor)


def _species(table: Table) -> list[str]:
    """Species of a feed table, or of a species-and-reaction table, in its order."""
    rows = _table(table)[1:]
    names = [str(row[0]) for row in rows if row[0] is not None]
    stop = {"rate", "k", "k0", "flow", "temperature", "pressure"}
    ends = [i for i, name in enumerate(names) if name.split("[")[0].strip().lower() in stop]
    return names[: ends[0]] if ends else names


def _headed(outcome: Outcome) -> pd.DataFrame:
    head, rows = outcome.block[0], outcome.block[1:]
    return _frame(outcome, rows, [str(c) for c in head])


def _frame(outcome: Outcome, block: Block, columns: list[str]) -> pd.DataFrame:
    import pandas as pd

    answers = [cell for row in block for cell in row if not isinstance(cell, ExcelError)]
    if outcome.problems and not answers:
        raise BalanceError(outcome.problems[0].reason)
    values = [[float("nan") if isinstance(c, ExcelError) else c for c in row] for row in block]
    frame = pd.DataFrame(values, columns=columns)
    frame.attrs["problems"] = [problem.reason for problem in outcome.problems]
    return frame
