"""References into tables, such as `T[#All]`, `T[k]`, `T[[#Headers],[a]:[b]]`, `T[@k]`, as plain ranges."""

import re
from collections.abc import Mapping

from moletally.hosts.headless.book import FormulaCell, Table
from moletally.hosts.headless.references import Rect, split_sheet

__all__ = ["structured"]

ITEM = re.compile(r"\[((?:[^\[\]']|'.)*)\]")
SPECIAL = ("#all", "#data", "#headers", "#totals", "#this row")


def structured(text: str, tables: Mapping[str, Table], cell: FormulaCell) -> Rect | None:
    """The range of a table reference as seen from a cell; None where it is not understood."""
    name, _, inside = split_sheet(text)[1].partition("[")
    table = tables.get(name.casefold()) if name else _around(tables, cell)
    if table is None:
        return None
    inside = inside[:-1].strip()
    this_row = inside.startswith("@")
    inside = inside.removeprefix("@").strip()
    pieces = (
        [_plain(p) for p in ITEM.findall(inside)] if "[" in inside else [_plain(inside)] if inside else []
    )
    specials = [p.casefold() for p in pieces if p.casefold() in SPECIAL]
    columns = [p for p in pieces if p.casefold() not in SPECIAL]
    span = _columns(table, columns, ranged="]:[" in inside.replace(" ", ""))
    rows = _rows(table, [*specials, "#this row"] if this_row else specials, cell)
    if span is None or rows is None:
        return None
    return Rect(table.area.sheet, rows[0], span[0], rows[1], span[1])


def _around(tables: Mapping[str, Table], cell: FormulaCell) -> Table | None:
    return next((t for t in tables.values() if t.area.covers(cell.sheet, cell.row, cell.column)), None)


def _plain(text: str) -> str:
    return re.sub(r"'(.)", r"\1", text.strip())


def _columns(table: Table, columns: list[str], ranged: bool) -> tuple[int, int] | None:
    if not columns:
        return table.area.left, table.area.right
    folded = [c.casefold() for c in table.columns]
    try:
        places = [table.area.left + folded.index(c.casefold()) for c in columns]
    except ValueError:
        return None
    if len(places) > (2 if ranged else 1):
        return None
    return min(places), max(places)


def _rows(table: Table, specials: list[str], cell: FormulaCell) -> tuple[int, int] | None:
    area = table.area
    first, last = area.top + table.header_rows, area.bottom - table.total_rows
    found = []
    for special in specials or ["#data"]:
        if special == "#all":
            found.append((area.top, area.bottom))
        elif special == "#data":
            found.append((first, last))
        elif special == "#headers" and table.header_rows:
            found.append((area.top, first - 1))
        elif special == "#totals" and table.total_rows:
            found.append((last + 1, area.bottom))
        elif special == "#this row" and first <= cell.row <= last:
            found.append((cell.row, cell.row))
        else:
            return None
    return min(f[0] for f in found), max(f[1] for f in found)
