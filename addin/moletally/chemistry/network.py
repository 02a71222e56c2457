"""A network: species, reactions, rate laws and their parameters, compiled for the kernel."""

from dataclasses import dataclass, field
from functools import cached_property, lru_cache

import numpy as np
from numpy.typing import NDArray

from moletally.chemistry.alike import hint
from moletally.chemistry.compiler import compile_laws
from moletally.chemistry.errors import Finding, InputError, Level, Place
from moletally.chemistry.expression import Call, names, walk
from moletally.chemistry.laws import Law, exponent_slots, law_of, unused
from moletally.chemistry.parameters import Parameter, Parameters
from moletally.chemistry.quantity import Unit, parse_unit
from moletally.chemistry.rate_units import check_rates, is_per_pressure
from moletally.chemistry.tables import ConstantRow, ReactionRow, ReactionTable
from moletally.kernel.program import Model

__all__ = ["Network", "Reaction", "build_network"]


@dataclass(frozen=True)
class Reaction:
    """A reaction of the network.

    number : 1, 2, … as in k(2); label : what a result calls it; change : net coefficients in feed order
    """

    number: int
    label: str
    row: ReactionRow
    law: Law
    change: tuple[float, ...]


@dataclass(frozen=True, eq=False)
class Network:
    """Species in feed order, reactions, and the parameters their laws take.

    model : the kernel's program and stoichiometry; parameters : what its parameter vector holds
    with_units : whether numbers are converted to SI; mass_basis : whether amounts are masses
    time_units : the units of time that the rate constants are given in
    per_mass : True where rates are per mass of catalyst
    """

    species: tuple[str, ...]
    reactions: tuple[Reaction, ...]
    parameters: Parameters
    model: Model
    with_units: bool
    mass_basis: bool
    per_mass: bool
    findings: tuple[Finding, ...]
    constants: tuple[ConstantRow, ...] = field(default=())

    @cached_property
    def time_units(self) -> tuple[str, ...]:
        """Names of the units of time among the constants' units."""
        found = {name for p in self.parameters.items if p.unit is not None for name in p.unit.time_units}
        return tuple(sorted(found))

    @cached_property
    def units(self) -> tuple[Unit, ...]:
        """The units of the constants, as given."""
        return tuple(p.unit for p in self.parameters.items if p.unit is not None)

    @cached_property
    def needs_temperature(self) -> Parameter | str | None:
        """What makes a temperature necessary: a parameter, a law's text, or None."""
        for reaction in self.reactions:
            if reaction.law.uses_temperature:
                return f"the law {reaction.law.text}"
        return next((p for p in self.parameters.items if p.needs_temperature), None)

    @cached_property
    def uses_pressure(self) -> bool:
        """True where a law is in partial pressures."""
        return any(reaction.law.uses_pressure for reaction in self.reactions)

    def values(self, numbers: tuple[float, ...]) -> tuple[NDArray[np.float64], tuple[Finding, ...]]:
        """The parameter vector in SI for the numbers of a table, and remarks on them.

        Raises
        ------
        InputError
            For a number that can't be: a negative rate constant, an equilibrium constant of zero.
        """
        return self.parameters.values(numbers)


def build_network(
    table: ReactionTable,
    constants: tuple[ConstantRow, ...],
    species: tuple[str, ...],
    with_units: bool,
    mass_basis: bool,
    feed_units: tuple[str, ...],
    exponents: tuple[tuple[int, float], ...],
) -> Network:
    """Build the network of a table.

    species : names in feed order
    feed_units : units of the feed as written, in which a missing unit is proposed
    exponents : (slot, number) of the plain numbers that may be exponents: orders decide dimensions

    Raises
    ------
    InputError
        With its place, for what is missing, unknown, unused or does not fit together.
    """
    if exponents:  # a number that is no exponent must not make a network of its own
        slots = exponent_slots(table, constants)
        exponents = tuple(pair for pair in exponents if pair[0] in slots)
    return _build(table, constants, species, with_units, mass_basis, feed_units, exponents)


@lru_cache(maxsize=512)
def _build(
    table: ReactionTable,
    constants: tuple[ConstantRow, ...],
    species: tuple[str, ...],
    with_units: bool,
    mass_basis: bool,
    feed_units: tuple[str, ...],
    exponents: tuple[tuple[int, float], ...],
) -> Network:
    _check_names(table, constants, species)
    shared = frozenset(row.name for row in constants)
    like = tuple(parse_unit(u) for u in feed_units)
    reactions: list[Reaction] = []
    findings: list[Finding] = []
    for number, row in enumerate(table.rows, start=1):
        in_pressures = with_units and not row.rate and is_per_pressure(row, mass_basis)
        law = law_of(row, species, shared, in_pressures)
        _check_row(row, law, species, shared)
        _check_basis(row, law, species, with_units, mass_basis)
        reactions.append(Reaction(number, _label(row), row, law, _change(row, species)))
        findings += _remarks(reactions[-1], table, species)
    _check_shared(constants, reactions, species)
    parameters = Parameters.of(tuple((r.number, r.row, r.law) for r in reactions), constants, with_units)
    per_mass = False
    if with_units:
        per_mass, orders = check_rates(reactions, parameters, species, mass_basis, like, dict(exponents))
        parameters = parameters.with_orders({slot: x for slot, x in exponents if slot in orders})
    program = compile_laws([r.law for r in reactions], parameters, species)
    model = Model(
        program, np.array([r.change for r in reactions], dtype=np.float64).reshape(-1, len(species))
    )
    return Network(
        species,
        tuple(reactions),
        parameters,
        model,
        with_units,
        mass_basis,
        per_mass,
        tuple(findings),
        constants,
    )


def _label(row: ReactionRow) -> str:
    """The equation for a list of reactions, the column's header for a matrix."""
    return row.equation.text if row.label.isdigit() else row.label


def _change(row: ReactionRow, species: tuple[str, ...]) -> tuple[float, ...]:
    change = dict.fromkeys(species, 0.0)
    for sign, side in ((-1.0, row.equation.left), (1.0, row.equation.right)):
        for name, coefficient in side:
            change[name] += sign * coefficient
    return tuple(change.values())


def _check_names(table: ReactionTable, constants: tuple[ConstantRow, ...], species: tuple[str, ...]) -> None:
    for row in table.rows:
        for name, _ in (*row.equation.left, *row.equation.right):
            if name not in species:
                raise InputError(
                    f"the species {name!r} has no row in the feed table (write 0 if it is not fed)."
                    f" {hint(name, species)}",
                    row.place,
                )
        for name, number in row.constants:
            _check_constant(name, number.place, species)
    for constant in constants:
        _check_constant(constant.name, constant.place, species)


def _check_constant(name: str, place: Place, species: tuple[str, ...]) -> None:
    if name in species:
        raise InputError(f"{name!r} is both a species and a constant: rename one of them", place)
    if name in ("R", "T"):
        what = "gas constant" if name == "R" else "temperature"
        raise InputError(f"{name} stands for the {what} in a rate law: rename the constant", place)


def _check_row(row: ReactionRow, law: Law, species: tuple[str, ...], shared: frozenset[str]) -> None:
    given = dict(row.constants)
    if "k" in given and "k0" in given:
        raise InputError("both k and k0 are given: keep one", given["k0"].place)
    name = unused(row, law)
    if name is None:
        return
    if name in ("E", "T ref"):
        raise InputError(f"{name} belongs to k, which the law {law.text} does not use", given[name].place)
    others = [n.text for n in names(law.tree) if n.text not in species and n.text not in shared]
    raise InputError(f"the constant {name!r} stands in no law: the Rate is {law.text}."
                     f" {hint(name, others)}".rstrip(), given[name].place)  # fmt: skip


def _check_basis(
    row: ReactionRow, law: Law, species: tuple[str, ...], with_units: bool, mass_basis: bool
) -> None:
    """Refuse what has no meaning without units, or on a basis of mass."""
    if not with_units and any(
        n.text == "R" and not n.bracketed and n.text not in species for n in names(law.tree)
    ):
        raise InputError("R is 8.314 J/(mol K): a law with R needs units throughout", row.rate_place)
    if mass_basis and any(isinstance(node, Call) and node.function in ("p", "x") for node in walk(law.tree)):
        raise InputError("p() and x() count moles, but the feed is in mass: give the MW of every species",
                         row.rate_place)  # fmt: skip


def _check_shared(
    constants: tuple[ConstantRow, ...], reactions: list[Reaction], species: tuple[str, ...]
) -> None:
    for constant in constants:
        if not any(constant.name in r.law.constants for r in reactions):
            words = sorted({n.text for r in reactions for n in names(r.law.tree)} - set(species))
            raise InputError(f"the constant {constant.name!r} stands in no Rate. {hint(constant.name, words)}",
                             constant.place)  # fmt: skip


def _remarks(reaction: Reaction, table: ReactionTable, species: tuple[str, ...]) -> list[Finding]:
    """Notes on what was read into a row."""
    row, where = reaction.row, str(reaction.row.place)
    notes: list[Finding] = []
    if reaction.law.by_default:
        notes.append(Finding(Level.NOTE, where, f"no Rate given: mass action, {reaction.law.text}"))
    factors = {abs(nu) for nu in reaction.change if nu} - {1.0}
    if factors:
        consumed = [
            (name, -nu) for name, nu in zip(species, reaction.change, strict=True) if nu < 0 and nu != -1
        ]
        made = [(name, nu) for name, nu in zip(species, reaction.change, strict=True) if nu > 0 and nu != 1]
        words = [f"{name} disappears at {nu:g}·r" for name, nu in consumed]
        words += [f"{name} forms at {nu:g}·r" for name, nu in made]
        notes.append(
            Finding(Level.NOTE, where, f"r is the rate of {row.equation.text} as written: {', '.join(words)}")
        )
    given = {name for name, _ in row.constants}
    for reference, energy, name in (("T ref", "E", "k"), ("Keq T ref", "dH", "Keq")):
        if reference in given and energy not in given:
            notes.append(
                Finding(
                    Level.NOTE, where, f"{reference} but no {energy}: {name} does not depend on temperature"
                )
            )
    if not any(reaction.change):
        notes.append(Finding(Level.DOUBT, where, f"{row.equation.text} changes nothing: is it meant?"))
    twins = [r for r in table.rows if r is not row and r.equation == row.equation and r.rate == row.rate]
    if twins and table.rows.index(row) > table.rows.index(twins[0]):
        notes.append(
            Finding(Level.DOUBT, where, f"{row.equation.text} stands twice with the same Rate: the rates add")
        )
    return notes
