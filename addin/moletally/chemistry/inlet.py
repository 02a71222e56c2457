"""What enters a vessel: streams in concentrations or flows, moles or mass, mixed by moles and volume."""

import math
from collections.abc import Sequence
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from moletally.chemistry.errors import Finding, InputError, Level, Place
from moletally.chemistry.quantity import DIMENSIONLESS, ONE, Dims, Unit, compose, parse_unit, to_si
from moletally.chemistry.tables import FeedTable, Quantity, Stream

__all__ = ["Inlet", "feed_quantities", "is_mass_basis"]

Floats = NDArray[np.float64]

CONCENTRATION: Dims = (1, -3, 0, 0, 0)
MASS_CONCENTRATION: Dims = (0, -3, 0, 1, 0)
MOLAR_FLOW: Dims = (1, 0, -1, 0, 0)
MASS_FLOW: Dims = (0, 0, -1, 1, 0)
VOLUMETRIC_FLOW: Dims = (0, 3, -1, 0, 0)
MOLAR_MASS: Dims = (-1, 0, 0, 1, 0)
TEMPERATURE: Dims = (0, 0, 0, 0, 1)
PRESSURE: Dims = (0, -1, -2, 1, 0)
KINDS = {CONCENTRATION: "conc", MASS_CONCENTRATION: "mass conc", MOLAR_FLOW: "flow", MASS_FLOW: "mass flow"}

NOISE = 1e-9  # of the total: a feed this little below zero is the round-off of a subtraction


def feed_quantities(feed: FeedTable) -> list[Quantity]:
    """Every amount and flow of a feed table: what makes a call one with units."""
    amounts = [q for row in feed.species for q in (*row.feed, row.start) if q is not None]
    return amounts + [s.flow for s in feed.streams if s.flow is not None]


def _unit(quantity: Quantity, what: str) -> Unit:
    """The unit of an amount, `what` in words; raises where it is none that a feed can have."""
    if quantity.unit is None:
        raise InputError(f"{what} has no unit, but other quantities of this call have one:"
                         " give units everywhere or nowhere", quantity.place)  # fmt: skip
    try:
        unit = parse_unit(quantity.unit)
    except InputError as error:
        raise error.at(quantity.place) from None
    if unit.dims not in KINDS:
        what = "mole fractions need a gas phase, which this version does not solve yet" if unit.dims == ONE else (
            f"a feed can't be in {unit.text}")  # fmt: skip
        raise InputError(
            f"{what}: give a concentration (mol/L, g/L) or a flow (mol/min, kg/h)", quantity.place
        )
    return unit


def _molar_mass(quantity: Quantity, name: str) -> float:
    value = to_si(quantity, MOLAR_MASS, True, f"MW of {name}")
    if not 0 < value < np.inf:
        raise InputError(f"MW of {name} must be more than 0", quantity.place)
    return value


def is_mass_basis(feed: FeedTable, with_units: bool) -> bool:
    """True where amounts are masses: fed in mass, and no molar mass to make them moles."""
    if not with_units:
        return False
    molar: list[str] = []
    without: list[tuple[str, Place]] = []
    for row in feed.species:
        for quantity in row.feed:
            in_mass = "mass" in KINDS[_unit(quantity, f"the feed of {row.name}").dims]
            if not in_mass:
                molar.append(row.name)
            elif row.molar_mass is None:
                without.append((row.name, quantity.place))
    if without and (molar or any(row.molar_mass is not None for row in feed.species)):
        name, place = without[0]
        raise InputError(f"{name} is fed in mass, others in moles: give its MW, or feed all in mass", place)
    return bool(without)


@dataclass
class Inlet:
    """The mixed inlet of N cases, in SI.

    concentration : ndarray, shape (N, S); start : the same for the first contents, or None
    flow : ndarray, shape (N,) - volumetric flow, nan where unknown
    temperature, pressure : of the streams, nan where not given; molar_mass : shape (S,), nan where not given
    units : the unit each species' concentration is shown in; common : the one for expressions
    amount : unit of molar flows, "" where none is known
    """

    feed: FeedTable
    with_units: bool
    mass_basis: bool
    findings: list[Finding] = field(default_factory=list)

    def __post_init__(self) -> None:
        self.molar_mass = self._molar_masses()
        streams = self.feed.streams
        self.stream_flow = np.array([self._scalar(s.flow, VOLUMETRIC_FLOW, "Flow") for s in streams])
        if (self.stream_flow <= 0).any():
            bad = streams[int(np.flatnonzero(self.stream_flow <= 0)[0])]
            raise InputError(
                f"Flow of the stream {bad.name} must be more than 0",
                bad.flow.place if bad.flow else bad.place,
            )
        self._units = [[self._amount_unit(row.name, q) for q in row.feed] for row in self.feed.species]

    def _scalar(self, quantity: Quantity | None, dims: Dims, name: str) -> float:
        return np.nan if quantity is None else to_si(quantity, dims, self.with_units, name)

    def _amount_unit(self, name: str, quantity: Quantity) -> Unit:
        return _unit(quantity, f"the feed of {name}") if self.with_units else DIMENSIONLESS

    def _molar_masses(self) -> Floats:
        return np.array([
            np.nan if row.molar_mass is None else _molar_mass(row.molar_mass, row.name)
            for row in self.feed.species
        ])  # fmt: skip

    @cached_property
    def needs_flow(self) -> bool:
        """True where concentrations follow from flows only."""
        return len(self.feed.streams) > 1 or any(
            "flow" in KINDS.get(u.dims, "") for row in self._units for u in row
        )

    @cached_property
    def flow(self) -> float:
        """Volumetric flow of all streams, nan if one is unknown."""
        return float(self.stream_flow.sum())

    def mixed(self, flow: Floats, place: Place) -> tuple[Floats, Floats]:
        """Concentrations, shape (N, S), and flows, shape (N,), for flows given with the reactor (nan: none).

        place : of that flow, for complaints
        """
        if not self.needs_flow:
            known = flow if math.isnan(self.flow) else np.where(np.isnan(flow), self.flow, flow)
            return self._given[None, :].repeat(len(flow), axis=0), known
        own = self.flow
        total = np.where(np.isnan(flow), own, flow)
        if np.isnan(total).any():
            raise InputError(self._missing_flow(), place)
        if len(self.feed.streams) > 1:
            per_stream = self.stream_flow
            if np.isnan(per_stream).any():
                raise InputError(self._missing_flow(), self.feed.streams[0].place)
            return np.repeat((self._molar / own)[None, :], len(flow), axis=0), total
        by_flow, amounts = self._by_flow(0), self._given
        with np.errstate(invalid="ignore"):
            c = np.where(by_flow[None, :], amounts[None, :] / total[:, None], amounts[None, :])
        return self._clean(c), total

    @cached_property
    def _given(self) -> Floats:
        """Concentrations or flows of the one stream, shape (S,)."""
        return self._clean(self._amounts(0))

    @cached_property
    def _molar(self) -> Floats:
        """Molar flows of all streams together, shape (S,)."""
        return sum(
            (self._moles(s, q) for s, q in enumerate(self.stream_flow)), np.zeros(len(self.feed.species))
        )

    def _by_flow(self, stream: int) -> NDArray[np.bool_]:
        return np.array(["flow" in KINDS.get(row[stream].dims, "") for row in self._units])

    def start(self, c: Floats) -> Floats | None:
        """First contents, shape (N, S); what is not given is the feed. None where nothing is given."""
        if not self._has_start:
            return None
        rows = self.feed.species
        first = c.copy()
        for i, row in enumerate(rows):
            if row.start is not None:
                first[:, i] = self._concentration(row.start, i)
                if row.start.value < 0:
                    raise InputError(f"Start of {row.name} is negative", row.start.place)
        return self._clean(first)

    @cached_property
    def _has_start(self) -> bool:
        return any(row.start is not None for row in self.feed.species)

    def temperature(self) -> float:
        """Temperature of the streams, nan where none is given or where they differ."""
        given = [
            to_si(s.temperature, TEMPERATURE, True, "Temperature") for s in self.feed.streams if s.temperature
        ]
        return given[0] if given and max(given) - min(given) <= 1e-9 * max(given) else np.nan

    def temperatures_differ(self) -> bool:
        """True where streams of different temperatures meet."""
        return any(s.temperature for s in self.feed.streams) and bool(np.isnan(self.temperature()))

    def pressure(self) -> float:
        """Pressure of the first stream that has one, nan where none is given."""
        given = [s.pressure for s in self.feed.streams if s.pressure]
        return to_si(given[0], PRESSURE, True, "Pressure") if given else np.nan

    def _missing_flow(self) -> str:
        if len(self.feed.streams) > 1:
            lacking = [
                s.name for s, q in zip(self.feed.streams, self.stream_flow, strict=True) if np.isnan(q)
            ]
            return f"streams are mixed by their flows: give Flow of {', '.join(lacking)} below the species"
        return "the feed is given as a flow: give Flow too, the volumetric flow, to make it a concentration"

    def _concentration(self, quantity: Quantity, i: int) -> float:
        name = f"Start of {self.feed.species[i].name}"
        if not self.with_units:
            return to_si(quantity, ONE, False, name)
        unit = _unit(quantity, f"Start of {self.feed.species[i].name}")
        if "flow" in KINDS[unit.dims]:
            raise InputError(f"{name} is a concentration, not a flow", quantity.place)
        return unit.to_si(quantity.value) / self._per_mole(unit, i, quantity.place)

    def _per_mole(self, unit: Unit, i: int, place: Place) -> float:
        """What to divide a mass by: the molar mass, or 1 on a mass basis."""
        if "mass" not in KINDS.get(unit.dims, "") or self.mass_basis:
            return 1.0
        if np.isnan(self.molar_mass[i]):
            raise InputError(f"{self.feed.species[i].name} is given in mass: give its MW", place)
        return float(self.molar_mass[i])

    def _amounts(self, stream: int) -> Floats:
        """Concentrations or flows of one stream in SI and moles, as they are given."""
        values = []
        for i, row in enumerate(self.feed.species):
            quantity, unit = row.feed[stream], self._units[i][stream]
            if not self.with_units and quantity.unit not in (None, "", "-"):
                to_si(quantity, ONE, False, f"the feed of {row.name}")
            values.append(unit.to_si(quantity.value) / self._per_mole(unit, i, quantity.place))
            if not np.isfinite(values[-1]):
                raise InputError(f"the feed of {row.name} is too large to compute with", quantity.place)
        return self._not_negative(np.array(values), stream)

    def _not_negative(self, values: Floats, stream: int) -> Floats:
        total = np.abs(values).sum()
        for i in np.flatnonzero(values < 0):
            row = self.feed.species[i]
            if values[i] < -NOISE * total:
                raise InputError(f"the feed of {row.name} is negative", row.feed[stream].place)
            self.findings.append(Finding(Level.NOTE, str(row.feed[stream].place),
                                         f"the feed of {row.name} is a little below zero: taken as 0"))  # fmt: skip
        return np.maximum(values, 0.0)

    def _moles(self, stream: int, flow: float) -> Floats:
        """Molar flows of one stream, mol/s."""
        amounts = self._amounts(stream)
        return np.where(self._by_flow(stream), amounts, amounts * flow)

    @staticmethod
    def _clean(c: Floats) -> Floats:
        return c + 0.0  # no negative zero reaches a key or a cell

    def species_units(self) -> tuple[Unit, ...]:
        """The unit each species is shown in: its own, or mol/m^3 where it is fed as a flow."""
        if not self.with_units:
            return (DIMENSIONLESS,) * len(self._units)
        fallback = parse_unit("kg/m^3" if self.mass_basis else "mol/m^3")
        return tuple(row[0] if "conc" in KINDS[row[0].dims] else fallback for row in self._units)

    def common_unit(self) -> Unit:
        """The unit of concentrations inside an expression."""
        if not self.with_units:
            return DIMENSIONLESS
        wanted = MASS_CONCENTRATION if self.mass_basis else CONCENTRATION
        units = self.species_units()
        return next(
            (u for u in units if u.dims == wanted), parse_unit("kg/m^3" if self.mass_basis else "mol/m^3")
        )

    def flow_unit(self, volumetric: Sequence[str]) -> Unit:
        """The unit of molar flows: the feed's, or its amount unit per the time unit of the flow.

        volumetric : units in which a volumetric flow is given
        """
        if not self.with_units:
            return DIMENSIONLESS
        own = next((u for row in self._units for u in row if "flow" in KINDS[u.dims]), None)
        if own is not None:
            return own
        like = [parse_unit(text) for text in volumetric] + [self.common_unit()]
        return parse_unit(compose(MASS_FLOW if self.mass_basis else MOLAR_FLOW, like))

    def flow_units(self) -> list[str]:
        """Units of the streams' volumetric flows, as written."""
        return [s.flow.unit for s in self.feed.streams if isinstance(s, Stream) and s.flow and s.flow.unit]
