"""From labels and tables to a batch of cases in SI; a fault of one case takes that case alone."""

from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from moletally.chemistry.errors import Finding, InputError, Level, Place, SheetError
from moletally.chemistry.formulas import check_formulas
from moletally.chemistry.inlet import Inlet
from moletally.chemistry.network import Network
from moletally.chemistry.quantity import DIMENSIONLESS, Dims, Unit, compose, parse_unit
from moletally.reactors.batch import Batch
from moletally.sheet.cases import Cases, Scales
from moletally.sheet.reading.grid import fold
from moletally.sheet.reading.labels import LABELS
from moletally.sheet.reading.reactor import Layout, ReactorInput
from moletally.sheet.reading.tables import Tables
from moletally.sheet.state import ResultUnits

__all__ = ["Setup"]

Floats = NDArray[np.float64]

TIME: Dims = (0, 0, 1, 0, 0)
VOLUME: Dims = (0, 3, 0, 0, 0)
FLOW: Dims = (0, 3, -1, 0, 0)
MASS: Dims = (0, 0, 0, 1, 0)
DENSITY: Dims = (0, -3, 0, 1, 0)
TEMPERATURE: Dims = (0, 0, 0, 0, 1)
PRESSURE: Dims = (0, -1, -2, 1, 0)
CONCENTRATION: Dims = (1, -3, 0, 0, 0)
MASS_CONCENTRATION: Dims = (0, -3, 0, 1, 0)
MOLAR_FLOW: Dims = (1, 0, -1, 0, 0)
AGREEMENT = 1e-6  # between a size given twice, such as a residence time beside volume and flow

# label -> (what this version solves, what belongs to later ones)
WORDS = {"Phase": ("liquid", ("gas",)), "Heat": ("isothermal", ("adiabatic", "jacket"))}


class Setup:
    """What tables and a layout of the reactor mean together; the numbers of a reactor make it a batch of cases.

    Made once for all calls that differ in the reactor's numbers alone: what depends on less is worked out
    at its first use and kept. Nothing here depends on those numbers.
    """

    def __init__(
        self, tables: Tables, layout: Layout, network: Network, with_units: bool, sized: bool
    ) -> None:
        self.tables, self.layout, self.network = tables, layout, network
        self.with_units, self.sized = with_units, sized
        self.inlet = Inlet(tables.feed, with_units, network.mass_basis)
        self.scales: Scales = {}

    def batch(self, reactor: ReactorInput) -> tuple[Batch, tuple[int | SheetError, ...], Floats]:
        """The good cases, for each case of the sheet its row or fault, and the pressures of the good ones."""
        cases = Cases(reactor, self.with_units, self.scales)
        parameters = self._parameters(cases)
        size, flow, density = self._size(cases)
        feed, flow = self.inlet.mixed(flow, self._flow_place)
        self._override_feed(cases, feed, flow)
        temperature = self._temperature(cases)
        whole = Batch(
            self.network, feed, size, temperature, parameters, self.inlet.start(feed), flow, density
        )
        pressure = self._or_inlet(cases.values("Pressure", PRESSURE, always=True), self._inlet_state[1])
        if not cases.faults and len(cases) == len(reactor.rows):
            return whole, tuple(range(len(cases))), pressure
        kept = np.array([i for i in range(len(cases)) if i not in cases.faults], dtype=np.intp)
        return whole.at(kept), self._rows(cases, kept), pressure[kept]

    def _rows(self, cases: Cases, kept: NDArray[np.intp]) -> tuple[int | SheetError, ...]:
        places = {int(row): i for i, row in enumerate(kept)}
        rows = iter(range(len(cases)))
        found: list[int | SheetError] = []
        for case in cases.reactor.rows:
            if isinstance(case, SheetError):
                found.append(case)
                continue
            row = next(rows)
            found.append(places[row] if row in places else cases.faults[row])
        return tuple(found)

    def check_words(self) -> None:
        """Refuse what belongs to a model that this version does not solve."""
        words = dict(self.layout.words)
        for label, (now, later) in WORDS.items():
            value, place = words.get(label, now).strip().casefold(), Place("Reactor", header=label)
            if value in later:
                raise InputError(f"{label} {value} is not solved by this version yet", place)
            if value != now:
                raise InputError(f"{label} is {value!r}: it takes {', '.join((now, *later))}", place)
        if self.network.uses_pressure:
            raise InputError(
                "rate laws in partial pressures need Phase gas, which is not solved by this version yet",
                Place("Reactions"),
            )

    @cached_property
    def _flow_place(self) -> Place:
        column = self.layout.column("Flow")
        return Place("Reactor", header="Flow") if column is None else column.place

    @cached_property
    def _values(self) -> tuple[Floats, tuple[Finding, ...]]:
        """The parameter vector of the tables' numbers, and remarks on them."""
        return self.network.values(self.tables.numbers)

    @cached_property
    def _overrides(self) -> tuple[str, ...]:
        """Labels of constants that the reactor gives numbers of its own."""
        return tuple(label for label in self.layout.where if fold(label) not in LABELS and label[:3] != "in(")

    def _parameters(self, cases: Cases) -> Floats:
        """The parameter vector of each case: the tables' numbers, overridden by labels of constants."""
        parameters = self._values[0][None, :].repeat(len(cases), axis=0)
        for label in self._overrides:
            self._override(cases, parameters, label)
        return parameters

    def _override(self, cases: Cases, parameters: Floats, label: str) -> None:
        index = self.network.parameters.find(label)
        place = cases.place(label)
        if index is None:
            raise InputError(
                f"{label} stands for several constants: write {label}(1) for that of reaction 1", place
            )
        item = self.network.parameters.items[index]
        own = item.with_unit(cases.unit_text(label), self.with_units, place)
        raw = cases.raw(label)
        wrong = {int(i): own.wrong(float(raw[i])) for i in np.flatnonzero(~np.isnan(raw))}
        bad = np.array([bool(wrong.get(i)) for i in range(len(raw))], dtype=np.bool_)
        cases.refuse(bad, label, lambda i: wrong[i])
        for i in wrong:
            parameters[i, index] = own.to_si(float(raw[i]))

    def _size(self, cases: Cases) -> tuple[Floats, Floats, Floats]:
        """tau (or W/q), flow and catalyst density of each case; what is given twice has to agree."""
        flow = cases.values("Flow", FLOW)
        bare = self._time_unit() if self.layout.bare and self.with_units else None
        tau = cases.values("Residence time", TIME, bare)
        volume = cases.values("Volume", VOLUME)
        cases.refuse_sign("Flow", flow, zero_too=False)
        cases.refuse_sign("Residence time", tau, zero_too=True)
        cases.refuse_sign("Volume", volume, zero_too=True)
        if cases.has("Volume") or cases.has("Flow") or self.inlet.flow == self.inlet.flow:
            tau, flow = self._from_volume(cases, tau, volume, flow)
        if self.network.per_mass:
            return self._catalyst(cases, tau, flow)
        self._require(
            cases, tau, "the size of the vessel is missing: give Residence time, or Volume and Flow"
        )
        return tau, flow, cases.unknown

    def _from_volume(self, cases: Cases, tau: Floats, volume: Floats, flow: Floats) -> tuple[Floats, Floats]:
        """Residence time and flow, each from the other where it is not given."""
        own = self.inlet.flow
        if (
            not cases.has("Residence time") and own != own
        ):  # the usual block: volume and flow, and nothing twice
            with np.errstate(all="ignore"):
                return volume / flow, flow
        with np.errstate(all="ignore"):
            known = np.where(np.isnan(flow), own, flow)
            known = np.where(np.isnan(known) & (tau > 0), volume / tau, known)
            from_volume = volume / known
            clash = np.abs(tau - from_volume) > AGREEMENT * np.abs(tau)
            twice = np.abs(flow - own) > AGREEMENT * own
        cases.refuse(
            clash, "Residence time",
            lambda i: f"the residence time and Volume / Flow do not agree ({tau[i]:.6g} and {from_volume[i]:.6g},"
            f" in {'s' if self.with_units else 'the units of the sheet'}): keep one",
        )  # fmt: skip
        cases.refuse(
            twice, "Flow",
            lambda i: f"Flow is given with the feed too, and differs ({flow[i]:.6g} and {own:.6g},"
            f" in {'m3/s' if self.with_units else 'the units of the sheet'}): keep one",
        )  # fmt: skip
        return np.where(np.isnan(tau), from_volume, tau), known

    def _catalyst(self, cases: Cases, tau: Floats, flow: Floats) -> tuple[Floats, Floats, Floats]:
        """W/q for rates per mass of catalyst."""
        density = cases.values("Bulk density", DENSITY)
        mass = cases.values("Catalyst mass", MASS)
        cases.refuse_sign("Bulk density", density, zero_too=False)
        cases.refuse_sign("Catalyst mass", mass, zero_too=True)
        with np.errstate(all="ignore"):
            by_mass, by_density = mass / flow, tau * density
            clash = np.abs(by_mass - by_density) > AGREEMENT * by_mass
        cases.refuse(clash, "Catalyst mass",
                     lambda _: "Catalyst mass and Bulk density times volume do not agree: keep one")  # fmt: skip
        size = np.where(np.isnan(by_mass), by_density, by_mass)
        self._require(
            cases, size,
            "the rates are per mass of catalyst: give Catalyst mass and Flow, or Bulk density and the volume",
        )  # fmt: skip
        return size, flow, density

    def _require(self, cases: Cases, size: Floats, missing: str) -> None:
        if self.sized and not cases.all_have("Residence time"):
            cases.refuse(np.isnan(size), "Residence time", lambda _: missing)

    def _time_unit(self) -> Unit:
        """The one time unit of the constants: what a bare residence time is in."""
        names = self.network.time_units
        if len(names) == 1:
            return parse_unit(names[0])
        why = f"have several ({', '.join(names)})" if names else "have none"
        raise InputError(
            f"the residence time has no unit and takes that of the rate constants, but they {why}:"
            " give a block, Residence time | value | unit", Place("Reactor"))  # fmt: skip

    @cached_property
    def _own_feeds(self) -> tuple[tuple[int, str], ...]:
        """Species whose feed the reactor gives, with their labels."""
        labels = [(i, f"in({name})") for i, name in enumerate(self.network.species)]
        return tuple((i, label) for i, label in labels if label in self.layout.where)

    def _override_feed(self, cases: Cases, feed: Floats, flow: Floats) -> None:
        """Put in the cases' own `in(A)`."""
        for i, label in self._own_feeds:
            if np.isnan(cases.raw(label)).all():
                continue
            values = self._inlet_values(cases, label, i, flow)
            cases.refuse_sign(label, values, zero_too=True)
            feed[:, i] = np.where(np.isnan(values), feed[:, i], values)

    def _inlet_values(self, cases: Cases, label: str, i: int, flow: Floats) -> Floats:
        if not self.with_units:
            return cases.values(label, CONCENTRATION)
        text = cases.unit_text(label)
        dims = parse_unit(text).dims if text else None
        if dims == MASS_CONCENTRATION and not self.network.mass_basis:
            if np.isnan(self.inlet.molar_mass[i]):
                name = self.network.species[i]
                raise InputError(f"{label} is in mass: give the MW of {name}", cases.place(label))
            return cases.values(label, dims) / float(self.inlet.molar_mass[i])
        if dims == MOLAR_FLOW:
            return cases.values(label, dims) / flow
        return cases.values(label, MASS_CONCENTRATION if self.network.mass_basis else CONCENTRATION)

    @cached_property
    def _inlet_state(self) -> tuple[float, float]:
        """Temperature and pressure of the streams, nan where there is none or where they differ."""
        return self.inlet.temperature(), self.inlet.pressure()

    @staticmethod
    def _or_inlet(values: Floats, inlet: float) -> Floats:
        return values if inlet != inlet else np.where(np.isnan(values), inlet, values)

    def _temperature(self, cases: Cases) -> Floats:
        values = cases.values("Temperature", TEMPERATURE, always=True)
        cases.refuse_sign("Temperature", values, zero_too=False)
        values = self._or_inlet(values, self._inlet_state[0])
        reason = self.network.needs_temperature
        if reason is not None:
            what = reason if isinstance(reason, str) else f"{reason.label} is given, which"
            text = f"{what} needs a temperature: add Temperature to the reactor block"
            if self.inlet.temperatures_differ():
                text = "the streams have different temperatures: give Temperature of the vessel"
            cases.refuse(np.isnan(values), "Temperature", lambda _: text)
        return values

    @cached_property
    def findings(self) -> tuple[Finding, ...]:
        """What an audit should say of the tables and the labels.

        Raises
        ------
        InputError
            For reactions whose atoms do not balance.
        """
        found = [*self.network.findings, *self._values[1]]
        for label in self.layout.labels:
            known = LABELS.get(fold(label))
            catalyst = label in ("Bulk density", "Catalyst mass") and not self.network.per_mass
            if known is not None and (known.later or catalyst):
                column = self.layout.column(label)
                place = column.place if column is not None else Place("Reactor", header=label)
                found.append(Finding(Level.NOTE, str(place), f"{label} is not used here"))
        found += check_formulas(self.network, self.tables.feed)
        rows = [r.row.equation for r in self.network.reactions]
        used = {name for e in rows for name, _ in (*e.left, *e.right)}
        inert = [name for name in self.network.species if name not in used]
        if inert:
            found.append(Finding(Level.NOTE, "Feed", f"in no reaction, so inert: {', '.join(inert)}"))
        if not self.with_units:
            found.append(Finding(Level.NOTE, "units", "no units are given: numbers are taken as consistent"))
        elif self.network.mass_basis:
            found.append(Finding(Level.NOTE, "Feed",
                                 "fed in mass without MW: amounts are masses and coefficients mass ratios"))  # fmt: skip
        return (*found, *self.inlet.findings)

    @cached_property
    def units(self) -> ResultUnits:
        """The units of results that name none of their own."""
        pressure = self._given_unit("Pressure", "Pa")
        if not self.with_units:
            return ResultUnits(self.inlet.species_units(), DIMENSIONLESS, pressure=pressure)
        flows = [text for text in (self._unit_text("Flow"), *self.inlet.flow_units()) if text]
        times = self.network.time_units
        volume = compose(VOLUME, [parse_unit(f) for f in flows])
        return ResultUnits(
            species=self.inlet.species_units(),
            common=self.inlet.common_unit(),
            flow=self.inlet.flow_unit(flows),
            time=self._given_unit("Residence time", times[0] if len(times) == 1 else "s"),
            volume=self._given_unit("Catalyst mass", "kg")
            if self.network.per_mass
            else self._given_unit("Volume", volume),
            pressure=pressure,
        )

    def _given_unit(self, label: str, default: str) -> Unit:
        return parse_unit(self._unit_text(label) or default)

    def _unit_text(self, label: str) -> str | None:
        column = self.layout.column(label)
        return None if column is None else column.unit
