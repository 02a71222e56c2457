"""A call read whole: tables, network, cases and the units of its results."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from moletally.chemistry.errors import Finding, InputError, Level, Place, SheetError
from moletally.chemistry.formulas import check_formulas
from moletally.chemistry.inlet import Inlet, feed_quantities, is_mass_basis
from moletally.chemistry.network import Network, build_network
from moletally.chemistry.quantity import DIMENSIONLESS, Unit, compose, parse_unit
from moletally.chemistry.tables import Quantity
from moletally.reactors.batch import Batch
from moletally.sheet.cases import Cases
from moletally.sheet.cells import Argument
from moletally.sheet.reading.grid import fold, is_empty
from moletally.sheet.reading.labels import LABELS
from moletally.sheet.reading.reactor import ReactorInput, read_reactor
from moletally.sheet.reading.tables import Tables, read_tables
from moletally.sheet.state import ResultUnits, State

__all__ = ["Request", "read_request"]

Floats = NDArray[np.float64]

TIME = (0, 0, 1, 0, 0)
VOLUME = (0, 3, 0, 0, 0)
FLOW = (0, 3, -1, 0, 0)
MASS = (0, 0, 0, 1, 0)
DENSITY = (0, -3, 0, 1, 0)
TEMPERATURE = (0, 0, 0, 0, 1)
PRESSURE = (0, -1, -2, 1, 0)
CONCENTRATION = (1, -3, 0, 0, 0)
MASS_CONCENTRATION = (0, -3, 0, 1, 0)
AGREEMENT = 1e-6  # between a residence time and the volume and flow given beside it
NO_VALUE = ("k", "k0", "E", "T ref", "dH", "dH T ref", "Keq T ref")
ALWAYS_UNITS = ("Temperature", "Pressure")


@dataclass(frozen=True)
class Request:
    """What a call asks, in SI: see Batch and Cases.

    cases : for each case of the sheet its row in `batch`, or the fault that makes it an error
    """

    tables: Tables
    network: Network
    inlet: Inlet
    reactor: ReactorInput
    batch: Batch
    cases: tuple[int | SheetError, ...]
    pressure: Floats
    units: ResultUnits
    findings: tuple[Finding, ...]

    def state(self, concentration: Floats) -> State:
        """The outlets as a `want` sees them."""
        return State(
            self.network.species, concentration, self.batch.feed, self.batch.flow, self.batch.residence_time,
            self.batch.temperature, self.pressure, self.inlet.molar_mass, self.units,
        )  # fmt: skip


def read_request(reactions: Argument, feed: Argument, reactor: Argument, constants: Argument,
                 sized: bool = True) -> Request:  # fmt: skip
    """Read the arguments that all functions share.

    sized : False where no vessel is meant: the reactor may be left out, and its size with it

    Raises
    ------
    SheetError
        For what can't be used in any case; a fault in one case stays with that case.
    """
    tables = read_tables(reactions, feed, constants)
    read = ReactorInput() if not sized and is_empty(reactor) else _read_reactor(reactor, tables)
    with_units = _carries_units(tables, read)
    network = _network(tables, with_units)
    return _Builder(tables, network, read, with_units, sized).request()


def _read_reactor(argument: Argument, tables: Tables) -> ReactorInput:
    labels = _labels(tables)
    return read_reactor(argument, labels.__contains__, labels)


def _labels(tables: Tables) -> list[str]:
    """Labels of this call that a reactor may carry: in(A), K_A, k(2)."""
    labels = [f"in({name})" for name in tables.feed.names] + [row.name for row in tables.constants]
    for number, row in enumerate(tables.reactions.rows, start=1):
        labels += [f"{name}({number})" for name, _ in row.constants]
        labels += [name for name, _ in row.constants if name not in labels]
    return labels


def _carries_units(tables: Tables, reactor: ReactorInput) -> bool:
    """True as soon as a concentration, constant, flow or time has a unit; temperatures always have one."""
    texts = [q.unit for q in feed_quantities(tables.feed)]
    energies = ("E", "T ref", "dH", "dH T ref", "Keq T ref")
    texts += [n.unit for row in tables.reactions.rows for name, n in row.constants if name not in energies]
    texts += [row.value.unit for row in tables.constants]
    texts += [
        q.unit for label, q in reactor.fixed.items() if isinstance(q, Quantity) and label not in ALWAYS_UNITS
    ]
    texts += [c.unit for c in reactor.columns if c.label not in ALWAYS_UNITS]
    return any(text not in (None, "", "-", "1") for text in texts)


def _network(tables: Tables, with_units: bool) -> Network:
    mass_basis = is_mass_basis(tables.feed, with_units)
    units = (
        tuple(dict.fromkeys(q.unit for row in tables.feed.species for q in row.feed if q.unit))
        if with_units
        else ()
    )
    # Numbers without a unit may be exponents: with them the order, and so the dimension, of a law changes.
    plain = [n for row in tables.reactions.rows for name, n in row.constants if name not in NO_VALUE]
    plain += [row.value for row in tables.constants]
    exponents = tuple((n.slot, tables.numbers[n.slot]) for n in plain if n.unit in (None, "", "-", "1"))
    return build_network(tables.reactions, tables.constants, tables.feed.names, with_units, mass_basis, units,
                         exponents if with_units else ())  # fmt: skip


class _Builder:
    """Turns what was read into a batch of cases."""

    def __init__(self, tables: Tables, network: Network, reactor: ReactorInput, with_units: bool,
                 sized: bool) -> None:  # fmt: skip
        self.tables, self.network, self.reactor, self.with_units = tables, network, reactor, with_units
        self.sized = sized
        self.cases = Cases(reactor, with_units)
        self.inlet = Inlet(tables.feed, with_units, network.mass_basis)
        self.findings: list[Finding] = list(network.findings)

    def request(self) -> Request:
        self._check_phase()
        place = self.cases.place("Flow")
        given = self.cases.values("Flow", FLOW)
        self.cases.check_sign("Flow", given, zero_too=False)
        parameters = self._parameters()
        size, flow, density = self._size(given)
        feed, flow = self.inlet.mixed(flow, place)
        feed = self._overridden(feed, flow)
        temperature = self._temperature()
        self._remarks()
        batch = Batch(
            self.network, feed, size, temperature, parameters, self.inlet.start(feed), flow, density
        )
        return Request(self.tables, self.network, self.inlet, self.reactor, batch, self._case_rows(),
                       self._pressure(), self._units(), tuple(self.findings + self.inlet.findings))  # fmt: skip

    def _case_rows(self) -> tuple[int | SheetError, ...]:
        good = iter(range(len(self.cases)))
        return tuple(row if isinstance(row, SheetError) else next(good) for row in self.reactor.rows)

    def _check_phase(self) -> None:
        """Refuse what belongs to a model that this version does not solve."""
        for label, known, word in (
            ("Phase", ("liquid",), "gas"),
            ("Heat", ("isothermal",), "adiabatic, jacket"),
        ):
            value = self.cases.word(label, known[0])
            place = Place("Reactor", header=label)
            if value in [w.strip() for w in word.split(",")]:
                raise InputError(f"{label} {value} is not solved by this version yet", place)
            if value not in known:
                raise InputError(f"{label} is {value!r}: it takes {known[0]}, {word}", place)
        if self.network.uses_pressure:
            raise InputError("rate laws in partial pressures need Phase gas, which this version does not solve yet",
                             Place("Reactions"))  # fmt: skip

    def _parameters(self) -> Floats:
        """The parameter vector of each case: the tables' numbers, overridden by labels of constants."""
        vector, remarks = self.network.values(self.tables.numbers)
        self.findings += remarks
        parameters = np.repeat(vector[None, :], len(self.cases), axis=0)
        for label in (*self.reactor.fixed, *(c.label for c in self.reactor.columns)):
            if fold(label) in LABELS or label.startswith("in("):
                continue
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
        column = self.cases.column(label)
        fixed = self.reactor.fixed.get(label)
        text = self.cases.unit_text(label)
        raw = (
            column[1]
            if column
            else np.full(len(self.cases), fixed.value if isinstance(fixed, Quantity) else np.nan)
        )
        own = item.with_unit(text, self.with_units, place)
        for i in np.flatnonzero(~np.isnan(raw)):
            own.check(float(raw[i]))
            parameters[i, index] = own.to_si(float(raw[i]))

    def _size(self, flow: Floats) -> tuple[Floats, Floats, Floats]:
        """tau (or W/q), flow and catalyst density of each case; what is given twice has to agree."""
        bare = self._time_unit() if self.reactor.bare and self.with_units else None
        tau = self.cases.values("Residence time", TIME, bare)
        volume = self.cases.values("Volume", VOLUME)
        for label, values in (("Residence time", tau), ("Volume", volume)):
            self.cases.check_sign(label, values, zero_too=True)
        own = self.inlet.flow
        known = np.where(np.isnan(flow), own, flow)
        with np.errstate(all="ignore"):
            known = np.where(np.isnan(known) & (tau > 0), volume / tau, known)
            from_volume = volume / known
            clash = np.abs(tau - from_volume) > AGREEMENT * np.abs(tau)
        if clash.any():
            i = int(np.flatnonzero(clash)[0])
            raise InputError(
                f"Residence time ({tau[i]:.6g}) and Volume over Flow ({from_volume[i]:.6g}, in SI) are both given and"
                " do not agree: keep one", self.cases.place("Residence time"))  # fmt: skip
        tau = np.where(np.isnan(tau), from_volume, tau)
        flow = np.where(np.isnan(flow) & np.isnan(own), known, flow)
        if self.network.per_mass:
            return self._catalyst(tau, known, flow)
        self._require(tau, "the size of the vessel is missing: give Residence time, or Volume and Flow")
        return tau, flow, np.full(len(tau), np.nan)

    def _catalyst(self, tau: Floats, known: Floats, flow: Floats) -> tuple[Floats, Floats, Floats]:
        """W/q for rates per mass of catalyst."""
        density = self.cases.values("Bulk density", DENSITY)
        mass = self.cases.values("Catalyst mass", MASS)
        self.cases.check_sign("Bulk density", density, zero_too=False)
        self.cases.check_sign("Catalyst mass", mass, zero_too=True)
        with np.errstate(all="ignore"):
            by_mass, by_density = mass / known, tau * density
            clash = np.abs(by_mass - by_density) > AGREEMENT * by_mass
        if clash.any():
            raise InputError("Catalyst mass and Bulk density times volume do not agree: keep one",
                             self.cases.place("Catalyst mass"))  # fmt: skip
        size = np.where(np.isnan(by_mass), by_density, by_mass)
        self._require(
            size, "the rates are per mass of catalyst: give Catalyst mass and Flow, or Bulk density too"
        )
        return size, flow, density

    def _require(self, values: Floats, missing: str) -> None:
        if self.sized and np.isnan(values).any():
            single = self.reactor.single
            where = (
                "" if single else f" (case {self._sheet_case(int(np.flatnonzero(np.isnan(values))[0])) + 1})"
            )
            raise InputError(missing + where, Place("Reactor"))

    def _sheet_case(self, row: int) -> int:
        return self._case_rows().index(row)

    def _time_unit(self) -> Unit:
        """The one time unit of the constants: what a bare residence time is in."""
        names = self.network.time_units
        if len(names) == 1:
            return parse_unit(names[0])
        why = f"have several ({', '.join(names)})" if names else "have none"
        raise InputError(
            f"the residence time has no unit and takes that of the rate constants, but they {why}:"
            " give a block with Residence time | value | unit", Place("Reactor"))  # fmt: skip

    def _overridden(self, feed: Floats, flow: Floats) -> Floats:
        """Feeds with the cases' own `in(A)`."""
        for i, name in enumerate(self.network.species):
            label = f"in({name})"
            if not self.cases.given(label):
                continue
            values = self._inlet_values(label, i, flow)
            if (values < 0).any():
                raise InputError(f"{label} is negative", self.cases.place(label))
            feed[:, i] = np.where(np.isnan(values), feed[:, i], values)
        return feed

    def _inlet_values(self, label: str, i: int, flow: Floats) -> Floats:
        if not self.with_units:
            return self.cases.values(label, CONCENTRATION)
        text = self.cases.unit_text(label)
        unit = None if text is None else parse_unit(text)
        if unit is not None and unit.dims == MASS_CONCENTRATION and not self.network.mass_basis:
            if np.isnan(self.inlet.molar_mass[i]):
                raise InputError(
                    f"{label} is in mass: give the MW of {self.network.species[i]}", self.cases.place(label)
                )
            per_volume = self.cases.values(label, MASS_CONCENTRATION)
            return per_volume / float(self.inlet.molar_mass[i])
        if unit is not None and unit.dims == (1, 0, -1, 0, 0):
            return self.cases.values(label, unit.dims) / flow
        return self.cases.values(label, MASS_CONCENTRATION if self.network.mass_basis else CONCENTRATION)

    def _temperature(self) -> Floats:
        values = self.cases.values("Temperature", TEMPERATURE, always=True)
        values = np.where(np.isnan(values), self.inlet.temperature(), values)
        self.cases.check_sign("Temperature", values, zero_too=False)
        reason = self.network.needs_temperature
        if reason is not None and np.isnan(values).any():
            if self.inlet.temperatures_differ():
                raise InputError("the streams have different temperatures: give Temperature of the vessel",
                                 Place("Reactor"))  # fmt: skip
            what = reason if isinstance(reason, str) else f"{reason.label} is given, which"
            raise InputError(
                f"{what} needs a temperature: add Temperature to the reactor block", Place("Reactor")
            )
        return values

    def _pressure(self) -> Floats:
        values = self.cases.values("Pressure", PRESSURE, always=True)
        return np.where(np.isnan(values), self.inlet.pressure(), values)

    def _remarks(self) -> None:
        """Notes on the feed and on labels that this model does not use."""
        for label in (*self.reactor.fixed, *(c.label for c in self.reactor.columns)):
            known = LABELS.get(fold(label))
            unused = known is not None and (known.later or (label in ("Bulk density", "Catalyst mass")
                                                            and not self.network.per_mass))  # fmt: skip
            if unused:
                self.findings.append(
                    Finding(Level.NOTE, str(self.cases.place(label)), f"{label} is not used here")
                )
        self.findings += check_formulas(self.network, self.tables.feed)
        used = {
            n
            for r in self.network.reactions
            for s in (r.row.equation.left, r.row.equation.right)
            for n, _ in s
        }
        inert = [name for name in self.network.species if name not in used]
        if inert:
            self.findings.append(Finding(Level.NOTE, "Feed", f"in no reaction, so inert: {', '.join(inert)}"))
        if not self.with_units:
            self.findings.append(
                Finding(Level.NOTE, "units", "no units are given: numbers are taken as consistent")
            )
        elif self.network.mass_basis:
            self.findings.append(Finding(Level.NOTE, "Feed", "fed in mass without MW: amounts are masses and"
                                         " coefficients mass ratios"))  # fmt: skip

    def _units(self) -> ResultUnits:
        if not self.with_units:
            plain = DIMENSIONLESS
            return ResultUnits(self.inlet.species_units(), plain, pressure=self._given_unit("Pressure", "Pa"))
        flows = [text for text in (self.cases.unit_text("Flow"), *self.inlet.flow_units()) if text]
        times = self.network.time_units
        time = self._given_unit("Residence time", times[0] if len(times) == 1 else "s")
        volume = "kg" if self.network.per_mass else compose(VOLUME, [parse_unit(f) for f in flows])
        return ResultUnits(
            species=self.inlet.species_units(),
            common=self.inlet.common_unit(),
            flow=self.inlet.flow_unit(flows),
            time=time,
            volume=self._given_unit("Catalyst mass" if self.network.per_mass else "Volume", volume),
            pressure=self._given_unit("Pressure", "Pa"),
        )

    def _given_unit(self, label: str, default: str) -> Unit:
        return parse_unit(self.cases.unit_text(label) or default)
