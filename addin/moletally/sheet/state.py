"""The state a `want` may ask about: outlet, inlet, flows, and the unit each is shown in."""

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from moletally.chemistry.quantity import DIMENSIONLESS, Unit

__all__ = ["ResultUnits", "State"]

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class ResultUnits:
    """The units of results that carry none of their own; all dimensionless in a call without units.

    species : unit of each species' concentration, in feed order
    common : unit of concentrations inside an expression (moles, or mass where all is mass)
    flow, size, volume, pressure : units of molar flows, residence time, volume (or catalyst mass), pressure
    """

    species: tuple[Unit, ...]
    common: Unit
    flow: Unit = DIMENSIONLESS
    time: Unit = DIMENSIONLESS
    volume: Unit = DIMENSIONLESS
    pressure: Unit = DIMENSIONLESS

    @cached_property
    def in_common(self) -> "ResultUnits":
        """The same with every concentration in one unit."""
        same = (self.common,) * len(self.species)
        return self if self.species == same else replace(self, species=same)


@dataclass(frozen=True)
class State:
    """M states (cases, or points along a tube), all in SI.

    names : S species in feed order
    concentration, inlet : ndarray, shape (M, S) [mol/m3]
    flow : ndarray, shape (M,) - volumetric flow [m3/s], nan where unknown
    residence_time : ndarray, shape (M,) [s], nan where unknown
    temperature, pressure : ndarray, shape (M,) [K], [Pa], nan where not given
    molar_mass : ndarray, shape (S,) [kg/mol], nan where not given
    """

    names: tuple[str, ...]
    concentration: Floats
    inlet: Floats
    flow: Floats
    residence_time: Floats
    temperature: Floats
    pressure: Floats
    molar_mass: Floats
    units: ResultUnits

    def __len__(self) -> int:
        return len(self.flow)

    def in_common_units(self) -> "State":
        """The same with every concentration in one unit: what expressions are evaluated in."""
        units = self.units.in_common
        return self if units is self.units else replace(self, units=units)
