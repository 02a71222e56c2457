"""Why a case has no trustworthy answer, in the words of the status table and the names of the call."""

from moletally.kernel.status import STATUS, Status
from moletally.reactors.batch import Outlets
from moletally.sheet.request import Request

__all__ = ["failure", "status_text"]


def status_text(status: int) -> str:
    """What happened, and what to do."""
    text = STATUS[Status(status)]
    return f"{text.sentence} {text.remedy}"


def failure(kind: str, request: Request, outlets: Outlets, case: int) -> str:
    """The reason of a failed case; it names the case where there are several."""
    row = request.cases[case]
    assert isinstance(row, int)
    where = kind if request.reactor.single else f"{kind}, case {case + 1}"
    return f"{where}: {status_text(int(outlets.status[row]))}"
