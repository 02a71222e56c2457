"""`--set`: inputs that are changed for one recalculation."""

import re

from moletally.chemistry.errors import near_miss
from moletally.hosts.headless.book import Book, BookError, Value
from moletally.hosts.headless.lexer import tokens
from moletally.hosts.headless.references import Rect, address, parse_area, split_sheet

__all__ = ["apply_settings"]

NUMBER = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?")


def apply_settings(book: Book, settings: list[str]) -> dict[tuple[str, int, int], Value]:
    """Change constants of the book as `Sheet!B3=0.5`, `Name=0.5` say; returns what was set.

    Raises
    ------
    BookError
        For a setting that names no input cell.
    """
    done: dict[tuple[str, int, int], Value] = {}
    for setting in settings:
        target, mark, text = _split(setting)
        if not mark:
            raise BookError(f"--set {setting!r}: write it as Sheet!B3=0.5 or Name=0.5")
        rect = _target(book, target.strip())
        sheet = book.sheets[rect.sheet]
        if (rect.top, rect.left) in sheet.formulas or (rect.top, rect.left) in sheet.cached:
            raise BookError(f"--set {target.strip()}: {address(rect)} holds a formula, not an input")
        value = _value(text)
        sheet.constants.pop((rect.top, rect.left), None)
        sheet.dates.discard((rect.top, rect.left))
        if value is not None:
            sheet.constants[rect.top, rect.left] = value
        done[rect.sheet, rect.top, rect.left] = value
    return done


def _split(setting: str) -> tuple[str, str, str]:
    """At the first equals sign outside of a quoted sheet name."""
    quoted = False
    for i, char in enumerate(setting):
        if char == "'":
            quoted = not quoted
        elif char == "=" and not quoted:
            return setting[:i], "=", setting[i + 1 :]
    return setting, "", ""


def _target(book: Book, text: str) -> Rect:
    sheet_name, rest = split_sheet(text)
    area = parse_area(rest.replace("$", ""))
    if area is not None and sheet_name:
        sheet = book.sheet(sheet_name)
        if sheet is None:
            raise BookError(
                f"--set {text}: there is no sheet {sheet_name!r}. {near_miss(sheet_name, book.sheets)}"
            )
        rect = Rect(sheet.name, *area)
    elif area is not None and len(book.sheets) == 1:
        rect = Rect(next(iter(book.sheets)), *area)
    else:
        rect = _named(book, text, sheet_name, rest)
    if not rect.single:
        raise BookError(f"--set {text}: {address(rect)} is more than one cell")
    return rect


def _named(book: Book, text: str, sheet_name: str, name: str) -> Rect:
    definition = book.name(name, sheet_name)
    pieces = tokens(definition) if definition else []
    if len(pieces) == 1 and pieces[0].kind == "reference":
        sheet, rest = split_sheet(pieces[0].text)
        area, found = parse_area(rest.replace("$", "")), book.sheet(sheet)
        if area is not None and found is not None:
            return Rect(found.name, *area)
    if parse_area(name.replace("$", "")) is not None:
        raise BookError(f"--set {text}: name the sheet too, as in {next(iter(book.sheets), 'Sheet')}!{name}")
    known = sorted({key for _, key in book.names})
    raise BookError(f"--set {text}: no cell and no defined name. {near_miss(name, known)}")


def _value(text: str) -> Value:
    plain = text.strip()
    if not plain:
        return None
    if plain.upper() in ("TRUE", "FALSE"):
        return plain.upper() == "TRUE"
    return float(plain) if NUMBER.fullmatch(plain) else text
