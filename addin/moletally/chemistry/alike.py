"""Letters that look like others: a Cyrillic С beside a Latin C, a subscript ₂ beside a 2."""

import unicodedata
from collections.abc import Iterable

from moletally.chemistry.errors import near_miss

__all__ = ["hint"]

# The capitals and small letters of Cyrillic and Greek that print like Latin ones.
LATIN = str.maketrans(
    "АВЕЅІЈКМНОРСТХУаеѕіјорсхуΑΒΕΖΗΙΚΜΝΟΡΤΥΧο",
    "ABESIJKMHOPCTXYaesijopcxyABEZHIKMNOPTYXo",
)


def hint(name: str, known: Iterable[str]) -> str:
    """What to append to "unknown …": the letter that only looks like that of a known name, else the nearest name."""
    candidates = list(known)
    plain = _plain(name)
    for other in candidates:
        if other != name and _plain(other) == plain:
            return f"It holds letters that only look like others: {_difference(name, other)}. Type it again."
    return near_miss(name, candidates)


def _plain(name: str) -> str:
    return unicodedata.normalize("NFKC", name).translate(LATIN)


def _difference(name: str, other: str) -> str:
    for mine, its in zip(name, other, strict=False):
        if mine != its:
            return f"{mine!r} here is {_called(mine)}, there it is {_called(its)}"
    return "one of the two has signs that can't be seen"


def _called(char: str) -> str:
    return unicodedata.name(char, f"U+{ord(char):04X}").lower()
