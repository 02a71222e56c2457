"""MOLE_PROFILE: a tube along its length."""

import numpy as np

from moletally.chemistry.errors import InputError, NoAnswer, Place, SheetError
from moletally.kernel.status import Status
from moletally.reactors.tube import profile
from moletally.sheet.answers.outlet import answers
from moletally.sheet.cells import Argument, Cell
from moletally.sheet.failure import status_text
from moletally.sheet.outcome import Outcome, outcome
from moletally.sheet.reading.grid import is_empty
from moletally.sheet.reading.numbers import read_number
from moletally.sheet.reading.wants import Wants, read_wants
from moletally.sheet.request import Request, read_request
from moletally.sheet.state import State
from moletally.sheet.want import Answer

__all__ = ["tube_profile"]

POINTS = 51
MOST_POINTS = 10_000


def tube_profile(reactions: Argument, feed: Argument, reactor: Argument, points: Argument, want: Argument,
                 constants: Argument) -> Outcome:  # fmt: skip
    """MOLE_PROFILE: a header row, then a row per point from inlet to outlet."""
    request = read_request(reactions, feed, reactor, constants)
    wants = read_wants(want)
    row = _the_case(request)
    count = _points(points)
    batch = request.batch.at(np.array([row]))
    grid = np.linspace(0.0, float(batch.size[0]), count)
    c, status, _ = profile(batch, grid)
    share = grid / batch.size[0] if batch.size[0] else np.zeros(count)
    state = _along(request, row, c, share)
    columns = answers(wants, state)
    lead = _lead(request, row, state, share)
    head: list[Cell | SheetError] = [title for title, _ in lead]
    head += [_title(wants, i, column, request) for i, column in enumerate(columns)]
    rows: list[list[Cell | SheetError]] = [head]
    for i in range(count):
        fault = (
            None if status[i] == Status.OK else NoAnswer(f"PFR, point {i + 1}: {status_text(int(status[i]))}")
        )
        where: list[Cell | SheetError] = [float(values[i]) for _, values in lead]
        rows.append(where + [_cell(column, i, fault) for column in columns])
    return outcome(rows)


def _the_case(request: Request) -> int:
    if len(request.cases) != 1:
        raise InputError("a profile is of one case: give a residence time or a block, not a table of cases",
                         Place("Reactor"))  # fmt: skip
    case = request.cases[0]
    if isinstance(case, SheetError):
        raise case
    return case


def _points(argument: Argument) -> int:
    place = Place("points")
    if is_empty(argument):
        return POINTS
    cell = argument[0][0] if isinstance(argument, tuple) else argument
    count = read_number(cell, place)  # type: ignore[arg-type]  # OMITTED is empty
    if not 2 <= count <= MOST_POINTS or count != int(count):
        raise InputError(f"points is {count:g}: it takes a whole number from 2 to {MOST_POINTS}", place)
    return int(count)


def _along(request: Request, row: int, c: np.ndarray, share: np.ndarray) -> State:
    """The states at the points: what `tau` means at each is the time from the inlet to there."""
    n = len(share)
    whole = request.state(c)
    return State(
        whole.names, c, np.repeat(whole.inlet[row : row + 1], n, axis=0), np.repeat(whole.flow[row], n),
        whole.residence_time[row] * share, np.repeat(whole.temperature[row], n), np.repeat(whole.pressure[row], n),
        whole.molar_mass, whole.units,
    )  # fmt: skip


def _lead(request: Request, row: int, state: State, share: np.ndarray) -> list[tuple[str, np.ndarray]]:
    """The columns that say where a point is: tau, and volume or catalyst mass where the flow is known."""
    columns = []
    units = request.units
    if not np.isnan(state.residence_time).any():
        columns.append((_with_unit("tau", units.time.text), units.time.from_si(state.residence_time)))
    flow = request.batch.flow[row]
    if not np.isnan(flow):
        name = "Catalyst mass" if request.network.per_mass else "Volume"
        size = request.batch.size[row] * flow * share
        columns.append((_with_unit(name, units.volume.text), units.volume.from_si(size)))
    return columns


def _with_unit(name: str, unit: str) -> str:
    return f"{name} [{unit}]" if unit else name


def _title(wants: Wants | None, i: int, column: Answer | SheetError | None, request: Request) -> str:
    if wants is not None:
        text = wants.texts[i]
        return text if isinstance(text, str) else ""
    return _with_unit(request.network.species[i], column.unit if isinstance(column, Answer) else "")


def _cell(column: Answer | SheetError | None, i: int, fault: SheetError | None) -> Cell | SheetError:
    if column is None:
        return ""
    if isinstance(column, SheetError):
        return column
    return fault if fault is not None else column.cell(i)
