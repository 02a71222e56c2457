"""From labels and tables to a batch of cases in SI; a fault of one case takes that case alone."""

import numpy as np
from numpy.typing import NDArray

from moletally.chemistry.errors import Finding, InputError, Level, Place, SheetError
from moletally.chemistry.formulas import check_formulas
from moletally.chemistry.inlet import Inlet
from moletally.chemistry.network import Network
from moletally.chemistry.quantity import DIMENSIONLESS, Dims, Unit, compose, parse_unit
from moletally.reactors.batch import Batch
from moletally.sheet.cases import Cases
from moletally.sheet.reading.grid import fold
from moletally.sheet.reading.labels import LABELS
from moletally.sheet.reading.reactor import ReactorInput
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
    """Works out the cases of one call; `findings` collects what an audit should say."""

    def __init__(self, tables: Tables, network: Network, reactor: ReactorInput, with_units: bool,
                 sized: bool) -> None:  # fmt: skip
        self.tables, self.network, self.reactor = tables, network, reactor
        self.with_units, self.sized = with_units, sized
        self.cases = Cases(reactor, with_units)
        self.inlet = Inlet(tables.feed, with_units, network.mass_basis)
        self.findings: list[Finding] = list(network.findings)

    def batch(self) -> tuple[Batch, tuple[int | SheetError, ...], Floats]:
        """The good cases, for each case of the sheet its row or fault, and the pressures of the good ones."""
        self._check_words()
        parameters = self._parameters()
        size, flow, density = self._size()
        feed, flow = self.inlet.mixed(flow, self.cases.place("Flow"))
        feed = self._overridden(feed, flow)
        temperature = self._temperature()
        self._remarks()
        whole = Batch(
            self.network, feed, size, temperature, parameters, self.inlet.start(feed), flow, density
        )
        kept = np.array([i for i in range(len(self.cases)) if i not in self.cases.faults], dtype=np.intp)
        batch = whole if len(kept) == len(self.cases) else whole.at(kept)
        return batch, self._rows(kept), self._pressure()[kept]

    def _rows(self, kept: NDArray[np.intp]) -> tuple[int | SheetError, ...]:
        places = {int(row): i for i, row in enumerate(kept)}
        rows = iter(range(len(self.cases)))
        found: list[int | SheetError] = []
        for case in self.reactor.rows:
            if isinstance(case, SheetError):
                found.append(case)
                continue
            row = next(rows)
            found.append(places[row] if row in places else self.cases.faults[row])
        return tuple(found)

    def _check_words(self) -> None:
        """Refuse what belongs to a model that this version does not solve."""
        for label, (now, later) in WORDS.items():
            value, place = self.cases.word(label, now), self.cases.place(label)
            if value in later:
                raise InputError(f"{label} {value} is not solved by this version yet", place)
            if value != now:
                raise InputError(f"{label} is {value!r}: it takes {', '.join((now, *later))}", place)
        if self.network.uses_pressure:
            raise InputError(
                "rate laws in partial pressures need Phase gas, which is not solved by this version yet",
                Place("Reactions"),
            )

    def _parameters(self) -> Floats:
        """The parameter vector of each case: the tables' numbers, overridden by labels of constants."""
        vector, remarks = self.network.values(self.tables.numbers)
        self.findings += remarks
        parameters = np.repeat(vector[None, :], len(self.cases), axis=0)
        for label in (*self.reactor.fixed, *(c.label for c in self.reactor.columns)):
            if fold(label) not in LABELS and not label.startswith("in("):
                self._override(parameters, label)
        return parameters

    def _override(self, parameters: Floats, label: str) -> None:
        index = self.network.parameters.find(label)
        place = self.cases.place(label)
        if index is None:
            raise InputError(
                f"{label} stands for several constants: write {label}(1) for that of reaction 1", place
            )
        item = self.network.parameters.items[index]
        own = item.with_unit(self.cases.unit_text(label), self.with_units, place)
        raw = self.cases.raw(label)
        wrong = {int(i): own.wrong(float(raw[i])) for i in np.flatnonzero(~np.isnan(raw))}
        bad = np.array([bool(wrong.get(i)) for i in range(len(raw))], dtype=np.bool_)
        self.cases.refuse(bad, label, lambda i: wrong[i])
        for i in wrong:
            parameters[i, index] = own.to_si(float(raw[i]))

    def _size(self) -> tuple[Floats, Floats, Floats]:
        """tau (or W/q), flow and catalyst density of each case; what is given twice has to agree."""
        cases = self.cases
        flow = cases.values("Flow", FLOW)
        bare = self._time_unit() if self.reactor.bare and self.with_units else None
        tau = cases.values("Residence time", TIME, bare)
        volume = cases.values("Volume", VOLUME)
        cases.refuse_sign("Flow", flow, zero_too=False)
        cases.refuse_sign("Residence time", tau, zero_too=True)
        cases.refuse_sign("Volume", volume, zero_too=True)
        own = self.inlet.flow
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
        tau = np.where(np.isnan(tau), from_volume, tau)
        flow = np.where(np.isnan(flow), known, flow)
        if self.network.per_mass:
            return self._catalyst(tau, flow)
        self._require(tau, "the size of the vessel is missing: give Residence time, or Volume and Flow")
        return tau, flow, np.full(len(tau), np.nan)

    def _catalyst(self, tau: Floats, flow: Floats) -> tuple[Floats, Floats, Floats]:
        """W/q for rates per mass of catalyst."""
        density = self.cases.values("Bulk density", DENSITY)
        mass = self.cases.values("Catalyst mass", MASS)
        self.cases.refuse_sign("Bulk density", density, zero_too=False)
        self.cases.refuse_sign("Catalyst mass", mass, zero_too=True)
        with np.errstate(all="ignore"):
            by_mass, by_density = mass / flow, tau * density
            clash = np.abs(by_mass - by_density) > AGREEMENT * by_mass
        self.cases.refuse(clash, "Catalyst mass",
                          lambda _: "Catalyst mass and Bulk density times volume do not agree: keep one")  # fmt: skip
        size = np.where(np.isnan(by_mass), by_density, by_mass)
        self._require(
            size,
            "the rates are per mass of catalyst: give Catalyst mass and Flow, or Bulk density and the volume",
        )
        return size, flow, density

    def _require(self, size: Floats, missing: str) -> None:
        if self.sized:
            self.cases.refuse(np.isnan(size), "Residence time", lambda _: missing)

    def _time_unit(self) -> Unit:
        """The one time unit of the constants: what a bare residence time is in."""
        names = self.network.time_units
        if len(names) == 1:
            return parse_unit(names[0])
        why = f"have several ({', '.join(names)})" if names else "have none"
        raise InputError(
            f"the residence time has no unit and takes that of the rate constants, but they {why}:"
            " give a block, Residence time | value | unit", Place("Reactor"))  # fmt: skip

    def _overridden(self, feed: Floats, flow: Floats) -> Floats:
        """Feeds with the cases' own `in(A)`."""
        for i, name in enumerate(self.network.species):
            label = f"in({name})"
            if np.isnan(self.cases.raw(label)).all():
                continue
            values = self._inlet_values(label, i, flow)
            self.cases.refuse_sign(label, values, zero_too=True)
            feed[:, i] = np.where(np.isnan(values), feed[:, i], values)
        return feed

    def _inlet_values(self, label: str, i: int, flow: Floats) -> Floats:
        if not self.with_units:
            return self.cases.values(label, CONCENTRATION)
        text = self.cases.unit_text(label)
        dims = parse_unit(text).dims if text else None
        if dims == MASS_CONCENTRATION and not self.network.mass_basis:
            if np.isnan(self.inlet.molar_mass[i]):
                name = self.network.species[i]
                raise InputError(f"{label} is in mass: give the MW of {name}", self.cases.place(label))
            return self.cases.values(label, dims) / float(self.inlet.molar_mass[i])
        if dims == MOLAR_FLOW:
            return self.cases.values(label, dims) / flow
        return self.cases.values(label, MASS_CONCENTRATION if self.network.mass_basis else CONCENTRATION)

    def _temperature(self) -> Floats:
        values = self.cases.values("Temperature", TEMPERATURE, always=True)
        self.cases.refuse_sign("Temperature", values, zero_too=False)
        values = np.where(np.isnan(values), self.inlet.temperature(), values)
        reason = self.network.needs_temperature
        if reason is not None:
            what = reason if isinstance(reason, str) else f"{reason.label} is given, which"
            text = f"{what} needs a temperature: add Temperature to the reactor block"
            if self.inlet.temperatures_differ():
                text = "the streams have different temperatures: give Temperature of the vessel"
            self.cases.refuse(np.isnan(values), "Temperature", lambda _: text)
        return values

    def _pressure(self) -> Floats:
        values = self.cases.values("Pressure", PRESSURE, always=True)
        return np.where(np.isnan(values), self.inlet.pressure(), values)

    def _remarks(self) -> None:
        """Notes on the feed and on labels that this model does not use."""
        for label in (*self.reactor.fixed, *(c.label for c in self.reactor.columns)):
            known = LABELS.get(fold(label))
            catalyst = label in ("Bulk density", "Catalyst mass") and not self.network.per_mass
            if known is not None and (known.later or catalyst):
                self._note(str(self.cases.place(label)), f"{label} is not used here")
        self.findings += check_formulas(self.network, self.tables.feed)
        rows = [r.row.equation for r in self.network.reactions]
        used = {name for e in rows for name, _ in (*e.left, *e.right)}
        inert = [name for name in self.network.species if name not in used]
        if inert:
            self._note("Feed", f"in no reaction, so inert: {', '.join(inert)}")
        if not self.with_units:
            self._note("units", "no units are given: numbers are taken as consistent")
        elif self.network.mass_basis:
            self._note("Feed", "fed in mass without MW: amounts are masses and coefficients mass ratios")

    def _note(self, where: str, text: str) -> None:
        self.findings.append(Finding(Level.NOTE, where, text))

    def units(self) -> ResultUnits:
        """The units of results that name none of their own."""
        pressure = self._given_unit("Pressure", "Pa")
        if not self.with_units:
            return ResultUnits(self.inlet.species_units(), DIMENSIONLESS, pressure=pressure)
        flows = [text for text in (self.cases.unit_text("Flow"), *self.inlet.flow_units()) if text]
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
        return parse_unit(self.cases.unit_text(label) or default)
