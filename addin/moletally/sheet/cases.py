"""The values of a reactor's labels, case by case and in SI, and the cases that can't be used."""

from collections.abc import Callable
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from moletally.chemistry.errors import InputError, Place, SheetError
from moletally.chemistry.quantity import Dims, Unit, to_si
from moletally.chemistry.tables import Quantity
from moletally.sheet.reading.reactor import ReactorInput

__all__ = ["Cases", "Scales"]

Floats = NDArray[np.float64]
Mask = NDArray[np.bool_]


Scales = dict[str, tuple[float, float]]


class Cases:
    """The readable cases of a reactor input: N rows of numbers, and what is the same for all.

    with_units : whether the call carries units
    scales : label -> its zero and its step in SI; kept by the caller for all inputs of one layout
    faults : row -> why that case has no answer; filled while the cases are worked out
    """

    def __init__(self, reactor: ReactorInput, with_units: bool, scales: Scales | None = None) -> None:
        self.reactor, self.layout, self.with_units = reactor, reactor.layout, with_units
        self.scales: Scales = {} if scales is None else scales
        self.faults: dict[int, SheetError] = {}
        good = [row for row in reactor.rows if not isinstance(row, SheetError)]
        self.count = len(good)
        self.numbers: Floats = np.array(good, dtype=np.float64).reshape(self.count, len(self.layout.columns))

    def __len__(self) -> int:
        return self.count

    @cached_property
    def on_sheet(self) -> tuple[int, ...]:
        """For each row, which case of the sheet it is, counted from 0."""
        return tuple(i for i, row in enumerate(self.reactor.rows) if not isinstance(row, SheetError))

    @cached_property
    def unknown(self) -> Floats:
        """The values of a label that no case has, shape (N,): nan."""
        return np.full(self.count, np.nan)

    def has(self, label: str) -> bool:
        """True where a label has a number, the same for all or one per case."""
        return label in self.layout.where

    def all_have(self, label: str) -> bool:
        """True where no case can be without it."""
        return self.has(label) and (self.reactor.single or self.layout.where[label] < 0)

    def place(self, label: str, row: int | None = None) -> Place:
        """Where a label stands, or its value in one row."""
        column = self.layout.column(label)
        if column is None:
            return Place("Reactor", header=label)
        head = column.place
        if row is None or self.reactor.single or self.layout.where[label] < 0:
            return head
        case = self.on_sheet[row]
        if self.reactor.shape is not None:
            i, j = divmod(case, self.reactor.shape[1])
            return Place(head.table, i + 1, j + 1)
        return Place(head.table, head.row + 1 + case, head.column, head.header)

    def unit_text(self, label: str) -> str | None:
        """The unit a label was given in, as written."""
        column = self.layout.column(label)
        return None if column is None else column.unit

    def raw(self, label: str) -> Floats:
        """Values of a label as they are typed, shape (N,); nan in cases that do not have it."""
        where = self.layout.where.get(label)
        if where is None:
            return self.unknown
        return np.full(self.count, self.reactor.numbers[where]) if where < 0 else self.numbers[:, where]

    def values(self, label: str, dims: Dims, bare: Unit | None = None, always: bool = False) -> Floats:
        """Values of a label in SI, shape (N,); nan in cases that do not have it.

        dims : the dimension it must have
        bare : unit of values that carry none
        always : True for what needs a unit even where nothing else has one (temperatures, pressures)
        """
        where = self.layout.where.get(label)
        if where is None or (
            not self.reactor.single and where >= 0 and np.isnan(self.numbers[:, where]).all()
        ):
            return self.unknown
        scale = self.scales.get(label)
        if scale is None:
            text = self.unit_text(label) or (bare.text if bare is not None else None)
            place = self.place(label)
            zero, one = (
                to_si(Quantity(x, text, place), dims, self.with_units or always, label) for x in (0.0, 1.0)
            )
            scale = self.scales[label] = zero, one - zero
        if where < 0:
            return np.full(self.count, scale[0] + scale[1] * self.reactor.numbers[where])
        return scale[0] + scale[1] * self.numbers[:, where]

    def refuse(self, bad: Mask, label: str, say: Callable[[int], str]) -> None:
        """Take cases out: `say` words the fault of a row. One case alone, or a fault of all, is the call's."""
        if not bad.any():
            return
        rows = [int(i) for i in np.flatnonzero(bad)]
        varies = self.layout.where.get(label, -1) >= 0
        if self.reactor.single or (not varies and len(rows) == len(self)):
            raise InputError(say(rows[0]), self.place(label))
        for row in rows:
            self.faults.setdefault(row, InputError(say(row), self.place(label, row)))

    def refuse_sign(self, label: str, values: Floats, zero_too: bool) -> None:
        """Take out cases with a negative value (or zero, where that makes no sense)."""
        if not self.has(label):
            return
        least = "0 or more" if zero_too else "more than 0"
        bad = values < 0 if zero_too else values <= 0
        self.refuse(bad, label, lambda i: f"{label} is {self.raw(label)[i]:g}: it must be {least}")
