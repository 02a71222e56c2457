"""Do the units of the constants fit the rate laws? If not: which one, and what unit it should have."""

from collections.abc import Mapping, Sequence
from typing import Protocol

from moletally.chemistry.errors import InputError
from moletally.chemistry.expression import Num, source, walk
from moletally.chemistry.lawcheck import (
    GAS_CONSTANT,
    PRESSURE,
    TEMPERATURE,
    Mismatch,
    Symbols,
    close,
    dimension,
    orders,
    remedy,
)  # fmt: skip
from moletally.chemistry.laws import Law
from moletally.chemistry.parameters import Parameters
from moletally.chemistry.quantity import ONE, Dims, Unit, compose, parse_unit
from moletally.chemistry.tables import ReactionRow

__all__ = ["CONCENTRATION", "MASS_CONCENTRATION", "check_rates", "is_per_pressure"]

CONCENTRATION: Dims = (1, -3, 0, 0, 0)
MASS_CONCENTRATION: Dims = (0, -3, 0, 1, 0)


class HasLaw(Protocol):
    """A reaction with its law."""

    @property
    def row(self) -> ReactionRow:
        """Its row of the table."""

    @property
    def law(self) -> Law:
        """Its rate law."""


def targets(mass_basis: bool) -> tuple[Dims, Dims]:
    """What a rate may be: per volume and time, or per mass of catalyst and time."""
    if mass_basis:
        return (0, -3, -1, 1, 0), (0, 0, -1, 0, 0)
    return (1, -3, -1, 0, 0), (1, 0, -1, -1, 0)


def is_per_pressure(row: ReactionRow, mass_basis: bool) -> bool:
    """True where the unit of k or Keq shows that mass action is meant in partial pressures."""
    units = dict(row.constants)
    order = sum(coefficient for _, coefficient in row.equation.left)
    change = sum(c for _, c in row.equation.right) - order
    for name, power in (("k", order), ("k0", order), ("Keq", change)):
        number = units.get(name)
        if number is None or number.unit is None or not power:
            continue
        dims = parse_unit(number.unit).dims
        bases = [ONE] if name == "Keq" else list(targets(mass_basis))
        sign = 1.0 if name == "Keq" else -1.0
        if any(close(dims, _plus(base, PRESSURE, sign * power)) for base in bases):
            return True
    return False


def _plus(one: Dims, other: Dims, factor: float) -> Dims:
    return tuple(a + factor * b for a, b in zip(one, other, strict=True))  # type: ignore[return-value]


def check_rates(reactions: Sequence[HasLaw], parameters: Parameters, species: tuple[str, ...], mass_basis: bool,
                like: tuple[Unit, ...], exponents: Mapping[int, float]) -> tuple[bool, set[int]]:  # fmt: skip
    """Whether the rates are per mass of catalyst, and the slots of the numbers that are orders.

    like : units of the feed, in which a unit is proposed; exponents : slot -> number
    """
    bases: list[tuple[ReactionRow, bool]] = []
    deciding: set[int] = set()
    concentration = MASS_CONCENTRATION if mass_basis else CONCENTRATION
    like = (*like, *(item.unit for item in parameters.items if item.unit is not None))
    for reaction, symbols in zip(reactions, parameters.symbols, strict=True):
        dims: dict[str, Dims] = {"T": TEMPERATURE, "R": GAS_CONSTANT}
        values: dict[str, float] = {}
        units: dict[str, Unit] = {}
        for name, symbol in symbols.items():
            item = parameters.items[symbol.value]
            assert item.unit is not None
            dims[name], units[name] = item.unit.dims, item.unit
            if item.slot in exponents:
                values[name] = exponents[item.slot]
        dims.update(dict.fromkeys(species, concentration))
        known = Symbols(dims, values)
        bases.append((reaction.row, _check(reaction, known, units, mass_basis, like)))
        decided = orders(reaction.law.tree, known) & symbols.keys()
        deciding |= {parameters.items[symbols[name].value].slot for name in decided}
    if len({its for _, its in bases}) > 1:
        odd = next(row for row, its in bases if its != bases[0][1])
        raise InputError(f"the rate of {odd.equation.text} is per {_basis(not bases[0][1])}, that of"
                         f" {bases[0][0].equation.text} per {_basis(bases[0][1])}: give all in one way",
                         odd.place)  # fmt: skip
    return bool(bases) and bases[0][1], deciding


def _basis(per_mass: bool) -> str:
    return "mass of catalyst" if per_mass else "volume"


def _check(reaction: HasLaw, symbols: Symbols, units: Mapping[str, Unit], mass_basis: bool,
           like: tuple[Unit, ...]) -> bool:  # fmt: skip
    law = reaction.law
    wrong = ""
    per_volume, per_catalyst = targets(mass_basis)
    try:
        found = dimension(law.tree, symbols)
        if close(found, per_volume):
            return False
        if close(found, per_catalyst):
            return True
        if close(found, ONE) and not any(unit.text for unit in units.values()):
            wrong = "its constants have no unit"
    except Mismatch as error:
        wrong = error.what
    raise InputError(_complaint(law, symbols, units, per_volume, wrong, like), reaction.row.rate_place)


def _complaint(law: Law, symbols: Symbols, units: Mapping[str, Unit], target: Dims, wrong: str,
               like: tuple[Unit, ...]) -> str:  # fmt: skip
    similar = (*units.values(), *like)
    text = source(law.text, law.tree) if law.text else ""
    for goal in (target, None):
        for name in units:
            proposed = remedy(law.tree, symbols, name, goal)
            if proposed is not None and not close(proposed, symbols.dims[name]):
                return _proposal(name, units[name], proposed, text, similar)
    made = compose(target, similar)
    because = f": {wrong}" if wrong else ""
    plain = any(isinstance(node, Num) and node.value != 0 for node in walk(law.tree))
    numbers = ". A number in a law has no unit: give it a name and a column of its own" if plain else ""
    return f"the units of the law {text} do not fit together{because}. A rate is in {made}{numbers}"


def _proposal(name: str, unit: Unit, proposed: Dims, text: str, like: tuple[Unit, ...]) -> str:
    has = f"the unit {unit.text}" if unit.text else "no unit"
    order, fits = _order(unit.dims), _order(proposed)
    reason = ""
    if fits is not None:
        reason = (
            f", which is of order {fits:g}"
            if order is None
            else f" (order {order:g}), but the law is of order {fits:g}"
        )
        reason = reason if unit.text else f"; the law is of order {fits:g}"
    return f"{name} has {has}{reason} in {text}: give {name} in {compose(proposed, like) if proposed != ONE else '-'}"


def _order(dims: Dims) -> float | None:
    """The order n of a rate constant in (volume/amount)^(n-1)/time; None if it is no such unit."""
    amount = dims[0]
    n = 1.0 - amount
    expected = (1.0 - n, -3.0 * (1.0 - n), -1.0, 0.0, 0.0)
    return n if close(dims, expected) else None
