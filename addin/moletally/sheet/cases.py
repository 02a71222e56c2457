"""The values of a reactor's labels, case by case and in SI, and the cases that can't be used."""

from collections.abc import Callable
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from moletally.chemistry.errors import InputError, Place, SheetError
from moletally.chemistry.quantity import Dims, Unit, to_si
from moletally.chemistry.tables import Quantity
from moletally.sheet.reading.reactor import CaseColumn, ReactorInput

__all__ = ["Cases"]

Floats = NDArray[np.float64]
Mask = NDArray[np.bool_]


@dataclass(frozen=True)
class Cases:
    """The readable cases of a reactor input: N rows of numbers, and what is the same for all.

    with_units : whether the call carries units
    faults : row -> why that case has no answer; filled while the cases are worked out
    """

    reactor: ReactorInput
    with_units: bool
    faults: dict[int, SheetError] = field(default_factory=dict)

    @cached_property
    def on_sheet(self) -> tuple[int, ...]:
        """For each row, which case of the sheet it is, counted from 0."""
        return tuple(i for i, row in enumerate(self.reactor.rows) if not isinstance(row, SheetError))

    @cached_property
    def numbers(self) -> Floats:
        """Values of the columns, shape (N, columns); nan where a cell is empty."""
        good = [row for row in self.reactor.rows if not isinstance(row, SheetError)]
        return np.array(good, dtype=np.float64).reshape(len(good), len(self.reactor.columns))

    def __len__(self) -> int:
        return len(self.numbers)

    def column(self, label: str) -> tuple[CaseColumn, Floats] | None:
        """The column of a label and its raw values."""
        for j, column in enumerate(self.reactor.columns):
            if column.label == label:
                return column, self.numbers[:, j]
        return None

    def place(self, label: str, row: int | None = None) -> Place:
        """Where a label stands, or its value in one row."""
        column = self.column(label)
        if column is None:
            fixed = self.reactor.fixed.get(label)
            return fixed.place if isinstance(fixed, Quantity) else Place("Reactor", header=label)
        head = column[0].place
        if row is None or self.reactor.single:
            return head
        case = self.on_sheet[row]
        if self.reactor.shape is not None:
            i, j = divmod(case, self.reactor.shape[1])
            return Place(head.table, i + 1, j + 1)
        return Place(head.table, head.row + 1 + case, head.column, head.header)

    def unit_text(self, label: str) -> str | None:
        """The unit a label was given in, as written."""
        column = self.column(label)
        if column is not None:
            return column[0].unit
        fixed = self.reactor.fixed.get(label)
        return fixed.unit if isinstance(fixed, Quantity) else None

    def word(self, label: str, default: str) -> str:
        """A text label, folded for comparison."""
        fixed = self.reactor.fixed.get(label, default)
        return fixed.strip().casefold() if isinstance(fixed, str) else default

    def raw(self, label: str) -> Floats:
        """Values of a label as they are typed, shape (N,); nan in cases that do not have it."""
        column = self.column(label)
        if column is not None:
            return column[1]
        fixed = self.reactor.fixed.get(label)
        return np.full(len(self), fixed.value if isinstance(fixed, Quantity) else np.nan)

    def values(self, label: str, dims: Dims, bare: Unit | None = None, always: bool = False) -> Floats:
        """Values of a label in SI, shape (N,); nan in cases that do not have it.

        dims : the dimension it must have
        bare : unit of values that carry none
        always : True for what needs a unit even where nothing else has one (temperatures, pressures)
        """
        raw = self.raw(label)
        if np.isnan(raw).all():
            return raw
        text = self.unit_text(label) or (bare.text if bare is not None else None)
        place = self.place(label)
        zero, one = (
            to_si(Quantity(x, text, place), dims, self.with_units or always, label) for x in (0.0, 1.0)
        )
        return zero + (one - zero) * raw

    def refuse(self, bad: Mask, label: str, say: Callable[[int], str]) -> None:
        """Take cases out: `say` words the fault of a row. One case alone, or a fault of all, is the call's."""
        rows = [int(i) for i in np.flatnonzero(bad)]
        if not rows:
            return
        if self.reactor.single or (self.column(label) is None and len(rows) == len(self)):
            raise InputError(say(rows[0]), self.place(label))
        for row in rows:
            self.faults.setdefault(row, InputError(say(row), self.place(label, row)))

    def refuse_sign(self, label: str, values: Floats, zero_too: bool) -> None:
        """Take out cases with a negative value (or zero, where that makes no sense)."""
        raw = self.raw(label)
        least = "0 or more" if zero_too else "more than 0"
        with np.errstate(invalid="ignore"):
            bad = values < 0 if zero_too else values <= 0
        self.refuse(bad, label, lambda i: f"{label} is {raw[i]:g}: it must be {least}")
