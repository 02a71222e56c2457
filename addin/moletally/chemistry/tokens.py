"""Text of a rate law or a `want` cut into tokens, and the error that points into it."""

import unicodedata
from dataclasses import dataclass
from enum import Enum

from moletally.chemistry.errors import InputError, Place

__all__ = ["ExpressionError", "Kind", "Token", "bare", "bracketed", "tokenise"]

MAX_LENGTH = 4000

ALIKE = {"−": "-", "–": "-", "·": "*", "⋅": "*", "∙": "*", "×": "*", "∗": "*"}
SUPERSCRIPTS = "⁰¹²³⁴⁵⁶⁷⁸⁹⁺⁻"


class ExpressionError(InputError):
    """A text that does not follow the grammar; `what` ends in the text with a caret below it."""

    @classmethod
    def pointing(
        cls, text: str, position: int, message: str, place: Place | None = None
    ) -> "ExpressionError":
        """The error for `text`, with a caret under the character at `position`."""
        start = max(0, position - 40)
        shown = "".join(c if c.isprintable() else " " for c in text[start : position + 40])
        lead = "…" if start else ""
        tail = "…" if position + 40 < len(text) else ""
        caret = " " * (len(lead) + position - start) + "^"
        return cls(f"{message}\n  {lead}{shown}{tail}\n  {caret}", place)


class Kind(Enum):
    """What a token is."""

    NUMBER = "a number"
    NAME = "a name"
    BRACKETS = "a name in brackets"
    SYMBOL = "a symbol"
    END = "the end"


@dataclass(frozen=True, slots=True)
class Token:
    """A piece of the text; `text` is the name without its brackets, or the symbol as we write it."""

    kind: Kind
    text: str
    start: int
    stop: int
    number: float = 0.0


def tokenise(text: str) -> list[Token]:
    """All tokens of `text`, an END token last.

    Raises
    ------
    ExpressionError
        At the first character that fits nowhere; the message says what to write instead.
    """
    if len(text) > MAX_LENGTH:
        raise ExpressionError(f"the text is longer than {MAX_LENGTH} characters: split the law up")
    tokens: list[Token] = []
    at = 0
    while at < len(text):
        if text[at].isspace():
            at += 1
            continue
        token = _token(text, at)
        tokens.append(token)
        at = token.stop
    tokens.append(Token(Kind.END, "", len(text), len(text)))
    return tokens


def bare(name: str) -> bool:
    """True where a name needs no brackets: letters, digits, `_`, not starting with a digit."""
    return bool(name) and _starts_name(name[0]) and all(_continues_name(c) for c in name)


def bracketed(name: str) -> str:
    """The name as it stands in an expression."""
    return name if bare(name) else f"[{name}]"


def _token(text: str, at: int) -> Token:
    char = text[at]
    if char.isascii() and (char.isdigit() or (char == "." and text[at + 1 : at + 2].isdigit())):
        return _number(text, at)
    if _starts_name(char):
        stop = _end_of_name(text, at)
        return Token(Kind.NAME, text[at:stop], at, stop)
    if char == "[":
        return _brackets(text, at)
    symbol = ALIKE.get(char, char)
    if symbol == "*" and text[at + 1 : at + 2] == "*":
        raise ExpressionError.pointing(text, at, "a power is written with ^, not with **")
    if symbol in "+-*/^(),":
        return Token(Kind.SYMBOL, symbol, at, at + 1)
    raise ExpressionError.pointing(text, at, _refusal(char))


def _starts_name(char: str) -> bool:
    return char.isalpha() or char == "_"


def _continues_name(char: str) -> bool:
    # Subscript digits and combining accents stay with the name, so that "H₂" is a name the species
    # table may or may not have; superscripts are powers to a reader and are refused.
    if char in SUPERSCRIPTS:
        return False
    return char.isalnum() or char == "_" or unicodedata.category(char) in ("Mn", "Mc")


def _end_of_name(text: str, at: int) -> int:
    while at < len(text) and _continues_name(text[at]):
        at += 1
    return at


def _digits(text: str, at: int) -> int:
    while at < len(text) and text[at].isascii() and text[at].isdigit():
        at += 1
    return at


def _number(text: str, start: int) -> Token:
    stop = _digits(text, start)
    if text[stop : stop + 1] == ".":
        stop = _digits(text, stop + 1)
    if text[stop : stop + 1] in ("e", "E"):
        sign = stop + 2 if text[stop + 1 : stop + 2] in ("+", "-", "−") else stop + 1
        exponent = _digits(text, sign)
        if exponent > sign:
            stop = exponent
    follows = text[stop : stop + 1]
    if follows and (_starts_name(follows) or follows == "["):
        _refuse_product(text, start, stop)
    if follows == ".":
        raise ExpressionError.pointing(text, stop, "a number has one decimal point")
    value = float(text[start:stop].replace("−", "-"))
    if value == float("inf"):
        raise ExpressionError.pointing(text, start, "the number is too large")
    return Token(Kind.NUMBER, text[start:stop], start, stop, value)


def _refuse_product(text: str, start: int, stop: int) -> None:
    number = text[start:stop]
    if text[stop] == "[":
        raise ExpressionError.pointing(text, stop, f"an operator is missing: for a product write {number}*[")
    name = text[stop : _end_of_name(text, stop)]
    raise ExpressionError.pointing(
        text, stop, f"a product needs its sign: write {number}*{name}, or [{number}{name}] if that is a name"
    )


def _brackets(text: str, at: int) -> Token:
    depth = 0
    for stop in range(at, len(text)):
        depth += (text[stop] == "[") - (text[stop] == "]")
        if depth == 0:
            name = text[at + 1 : stop].strip()
            if not name:
                raise ExpressionError.pointing(text, at, "the brackets are empty: a name was expected")
            return Token(Kind.BRACKETS, name, at, stop + 1)
    raise ExpressionError.pointing(text, at, "the bracket [ is not closed")


def _refusal(char: str) -> str:
    if char in SUPERSCRIPTS:
        return "a power is written with ^, for example A^2"
    if char == "]":
        return "a ] without its ["
    if char in "=<>":
        return f"{char!r} does not belong here: write the expression alone, without an equals sign"
    if char == "%":
        return "write the fraction instead of a percentage"
    if char in ";":
        return "arguments are parted by a comma"
    if not char.isprintable() or unicodedata.category(char) == "Cf":
        return f"an invisible character (U+{ord(char):04X}) stands here: delete it"
    return f"unexpected character {char!r}; a name with other signs than letters, digits and _ stands in [ ]"
