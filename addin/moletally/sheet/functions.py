"""The one table of worksheet functions: hosts, wizard texts, documentation and tests are made from it."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from moletally.chemistry.errors import InputError, NoAnswer, Place, SheetError, near_miss
from moletally.sheet import cells
from moletally.sheet.answers.audit import audit
from moletally.sheet.answers.outlet import pfr_outlet, tank_outlet
from moletally.sheet.answers.profile import tube_profile
from moletally.sheet.answers.rates import reaction_rates
from moletally.sheet.outcome import Outcome, failed

__all__ = ["CATEGORY", "DEFECT", "FUNCTIONS", "Argument", "Function", "call"]

CATEGORY = "Reactor balances"
DEFECT = "this is a defect of moletally and not of your sheet, please report it with the workbook"


@dataclass(frozen=True, slots=True)
class Argument:
    """An argument of a worksheet function: its name and the help a function wizard shows."""

    name: str
    help: str
    optional: bool = False
    repeats: bool = False  # stands for as many arguments as are given


@dataclass(frozen=True, slots=True)
class Function:
    """A worksheet function; `run` takes one value per argument, in order."""

    name: str
    summary: str
    arguments: tuple[Argument, ...]
    result: str
    run: Callable[..., Outcome]
    category: str = CATEGORY

    @property
    def signature(self) -> str:
        """The call as it is typed."""
        shown = [f"[{a.name}]" if a.optional else a.name + ("…" if a.repeats else "") for a in self.arguments]
        return f"{self.name}({', '.join(shown)})"


REACTIONS = Argument("reactions", "Reactions table, or one species-and-reaction table, with its header row")
FEED = Argument("feed", "Feed table: species and their feed; leave empty if the first table holds it")
REACTOR = Argument(
    "reactor", "Residence time, a range of them, a block of label | value | unit, or a table of cases"
)
OPTIONAL_REACTOR = Argument(
    "reactor", "Block with the temperature, where a rate law needs one", optional=True
)
WANT = Argument("want", "What to return, such as Mono/Di or 100*conversion(Ox); default: every species", True)
CONSTANTS = Argument(
    "constants", "Constants shared by the rate laws: name, value, unit, E or dH, T ref", True
)
POINTS = Argument("points", "Number of rows below the header, default 51", optional=True)
AT = Argument("at", "Feed table with the concentrations at which the rates are wanted")

_OUTLET = "A column in feed order, or the shape of want; several cases: a row per case"

FUNCTIONS: dict[str, Function] = {
    f.name: f
    for f in (
        Function("MOLE_CSTR", "Outlet of a stirred tank (CSTR) at steady state.",
                 (REACTIONS, FEED, REACTOR, WANT, CONSTANTS), _OUTLET, tank_outlet),
        Function("MOLE_PFR", "Outlet of a plug-flow tube (PFR) at steady state.",
                 (REACTIONS, FEED, REACTOR, WANT, CONSTANTS), _OUTLET, pfr_outlet),
        Function("MOLE_PROFILE", "Concentrations along a plug-flow tube.",
                 (REACTIONS, FEED, REACTOR, POINTS, WANT, CONSTANTS),
                 "A header row and a row per point: tau, volume or catalyst mass, then species or wants",
                 tube_profile),
        Function("MOLE_RATES", "Rates of the reactions and of the species at given concentrations.",
                 (REACTIONS, AT, OPTIONAL_REACTOR, CONSTANTS),
                 "A header row, then a row per reaction and a row per species: name, rate", reaction_rates),
        Function("MOLE_AUDIT", "What was read, assumed, checked and found doubtful in a call, verdict first.",
                 (Argument("function", 'Which function to audit: "CSTR", "PFR", "PROFILE" or "RATES"'),
                  Argument("arguments", "The arguments of that function, in its order", repeats=True)),
                 "Rows of level (stop, doubt, note, fine), where, what and what to do", audit),
    )
}  # fmt: skip


def call(name: str, args: Sequence[cells.Argument]) -> Outcome:
    """Answer a worksheet function; never raises.

    name : as in FUNCTIONS, in any case
    args : cells, blocks or OMITTED, in the function's order; missing ones at the end count as omitted
    """
    function = FUNCTIONS.get(name.upper())
    if function is None:
        return failed(InputError(f"there is no function {name!r}. {near_miss(name.upper(), FUNCTIONS)}"))
    try:
        # Overflow and the like are looked for in the answers, not announced on the way.
        with np.errstate(all="ignore"):
            return function.run(*_fitted(function, args))
    except SheetError as error:
        return failed(error)
    except Exception as error:  # a spreadsheet must live on, and the user must know whose fault it is
        return failed(NoAnswer(f"{DEFECT}: {type(error).__name__}: {error}"))


def _fitted(function: Function, args: Sequence[cells.Argument]) -> list[cells.Argument]:
    """One value per argument; what is not given is OMITTED, or an error if it must be there."""
    given = list(args)
    declared = function.arguments
    if declared[-1].repeats:
        return given if given else [cells.OMITTED]
    if len(given) > len(declared):
        raise InputError(f"{function.name} takes {len(declared)} arguments at the most: {function.signature}")
    given += [cells.OMITTED] * (len(declared) - len(given))
    for value, argument in zip(given, declared, strict=True):
        if value is cells.OMITTED and not argument.optional and argument not in (FEED, AT):
            raise InputError(f"the argument {argument.name} is missing: {function.signature}",
                             Place(function.name))  # fmt: skip
    return given
