"""MOLE_CSTR and MOLE_PFR: the outlet of a vessel, or what is wanted of it, for one case or many."""

from collections.abc import Sequence

from moletally.chemistry.errors import NoAnswer, SheetError
from moletally.kernel.status import Status
from moletally.reactors.batch import Outlets
from moletally.reactors.solve import solve
from moletally.sheet.cells import Argument, Cell
from moletally.sheet.failure import failure
from moletally.sheet.outcome import Outcome, outcome
from moletally.sheet.reading.wants import Wants, read_wants, want_place
from moletally.sheet.request import Request, read_request
from moletally.sheet.state import State
from moletally.sheet.want import Answer, answer, species_answer

__all__ = ["Question", "answers", "ask", "pfr_outlet", "tank_outlet"]

OK = int(Status.OK)

Question = tuple[Request, Wants | None, Outlets]


def tank_outlet(reactions: Argument, feed: Argument, reactor: Argument, want: Argument,
                constants: Argument) -> Outcome:  # fmt: skip
    """MOLE_CSTR."""
    return _outlet("CSTR", reactions, feed, reactor, want, constants)


def pfr_outlet(reactions: Argument, feed: Argument, reactor: Argument, want: Argument,
               constants: Argument) -> Outcome:  # fmt: skip
    """MOLE_PFR."""
    return _outlet("PFR", reactions, feed, reactor, want, constants)


def ask(kind: str, reactions: Argument, feed: Argument, reactor: Argument, want: Argument,
        constants: Argument) -> Question:  # fmt: skip
    """Read a call's arguments and solve its cases."""
    request = read_request(reactions, feed, reactor, constants)
    return request, read_wants(want), solve(kind, request.batch)


def _outlet(kind: str, *arguments: Argument) -> Outcome:
    request, wants, outlets = ask(kind, *arguments)
    columns = answers(wants, request.state(outlets.concentration))
    rows = [_row(kind, request, outlets, columns, case) for case in range(len(request.cases))]
    return outcome(_laid_out(request, wants, rows))


def answers(wants: Wants | None, state: State) -> list[Answer | SheetError | None]:
    """The answer to each want, or to every species; a want that can't be read fails alone."""
    if wants is None:
        return [species_answer(state, i) for i in range(len(state.names))]
    found: list[Answer | SheetError | None] = []
    for i, text in enumerate(wants.texts):
        if text is None or isinstance(text, SheetError):
            found.append(text)
            continue
        try:
            found.append(answer(text, state))
        except SheetError as error:
            found.append(error.at(want_place(i, wants.shape)))
    return found


def _row(kind: str, request: Request, outlets: Outlets, columns: Sequence[Answer | SheetError | None],
         case: int) -> list[Cell | SheetError]:  # fmt: skip
    """The cells of one case: a fault in the case takes all of them."""
    row = request.cases[case]
    if isinstance(row, SheetError):
        return [row] * len(columns)
    if outlets.status[row] != OK:
        fault: SheetError = NoAnswer(failure(kind, request, outlets, case))
        return [
            column if isinstance(column, SheetError) else "" if column is None else fault
            for column in columns
        ]
    return [column.cell(row) if isinstance(column, Answer) else "" if column is None else column
            for column in columns]  # fmt: skip


def _laid_out(request: Request, wants: Wants | None,
              rows: list[list[Cell | SheetError]]) -> Sequence[Sequence[Cell | SheetError]]:  # fmt: skip
    """The shape of the answer: see the function table."""
    if request.reactor.single:
        if wants is None:
            return [[cell] for cell in rows[0]]
        width = wants.shape[1]
        return [rows[0][i : i + width] for i in range(0, len(rows[0]), width)]
    shape = request.reactor.shape
    if shape is not None and wants is not None and len(wants.texts) == 1:
        cells = [row[0] for row in rows]
        return [cells[i : i + shape[1]] for i in range(0, len(cells), shape[1])]
    return rows
