"""What a recalculation found: a table for people, and the same as JSON."""

import json
from collections.abc import Collection, Iterator
from dataclasses import dataclass
from typing import Any

from moletally.hosts.headless.book import StoredError, Value
from moletally.hosts.headless.calculate import Calculation, Result
from moletally.hosts.headless.references import Rect, address
from moletally.hosts.headless.spelling import plain

__all__ = ["Trouble", "as_json", "as_text", "json_text", "troubles"]

MOST_ROWS = 12  # of a block shown on a terminal; JSON has all


@dataclass(frozen=True, slots=True)
class Trouble:
    """A cell with a problem: its error (or `stale`) and the reason."""

    cell: str
    error: str
    reason: str


def _address(result: Result, row: int = 0, column: int = 0) -> str:
    top, left = result.cell.row + row, result.cell.column + column
    return address(Rect(result.cell.sheet, top, left, top, left))


def troubles(calculation: Calculation) -> list[Trouble]:
    """All that is wrong in cells that call us, and every cell that could not be recalculated."""
    found = []
    for result in calculation.results:
        if result.stale:
            found.append(
                Trouble(_address(result), "stale", f"not recalculated, the old value stands: {result.stale}")
            )
        elif result.calls:
            found += _of_calls(result)
    return found


def _of_calls(result: Result) -> Iterator[Trouble]:
    """One per reason; in an array the first cell that shows it."""
    errors = [
        (i, j, v.code)
        for i, row in enumerate(result.block)
        for j, v in enumerate(row)
        if isinstance(v, StoredError)
    ]
    if not errors:
        return
    if errors[0][2] == "#SPILL!":
        yield Trouble(
            _address(result), "#SPILL!", "the cells that the result needs are not empty: clear them"
        )
        return
    seen: set[str] = set()
    for problem in result.problems:
        if problem.reason in seen:
            continue
        seen.add(problem.reason)
        inside = problem.row < len(result.block) and problem.column < len(result.block[0])
        shown = result.block[problem.row][problem.column] if inside else None
        place = (problem.row, problem.column) if isinstance(shown, StoredError) else errors[0][:2]
        code = shown.code if isinstance(shown, StoredError) else errors[0][2]
        yield Trouble(_address(result, *place), code, problem.reason)
    if not seen:
        i, j, code = errors[0]
        yield Trouble(_address(result, i, j), code, "the formula around our function gives this error")


def _shown(value: Value) -> Any:
    return value.code if isinstance(value, StoredError) else value


def as_json(calculation: Calculation, names: Collection[str]) -> dict[str, Any]:
    """The answers and problems as the command line prints them with --json."""
    cells = []
    for result in calculation.results:
        if not result.calls:
            continue
        block = [[_shown(v) for v in row] for row in result.block]
        single = len(block) == 1 and len(block[0]) == 1
        formula = "=" + plain(result.cell.formula, names)
        cells.append(
            {"cell": _address(result), "formula": formula, "value": block[0][0] if single else block}
        )
    problems = [{"cell": t.cell, "error": t.error, "reason": t.reason} for t in troubles(calculation)]
    return {"cells": cells, "problems": problems}


def json_text(report: dict[str, Any]) -> str:
    """The report as JSON, a line per cell: each line is written by the compiled encoder."""
    lists = (
        f' "{name}": [' + ",".join("\n  " + json.dumps(item, ensure_ascii=False) for item in items) + "\n ]"
        for name, items in report.items()
    )
    return "{\n" + ",\n".join(lists) + "\n}"


def as_text(calculation: Calculation, names: Collection[str]) -> str:
    """A line per answer, the reason under each failing cell."""
    lines: list[str] = []
    told = troubles(calculation)
    of_cell: dict[str, list[Trouble]] = {}
    for trouble in told:
        of_cell.setdefault(trouble.cell, []).append(trouble)
    for result in calculation.results:
        if not result.calls and not result.stale:
            continue
        formula = "=" + plain(result.cell.formula, names)
        lines.append(f"{_address(result)}  {formula}")
        lines += [f"    {line}" for line in _block_lines(result)]
        here = (_address(result, i, j) for i, row in enumerate(result.block) for j in range(len(row)))
        for trouble in (t for cell in here for t in of_cell.get(cell, ())):
            where = "" if trouble.cell == _address(result) else f"{trouble.cell}: "
            reason = trouble.reason.replace("\n", "\n        ")
            lines.append(f"    ! {where}{trouble.error}  {reason}")
    count = sum(bool(r.calls) for r in calculation.results)
    bad = len({t.cell for t in told})
    lines.append("")
    lines.append(f"{count} cell{'s' * (count != 1)} with our functions, {bad} with a problem" if count or bad
                 else "no cell of this book calls our functions")  # fmt: skip
    return "\n".join(lines)


def _block_lines(result: Result) -> list[str]:
    texts = [[_text(v) for v in row] for row in result.block]
    widths = [max(len(row[j]) for row in texts) for j in range(len(texts[0]))]
    lines = ["  ".join(t.rjust(w) for t, w in zip(row, widths, strict=True)).rstrip() for row in texts]
    if len(lines) <= MOST_ROWS:
        return lines
    return [*lines[: MOST_ROWS - 1], f"… {len(lines) - MOST_ROWS} more rows", lines[-1]]


def _text(value: Value) -> str:
    match value:
        case None:
            return ""
        case bool():
            return "TRUE" if value else "FALSE"
        case StoredError(code):
            return code
        case float():
            return f"{value:.8g}"
    return value
