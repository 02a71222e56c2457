"""Atom balance of the reactions, where formulas are given, and mass balance, where molar masses are."""

import re
from collections import Counter
from collections.abc import Mapping
from functools import lru_cache

from moletally.chemistry.errors import Finding, InputError, Level, Place
from moletally.chemistry.network import Network, Reaction
from moletally.chemistry.quantity import to_si
from moletally.chemistry.tables import FeedTable

__all__ = ["atoms", "check_formulas"]

PIECE = re.compile(
    r"(?P<element>[A-Z][a-z]?)|(?P<open>[(\[])|(?P<close>[)\]])|(?P<count>\d+(?:\.\d+)?)|(?P<dot>[.·*])"
)
# IUPAC's 118, and D and T for heavy hydrogen
SYMBOLS = (
    "H D T He Li Be B C N O F Ne Na Mg Al Si P S Cl Ar K Ca Sc Ti V Cr Mn Fe Co Ni Cu Zn Ga Ge As Se Br Kr Rb Sr Y"
    " Zr Nb Mo Tc Ru Rh Pd Ag Cd In Sn Sb Te I Xe Cs Ba La Ce Pr Nd Pm Sm Eu Gd Tb Dy Ho Er Tm Yb Lu Hf Ta W Re Os"
    " Ir Pt Au Hg Tl Pb Bi Po At Rn Fr Ra Ac Th Pa U Np Pu Am Cm Bk Cf Es Fm Md No Lr Rf Db Sg Bh Hs Mt Ds Rg Cn Nh"
    " Fl Mc Lv Ts Og"
)
ELEMENTS = frozenset(SYMBOLS.split())
CHARGE = re.compile(r"(?:\^(?P<size>\d*))?(?P<sign>[+-]+)$")
MAX_LENGTH = 200
OFF_BY = 5e-3  # of the mass of a side: molar masses are often given to three digits
SLACK = 2e-3  # of the larger side: 0.333 is meant to be a third
MOLAR_MASS = (-1, 0, 0, 1, 0)


@lru_cache(maxsize=2048)
def atoms(formula: str) -> tuple[tuple[str, float], ...]:
    """Atoms of a formula such as `C2H6O`, `Ca(OH)2`, `CuSO4.5H2O`, `SO4^2-`; a charge counts as `charge`.

    Raises
    ------
    InputError
        Where the text is no formula.
    """
    text = formula.replace(" ", "")
    if len(text) > MAX_LENGTH:
        raise InputError(f"the formula is longer than {MAX_LENGTH} characters")
    total: Counter[str] = Counter()
    charge = CHARGE.search(text)
    if charge is not None and charge.start() > 0:
        size = int(charge["size"] or 1) if charge["size"] is not None else len(charge["sign"])
        total["charge"] = size if charge["sign"][0] == "+" else -size
        text = text[: charge.start()]
    for part in re.split(r"[.·*]", text):
        lead = re.match(r"\d+(?:\.\d+)?", part)
        factor = float(lead[0]) if lead else 1.0
        for element, count in _group(part[lead.end() if lead else 0 :], formula).items():
            total[element] += factor * count  # type: ignore[assignment]
    return tuple(sorted((element, float(count)) for element, count in total.items() if count))


def _group(text: str, formula: str) -> dict[str, float]:
    stack: list[dict[str, float]] = [{}]
    at = 0
    last: dict[str, float] = {}
    while at < len(text):
        match = PIECE.match(text, at)
        if match is None or match.lastgroup == "dot" or (match.lastgroup == "count" and not last):
            raise InputError(f"the formula {formula!r} can't be read at {text[at:][:8]!r}")
        at = match.end()
        if match.lastgroup == "open":
            stack.append({})
            last = {}
            continue
        if match.lastgroup == "close":
            if len(stack) == 1:
                raise InputError(f"the formula {formula!r} has a bracket too many")
            last = stack.pop()
            _add(stack[-1], last, 1.0)
            continue
        if match.lastgroup == "count":
            _add(stack[-1], last, float(match[0]) - 1.0)
            last = {}
            continue
        if match[0] not in ELEMENTS:
            raise InputError(f"the formula {formula!r} has an element {match[0]!r} that does not exist")
        last = {match[0]: 1.0}
        _add(stack[-1], last, 1.0)
    if len(stack) > 1 or not stack[0]:
        raise InputError(f"the formula {formula!r} is not complete")
    return stack[0]


def _add(total: dict[str, float], more: dict[str, float], factor: float) -> None:
    for element, count in more.items():
        total[element] = total.get(element, 0.0) + factor * count


def check_formulas(network: Network, feed: FeedTable) -> list[Finding]:
    """Doubts about masses that do not balance.

    Raises
    ------
    InputError
        For a reaction whose atoms do not balance, naming them: "H: 4 -> 2".
    """
    formulas = {row.name: (row.formula, row.place) for row in feed.species if row.formula}
    masses = {
        row.name: to_si(row.molar_mass, MOLAR_MASS, True, f"MW of {row.name}")
        for row in feed.species
        if row.molar_mass is not None
    }
    findings = []
    for reaction in network.reactions:
        species = {
            name for side in (reaction.row.equation.left, reaction.row.equation.right) for name, _ in side
        }
        if species <= formulas.keys():
            _check_atoms(reaction, formulas)
        elif species <= masses.keys() and not network.mass_basis:
            findings += _check_mass(reaction, masses)
    return findings


def _check_atoms(reaction: Reaction, formulas: Mapping[str, tuple[str, Place]]) -> None:
    sides: list[dict[str, float]] = []
    for side in (reaction.row.equation.left, reaction.row.equation.right):
        total: dict[str, float] = {}
        for name, coefficient in side:
            formula, place = formulas[name]
            try:
                _add(total, dict(atoms(formula)), coefficient)
            except InputError as error:
                raise error.at(place) from None
        sides.append(total)
    left, right = sides
    off = [
        f"{element}: {left.get(element, 0):g} -> {right.get(element, 0):g}"
        for element in sorted(left.keys() | right.keys())
        if abs(left.get(element, 0) - right.get(element, 0))
        > SLACK * max(abs(left.get(element, 0)), abs(right.get(element, 0)))
    ]
    if off:
        raise InputError(f"{reaction.row.equation.text} does not balance by the formulas: {', '.join(off)}."
                         " Mend the coefficients, or leave the Formula column out", reaction.row.place)  # fmt: skip


def _check_mass(reaction: Reaction, masses: dict[str, float]) -> list[Finding]:
    left, right = (
        sum(coefficient * masses[name] for name, coefficient in side)
        for side in (reaction.row.equation.left, reaction.row.equation.right)
    )
    if not left or not right or abs(left - right) <= OFF_BY * max(left, right):
        return []
    text = (
        f"{reaction.row.equation.text}: masses do not balance by MW, {1e3 * left:.6g} -> {1e3 * right:.6g} g"
    )
    return [Finding(Level.DOUBT, str(reaction.row.place), text)]
