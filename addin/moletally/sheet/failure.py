"""Why a case has no trustworthy answer, in the words of the status table and the names of the call."""

from dataclasses import replace

import numpy as np

from moletally.kernel.status import STATUS, Status
from moletally.reactors.batch import Batch, Floats, Outlets
from moletally.reactors.solve import solve
from moletally.sheet.request import Request

__all__ = ["failure", "status_text"]

SEED = 0.05  # of all that is fed, given to one species at the start, to see where else a start-up may end
SAME = 1e-4  # states that agree to this share of what is fed are one
MOST_STATES = 3


def status_text(status: int) -> str:
    """What happened, and what to do."""
    text = STATUS[Status(status)]
    return f"{text.sentence} {text.remedy}"


def failure(kind: str, request: Request, outlets: Outlets, case: int) -> str:
    """The reason of a failed case; it names the case where there are several."""
    row = request.cases[case]
    assert isinstance(row, int)
    where = kind if request.reactor.single else f"{kind}, case {case + 1}"
    text = f"{where}: {status_text(int(outlets.status[row]))}"
    if outlets.status[row] in (Status.UNSTABLE, Status.OSCILLATES):
        text += _other_states(request, row)
    return text


def _other_states(request: Request, row: int) -> str:
    """The states that start-ups with a little of one species end on, in the unit of the feed."""
    case = request.batch.at(np.array([row]))
    states = [_shown(request, c) for c in _reached(case)[:MOST_STATES]]
    if not states:
        return ""
    return f" With a little of one species at the start it would reach {' or '.join(states)}."


def _reached(case: Batch) -> list[Floats]:
    species = case.feed.shape[1]
    first = case.feed if case.start is None else case.start
    total = float(case.feed.sum()) or float(first.sum())
    seeds = np.repeat(first, species, axis=0) + SEED * total * np.eye(species)
    many = replace(case.at(np.zeros(species, dtype=np.intp)), start=seeds)
    answer = solve("CSTR", many)
    found: list[Floats] = []
    for c in answer.concentration[answer.fine]:
        if not any(np.abs(c - other).max() <= SAME * total for other in found):
            found.append(c)
    return found


def _shown(request: Request, c: Floats) -> str:
    parts = []
    for name, value, unit, mass in zip(
        request.network.species, c, request.units.species, request.inlet.molar_mass, strict=True
    ):
        amount = value * mass if unit.dims[3] and not request.network.mass_basis else value
        parts.append(f"{name} = {unit.from_si(float(amount)):.4g} {unit.text}".rstrip())
    return ", ".join(parts)
