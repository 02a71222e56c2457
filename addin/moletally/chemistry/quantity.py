"""Units as they are written in the trade, read into a factor to SI and a dimension."""

import math
import re
from collections.abc import Iterable
from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache
from typing import TYPE_CHECKING, NoReturn, TypeVar

import numpy as np
from numpy.typing import NDArray

from moletally.chemistry.errors import InputError, near_miss
from moletally.chemistry.tables import Quantity
from moletally.chemistry.unit_names import REFUSED, known_names, look_up

if TYPE_CHECKING:
    import pint

__all__ = ["DIMENSIONLESS", "Dims", "Unit", "compose", "parse_unit", "to_si"]

Dims = tuple[float, float, float, float, float]  # amount, length, time, mass, temperature
ONE: Dims = (0, 0, 0, 0, 0)
TIME = (0, 0, 1, 0, 0)
PRESSURE: Dims = (0, -1, -2, 1, 0)
MAX_LENGTH = 120
MAX_POWER = 12  # beyond it a slip
MAX_DECADES = 150  # of a factor: products of two stay floating-point numbers
Value = TypeVar("Value", float, NDArray[np.float64])

TOKEN = re.compile(
    r"\s*(?:(?P<op>\*|/|\(|\)|\^)|(?P<num>[+-]?\d+(?:\.\d+)?)|(?P<name>(?:lb|k?g)-mol|[^\W\d]\w*(?:\([ag]\))?|[°ºµμ℃℉]\w*|%))\s*"
)
SUPERSCRIPT = str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁺⁻", "0123456789+-")
NAME_POWER = re.compile(r"(?P<name>.*?[^\W\d_])(?P<power>\d)$")


@dataclass(frozen=True, slots=True)
class Unit:
    """A unit: x in it is x * factor + offset in SI.

    dims : powers of amount, length, time, mass, temperature
    time_units : names of the time units it was written with
    names : all unit names it was written with
    """

    text: str
    factor: float
    dims: Dims
    offset: float = 0.0
    names: tuple[str, ...] = ()

    @property
    def time_units(self) -> tuple[str, ...]:
        """The units of time among its names."""
        found = (look_up(name) for name in self.names)
        return tuple(unit.name for unit in found if unit is not None and unit.dims == TIME)

    def to_si(self, value: Value) -> Value:
        """A number, or an array of them, in SI."""
        return value * self.factor + self.offset

    def from_si(self, value: Value) -> Value:
        """An SI number, or an array of them, in this unit."""
        return (value - self.offset) / self.factor if self.offset else value / self.factor


DIMENSIONLESS = Unit("", 1.0, ONE)


class _Reader:
    """Recursive descent over the text of a unit: products of powers, exact in fractions where it can be."""

    def __init__(self, text: str) -> None:
        self.text = text
        self.names: list[str] = []
        self.offset = 0.0
        plain = re.sub(r"[⁰¹²³⁴⁵⁶⁷⁸⁹⁺⁻]+", lambda m: "^" + m[0].translate(SUPERSCRIPT), text)
        plain = re.sub(r"[·⋅∙×]", "*", plain).replace("**", "^").replace("−", "-").replace("–", "-")
        self.tokens: list[tuple[str, str, bool]] = []  # kind, text, blank before
        at = 0
        while at < len(plain):
            match = TOKEN.match(plain, at)
            if match is None or match.end() == at:
                raise InputError(f"the unit {text!r} can't be read at {plain[at:].strip()[:10]!r}")
            kind = match.lastgroup or ""
            lead = match[0][: len(match[0]) - len(match[0].lstrip())]
            tail = plain[at - 1 : at].isspace()
            self.tokens.append((kind, match[kind], bool(lead) or tail))
            at = match.end()
        self.at = 0

    def whole(self) -> Unit:
        """The unit of the whole text."""
        factor, dims = self.product()
        if self.at < len(self.tokens):
            raise InputError(f"the unit {self.text!r} can't be read at {self.tokens[self.at][1]!r}")
        if self.offset and len(self.tokens) > 1:
            raise InputError(
                f"the unit {self.text!r} has a shifted zero inside: write K for a step of 1 degC, degR for one of"
                " 1 degF, and a pressure without its g"
            )
        return Unit(self.text, float(factor), dims, self.offset, tuple(self.names))

    def product(self) -> tuple[float | Fraction, Dims]:
        factor, dims = self.power()
        divided = False
        while self.at < len(self.tokens):
            kind, token, _ = self.tokens[self.at]
            if kind == "op" and token in ")^":
                break
            operator = "*"
            if kind == "op" and token in "*/":
                operator = token
                self.at += 1
            if divided and operator == "*":
                raise InputError(
                    f"the unit {self.text!r} can be read in two ways: write what stands below the line in"
                    " parentheses, as in L/(mol h)"
                )
            divided = divided or operator == "/"
            sign = -1 if operator == "/" else 1
            more, its = self.power()
            factor = factor * more if sign > 0 else factor / more
            if not 10.0**-MAX_DECADES < factor < 10.0**MAX_DECADES:
                raise InputError(f"the unit {self.text!r} is too large or too small to compute with")
            dims = _dims(a + sign * b for a, b in zip(dims, its, strict=True))
        return factor, dims

    def power(self) -> tuple[float | Fraction, Dims]:
        factor, dims, bare = self.atom()
        exponent = self.exponent(bare)
        if exponent == 1:
            return factor, dims
        if abs(exponent) > MAX_POWER or abs(math.log10(factor)) * abs(exponent) > MAX_DECADES:
            raise InputError(f"the unit {self.text!r} is raised to too high a power")
        raised = factor ** int(exponent) if exponent == int(exponent) else float(factor) ** exponent
        return raised, _dims(d * exponent for d in dims)

    def exponent(self, bare: bool) -> float:
        """What follows a factor as its power: `^0.5`, `^(1/2)`, `-1` after a name."""
        if self.at >= len(self.tokens):
            return 1.0
        kind, token, blank = self.tokens[self.at]
        if kind == "op" and token == "^":
            self.at += 1
            return self.number()
        if bare and kind == "num" and not blank:
            self.at += 1
            return float(token)
        return 1.0

    def number(self) -> float:
        kind, token, _ = self.take("a power")
        if kind == "num":
            return float(token)
        if token == "(":
            _, first, _ = self.take("a number")
            value = float(first) if re.fullmatch(r"[+-]?[\d.]+", first) else self.fail("a number")
            if self.at < len(self.tokens) and self.tokens[self.at][1] == "/":
                self.at += 1
                _, second, _ = self.take("a number")
                value /= (
                    float(second) if re.fullmatch(r"[\d.]*[1-9][\d.]*", second) else self.fail("a number")
                )
            if self.take("a closing )")[1] != ")":
                self.fail("a closing )")
            return value
        return self.fail("a power")

    def atom(self) -> tuple[float | Fraction, Dims, bool]:
        kind, token, _ = self.take("the name of a unit")
        if kind == "num":
            if Fraction(token) != 1:
                self.fail("the name of a unit")
            return Fraction(1), ONE, False
        if token == "(":
            factor, dims = self.product()
            if self.take("a closing )")[1] != ")":
                self.fail("a closing )")
            return factor, dims, False
        if kind != "name":
            self.fail("the name of a unit")
        return (*self.named(token), True)

    def named(self, name: str) -> tuple[float | Fraction, Dims]:
        """Factor and dimension of a name; `m3` is m^3 unless it is a name itself."""
        if name in REFUSED:
            raise InputError(f"the unit {name!r}: " + REFUSED[name].format(name=name))
        found = look_up(name)
        if found is None:
            match = NAME_POWER.fullmatch(name)
            if match is not None:
                factor, dims = self.named(match["name"])
                power = int(match["power"])
                return factor**power, _dims(d * power for d in dims)
            return self.general(name)
        self.names.append(found.name)
        self.offset = self.offset or float(found.offset)
        return found.factor, found.dims

    def general(self, name: str) -> tuple[float, Dims]:
        """A name outside the trade's table, as a general library knows it."""
        unit = _from_pint(name)
        if unit is None:
            near = near_miss(name, known_names())
            hint = f". {near}" if near.startswith("Did") else ""
            raise InputError(f"the unit {self.text!r}: {name!r} is no unit that is known here{hint}")
        self.names.append(name)
        return unit

    def take(self, expected: str) -> tuple[str, str, bool]:
        if self.at >= len(self.tokens):
            self.fail(expected)
        self.at += 1
        return self.tokens[self.at - 1]

    def fail(self, expected: str) -> NoReturn:
        raise InputError(f"the unit {self.text!r} can't be read: {expected} is missing")


def _dims(values: Iterable[float]) -> Dims:
    a, b, c, d, e = values
    return a, b, c, d, e


PINT_BASE = {"[substance]": 0, "[length]": 1, "[time]": 2, "[mass]": 3, "[temperature]": 4}


@lru_cache(maxsize=256)
def _from_pint(name: str) -> tuple[float, Dims] | None:
    if len(name) < 2:  # there, k is Boltzmann's constant and b a barn
        return None
    import pint

    units = _registry()
    try:
        quantity = units.Quantity(1.0, name).to_base_units()
    except (pint.errors.PintError, AttributeError, TypeError, ValueError, AssertionError):
        return None
    dims = [0.0] * 5
    for base, power in quantity.dimensionality.items():
        if base not in PINT_BASE:
            return None
        dims[PINT_BASE[base]] = float(power)  # type: ignore[arg-type]  # a real number
    if not any(dims):  # an angle or a percentage scales a plain number unseen
        return None
    return float(str(quantity.magnitude)), _dims(dims)


@lru_cache(maxsize=1)
def _registry() -> "pint.UnitRegistry[float]":
    import pint

    return pint.UnitRegistry(system="SI", cache_folder=None)


@lru_cache(maxsize=4096)
def parse_unit(text: str) -> Unit:
    """The unit that `text` names.

    Raises
    ------
    InputError
        With what to write instead, for what is unknown, ambiguous or lacks a reference state.
    """
    stripped = text.strip()
    if stripped in ("", "-", "–", "1"):
        return Unit(stripped, 1.0, ONE)
    if len(stripped) > MAX_LENGTH:
        raise InputError(f"the unit is longer than {MAX_LENGTH} characters")
    return _Reader(stripped).whole()


def to_si(quantity: Quantity, dims: Dims, with_units: bool, name: str) -> float:
    """The value of a quantity in SI; it must have the dimension `dims`.

    with_units : False where numbers go through as they stand, because the call carries no units
    """
    if not with_units:
        if quantity.unit is not None:
            raise InputError(
                f"{name} has the unit {quantity.unit!r}, but other quantities of this call have none:"
                " give units everywhere or nowhere",
                quantity.place,
            )
        return quantity.value
    if quantity.unit is None and dims != ONE:
        raise InputError(f"{name} has no unit: write it behind the name, as in {name} [{_example(dims)}]",
                         quantity.place)  # fmt: skip
    try:
        unit = parse_unit(quantity.unit or "")
    except InputError as error:
        raise error.at(quantity.place) from None
    if any(abs(a - b) > 1e-9 for a, b in zip(unit.dims, dims, strict=True)):
        raise InputError(f"{name} can't be in {unit.text or 'a plain number'}: it takes a unit such as {_example(dims)}",
                         quantity.place)  # fmt: skip
    return unit.to_si(quantity.value)


EXAMPLES: dict[Dims, str] = {
    (0, 0, 1, 0, 0): "min",
    (0, 3, 0, 0, 0): "L",
    (0, 3, -1, 0, 0): "L/min",
    (0, 0, 0, 1, 0): "kg",
    (0, -3, 0, 1, 0): "kg/m^3",
    (0, 0, 0, 0, 1): "degC",
    (0, -1, -2, 1, 0): "bar",
    (1, -3, 0, 0, 0): "mol/L",
    (1, 0, -1, 0, 0): "mol/min",
    (-1, 2, -2, 1, 0): "kJ/mol",
    (-1, 0, 0, 1, 0): "g/mol",
}


def _example(dims: Dims) -> str:
    return EXAMPLES.get(dims) or compose(dims, ())


def compose(dims: Dims, like: Iterable[Unit]) -> str:
    """A text for a dimension, in the units of amount, volume or length, time and mass found in `like`.

    >>> compose((-1, 3, -1, 0, 0), [parse_unit("mol/L"), parse_unit("1/h")])
    'L/(mol h)'
    """
    base = {
        "amount": "mol",
        "volume": "m^3",
        "time": "s",
        "mass": "kg",
        "temperature": "K",
        "pressure": "bar",
    }
    kinds: dict[Dims, str] = {
        (1, 0, 0, 0, 0): "amount", (0, 3, 0, 0, 0): "volume", (0, 1, 0, 0, 0): "length",
        (0, 0, 1, 0, 0): "time", (0, 0, 0, 1, 0): "mass", (0, -1, -2, 1, 0): "pressure",
    }  # fmt: skip
    for unit in reversed(list(like)):
        for name in reversed(unit.names):
            found = look_up(name)
            if found is not None and (kind := kinds.get(found.dims)):
                base["volume" if kind == "length" else kind] = name + "^3" if kind == "length" else name
    pressure = _pressures(dims)
    n, length, time, mass, temperature = _dims(d - pressure * p for d, p in zip(dims, PRESSURE, strict=True))
    powers = [(base["amount"], n), (base["mass"], mass), (base["volume"], length / 3), (base["time"], time),
              (base["temperature"], temperature), (base["pressure"], pressure)]  # fmt: skip
    above = [_power(name, p) for name, p in powers if p > 1e-9]
    below = [_power(name, -p) for name, p in powers if p < -1e-9]
    over = " ".join(above) or "1"
    if not below:
        return over
    return f"{over}/{below[0]}" if len(below) == 1 else f"{over}/({' '.join(below)})"


def _pressures(dims: Dims) -> float:
    """How many pressures are in a dimension: those that leave it whole volumes, and 1/time or no time."""
    _, length, time, mass, _ = dims
    for power in (0.0, -time / 2, -(time + 1) / 2):
        whole = abs((length + power) / 3 - round((length + power) / 3)) < 1e-9 or power == 0.0 == mass
        if whole and min(abs(time + 2 * power), abs(time + 2 * power + 1)) < 1e-9:
            return power
    return 0.0


def _power(name: str, power: float) -> str:
    stem, _, own = name.partition("^")
    total = power * (float(own) if own else 1.0)
    return stem if abs(total - 1) < 1e-9 else f"{stem}^{total:.6g}"
