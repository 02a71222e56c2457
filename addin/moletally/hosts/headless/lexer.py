"""A formula's text as tokens, so that strings and quoted sheet names are never mistaken for anything else."""

import re
from typing import NamedTuple

__all__ = ["NAME", "SHEET", "Kind", "Token", "significant", "tokens"]

NAME = r"(?:[^\W\d]|\\)[\w.\\?]*"
# 'any name'!  [1]Sheet!  [1]!  Sheet!  First:Last!
SHEET = r"(?:'(?:[^']|'')+'|\[[^\[\]]+\][\w.]*|[^\W\d][\w.]*(?::[^\W\d][\w.]*)?)!"
_CELL = r"\$?[A-Za-z]{1,3}\$?[1-9]\d{0,6}"
_AREA = rf"{_CELL}:{_CELL}|\$?[A-Za-z]{{1,3}}:\$?[A-Za-z]{{1,3}}|\$?[1-9]\d{{0,6}}:\$?[1-9]\d{{0,6}}|{_CELL}"
_ERROR = (
    r"\#(?:N/A|VALUE!|REF!|DIV/0!|NUM!|NAME\?|NULL!|SPILL!|CALC!|GETTING_DATA|FIELD!|BLOCKED!"
    r"|CONNECT!|BUSY!|UNKNOWN!|PYTHON!|EXTERNAL!)"
)
_BRACKETS = r"\[(?:[^\[\]']|'.|\[(?:[^\[\]']|'.)*\])*\]"

_TOKEN = re.compile(
    rf"""(?P<space>[ \t\r\n]+)
    |(?P<text>"(?:[^"]|"")*")
    |(?P<error>(?:{SHEET})?{_ERROR})
    |(?P<function>(?:{SHEET})?(?:{NAME})\()
    |(?P<reference>(?:{SHEET})?(?:{_AREA})(?![\w.\[!(]))
    |(?P<table>(?:{SHEET})?(?:{NAME})?{_BRACKETS})
    |(?P<name>(?:{SHEET})?(?:{NAME}))
    |(?P<number>(?:\d+\.?\d*|\.\d+)(?:[Ee][+-]?\d+)?)
    |(?P<operator><>|<=|>=|.)""",
    re.VERBOSE | re.DOTALL,
)

Kind = str  # the name of a group above


class Token(NamedTuple):
    """A piece of a formula; the texts of all pieces joined are the formula."""

    kind: Kind
    text: str


def tokens(formula: str) -> list[Token]:
    """The pieces of a formula without its equals sign."""
    return [Token(m.lastgroup or "operator", m.group()) for m in _TOKEN.finditer(formula)]


def significant(pieces: list[Token], start: int, step: int) -> Token | None:
    """The next token that isn't space, from `start` on, in the direction `step`."""
    index = start
    while 0 <= index < len(pieces):
        if pieces[index].kind != "space":
            return pieces[index]
        index += step
    return None
