"""MOLE_RATES: rates of the reactions and of the species at given concentrations."""

import numpy as np

from moletally.chemistry.errors import InputError, NoAnswer, Place, SheetError
from moletally.chemistry.quantity import DIMENSIONLESS, Unit, compose, parse_unit
from moletally.reactors.rates import rates_at
from moletally.sheet.cells import Argument, Cell
from moletally.sheet.outcome import Outcome, outcome
from moletally.sheet.request import Request, read_request

__all__ = ["rate_unit", "reaction_rates"]


def reaction_rates(reactions: Argument, at: Argument, reactor: Argument, constants: Argument) -> Outcome:
    """MOLE_RATES: a header row, a row per reaction, then a row per species."""
    request = read_request(reactions, at, reactor, constants, sized=False)
    if len(request.cases) != 1:
        raise InputError("rates are those of one case: give a block, not a table of cases", Place("Reactor"))
    case = request.cases[0]
    if isinstance(case, SheetError):
        raise case
    r = rates_at(request.batch)[case]
    unit = rate_unit(request)
    change = r @ request.network.model.stoichiometry
    rows: list[list[Cell | SheetError]] = [["Name", f"Rate [{unit.text}]" if unit.text else "Rate"]]
    for reaction, value in zip(request.network.reactions, r, strict=True):
        rows.append([reaction.label, _cell(float(value), reaction.law.text, unit)])
    for name, value in zip(request.network.species, change, strict=True):
        rows.append([name, _cell(float(value), name, unit)])
    return outcome(rows)


def _cell(value: float, what: str, unit: Unit) -> float | SheetError:
    if np.isfinite(value):
        return unit.from_si(value)
    return NoAnswer(f"{what} has no finite value at these concentrations")


def rate_unit(request: Request) -> Unit:
    """The unit of a rate: the feed's concentration unit per time unit of the constants."""
    network = request.network
    if not network.with_units:
        return DIMENSIONLESS
    amount = (0, 0, 0, 1, 0) if network.mass_basis else (1, 0, 0, 0, 0)
    below = (0, 0, -1, -1, 0) if network.per_mass else (0, -3, -1, 0, 0)
    dims = tuple(a + b for a, b in zip(amount, below, strict=True))
    times = network.time_units
    like = [request.units.common, parse_unit(times[0] if len(times) == 1 else "s")]
    return parse_unit(compose(dims, like))  # type: ignore[arg-type]  # five numbers in, five out
