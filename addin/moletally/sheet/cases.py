"""The values of a reactor's labels, case by case and in SI."""

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from moletally.chemistry.errors import InputError, Place, SheetError
from moletally.chemistry.quantity import Dims, Unit, to_si
from moletally.chemistry.tables import Quantity
from moletally.sheet.reading.reactor import CaseColumn, ReactorInput

__all__ = ["Cases"]

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Cases:
    """The good cases of a reactor input: N rows of numbers, and what is the same for all.

    with_units : whether the call carries units
    """

    reactor: ReactorInput
    with_units: bool

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

    def given(self, label: str) -> bool:
        """True where the label has a value in some case."""
        return label in self.reactor.fixed or self.column(label) is not None

    def place(self, label: str) -> Place:
        """Where the label stands."""
        column = self.column(label)
        if column is not None:
            return column[0].place
        fixed = self.reactor.fixed.get(label)
        return fixed.place if isinstance(fixed, Quantity) else Place("Reactor", header=label)

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

    def values(self, label: str, dims: Dims, bare: Unit | None = None, always: bool = False) -> Floats:
        """Values of a label in SI, shape (N,); nan in cases that do not have it.

        dims : the dimension it must have
        bare : unit of values that carry none
        always : True for what needs a unit even where nothing else has one (temperatures, pressures)
        """
        column = self.column(label)
        if column is None:
            fixed = self.reactor.fixed.get(label)
            if not isinstance(fixed, Quantity):
                return np.full(len(self), np.nan)
            quantity = self._with(fixed, bare)
            return np.full(len(self), to_si(quantity, dims, self.with_units or always, label))
        head, raw = column
        scale = [to_si(self._with(Quantity(x, head.unit, head.place), bare), dims, self.with_units or always, label)
                 for x in (0.0, 1.0)]  # fmt: skip
        return scale[0] + (scale[1] - scale[0]) * raw

    @staticmethod
    def _with(quantity: Quantity, bare: Unit | None) -> Quantity:
        if quantity.unit is None and bare is not None:
            return Quantity(quantity.value, bare.text, quantity.place)
        return quantity

    def check_sign(self, label: str, values: Floats, zero_too: bool) -> None:
        """Raise at a negative value (or zero, where that makes no sense)."""
        bad = values < 0 if zero_too else values <= 0
        if bad.any():
            least = "0 or more" if zero_too else "more than 0"
            raise InputError(f"{label} is {values[bad][0]:g}: it must be {least}", self.place(label))
