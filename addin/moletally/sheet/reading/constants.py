"""The constants table: Name | Value | Unit | E or dH | T ref | SE."""

from moletally.chemistry.errors import InputError, near_miss
from moletally.chemistry.tables import ConstantRow, Number
from moletally.sheet.reading.columns import Columns
from moletally.sheet.reading.grid import Grid, text_of
from moletally.sheet.reading.numbers import symbol
from moletally.sheet.reading.reactions import Numbers

__all__ = ["read_constants"]

ENERGIES = ("E", "dH", "E or dH")
FIXED = ("Name", "Value", "Value0", "Unit", *ENERGIES, "T ref", "SE")


def read_constants(grid: Grid, numbers: Numbers) -> tuple[ConstantRow, ...]:
    """A row per constant; each has a Value or a Value0 (pre-exponential)."""
    grid.check_rows()
    columns = Columns(grid, FIXED)
    for column in columns.by_name.values():
        if column.name not in FIXED:
            raise InputError(f"unknown column {column.name!r}. {near_miss(column.name, FIXED)}",
                             columns.place(0, column))  # fmt: skip
    for name in ("Name", "Value"):
        if name not in columns.by_name and not (name == "Value" and "Value0" in columns.by_name):
            raise InputError(f"the header row has no column {name!r}", grid.place(0, 0, ""))
    rows = tuple(_row(columns, i, numbers) for i in range(1, len(grid.cells)))
    names: set[str] = set()
    for row in rows:
        if row.name in names:
            raise InputError(f"the constant {row.name!r} stands twice", row.place)
        names.add(row.name)
    return rows


def _row(columns: Columns, row: int, numbers: Numbers) -> ConstantRow:
    cells = columns.grid.cells[row]
    name_column = columns.by_name["Name"]
    place = columns.place(row, name_column)
    name = symbol(cells[name_column.index], place)
    given = [
        n for n in ("Value", "Value0") if n in columns.by_name and cells[columns.by_name[n].index] is not None
    ]
    if not given:
        raise InputError(f"{name} has no value", place)
    if len(given) == 2:
        raise InputError(f"{name} has both a Value and a Value0: keep one", place)
    value = _number(columns, given[0], row, numbers)
    assert value is not None
    unit = columns.by_name.get("Unit")
    if unit is not None:
        text = text_of(cells[unit.index], columns.place(row, unit))
        if text and value.unit and text != value.unit:
            raise InputError(f"two units of {name}, {value.unit!r} and {text!r}", place)
        value = Number(value.slot, text or value.unit, value.place)
    energies = [n for n in ENERGIES if n in columns.by_name and cells[columns.by_name[n].index] is not None]
    if len(energies) > 1:
        raise InputError(f"{name} has both E and dH: keep one", place)
    return ConstantRow(
        name=name,
        value=value,
        pre_exponential=given[0] == "Value0",
        energy=_number(columns, energies[0], row, numbers) if energies else None,
        reference=_number(columns, "T ref", row, numbers),
        deviation=_number(columns, "SE", row, numbers),
        place=place,
    )


def _number(columns: Columns, name: str, row: int, numbers: Numbers) -> Number | None:
    column = columns.by_name.get(name)
    if column is None or columns.grid.cells[row][column.index] is None:
        return None
    return numbers.put(columns, column, row)
