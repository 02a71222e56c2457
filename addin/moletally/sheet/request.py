"""A call read whole: tables, network, cases and the units of its results."""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from moletally.chemistry.errors import Finding, SheetError
from moletally.chemistry.inlet import Inlet, feed_quantities, is_mass_basis
from moletally.chemistry.network import Network, build_network
from moletally.reactors.batch import Batch
from moletally.sheet.cells import Argument
from moletally.sheet.reading.grid import is_empty
from moletally.sheet.reading.reactor import NOTHING, Layout, ReactorInput, read_reactor
from moletally.sheet.reading.tables import Tables, read_tables
from moletally.sheet.setup import Setup
from moletally.sheet.state import ResultUnits, State

__all__ = ["Request", "read_request"]

Floats = NDArray[np.float64]

# what always carries a unit, and so does not make a call one with units
ALWAYS_UNITS = ("Temperature", "Pressure", "E", "dH", "T ref", "dH T ref", "Keq T ref")
NO_UNIT = (None, "", "-", "1")


@dataclass(frozen=True, slots=True)
class Request:
    """What a call asks, in SI: see Batch and Cases.

    setup : what tables and layout mean together
    cases : for each case of the sheet its row in `batch`, or the fault that makes it an error
    pressure : ndarray, shape (N,) [Pa], nan where none is given
    findings : what an audit should say of tables and labels
    """

    setup: Setup
    reactor: ReactorInput
    batch: Batch
    cases: tuple[int | SheetError, ...]
    pressure: Floats
    findings: tuple[Finding, ...]

    @property
    def network(self) -> Network:
        """The network of the tables."""
        return self.setup.network

    @property
    def inlet(self) -> Inlet:
        """What enters."""
        return self.setup.inlet

    @property
    def units(self) -> ResultUnits:
        """The units of results that name none of their own."""
        return self.setup.units

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
    read = NOTHING if not sized and is_empty(reactor) else read_reactor(reactor, tables.labels)
    setup = _setup(tables, read.layout, sized)
    return Request(setup, read, *setup.batch(read), setup.findings)


@lru_cache(maxsize=256)
def _setup(tables: Tables, layout: Layout, sized: bool) -> Setup:
    """Tables and layouts are found by identity: those of equal content are one object each."""
    with_units = _carries_units(tables, layout)
    setup = Setup(tables, layout, _network(tables, with_units), with_units, sized)
    setup.check_words()
    return setup


def _carries_units(tables: Tables, layout: Layout) -> bool:
    """True as soon as a concentration, constant, flow or time has a unit."""
    named = [(name, n.unit) for row in tables.reactions.rows for name, n in row.constants]
    named += [(column.label, column.unit) for column in (*layout.fixed, *layout.columns)]
    texts = [unit for name, unit in named if name.partition("(")[0].partition(" of ")[0] not in ALWAYS_UNITS]
    texts += [q.unit for q in feed_quantities(tables.feed)]
    texts += [row.value.unit for row in tables.constants]
    return any(text not in NO_UNIT for text in texts)


def _network(tables: Tables, with_units: bool) -> Network:
    if not with_units:
        return build_network(tables.reactions, tables.constants, tables.feed.names, False, False, (), ())
    units = tuple(dict.fromkeys(q.unit for row in tables.feed.species for q in row.feed if q.unit))
    # Numbers without a unit may be exponents: with them the order, and so the dimension, of a law changes.
    plain = [n for row in tables.reactions.rows for name, n in row.constants if name not in ("k", "k0")]
    plain += [row.value for row in tables.constants]
    exponents = tuple((n.slot, tables.numbers[n.slot]) for n in plain if n.unit in NO_UNIT)
    mass_basis = is_mass_basis(tables.feed, with_units)
    return build_network(
        tables.reactions, tables.constants, tables.feed.names, True, mass_basis, units, exponents
    )
