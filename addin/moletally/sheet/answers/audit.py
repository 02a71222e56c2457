"""MOLE_AUDIT: what was read, assumed, checked and found doubtful in a call; the verdict first."""

from collections.abc import Callable, Sequence

import numpy as np

from moletally.chemistry.errors import Finding, InputError, Level, Place, SheetError, near_miss
from moletally.kernel.status import Status
from moletally.reactors.batch import Outlets
from moletally.sheet.answers.outlet import answers, ask
from moletally.sheet.answers.profile import tube_profile
from moletally.sheet.answers.rates import reaction_rates
from moletally.sheet.cells import OMITTED, Argument
from moletally.sheet.failure import failure
from moletally.sheet.outcome import Outcome, outcome
from moletally.sheet.reading.wants import Wants, want_place
from moletally.sheet.request import Request
from moletally.sheet.want import Answer

__all__ = ["audit"]

ORDER = {Level.STOP: 0, Level.DOUBT: 1, Level.NOTE: 2, Level.FINE: 3}
MOST_CASES = 20  # findings that repeat case by case are cut here and counted


def audit(function: Argument, *arguments: Argument) -> Outcome:
    """Findings of the call `function(arguments)`."""
    name = _name(function)
    findings = _findings(name, list(arguments))
    findings.sort(key=lambda f: ORDER[f.level])
    worst = findings[0].level if findings else Level.FINE
    verdict = [_verdict(name, worst, findings)] if worst is not Level.STOP else []
    return outcome([[str(f.level), f.where, f.text] for f in (*verdict, *findings)])


def _name(function: Argument) -> str:
    cell = function[0][0] if isinstance(function, tuple) else function
    name = cell.strip().upper().removeprefix("MOLE_") if isinstance(cell, str) else ""
    if name not in AUDITS:
        shown = ", ".join(f'"{known}"' for known in AUDITS)
        raise InputError(f"the first argument names the function to audit: {shown}. {near_miss(name, AUDITS)}",
                         Place("MOLE_AUDIT"))  # fmt: skip
    return name


def _findings(name: str, arguments: list[Argument]) -> list[Finding]:
    count, run = AUDITS[name]
    if len(arguments) > count:
        raise InputError(f"MOLE_{name} takes {count} arguments at the most", Place("MOLE_AUDIT"))
    try:
        return run(name, arguments + [OMITTED] * (count - len(arguments)))
    except SheetError as error:
        return [Finding(Level.STOP, str(error.place or f"MOLE_{name}"), error.what)]


def _verdict(name: str, worst: Level, findings: Sequence[Finding]) -> Finding:
    doubts = sum(f.level is Level.DOUBT for f in findings)
    if worst is Level.DOUBT:
        text = f"solved and checked; {doubts} doubt{'s' if doubts > 1 else ''} below"
    else:
        text = "solved and checked: balances, no negative concentration, conserved totals"
    return Finding(Level.DOUBT if worst is Level.DOUBT else Level.FINE, f"MOLE_{name}", text)


def _outlet(kind: str, arguments: list[Argument]) -> list[Finding]:
    request, wants, outlets = ask(kind, *arguments)
    findings = list(request.findings)
    findings += _cases(kind, request, outlets)
    findings += _wants(request, wants, outlets)
    if kind == "CSTR":
        findings += _states(request, outlets)
    findings += _exhaustion(request, outlets)
    return findings


def _cases(kind: str, request: Request, outlets: Outlets) -> list[Finding]:
    """A stop for every case that has no answer."""
    found = []
    for case, row in enumerate(request.cases):
        if isinstance(row, SheetError):
            found.append(Finding(Level.STOP, str(row.place or f"case {case + 1}"), row.what))
        elif outlets.status[row] != Status.OK:
            found.append(Finding(Level.STOP, f"MOLE_{kind}", failure(kind, request, outlets, case)))
    cut = found[:MOST_CASES]
    if len(found) > len(cut):
        cut.append(
            Finding(Level.STOP, f"MOLE_{kind}", f"and {len(found) - len(cut)} more cases without an answer")
        )
    return cut


def _wants(request: Request, wants: Wants | None, outlets: Outlets) -> list[Finding]:
    """The unit of each want, and what is wrong with those that have no value."""
    state = request.state(outlets.concentration)
    found = []
    for i, column in enumerate(answers(wants, state)):
        name = request.network.species[i] if wants is None else str(wants.texts[i])
        where = name if wants is None else str(want_place(i, wants.shape))
        if isinstance(column, SheetError):
            found.append(Finding(Level.STOP, str(column.place or where), column.what))
        elif isinstance(column, Answer):
            if column.fault is not None:
                found.append(Finding(Level.STOP, where, f"{name}: {column.fault.what}"))
            elif column.unit and wants is not None:
                found.append(Finding(Level.NOTE, where, f"{name} is in {column.unit}"))
    if wants is None and request.network.with_units:
        units = sorted({unit.text for unit in request.units.species})
        found.append(Finding(Level.NOTE, "result", f"outlet concentrations are in {', '.join(units)}"))
    return found


def _states(request: Request, outlets: Outlets) -> list[Finding]:
    """How sure the one steady state is."""
    good = outlets.fine
    if not good.any():
        return []
    worst = np.nanmax(outlets.residual[good]) if np.isfinite(outlets.residual[good]).any() else 0.0
    found = [Finding(Level.FINE, "balances", f"largest residual {worst:.1e} of the terms of its balance")]
    if outlets.unique[good].all():
        found.append(Finding(Level.FINE, "steady state", "unique (proven)"))
    else:
        start = "Start" if request.batch.start is not None else "a vessel full of feed"
        found.append(Finding(Level.NOTE, "steady state", f"not proven to be the only one: it is the state that a"
                             f" start-up from {start} reaches"))  # fmt: skip
    return found


def _exhaustion(request: Request, outlets: Outlets) -> list[Finding]:
    """Species that a law would drive below zero: the law is cut to what is supplied."""
    found = []
    for i, name in enumerate(request.network.species):
        rows = np.flatnonzero(outlets.exhausted[:, i] & outlets.fine)
        if not len(rows):
            continue
        at = outlets.exhausted_at[rows[0], i]
        unit = request.units.time
        if not np.isnan(at):
            tau = at / request.batch.density[rows[0]] if request.network.per_mass else at
            when = f" at tau = {unit.from_si(float(tau)):.6g} {unit.text}".rstrip()
        else:
            when = ""
        cases = "" if len(request.cases) == 1 else f" (in {len(rows)} of {len(request.cases)} cases)"
        found.append(Finding(Level.NOTE, name, f"{name} is used up{when}{cases}: from there on its laws are cut to"
                             " what other reactions supply"))  # fmt: skip
    return found


def _profile(_: str, arguments: list[Argument]) -> list[Finding]:
    reactions, feed, reactor, points, want, constants = arguments
    findings = _outlet("PFR", [reactions, feed, reactor, want, constants])
    return findings + _problems(tube_profile(reactions, feed, reactor, points, want, constants))


def _rates(_: str, arguments: list[Argument]) -> list[Finding]:
    return _problems(reaction_rates(*arguments))


def _problems(result: Outcome) -> list[Finding]:
    return [Finding(Level.STOP, f"row {p.row + 1}", p.reason) for p in result.problems[:MOST_CASES]]


AUDITS: dict[str, tuple[int, Callable[[str, list[Argument]], list[Finding]]]] = {
    "CSTR": (5, _outlet),
    "PFR": (5, _outlet),
    "PROFILE": (6, _profile),
    "RATES": (4, _rates),
}
