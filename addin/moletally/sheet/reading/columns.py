"""Headers of a table sorted into quantities: their columns, and where the unit of each stands."""

from collections.abc import Iterable
from dataclasses import dataclass

from moletally.chemistry.errors import InputError, Place
from moletally.sheet.reading.grid import Grid, fold, split_header, text_of

__all__ = ["Column", "Columns"]


@dataclass(frozen=True, slots=True)
class Column:
    """A quantity's column: its canonical name, the unit in its header, the column that holds units."""

    name: str
    index: int
    header: str
    unit: str | None
    unit_column: int | None


class Columns:
    """The columns of a grid's header row by canonical name.

    fixed : canonical names; a header that equals one after folding takes its spelling
    first : index of the first column to look at
    Any other header is kept as it is typed. `<name> unit` belongs to <name>.
    """

    def __init__(self, grid: Grid, fixed: Iterable[str], first: int = 0) -> None:
        self.grid = grid
        known = {fold(name): name for name in fixed}
        texts = ["" if j < first else text for j, text in enumerate(grid.headers())]
        parts = [split_header(text) for text in texts]
        names = [known.get(fold(name), name) for name, _ in parts]
        present = set(names) - {""}
        units = {
            self._unit_of(name, known): j
            for j, name in enumerate(names)
            if self._is_unit(name, present, known)
        }
        self.by_name: dict[str, Column] = {}
        for j, (name, (_, unit)) in enumerate(zip(names, parts, strict=True)):
            if not name or j in units.values():
                continue
            if name in self.by_name:
                first = self.by_name[name].index + 1
                raise InputError(f"the header {name!r} stands twice (columns {first} and {j + 1})",
                                 grid.place(0, j, name))  # fmt: skip
            self.by_name[name] = Column(name, j, texts[j], unit, units.get(name))

    @staticmethod
    def _unit_of(name: str, known: dict[str, str]) -> str:
        base = name.rstrip()[: -len("unit")].rstrip(" _")
        return known.get(fold(base), base)

    def _is_unit(self, name: str, present: set[str], known: dict[str, str]) -> bool:
        return fold(name).endswith("unit") and self._unit_of(name, known) in present

    def unit(self, column: Column, row: int) -> str | None:
        """The unit of a quantity in one row: from its unit column, else from its header."""
        if column.unit_column is None:
            return column.unit
        place = self.place(row, column)
        own = text_of(self.grid.cells[row][column.unit_column], place)
        if own and column.unit and own != column.unit:
            raise InputError(f"two units, {column.unit!r} in the header and {own!r} in the row", place)
        return own or column.unit

    def place(self, row: int, column: Column) -> Place:
        """The place of a quantity in a row."""
        return self.grid.place(row, column.index, column.name)
