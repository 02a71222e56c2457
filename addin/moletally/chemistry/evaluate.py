"""The value of an expression for numbers or arrays: what `want` is computed with."""

from collections.abc import Callable
from typing import Any, TypeAlias

import numpy as np
from numpy.typing import NDArray

from moletally.chemistry.expression import MATHS, Binary, Call, Name, Node, Num, Unary, fold

__all__ = ["Steps", "Values", "evaluate", "run", "steps_of"]

Values: TypeAlias = NDArray[np.float64] | np.float64
Leaf: TypeAlias = Name | Call
# (a name or call, 0), (a number, 0), or (an operation, how many of the last values it takes)
Steps: TypeAlias = tuple[tuple[Any, int], ...]

OPERATORS: dict[str, Callable[[Any, Any], Any]] = {
    "+": np.add, "-": np.subtract, "*": np.multiply, "/": np.divide, "^": np.power,
}  # fmt: skip
FUNCTIONS: dict[str, Callable[..., Any]] = {
    "exp": np.exp, "ln": np.log, "log10": np.log10, "sqrt": np.sqrt, "abs": np.abs,
    "min": lambda *v: _chain(np.minimum, v), "max": lambda *v: _chain(np.maximum, v),
}  # fmt: skip
LEAST = {f.name: f.least for f in MATHS}


def evaluate(
    tree: Node,
    resolve_name: Callable[[Name], Values | float],
    resolve_call: Callable[[Call], Values | float],
) -> Values:
    """The value of `tree`; 0/0 and the like come out as nan or inf, never as a warning.

    Parameters
    ----------
    tree : Node
    resolve_name : the value of a name
    resolve_call : the value of a call that is no plain mathematics, such as `flow(A)` or a `max(…)` of
        one argument; its arguments are not evaluated beforehand

    Returns
    -------
    float64 or ndarray, in the shape that the resolved values broadcast to
    """

    def resolved(leaf: Leaf) -> Values:
        return _array(resolve_name(leaf) if isinstance(leaf, Name) else resolve_call(leaf))

    with np.errstate(all="ignore"):
        return run(steps_of(tree), resolved)


def steps_of(tree: Node) -> Steps:
    """A tree as the steps that evaluate it, branches before what takes them."""
    steps: list[tuple[Any, int]] = []

    def write(node: Node, branches: list[None]) -> None:
        match node:
            case Num(number, _):
                steps.append((np.float64(number), 0))
            case Name():
                steps.append((node, 0))
            case Unary():
                steps.append((np.negative, 1))
            case Binary(op, _, _, _):
                steps.append((OPERATORS[op], 2))
            case Call(function, _, _):
                steps.append((node, 0) if _of_the_caller(node) else (FUNCTIONS[function], len(branches)))

    fold(tree, write, _of_the_caller)
    return tuple(steps)


def run(steps: Steps, resolve: Callable[[Leaf], Values]) -> Values:
    """The value of `steps_of` a tree; call within np.errstate.

    resolve : the value of a name or of a call that is no plain mathematics
    """
    values: list[Values] = []
    for what, takes in steps:
        if takes:
            parts = values[-takes:]
            del values[-takes:]
            values.append(what(*parts))
        else:
            values.append(resolve(what) if isinstance(what, Name | Call) else what)
    return values[0]


def _of_the_caller(node: Node) -> bool:
    return isinstance(node, Call) and len(node.args) < LEAST.get(node.function, len(node.args) + 1)


def _array(value: Any) -> Values:
    return np.float64(value) if np.ndim(value) == 0 else np.asarray(value, dtype=np.float64)


def _chain(op: Callable[[Any, Any], Any], values: tuple[Any, ...]) -> Any:
    result = values[0]
    for value in values[1:]:
        result = op(result, value)
    return result
