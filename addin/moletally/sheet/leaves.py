"""What a `want` may name: species, tau, conversion(A), flow(A) ...; each a value with its dimension."""

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from moletally.chemistry.errors import InputError, near_miss
from moletally.chemistry.expression import MATHS, Call, Function, Name
from moletally.chemistry.quantity import DIMENSIONLESS, Dims, Unit, parse_unit
from moletally.sheet.state import State

__all__ = ["WANT", "Leaf", "call_leaf", "name_leaf", "species_leaf"]

Floats = NDArray[np.float64]

# amount, length, time, mass, temperature
ONE: Dims = (0, 0, 0, 0, 0)
MASS_CONCENTRATION: Dims = (0, -3, 0, 1, 0)
MASS_FLOW: Dims = (0, 0, -1, 1, 0)
TEMPERATURE: Dims = (0, 0, 0, 0, 1)
PRESSURE: Dims = (0, -1, -2, 1, 0)


@dataclass(frozen=True)
class Leaf:
    """A value that an expression may name.

    si : ndarray, shape (M,); dims : its dimension; unit : the unit it is shown in if none is asked for
    undefined : why it is not finite, where it is not
    molar_mass, mass_dims : of an amount [kg/mol], and the dimension it has when it is counted in mass instead
        of moles; nan where no molar mass is known
    """

    si: Floats
    dims: Dims
    unit: Unit
    undefined: str = ""
    molar_mass: float = math.nan
    mass_dims: Dims = ONE

    @property
    def shown(self) -> Floats:
        """The value in `unit`."""
        return self.within(self.unit)

    def within(self, unit: Unit) -> Floats:
        """The value in a unit that `fits`."""
        if unit.dims != self.dims and self._in_mass(unit):
            return unit.from_si(self.si * self.molar_mass)
        return unit.from_si(self.si)

    def fits(self, unit: Unit) -> bool:
        """True where `within` can answer."""
        return unit.dims == self.dims or self._in_mass(unit)

    def _in_mass(self, unit: Unit) -> bool:
        return unit.dims == self.mass_dims and not math.isnan(self.molar_mass)


def _ratio(one: Floats, other: Floats) -> Floats:
    return np.divide(one, other, out=np.full_like(one, np.nan), where=other != 0)


def _formed(state: State, i: int) -> Floats:
    """Outlet less inlet; the difference of two equal amounts is round-off, not a product formed."""
    out, fed = state.concentration[:, i], state.inlet[:, i]
    formed = out - fed
    return np.where(np.abs(formed) <= 4 * np.finfo(float).eps * np.maximum(out, fed), 0.0, formed)


def _index(state: State, tree: Call, position: int = 0) -> int:
    node = tree.args[position]
    name = node.text if isinstance(node, Name) else ""
    if name not in state.names:
        raise InputError(f"unknown species {name!r} in {tree.function}(). {near_miss(name, state.names)}")
    return state.names.index(name)


def _conversion(state: State, tree: Call) -> Leaf:
    i = _index(state, tree)
    name = state.names[i]
    return Leaf(_ratio(-_formed(state, i), state.inlet[:, i]), ONE, DIMENSIONLESS,
                f"conversion({name}) is undefined (0/0): {name} is not fed")  # fmt: skip


def _yield(state: State, tree: Call) -> Leaf:
    product, key = _index(state, tree, 0), _index(state, tree, 1)
    name = state.names[key]
    return Leaf(_ratio(_formed(state, product), state.inlet[:, key]), ONE, DIMENSIONLESS,
                f"yield({state.names[product]}, {name}) is undefined (0/0): {name} is not fed")  # fmt: skip


def _selectivity(state: State, tree: Call) -> Leaf:
    one, other = _index(state, tree, 0), _index(state, tree, 1)
    name = state.names[other]
    why = f"selectivity({state.names[one]}, {name}) is undefined (0/0): no {name} is formed"
    return Leaf(_ratio(_formed(state, one), _formed(state, other)), ONE, DIMENSIONLESS, why)


def _inlet(state: State, tree: Call) -> Leaf:
    return _concentration(state, _index(state, tree), state.inlet)


def _concentration(state: State, i: int, values: Floats) -> Leaf:
    """A concentration; what was fed in mass is shown in mass, though balances run in moles."""
    units = state.units
    return Leaf(
        values[:, i], units.common.dims, units.species[i], "", state.molar_mass[i], MASS_CONCENTRATION
    )


def _flow(state: State, tree: Call) -> Leaf:
    i = _index(state, tree)
    if np.isnan(state.flow).all():
        raise InputError("flow() needs the volumetric flow: give Flow in the reactor block or below the feed")
    flow = state.concentration[:, i] * state.flow
    return Leaf(flow, state.units.flow.dims, state.units.flow, "", state.molar_mass[i], MASS_FLOW)


def _fraction(state: State, tree: Call) -> Leaf:
    i = _index(state, tree)
    total = state.concentration.sum(axis=1)
    return Leaf(_ratio(state.concentration[:, i], total), ONE, DIMENSIONLESS,
                f"x({state.names[i]}) is undefined (0/0): the stream is empty")  # fmt: skip


def _partial_pressure(state: State, tree: Call) -> Leaf:
    raise InputError(f"{tree.function}() needs a gas phase, which this version does not solve yet")


def _needed(values: Floats, dims: Dims, unit: Unit, missing: str) -> Leaf:
    if np.isnan(values).all():
        raise InputError(missing)
    return Leaf(values, dims, unit)


def _tau(state: State) -> Leaf:
    return _needed(state.residence_time, state.units.time.dims, state.units.time,
                   "tau is not known from a catalyst mass alone: add Bulk density")  # fmt: skip


def _temperature(state: State) -> Leaf:
    return _needed(state.temperature, TEMPERATURE, parse_unit("K"),
                   "no temperature is given: add Temperature to the reactor block")  # fmt: skip


def _pressure(state: State) -> Leaf:
    return _needed(state.pressure, PRESSURE, state.units.pressure,
                   "no pressure is given: add Pressure to the reactor block")  # fmt: skip


def _later(state: State) -> Leaf:
    raise InputError("this needs the heat balance, which this version does not solve yet")


CALLS: dict[str, tuple[Function, Callable[[State, Call], Leaf]]] = {
    "in": (Function("in", of_names=True), _inlet),
    "flow": (Function("flow", of_names=True), _flow),
    "x": (Function("x", of_names=True), _fraction),
    "p": (Function("p", of_names=True), _partial_pressure),
    "conversion": (Function("conversion", of_names=True), _conversion),
    "yield": (Function("yield", 2, 2, of_names=True), _yield),
    "selectivity": (Function("selectivity", 2, 2, of_names=True), _selectivity),
}

WORDS: dict[str, Callable[[State], Leaf]] = {
    "tau": _tau,
    "temperature": _temperature,
    "pressure": _pressure,
    "duty": _later,
    "coolant temperature": _later,
}

WANT: tuple[Function, ...] = (*MATHS, *(function for function, _ in CALLS.values()))


def call_leaf(state: State, node: Call) -> Leaf:
    """The value of a function of species, such as `conversion(A)`."""
    if node.function not in CALLS:
        raise InputError(
            f"{node.function}() of one value needs a tube with heat, which this version does not solve yet"
        )
    return CALLS[node.function][1](state, node)


def species_leaf(state: State, index: int) -> Leaf:
    """The outlet concentration of a species."""
    return _concentration(state, index, state.concentration)


def name_leaf(state: State, node: Name) -> Leaf:
    """The value of a bare name: a species first, else one of the words."""
    if node.text in state.names:
        return species_leaf(state, state.names.index(node.text))
    if node.text in WORDS:
        return WORDS[node.text](state)
    raise InputError(f"unknown name {node.text!r}. {near_miss(node.text, [*state.names, *WORDS])}")
