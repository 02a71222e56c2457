"""How the templates look: one palette, one style per kind of cell, one way to set a page."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from datetime import datetime

from xlsxwriter import Workbook
from xlsxwriter.format import Format
from xlsxwriter.utility import xl_range_abs, xl_rowcol_to_cell
from xlsxwriter.worksheet import Worksheet

__all__ = ["BUILT", "CURVES", "GRID", "INK", "Area", "Look", "heading", "open_book", "page", "title"]

BUILT = datetime(2026, 1, 5)  # fixed, so that the same script writes the same bytes
ENGINE = 191029  # a calculation id of today: Excel keeps the stored values until an input changes

INK = "#2B2A33"
HEAD = "#5B3A5E"  # headings and rules
SAND, SAND_INK, SAND_RULE = "#FBF1DE", "#7A4B12", "#D3B27C"  # what the engineer types
MIST, MIST_INK, MIST_RULE = "#E9EFEA", "#23443A", "#B4C7BB"  # what is calculated
GRID = "#D9D5DB"
CURVES = ("#5B3A5E", "#C0762B", "#2F7D6B", "#8C8A2E", "#A8475A", "#4A6FA5")

_BOX = {"border": 1, "valign": "vcenter", "text_wrap": True, "indent": 1}
_NUMBER = {"align": "right", "text_wrap": False}
_INPUT = {**_BOX, "bg_color": SAND, "font_color": SAND_INK, "border_color": SAND_RULE, "locked": False}
_RESULT = {**_BOX, "bg_color": MIST, "font_color": MIST_INK, "border_color": MIST_RULE}
_HEAD = {**_BOX, "bold": True, "font_color": "#FFFFFF", "bg_color": HEAD, "border_color": HEAD}

STYLES: Mapping[str, Mapping[str, object]] = {
    "title": {"bold": True, "font_size": 16, "font_color": HEAD},
    "subtitle": {"italic": True, "font_color": INK},
    "heading": {"bold": True, "font_size": 12, "font_color": HEAD, "bottom": 2, "bottom_color": HEAD},
    "head": _HEAD,
    "head number": {**_HEAD, "align": "right"},
    "label": {**_BOX, "border_color": GRID},
    "unit": {**_BOX, "border_color": GRID, "font_color": "#6B6872"},
    "text": {"align": "left", "valign": "top", "text_wrap": True, "indent": 1, "font_color": INK},
    "input": {**_INPUT, **_NUMBER},
    "input text": {**_INPUT, "num_format": "@"},
    "law": {**_INPUT, "num_format": "@", "font_name": "Consolas", "font_size": 10},
    "link number": {**_BOX, **_NUMBER, "border_color": SAND_RULE, "font_color": INK},
    "link": {**_BOX, "border_color": SAND_RULE, "font_color": INK},
    "result": {**_RESULT, **_NUMBER, "num_format": "0.0000"},
    "result 2": {**_RESULT, **_NUMBER, "num_format": "0.00"},
    "level": {**_RESULT, "bold": True, "align": "center", "indent": 0},
    "result head": {**_RESULT, "bold": True, "align": "right"},
    "result text": {**_RESULT},
    "check": {
        **_BOX,
        "align": "right",
        "border_color": GRID,
        "font_color": "#6B6872",
        "num_format": "0.0E+00",
    },
}


@dataclass(frozen=True, slots=True)
class Area:
    """A rectangle of cells on a sheet, zero-based, ends included."""

    sheet: str
    top: int
    left: int
    bottom: int
    right: int

    @property
    def ref(self) -> str:
        """The address with its sheet, absolute, as formulas and charts take it."""
        return f"={self.qualified}"

    @property
    def qualified(self) -> str:
        """The same without the equals sign."""
        return f"{self.sheet}!{xl_range_abs(self.top, self.left, self.bottom, self.right)}"

    def cell(self, row: int, column: int) -> str:
        """The address of a cell of the area, counted from its corner."""
        corner = xl_rowcol_to_cell(self.top + row, self.left + column, row_abs=True, col_abs=True)
        return f"{self.sheet}!{corner}"

    def part(self, row: int, column: int, rows: int, columns: int) -> "Area":
        """A rectangle inside, counted from the area's corner."""
        top, left = self.top + row, self.left + column
        return Area(self.sheet, top, left, top + rows - 1, left + columns - 1)


@dataclass(frozen=True, slots=True)
class Look:
    """A workbook and the formats made in it, by the name of the style."""

    book: Workbook
    formats: dict[str, Format] = field(default_factory=dict)

    def __getitem__(self, style: str) -> Format:
        if style not in self.formats:
            self.formats[style] = self.book.add_format(dict(STYLES[style]))
        return self.formats[style]


def open_book(path: str, name: str, description: str) -> Look:
    """A new workbook; `description` is what `moletally new` lists."""
    book = Workbook(path)
    book.set_properties({"title": f"{name}: {description}", "author": "moletally", "created": BUILT})
    book.set_calc_mode("auto", ENGINE)
    book.calc_on_load = False  # a reader without the add-in keeps the stored values
    book.set_size(24000, 14000)
    return Look(book)


def page(
    sheet: Worksheet, widths: Sequence[float], area: str, *, landscape: bool = True, fixed: bool = True
) -> None:
    """Column widths and a print set-up on one A4 page; `fixed`: rows of one height."""
    if fixed:
        sheet.set_default_row(16.5)
    for column, width in enumerate(widths):
        sheet.set_column(column, column, width)
    sheet.hide_gridlines(2)
    sheet.set_paper(9)
    if landscape:
        sheet.set_landscape()
    sheet.set_margins(left=0.5, right=0.5, top=0.6, bottom=0.7)
    sheet.set_footer("&L&8&F  ·  &A&R&8printed &D")
    sheet.fit_to_pages(1, 1)
    sheet.center_horizontally()
    sheet.print_area(area)


def title(sheet: Worksheet, look: Look, text: str, below: str) -> None:
    """Title and one line below it, in the second column."""
    sheet.set_row(0, 24)
    sheet.write_string(0, 1, text, look["title"])
    sheet.write_string(1, 1, below, look["subtitle"])


def heading(sheet: Worksheet, look: Look, at: tuple[int, int], columns: int, text: str) -> None:
    """A section's name, ruled below over `columns` columns."""
    row, left = at
    for column in range(left, left + columns):
        sheet.write_blank(row, column, None, look["heading"])
    sheet.write_string(row, left, text, look["heading"])
