"""One grammar for rate laws and for `want`: text becomes a small tree of frozen nodes.

    sum     = product { (+ | -) product }
    product = signed { (* | /) signed }
    signed  = { + | - } power
    power   = atom [ ^ [+ | -] atom ]
    atom    = number | name | [any name] | function ( sum { , sum } ) | ( sum )

`-a^b` and `a^b^c` mean different things in Excel and elsewhere, so both need parentheses here.
"""

from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from functools import lru_cache
from typing import TypeAlias, TypeVar

from moletally.chemistry.errors import near_miss
from moletally.chemistry.tokens import ExpressionError, Kind, Token, tokenise

__all__ = [
    "MATHS", "RATE_LAW", "Binary", "Call", "ExpressionError", "Function", "Name", "Node", "Num",
    "Unary", "check_reserved", "fold", "names", "parse", "source", "split_unit", "walk",
]  # fmt: skip

MAX_DEPTH = 60  # of nesting; a law that goes deeper is a slip or an attack on the stack
MAX_NODES = 1500

Span: TypeAlias = tuple[int, int]


@dataclass(frozen=True, slots=True)
class Num:
    """A number as typed."""

    value: float
    span: Span = field(compare=False)


@dataclass(frozen=True, slots=True)
class Name:
    """A species, constant or quantity; `bracketed` where it stood in [ ]."""

    text: str
    bracketed: bool
    span: Span = field(compare=False)


@dataclass(frozen=True, slots=True)
class Call:
    """A function and its arguments."""

    function: str
    args: tuple["Node", ...]
    span: Span = field(compare=False)


@dataclass(frozen=True, slots=True)
class Unary:
    """A minus sign."""

    arg: "Node"
    span: Span = field(compare=False)


@dataclass(frozen=True, slots=True)
class Binary:
    """`op` is one of + - * / ^."""

    op: str
    left: "Node"
    right: "Node"
    span: Span = field(compare=False)


Node: TypeAlias = Num | Name | Call | Unary | Binary
Value = TypeVar("Value")


@dataclass(frozen=True, slots=True)
class Function:
    """What a caller allows: a name, how many arguments, and whether they must be names of species."""

    name: str
    least: int = 1
    most: int | None = 1
    of_names: bool = False


MATHS = (
    Function("exp"), Function("ln"), Function("log10"), Function("sqrt"), Function("abs"),
    Function("min", 2, None), Function("max", 2, None),
)  # fmt: skip
RATE_LAW = (*MATHS, Function("p", of_names=True), Function("x", of_names=True))


@lru_cache(maxsize=4096)
def parse(text: str, functions: tuple[Function, ...] = RATE_LAW) -> Node:
    """The tree of an expression.

    Raises
    ------
    ExpressionError
        The message says what was expected, and points at the place in the text.
    """
    return _Parser(text, functions).whole()


def split_unit(text: str) -> tuple[str, str | None]:
    """`flow(Mono) [kmol/h]` -> (`flow(Mono)`, `kmol/h`); brackets that are a name stay: (`[2-pentene]`, None)."""
    tokens = tokenise(text)
    if len(tokens) < 3 or tokens[-2].kind is not Kind.BRACKETS:
        return text, None
    before, last = tokens[-3], tokens[-2]
    if before.kind is Kind.SYMBOL and before.text != ")":
        return text, None
    return text[: last.start].rstrip(), last.text


def source(text: str, node: Node) -> str:
    """The piece of `text` that became `node`."""
    return text[node.span[0] : node.span[1]]


def _children(node: Node) -> tuple[Node, ...]:
    match node:
        case Call(_, args, _):
            return args
        case Unary(arg, _):
            return (arg,)
        case Binary(_, left, right, _):
            return (left, right)
        case _:
            return ()


def walk(tree: Node) -> Iterator[Node]:
    """Every node, in reading order."""
    stack = [tree]
    while stack:
        node = stack.pop()
        yield node
        stack.extend(reversed(_children(node)))


def names(tree: Node) -> tuple[Name, ...]:
    """Every name that occurs, in reading order, repetitions included."""
    return tuple(node for node in walk(tree) if isinstance(node, Name))


def fold(
    tree: Node,
    value: Callable[[Node, list[Value]], Value],
    opaque: Callable[[Node], bool] = lambda node: False,
) -> Value:
    """The value of a tree from the values of its branches; below an `opaque` node nothing is visited.

    A loop rather than recursion: a sum of a thousand terms is a thousand levels deep.
    """
    todo: list[tuple[Node, bool]] = [(tree, False)]
    done: list[Value] = []
    while todo:
        node, ready = todo.pop()
        branches = () if opaque(node) else _children(node)
        if ready or not branches:
            first = len(done) - len(branches)
            result = value(node, done[first:])
            del done[first:]
            done.append(result)
        else:
            todo.append((node, True))
            todo.extend((branch, False) for branch in reversed(branches))
    return done[0]


def check_reserved(text: str, tree: Node, species: tuple[str, ...]) -> None:
    """Refuse a bare `T` or `R` where a species has that name: it must be written [T], [R]."""
    for name in names(tree):
        if not name.bracketed and name.text in ("T", "R") and name.text in species:
            what = "temperature" if name.text == "T" else "gas constant"
            raise ExpressionError.pointing(
                text, name.span[0],
                f"{name.text} is a species and the letter of the {what}: write [{name.text}] for the species, "
                f"or rename it",
            )  # fmt: skip


class _Parser:
    """Recursive descent over the tokens of one text."""

    def __init__(self, text: str, functions: tuple[Function, ...]) -> None:
        self.text = text
        self.functions = {f.name: f for f in functions}
        self.tokens = tokenise(text)
        self.at = 0
        self.depth = 0
        self.calls = 0  # open function calls: only there does a comma belong
        if len(self.tokens) > MAX_NODES:
            raise ExpressionError(f"the text has more than {MAX_NODES} parts: split the law up")

    @property
    def token(self) -> Token:
        return self.tokens[self.at]

    def whole(self) -> Node:
        if self.token.kind is Kind.END:
            raise ExpressionError("the text is empty: an expression was expected")
        tree = self.sum()
        if self.at < len(self.tokens) - 1:
            raise self.error(self.token, self.leftover())
        return tree

    def sum(self) -> Node:
        self.depth += 1
        if self.depth > MAX_DEPTH:
            raise self.error(self.token, f"the expression is nested more than {MAX_DEPTH} levels deep")
        left = self.product()
        while self.is_symbol("+", "-"):
            left = self.binary(left, self.product)
        self.depth -= 1
        return left

    def product(self) -> Node:
        left = self.signed()
        while self.is_symbol("*", "/"):
            left = self.binary(left, self.signed)
        return left

    def binary(self, left: Node, operand: Callable[[], Node]) -> Node:
        op = self.next().text
        right = operand()
        return Binary(op, left, right, (left.span[0], right.span[1]))

    def signed(self) -> Node:
        signs = []
        while self.is_symbol("+", "-"):
            signs.append(self.next())
        if len(signs) > MAX_DEPTH:
            raise self.error(signs[0], "too many signs in a row")
        minus = next((s for s in reversed(signs) if s.text == "-"), None)
        node = self.power(minus)
        for sign in reversed(signs):
            if sign.text == "-":
                node = Unary(node, (sign.start, node.span[1]))
        return node

    def power(self, minus: Token | None) -> Node:
        base = self.atom()
        if not self.is_symbol("^"):
            return base
        if minus is not None:
            raise self.error(
                minus, "a minus before a power needs parentheses: write -(a^b) or (-a)^b, whichever is meant"
            )
        caret = self.next()
        sign = self.next() if self.is_symbol("+", "-") else None
        exponent = self.atom()
        if sign is not None and sign.text == "-":
            exponent = Unary(exponent, (sign.start, exponent.span[1]))
        if self.is_symbol("^"):
            raise self.error(
                self.token,
                "a power of a power needs parentheses: write (a^b)^c or a^(b^c), whichever is meant",
            )
        return Binary(caret.text, base, exponent, (base.span[0], exponent.span[1]))

    def atom(self) -> Node:
        token = self.next()
        if token.kind is Kind.NUMBER:
            return Num(token.number, (token.start, token.stop))
        if token.kind is Kind.BRACKETS:
            return Name(token.text, True, (token.start, token.stop))
        if token.kind is Kind.NAME:
            return self.name_or_call(token)
        if token.text == "(":
            inner = self.sum()
            self.close(token)
            return _respan(inner, (token.start, self.tokens[self.at - 1].stop))
        found = "the text ends" if token.kind is Kind.END else f"{token.text!r} stands"
        raise self.error(token, f"{found} where a number, a name or '(' was expected")

    def name_or_call(self, token: Token) -> Node:
        name = token.text
        second = self.token
        if second.kind is Kind.NAME and f"{name} {second.text}" in self.functions:
            name = f"{name} {self.next().text}"
        if not self.is_symbol("("):
            return Name(token.text, False, (token.start, token.stop))
        function = self.functions.get(name)
        if function is None:
            raise self.error(token, self.unknown_function(name))
        opening = self.next()
        args = self.arguments(opening)
        self.check_arguments(function, token, args)
        return Call(name, args, (token.start, self.tokens[self.at - 1].stop))

    def arguments(self, opening: Token) -> tuple[Node, ...]:
        self.calls += 1
        args = [self.sum()]
        while self.is_symbol(","):
            self.next()
            args.append(self.sum())
        self.calls -= 1
        self.close(opening)
        return tuple(args)

    def check_arguments(self, function: Function, token: Token, args: tuple[Node, ...]) -> None:
        most = len(args) if function.most is None else function.most
        if not function.least <= len(args) <= most:
            many = f"{function.least}" if function.least == function.most else f"at least {function.least}"
            what = "argument" if many == "1" else "arguments"
            raise self.error(token, f"{function.name} takes {many} {what}, here are {len(args)}")
        if function.of_names:
            for arg in args:
                if not isinstance(arg, Name):
                    raise ExpressionError.pointing(
                        self.text, arg.span[0], f"{function.name}() takes the name of a species"
                    )

    def unknown_function(self, name: str) -> str:
        if name in ("log", "Log", "LOG"):
            return "log can mean two things: write ln (natural) or log10"
        hint = near_miss(name, self.functions)
        return f"unknown function {name!r}: {hint} For a product write {name}*(…)"

    def close(self, opening: Token) -> None:
        if self.is_symbol(")"):
            self.next()
            return
        if self.token.kind is Kind.END:
            raise self.error(opening, "the parenthesis ( is not closed")
        raise self.error(self.token, self.leftover())

    def leftover(self) -> str:
        token = self.token
        before = self.tokens[self.at - 1]
        if token.text == ")" and token.kind is Kind.SYMBOL:
            return "a ) without its ("
        if token.text == "," and token.kind is Kind.SYMBOL:
            after = self.tokens[self.at + 1]
            if not self.calls and before.kind is Kind.NUMBER and after.kind is Kind.NUMBER:
                return f"numbers have a decimal point: write {before.text}.{after.text}"
            return "a comma parts the arguments of a function; here it does not belong"
        return "an operator such as * is missing before this"

    def is_symbol(self, *symbols: str) -> bool:
        return self.token.kind is Kind.SYMBOL and self.token.text in symbols

    def next(self) -> Token:
        token = self.token
        if token.kind is not Kind.END:
            self.at += 1
        return token

    def error(self, token: Token, message: str) -> ExpressionError:
        return ExpressionError.pointing(self.text, token.start, message)


def _respan(node: Node, span: Span) -> Node:
    """The node as it stood in parentheses: its piece of text includes them."""
    match node:
        case Num(value, _):
            return Num(value, span)
        case Name(text, bracketed, _):
            return Name(text, bracketed, span)
        case Call(function, args, _):
            return Call(function, args, span)
        case Unary(arg, _):
            return Unary(arg, span)
        case Binary(op, left, right, _):
            return Binary(op, left, right, span)
