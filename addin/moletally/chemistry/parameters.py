"""The parameter vector of a network: rate constants, energies and reference temperatures, in SI."""

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from moletally.chemistry.errors import Finding, InputError, Level, Place
from moletally.chemistry.laws import Law
from moletally.chemistry.quantity import ONE, Unit, parse_unit
from moletally.chemistry.tables import ConstantRow, Number, ReactionRow

__all__ = ["GAS_CONSTANT", "Parameter", "ParameterKind", "Parameters", "Symbol"]

GAS_CONSTANT = 8.31446261815324  # J/(mol K), exact by the SI of 2019
ENERGY = (-1, 2, -2, 1, 0)
KELVIN = (0, 0, 0, 0, 1)
LIKELY = (500.0, 60000.0)  # K; E/R outside of it is more often a slip of units than chemistry

COLD = 100.0  # K; a reference below it is more often degrees Celsius in a column of kelvins


class ParameterKind:
    """What a number is: each kind has its own way to SI."""

    VALUE = "value"
    ENERGY = "energy"  # kept as E/R in K
    REFERENCE = "reference temperature"


@dataclass(frozen=True)
class Parameter:
    """One number of the vector.

    label : as in a table of cases, `k(2)` or `K_A`; name : of the constant; unit : None where none is used
    order : the number an exponent had when the units of its law were checked, None for all others
    """

    label: str
    name: str
    kind: str
    slot: int
    unit: Unit | None
    place: Place
    order: float | None = None

    @property
    def needs_temperature(self) -> bool:
        """True for what makes a constant depend on temperature."""
        return self.kind == ParameterKind.ENERGY

    def to_si(self, value: float) -> float:
        """The number as the program takes it: SI, an energy as E/R in K."""
        si = value if self.unit is None else self.unit.to_si(value)
        if self.kind == ParameterKind.ENERGY and self.unit is not None and self.unit.dims == ENERGY:
            return si / GAS_CONSTANT
        return si

    def with_unit(self, text: str | None, with_units: bool, place: Place) -> "Parameter":
        """The same parameter as it is given elsewhere, in a unit of its own."""
        if self.kind == ParameterKind.VALUE and not with_units:
            if text not in (None, "", "-", "1"):
                raise InputError(
                    f"{self.label} has the unit {text!r}, but other quantities of this call have none:"
                    " give units everywhere or nowhere",
                    place,
                )
            return replace(self, place=place)
        if (
            text is None
            and self.kind == ParameterKind.VALUE
            and self.unit is not None
            and self.unit.dims == ONE
        ):
            return replace(self, place=place)
        if text is None:
            raise InputError(f"{self.label} has no unit: write it behind the label", place)
        try:
            unit = parse_unit(text)
        except InputError as error:
            raise error.at(place) from None
        if not self._takes(unit):
            has = self.unit.text if self.unit is not None else ""
            raise InputError(f"{self.label} can't be in {text}: its table has {has or '-'}", place)
        return replace(self, unit=unit, place=place)

    def _takes(self, unit: Unit) -> bool:
        """True for a unit of the same dimension; an energy may be J/mol here and K there."""
        if self.kind == ParameterKind.ENERGY:
            return unit.dims in (ENERGY, KELVIN) and not unit.offset
        own = ONE if self.unit is None else self.unit.dims
        return all(abs(a - b) <= 1e-9 for a, b in zip(unit.dims, own, strict=True))

    def wrong(self, value: float) -> str:
        """Why a number can't be, "" if it can."""
        if self.name in ("k", "k0") and self.kind == ParameterKind.VALUE and value < 0:
            return (
                f"{self.label} is {value:g}: a rate constant is not negative."
                " For the reverse reaction write it the other way round"
            )
        if self.name == "Keq" and self.kind == ParameterKind.VALUE and value <= 0:
            return f"{self.label} is {value:g}: an equilibrium constant is more than 0"
        if self.order is not None and abs(value - self.order) > 1e-9:
            return (
                f"{self.label} is an order, and the units of the rate constants fit {self.order:g}, not {value:g}:"
                " give the other order in reactions of its own, with the units that belong to it"
            )
        si = self.to_si(value)
        if not math.isfinite(si) or (value and self.kind == ParameterKind.VALUE and not si):
            return f"{self.label} is {value:g}: too large or too small to compute with in SI units"
        if self.kind == ParameterKind.REFERENCE and si <= 0:
            return f"{self.label} is below absolute zero"
        return ""

    def remark(self, value: float) -> Finding | None:
        """A doubt or note about a number."""
        if self.kind == ParameterKind.ENERGY and self.name == "k" and value:
            ratio = self.to_si(value)
            if not LIKELY[0] <= ratio <= LIKELY[1]:
                return Finding(Level.DOUBT, str(self.place), f"E/R is {ratio:.4g} K, outside {LIKELY[0]:g} to"
                               f" {LIKELY[1]:g} K: is the unit of E right?")  # fmt: skip
        if self.kind == ParameterKind.REFERENCE and self.to_si(value) < COLD:
            return Finding(
                Level.DOUBT, str(self.place), f"{self.label} is {self.to_si(value):g} K: is its unit right?"
            )
        if self.name in ("k", "k0") and self.kind == ParameterKind.VALUE and value == 0:
            return Finding(Level.NOTE, str(self.place), f"{self.label} is 0: the reaction is switched off")
        return None


@dataclass(frozen=True)
class Symbol:
    """A constant as a law sees it: where its number, E/R and T ref stand in the vector (-1: none)."""

    value: int
    energy: int = -1
    reference: int = -1


@dataclass(frozen=True)
class Parameters:
    """The vector's items, and for each reaction what its names stand for."""

    items: tuple[Parameter, ...]
    symbols: tuple[dict[str, Symbol], ...]

    @classmethod
    def of(cls, reactions: Sequence[tuple[int, ReactionRow, Law]], constants: tuple[ConstantRow, ...],
           with_units: bool) -> "Parameters":  # fmt: skip
        """Parameters of all constants that laws name; a row of the reactions wins over the shared table."""
        maker = _Maker(with_units)
        shared = {row.name: maker.shared(row) for row in constants}
        symbols = []
        for number, row, law in reactions:
            own = maker.own(number, row)
            symbols.append({name: own.get(name) or shared[name] for name in law.constants})
        return cls(tuple(maker.items), tuple(symbols))

    def values(self, numbers: tuple[float, ...]) -> tuple[NDArray[np.float64], tuple[Finding, ...]]:
        """The vector in SI, and remarks."""
        vector = np.empty(len(self.items))
        findings = []
        for i, item in enumerate(self.items):
            wrong = item.wrong(numbers[item.slot])
            if wrong:
                raise InputError(wrong, item.place)
            vector[i] = item.to_si(numbers[item.slot])
            remark = item.remark(numbers[item.slot])
            if remark is not None:
                findings.append(remark)
        return vector, tuple(findings)

    def with_orders(self, orders: Mapping[int, float]) -> "Parameters":
        """The same, with the numbers of exponents held fast: slot -> number."""
        if not orders:
            return self
        return replace(self, items=tuple(replace(p, order=orders.get(p.slot)) for p in self.items))

    def find(self, label: str) -> int | None:
        """Index of a label of a case table: `k(2)`, `K_A`; a bare name that only one reaction has."""
        found = [
            i for i, item in enumerate(self.items) if label in (item.label, item.label.partition("(")[0])
        ]
        exact = [i for i in found if self.items[i].label == label]
        return exact[0] if exact else found[0] if len(found) == 1 else None


class _Maker:
    """Collects parameters."""

    def __init__(self, with_units: bool) -> None:
        self.with_units = with_units
        self.items: list[Parameter] = []

    def own(self, number: int, row: ReactionRow) -> dict[str, Symbol]:
        """The constants of a reaction's row."""
        given = dict(row.constants)
        if "dH" in given and "Keq" not in given:
            self.unit("dH", ParameterKind.ENERGY, given["dH"])  # not used yet, but wrong is wrong
        made: dict[str, Symbol] = {}
        for name, value in given.items():
            if name in ("k", "k0"):
                energy, reference = given.get("E"), given.get("T ref")
                made["k"] = self.constant(
                    f"({number})", name, value, "E", energy, "T ref", reference, name == "k0"
                )
            elif name == "Keq":
                energy, reference = given.get("dH"), given.get("Keq T ref")
                made["Keq"] = self.constant(
                    f"({number})", "Keq", value, "dH", energy, "Keq T ref", reference, False
                )
            elif name not in ("E", "T ref", "dH", "dH T ref", "Keq T ref"):
                made[name] = Symbol(self.value(f"{name}({number})", name, value))
        return made

    def shared(self, row: ConstantRow) -> Symbol:
        """A constant of the constants table."""
        return self.constant("", row.name, row.value, f"E of {row.name}", row.energy, f"T ref of {row.name}",
                             row.reference, row.pre_exponential)  # fmt: skip

    def constant(self, suffix: str, name: str, value: Number, energy_name: str, energy: Number | None,
                 reference_name: str, reference: Number | None, pre_exponential: bool) -> Symbol:  # fmt: skip
        """A constant with what makes it depend on temperature."""
        index = self.value(name + suffix, name, value)
        if energy is None:
            if pre_exponential:
                raise InputError(f"{name} is a pre-exponential: it needs E (0 if there is none)", value.place)
            return Symbol(index)
        if pre_exponential:
            if reference is not None:
                raise InputError(
                    f"{reference_name} has no meaning beside a pre-exponential factor", reference.place
                )
            return Symbol(
                index, self.put(energy_name + suffix, name.replace("k0", "k"), ParameterKind.ENERGY, energy)
            )
        if reference is None:
            raise InputError(
                f"{energy_name} needs {reference_name}, the temperature at which {name} holds", energy.place
            )
        return Symbol(
            index,
            self.put(energy_name + suffix, name, ParameterKind.ENERGY, energy),
            self.put(reference_name + suffix, name, ParameterKind.REFERENCE, reference),
        )

    def value(self, label: str, name: str, number: Number) -> int:
        if not self.with_units and number.unit is not None:
            raise InputError(f"{name} has the unit {number.unit!r}, but other quantities of this call have none:"
                             " give units everywhere or nowhere", number.place)  # fmt: skip
        return self.put(label, name, ParameterKind.VALUE, number)

    def put(self, label: str, name: str, kind: str, number: Number) -> int:
        unit: Unit | None = None
        if kind != ParameterKind.VALUE or self.with_units:
            unit = self.unit(label, kind, number)
        self.items.append(Parameter(label, name, kind, number.slot, unit, number.place))
        return len(self.items) - 1

    def unit(self, label: str, kind: str, number: Number) -> Unit:
        wanted = {ParameterKind.ENERGY: (ENERGY, KELVIN), ParameterKind.REFERENCE: (KELVIN,)}.get(kind)
        if wanted is not None and number.unit is None:
            example = "kJ/mol" if kind == ParameterKind.ENERGY else "degC or K"
            raise InputError(f"{label} has no unit: it always needs one, such as {example}", number.place)
        try:
            unit = parse_unit(number.unit or "")
        except InputError as error:
            raise error.at(number.place) from None
        shifted = kind == ParameterKind.ENERGY and unit.offset
        if wanted is not None and (unit.dims not in wanted or shifted):
            example = "kJ/mol, or K for E/R" if kind == ParameterKind.ENERGY else "degC or K"
            raise InputError(f"{label} can't be in {unit.text}: it takes {example}", number.place)
        return unit
