"""Reaction equations: `A + 0.5 B -> C + 2 D`, sources `0 -> B`, sinks `A -> 0`."""

import re
from functools import lru_cache

from moletally.chemistry.errors import InputError
from moletally.chemistry.tables import Equation
from moletally.chemistry.tokens import MAX_LENGTH, ExpressionError, bare, bracketed

__all__ = ["parse_equation", "write_equation"]

ONE_WAY = ("->", "-->", "=>", "→", "⇒", "⟶")
BOTH_WAYS = ("<->", "<-->", "<=>", "⇌", "⇄", "↔", "⇋", "=")
BACKWARDS = ("<-", "<=", "←")
ARROW = re.compile("|".join(re.escape(a) for a in sorted((*ONE_WAY, *BOTH_WAYS, *BACKWARDS), key=len)[::-1]))

# An exponent needs its minus sign: in `2E+5 X` stand two species, E and X.
COEFFICIENT = re.compile(r"(?:\d+\.?\d*|\.\d+)(?:[eE]-\d+)?", re.ASCII)
NOTHING = ("0", "∅")


@lru_cache(maxsize=4096)
def parse_equation(text: str) -> Equation:
    """The equation that `text` states.

    Coefficients come out positive; a species named twice on a side is added up, one that stands on
    both sides stays on both (its order counts, its net change may be 0).

    Raises
    ------
    ExpressionError
        With a caret below the place and what was expected there.
    """
    if len(text) > MAX_LENGTH:
        raise ExpressionError(f"the equation is longer than {MAX_LENGTH} characters")
    blank = _hide_brackets(text)
    arrow = _arrow(text, blank)
    left = _side(text, blank, 0, arrow.start())
    right = _side(text, blank, arrow.end(), len(text))
    if not left and not right:
        raise ExpressionError.pointing(text, 0, "no species stands on either side of the arrow")
    return Equation(left, right, arrow.group() in BOTH_WAYS, text.strip())


def write_equation(left: dict[str, float], right: dict[str, float], reversible: bool) -> str:
    """The text of an equation from its coefficients, for tables that give them as numbers."""
    return f"{_write_side(left)} {'<->' if reversible else '->'} {_write_side(right)}"


def _write_side(side: dict[str, float]) -> str:
    terms = (bracketed(name) if nu == 1 else f"{nu:.12g} {bracketed(name)}" for name, nu in side.items())
    return " + ".join(terms) or "0"


def _hide_brackets(text: str) -> str:
    """The text with bracketed names overwritten by `[___]`, so that signs inside them are not read."""
    out = list(text)
    depth, opened = 0, 0
    for at, char in enumerate(text):
        if char == "[":
            opened = at if depth == 0 else opened
            depth += 1
        elif char == "]":
            depth -= 1
            if depth < 0:
                raise ExpressionError.pointing(text, at, "a ] without its [")
            if depth == 0:
                if not text[opened + 1 : at].strip():
                    raise ExpressionError.pointing(
                        text, opened, "the brackets are empty: a name was expected"
                    )
                out[opened + 1 : at] = "_" * (at - opened - 1)
    if depth:
        raise ExpressionError.pointing(text, opened, "the bracket [ is not closed")
    return "".join(out)


def _arrow(text: str, blank: str) -> re.Match[str]:
    found = list(ARROW.finditer(blank))
    if not found:
        raise InputError(
            f"{text.strip()!r} has no arrow: write A + B -> C, or <-> where it can run backwards"
        )
    if len(found) > 1:
        raise ExpressionError.pointing(
            text, found[1].start(), "a second arrow: an equation has one, further steps get rows of their own"
        )
    arrow = found[0]
    if arrow.group() in BACKWARDS:
        raise ExpressionError.pointing(
            text, arrow.start(), "this arrow points backwards: turn the equation round and write ->, or <->"
        )
    return arrow


def _side(text: str, blank: str, start: int, stop: int) -> tuple[tuple[str, float], ...]:
    where = "before" if start == 0 else "after"
    content = blank[start:stop].strip()
    if content in NOTHING:
        return ()
    if not content:
        sense = "source" if start == 0 else "sink"
        raise ExpressionError.pointing(
            text, start if start else stop, f"nothing stands {where} the arrow: write 0 for a {sense}"
        )
    terms: dict[str, float] = {}
    at = start
    while True:
        at, name, coefficient = _term(text, blank, at, stop)
        terms[name] = terms.get(name, 0.0) + coefficient
        at = _skip(blank, at, stop)
        if at == stop:
            return tuple(terms.items())
        if blank[at] != "+":
            raise ExpressionError.pointing(text, at, _between(blank[at]))
        at += 1
        if _skip(blank, at, stop) == stop:
            raise ExpressionError.pointing(text, at, "a species is missing after '+'")


def _term(text: str, blank: str, at: int, stop: int) -> tuple[int, str, float]:
    at = _skip(blank, at, stop)
    coefficient, at = _coefficient(text, blank, at, stop)
    at = _skip(blank, at, stop)
    if at == stop or blank[at] == "+":
        raise ExpressionError.pointing(text, min(at, len(text)), "a species is missing here")
    if blank[at] == "[":
        end = blank.index("]", at) + 1
        return end, text[at + 1 : end - 1].strip(), coefficient
    end = at
    while end < stop and bare(blank[at : end + 1]):
        end += 1
    if end == at:
        raise ExpressionError.pointing(text, at, _instead_of_name(blank[at]))
    return end, text[at:end], coefficient


def _coefficient(text: str, blank: str, at: int, stop: int) -> tuple[float, int]:
    number = COEFFICIENT.match(blank, at, stop)
    if number is None:
        return 1.0, at
    value, end = float(number.group()), number.end()
    following = blank[end : end + 1]
    if following in (",", "/") and blank[end + 1 : end + 2].isdigit():
        what = "a decimal point" if following == "," else "a decimal number, 0.5 for 1/2"
        raise ExpressionError.pointing(text, end, f"a coefficient is written with {what}")
    if not 0 < value < float("inf"):
        raise ExpressionError.pointing(text, at, "a coefficient is a number greater than 0")
    end = _skip(blank, end, stop)
    if end < stop and blank[end] in "*·":  # `2*A`, as the rate laws write it
        end += 1
    return value, end


def _skip(blank: str, at: int, stop: int) -> int:
    while at < stop and blank[at].isspace():
        at += 1
    return at


def _between(char: str) -> str:
    if char in "-−–":
        return "names with a dash stand in brackets, [A-B]; a coefficient can't be negative"
    return "'+' or the arrow was expected; a name with blanks or other signs stands in brackets, [tert-butyl]"


def _instead_of_name(char: str) -> str:
    if char in "-−–":
        return "a coefficient can't be negative: write the species on the other side"
    return f"a species was expected, not {char!r}; a name with other signs stands in brackets, [A*]"
