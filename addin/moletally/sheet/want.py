"""`want`: what a cell asks of an outlet, such as `Mono/Di` or `flow(Mono) [kmol/h]`.

Without a unit of its own, every name and function stands for the number that would be shown for it
alone, so an expression reads like the cells beside it. With a unit, everything is evaluated in SI and
with its dimension, and converted.
"""

import math
from collections.abc import Iterable
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from moletally.chemistry.errors import InputError, SheetError, Undefined
from moletally.chemistry.evaluate import Steps, run, steps_of
from moletally.chemistry.expression import (
    MATHS,
    Binary,
    Call,
    Name,
    Node,
    Num,
    Unary,
    check_reserved,
    fold,
    parse,
    split_unit,
)
from moletally.chemistry.quantity import Dims, Unit, parse_unit
from moletally.sheet.leaves import ONE, WANT, Leaf, call_leaf, name_leaf, species_leaf
from moletally.sheet.state import State

__all__ = ["Answer", "answer", "species_answer"]

Floats = NDArray[np.float64]
MATHS_NAMES = frozenset(f.name for f in MATHS)


@dataclass(frozen=True)
class Answer:
    """Values of one want, shape (M,), their unit, and the fault of those that are not finite."""

    values: Floats
    unit: str
    fault: SheetError | None = None

    def cell(self, row: int) -> float | SheetError:
        """The value of one state, or why there is none."""
        value = float(self.values[row])
        return value if self.fault is None or math.isfinite(value) else self.fault


@dataclass(frozen=True, eq=False, slots=True)
class _Want:
    """A text as it is understood: its tree, the steps that evaluate it, and the unit it ends in."""

    tree: Node
    steps: Steps
    unit: Unit | None


@lru_cache(maxsize=4096)
def _read(text: str, species: tuple[str, ...]) -> _Want:
    expression, unit = split_unit(text)
    tree = parse(expression, WANT)
    check_reserved(expression, tree, species)
    return _Want(tree, steps_of(tree), None if unit is None else parse_unit(unit))


def answer(text: str, state: State) -> Answer:
    """Values of a want in M states; call within np.errstate, as functions.call does.

    Raises
    ------
    InputError
        Where the text can't be read, or asks for what these states do not have.
    """
    want = _read(text, state.names)
    return _plain(want, state) if want.unit is None else _converted(want, want.unit, state)


def species_answer(state: State, index: int) -> Answer:
    """The concentration of a species, as it is shown without a want."""
    leaf = species_leaf(state, index)
    return Answer(leaf.shown, leaf.unit.text)


def _plain(want: _Want, state: State) -> Answer:
    single = _single(want.tree, state)
    if single is not None:
        return _finish(single.shown, single.unit.text, [single], state)
    leaves = _Leaves(state.in_common_units())
    values = run(want.steps, lambda node: leaves.of(node).shown)
    return _finish(values, "", leaves.met, state)


def _converted(want: _Want, unit: Unit, state: State) -> Answer:
    single = _single(want.tree, state)
    if single is not None and single.fits(unit):
        return _finish(single.within(unit), unit.text, [single], state)
    leaves = _Leaves(state.in_common_units())
    dims = _dimension(want.tree, leaves)
    if not np.allclose(dims, unit.dims, rtol=0, atol=1e-9):
        hint = " (units of mass need the MW column)" if unit.dims[3] and not dims[3] else ""
        raise InputError(
            f"the result is not a quantity that {unit.text} measures: mend the unit or leave it out{hint}"
        )
    values = run(want.steps, lambda node: leaves.of(node).si)
    return _finish(unit.from_si(np.asarray(values)), unit.text, leaves.met, state)


def _finish(values: object, unit: str, leaves: list[Leaf], state: State) -> Answer:
    """Values as an array, with the reason for those that are not finite."""
    array = np.asarray(values, dtype=np.float64)
    if array.shape != (len(state),):
        array = np.broadcast_to(array, (len(state),))
    if np.isfinite(array).all():
        return Answer(array, unit)
    solved = np.isfinite(state.concentration).all(axis=1)
    if np.isfinite(array[solved]).all():
        return Answer(array, unit)
    why = next((leaf.undefined for leaf in leaves if not np.isfinite(leaf.si[solved]).all()), "")
    return Answer(
        array,
        unit,
        Undefined(why or "undefined: a division by zero, or a root or logarithm that does not exist"),
    )


class _Leaves:
    """The leaves of one expression as they are met."""

    def __init__(self, state: State) -> None:
        self.state = state
        self.met: list[Leaf] = []

    def of(self, node: Name | Call) -> Leaf:
        leaf = name_leaf(self.state, node) if isinstance(node, Name) else call_leaf(self.state, node)
        self.met.append(leaf)
        return leaf


def _single(tree: Node, state: State) -> Leaf | None:
    """The leaf, if the want is nothing else: then, and only then, what was fed in mass is shown in mass."""
    if isinstance(tree, Name):
        return name_leaf(state, tree)
    if isinstance(tree, Call) and tree.function not in MATHS_NAMES:
        return call_leaf(state, tree)
    return None


def _dimension(tree: Node, leaves: _Leaves) -> Dims:
    """Dimension of an expression; a sum of unlike quantities is an error."""

    def value(node: Node, parts: list[Dims]) -> Dims:
        match node:
            case Num():
                return ONE
            case Name():
                return leaves.of(node).dims
            case Unary():
                return parts[0]
            case Binary(op, _, right, _):
                return _combine(op, parts[0], parts[1], right)
            case Call(function, _, _):
                return _of_function(function, parts) if function in MATHS_NAMES else leaves.of(node).dims

    return fold(tree, value, lambda node: isinstance(node, Call) and node.function not in MATHS_NAMES)


def _combine(op: str, left: Dims, right: Dims, exponent: Node) -> Dims:
    if op == "*":
        return _dims(a + b for a, b in zip(left, right, strict=True))
    if op == "/":
        return _dims(a - b for a, b in zip(left, right, strict=True))
    if op == "^":
        if left == ONE and right == ONE:
            return ONE
        power = exponent.arg if isinstance(exponent, Unary) else exponent
        if not isinstance(power, Num):
            raise InputError("with a unit, an exponent has to be a number")
        return _dims(a * (-power.value if isinstance(exponent, Unary) else power.value) for a in left)
    if left != right:
        raise InputError("quantities of different kinds are added or subtracted")
    return left


def _of_function(function: str, parts: list[Dims]) -> Dims:
    if function == "sqrt":
        return _dims(a / 2 for a in parts[0])
    if function in ("exp", "ln", "log10") and parts[0] != ONE:
        raise InputError(f"{function}() of a quantity with a unit: divide it by a quantity of its kind")
    if any(part != parts[0] for part in parts):
        raise InputError(f"{function}() compares quantities of different kinds")
    return parts[0]


def _dims(values: Iterable[float]) -> Dims:
    one, two, three, four, five = values
    return one, two, three, four, five
