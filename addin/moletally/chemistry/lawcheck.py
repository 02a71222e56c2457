"""The dimension of a rate law, from the expression itself and the unit of every constant in it.

A law is consistent where sums add like with like, exponents are plain numbers and the rate comes out as
concentration per time (or amount per catalyst mass and time). If it is not, each constant in turn is
taken as unknown: the dimension that would make the law consistent is the unit to propose.
"""

from collections.abc import Callable, Mapping
from dataclasses import dataclass

from moletally.chemistry.errors import InputError
from moletally.chemistry.expression import Binary, Call, Name, Node, Num, Unary, fold, names
from moletally.chemistry.quantity import ONE, Dims

__all__ = ["GAS_CONSTANT", "PRESSURE", "TEMPERATURE", "Mismatch", "Symbols", "dimension", "orders", "remedy"]

TEMPERATURE: Dims = (0, 0, 0, 0, 1)
PRESSURE: Dims = (0, -1, -2, 1, 0)
GAS_CONSTANT: Dims = (-1, 2, -2, 1, -1)
CLOSE = 1e-9  # orders such as 0.1 + 0.2 are not exact


class Mismatch(InputError):
    """A law that adds unlike quantities, or takes a power or function of what has a unit."""


@dataclass(frozen=True)
class Symbols:
    """What the names of a law stand for.

    dims : name -> dimension; values : name -> number, for constants that are exponents
    concentration : the dimension of every species
    """

    dims: Mapping[str, Dims]
    values: Mapping[str, float]


@dataclass(frozen=True)
class _Form:
    """A dimension that may hold an unknown x: base + share * x."""

    base: Dims
    share: float = 0.0

    def plus(self, other: "_Form", sign: float = 1.0) -> "_Form":
        base = tuple(a + sign * b for a, b in zip(self.base, other.base, strict=True))
        return _Form(base, self.share + sign * other.share)  # type: ignore[arg-type]

    def times(self, power: float) -> "_Form":
        return _Form(tuple(a * power for a in self.base), self.share * power)  # type: ignore[arg-type]


PLAIN = _Form(ONE)


class _Inference:
    """One pass over a law with at most one unknown constant."""

    def __init__(self, symbols: Symbols, unknown: str | None) -> None:
        self.symbols = symbols
        self.unknown = unknown
        self.found: Dims | None = None
        self.orders: set[str] = set()

    def of(self, tree: Node) -> _Form:
        return fold(tree, self._value, lambda node: isinstance(node, Call) and node.function in ("p", "x"))

    def equal(self, one: _Form, other: _Form, complaint: Callable[[], str]) -> _Form:
        """Both must be alike; where the unknown decides, it takes the value that makes them so."""
        gap = one.plus(other, -1.0)
        if abs(gap.share) > CLOSE:
            x: Dims = tuple(-a / gap.share for a in gap.base)  # type: ignore[assignment]
            if self.found is None:
                self.found = x
            if not close(self.found, x):
                raise Mismatch(complaint())
            return one
        if not close(gap.base, ONE):
            if self.found is not None and close(self._settled(gap), ONE):
                return one
            raise Mismatch(complaint())
        return one

    def _settled(self, form: _Form) -> Dims:
        assert self.found is not None
        return tuple(b + form.share * x for b, x in zip(form.base, self.found, strict=True))  # type: ignore[return-value]

    def _value(self, node: Node, parts: list[_Form]) -> _Form:
        match node:
            case Num():
                return PLAIN
            case Name(text, _, _):
                return _Form(ONE, 1.0) if text == self.unknown else _Form(self.symbols.dims[text])
            case Unary():
                return parts[0]
            case Binary(op, left, right, _):
                return self._binary(op, left, right, parts)
            case Call(function, _, _):
                return self._call(function, node.args, parts)

    def _binary(self, op: str, left: Node, right: Node, parts: list[_Form]) -> _Form:
        if op == "*":
            return parts[0].plus(parts[1])
        if op == "/":
            return parts[0].plus(parts[1], -1.0)
        if op in "+-":
            if _is_zero(left) or _is_zero(right):
                return parts[_is_zero(left)]
            return self.equal(
                parts[0], parts[1], lambda: "quantities of different units are added or subtracted"
            )
        self.equal(parts[1], PLAIN, lambda: "an exponent has a unit")
        power = constant(right, self.symbols.values)
        if power is not None:
            if parts[0].share or not close(parts[0].base, ONE):
                self.orders |= {name.text for name in names(right)}
            return parts[0].times(power)
        self.equal(parts[0], PLAIN, lambda: "the exponent of a quantity with a unit is no fixed number")
        return PLAIN

    def _call(self, function: str, args: tuple[Node, ...], parts: list[_Form]) -> _Form:
        if function == "p":
            return _Form(PRESSURE)
        if function == "x":
            return PLAIN
        if function == "sqrt":
            return parts[0].times(0.5)
        if function in ("exp", "ln", "log10"):
            return self.equal(PLAIN, parts[0], lambda: f"{function}() is taken of a quantity with a unit")
        # 0 is 0 in any unit: max(A, 0) compares like with like
        first, *rest = [p for p, arg in zip(parts, args, strict=True) if not _is_zero(arg)] or [PLAIN]
        for other in rest:
            self.equal(first, other, lambda: f"{function}() compares quantities of different units")
        return first


def _is_zero(node: Node) -> bool:
    return isinstance(node, Num) and node.value == 0


def close(one: Dims, other: Dims) -> bool:
    """Equal to rounding."""
    return all(abs(a - b) <= CLOSE for a, b in zip(one, other, strict=True))


def constant(node: Node, values: Mapping[str, float]) -> float | None:
    """The number an exponent stands for, if it is one for good."""
    match node:
        case Num(value, _):
            return value
        case Unary(arg, _):
            inner = constant(arg, values)
            return None if inner is None else -inner
        case Name(text, _, _):
            return values.get(text)
        case Binary(op, left, right, _):
            a, b = constant(left, values), constant(right, values)
            if a is None or b is None or op == "^" or (op == "/" and b == 0):
                return None
            return {"+": a + b, "-": a - b, "*": a * b, "/": a / b if b else 0.0}[op]
        case _:
            return None


def dimension(tree: Node, symbols: Symbols) -> Dims:
    """The dimension of a law.

    Raises
    ------
    Mismatch
        Where the law is not consistent in itself.
    """
    return _Inference(symbols, None).of(tree).base


def orders(tree: Node, symbols: Symbols) -> set[str]:
    """The constants whose numbers decide the dimension: exponents of what has a unit."""
    inference = _Inference(symbols, None)
    inference.of(tree)
    return inference.orders


def remedy(tree: Node, symbols: Symbols, unknown: str, target: Dims | None) -> Dims | None:
    """The dimension of one constant that makes the law consistent; None if none does.

    target : the dimension its rate must have, None where only sums and exponents are to be mended
    """
    inference = _Inference(symbols, unknown)
    try:
        form = inference.of(tree)
        if target is not None:
            inference.equal(form, _Form(target), lambda: "")
    except Mismatch:
        return None
    if inference.found is None:
        return None
    settled = Symbols({**symbols.dims, unknown: inference.found}, symbols.values)
    try:
        made = dimension(tree, settled)
        return inference.found if target is None or close(made, target) else None
    except Mismatch:
        return None
