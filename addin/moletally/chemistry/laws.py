"""The law of each reaction: as typed, or mass action where the Rate is left blank."""

from dataclasses import dataclass
from functools import lru_cache

from moletally.chemistry.alike import hint
from moletally.chemistry.errors import InputError, SheetError
from moletally.chemistry.expression import Binary, Call, Name, Node, check_reserved, names, parse, walk
from moletally.chemistry.tables import ConstantRow, ReactionRow, ReactionTable
from moletally.chemistry.tokens import bracketed

__all__ = ["Law", "exponent_slots", "law_of"]

RESERVED = ("T", "R")
CARRIERS = {"k0": "k", "E": "k", "T ref": "k", "dH": "Keq", "dH T ref": "Keq", "Keq T ref": "Keq"}


@dataclass(frozen=True, slots=True)
class Law:
    """A rate law: its text and tree, whether it is ours, and the constants it names, in reading order."""

    text: str
    tree: Node
    by_default: bool
    constants: tuple[str, ...]
    uses_temperature: bool
    uses_pressure: bool


def law_of(row: ReactionRow, species: tuple[str, ...], shared: frozenset[str], in_pressures: bool) -> Law:
    """The law of a reaction.

    species : names in feed order; shared : names of the constants table
    in_pressures : mass action in partial pressures rather than concentrations

    Raises
    ------
    InputError
        With the place of the Rate, for what can't be read and for names that are unknown.
    """
    if not row.rate and "k" in species:
        raise InputError("a species is called k, so the Rate has to be typed", row.rate_place)
    text = row.rate or _mass_action(row, in_pressures)
    try:
        tree = parse(text)
        check_reserved(text, tree, species)
        return _checked(text, tree, row, species, shared)
    except SheetError as error:
        raise error.at(row.rate_place) from None


@lru_cache(maxsize=512)
def exponent_slots(table: ReactionTable, constants: tuple[ConstantRow, ...]) -> frozenset[int]:
    """Slots of the constants that stand in an exponent of some Rate."""
    shared = {row.name: row.value.slot for row in constants}
    slots: set[int] = set()
    for row in table.rows:
        known = shared | {name: number.slot for name, number in row.constants}
        slots |= {known[name] for name in _in_exponents(row.rate) if name in known}
    return frozenset(slots)


def _in_exponents(rate: str) -> set[str]:
    try:
        tree = parse(rate)
    except SheetError:  # law_of says what is wrong with it
        return set()
    powers = (node.right for node in walk(tree) if isinstance(node, Binary) and node.op == "^")
    return {name.text for power in powers for name in names(power)}


def _mass_action(row: ReactionRow, in_pressures: bool) -> str:
    def side(terms: tuple[tuple[str, float], ...]) -> str:
        written = []
        for name, coefficient in terms:
            symbol = f"p({bracketed(name)})" if in_pressures else bracketed(name)
            if not in_pressures and name in RESERVED:
                symbol = f"[{name}]"
            written.append(symbol if coefficient == 1 else f"{symbol}^{coefficient:.12g}")
        return "*".join(written)

    forward, backward = side(row.equation.left), side(row.equation.right)
    if not row.equation.reversible:
        return f"k*{forward}" if forward else "k"
    return f"k*({forward or '1'} - {backward or '1'}/Keq)"


def _checked(
    text: str, tree: Node, row: ReactionRow, species: tuple[str, ...], shared: frozenset[str]
) -> Law:
    given = {name for name, _ in row.constants}
    own = (given - CARRIERS.keys()) | ({"k"} if "k0" in given else set())
    constants: list[str] = []
    temperature = False
    for name in names(tree):
        if name.text in species:
            continue
        if name.text in RESERVED and not name.bracketed:
            temperature |= name.text == "T"
            continue
        if name.text not in own and name.text not in shared:
            if name.text in given:
                raise _carrier(name.text)
            raise _unknown(name, row, species, own | shared, text)
        if name.text not in constants:
            constants.append(name.text)
    pressure = any(isinstance(node, Call) and node.function == "p" for node in walk(tree))
    for node in walk(tree):
        if isinstance(node, Call) and node.function in ("p", "x"):
            _check_species(node, species)
    return Law(text, tree, not row.rate, tuple(constants), temperature or pressure, pressure)


def _check_species(node: Call, species: tuple[str, ...]) -> None:
    name = node.args[0]
    if not isinstance(name, Name) or name.text not in species:
        what = name.text if isinstance(name, Name) else ""
        raise InputError(f"{node.function}() takes a species; {what!r} is none. {hint(what, species)}")


def _carrier(name: str) -> InputError:
    bearer = CARRIERS[name]
    return InputError(
        f"the column {name} acts through {bearer}: write {bearer} in the Rate, or give a constant of your own"
        " another name"
    )


def _unknown(name: Name, row: ReactionRow, species: tuple[str, ...], constants: set[str] | frozenset[str],
             text: str) -> InputError:  # fmt: skip
    if name.text == "k":
        return InputError(
            f"the rate constant k of reaction {row.label} is missing: fill in k (or k0), 0 if zero is meant"
        )
    if name.text == "Keq":
        return InputError(f"the reaction {row.equation.text} can run backwards: give Keq, or type its Rate")
    return InputError(
        f"unknown name {name.text!r} in {text}. {hint(name.text, [*species, *sorted(constants)])}"
    )


def unused(row: ReactionRow, law: Law) -> str | None:
    """A constant of the row that its law does not name."""
    for name, _ in row.constants:
        if name in ("dH", "dH T ref"):
            continue
        if CARRIERS.get(name, name) not in law.constants:
            return name
    return None
