"""The spellings under which one function stands in files.

Excel writes functions of an add-in as `[1]!NAME` or with the add-in's path, a web add-in's as
`_xldudf_NAME`, a native library's as `_xll.NAME`, and its own newer functions with `_xlfn.` in front.
"""

import re
from collections.abc import Collection, Container

from moletally.hosts.headless.lexer import SHEET, tokens

__all__ = ["builtin", "own", "plain"]

_OWNER = re.compile(rf"^(?:{SHEET})?(?:_xll\.|_xldudf_|_xludf\.|_xlfn\.)?", re.IGNORECASE)
_FUTURE = re.compile(r"^(?:_xlfn\.|_xlws\.|_xll\.)+", re.IGNORECASE)


_MARKED = re.compile(r"_xl|![\w.\\]+\(", re.IGNORECASE)  # what a formula holds that is not shown as it stands


def _lower(formula: str, names: Collection[str]) -> bool:
    """True where a name of ours may stand in small letters."""
    folded = formula.upper()
    return folded != formula and any(folded.count(name) != formula.count(name) for name in names)


def own(spelled: str, names: Container[str]) -> str | None:
    """Our name for a function as spelled in a file, or None if it isn't one of `names`."""
    name = spelled[_OWNER.match(spelled).end() :].upper()  # type: ignore[union-attr]  # matches the empty text
    return name if name in names else None


def builtin(spelled: str) -> str:
    """The name of a spreadsheet function without the prefixes that files put before newer ones."""
    return _FUTURE.sub("", spelled).upper()


def plain(formula: str, names: Collection[str]) -> str:
    """A formula as a person would read it: our functions bare, no prefixes of the file format."""
    if not _MARKED.search(formula) and not _lower(formula, names):
        return formula
    shown = []
    for kind, text in tokens(formula):
        if kind == "function":
            name = text[:-1]
            shown.append((own(name, names) or _FUTURE.sub("", name)) + "(")
        elif kind == "name":
            shown.append(text.removeprefix("_xlpm."))
        else:
            shown.append(text)
    return "".join(shown)
