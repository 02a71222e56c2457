"""The value of an expression for numbers or arrays: what `want` is computed with."""

from collections.abc import Callable
from typing import Any, TypeAlias

import numpy as np
from numpy.typing import NDArray

from moletally.chemistry.expression import MATHS, Binary, Call, Name, Node, Num, Unary, fold

__all__ = ["Values", "evaluate"]

Values: TypeAlias = NDArray[np.float64] | np.float64

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

    def value(node: Node, branches: list[Values]) -> Values:
        match node:
            case Num(number, _):
                return np.float64(number)
            case Name():
                return _array(resolve_name(node))
            case Unary():
                return _array(np.negative(branches[0]))
            case Binary(op, _, _, _):
                return _array(OPERATORS[op](*branches))
            case Call(function, _, _):
                if _of_the_caller(node):
                    return _array(resolve_call(node))
                return _array(FUNCTIONS[function](*branches))

    with np.errstate(all="ignore"):
        return fold(tree, value, _of_the_caller)


def _of_the_caller(node: Node) -> bool:
    return isinstance(node, Call) and len(node.args) < LEAST.get(node.function, len(node.args) + 1)


def _array(value: Any) -> Values:
    return np.float64(value) if np.ndim(value) == 0 else np.asarray(value, dtype=np.float64)


def _chain(op: Callable[[Any, Any], Any], values: tuple[Any, ...]) -> Any:
    result = values[0]
    for value in values[1:]:
        result = op(result, value)
    return result
