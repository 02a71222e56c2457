"""The parts that every template has: tables, result blocks, verdicts, notes, audit and charts."""

from collections.abc import Sequence
from dataclasses import dataclass

from workbook_templates.look import CURVES, GRID, INK, Area, Look, heading, page, title
from xlsxwriter.chart import Chart
from xlsxwriter.utility import xl_rowcol_to_cell
from xlsxwriter.worksheet import Worksheet

__all__ = [
    "Axis", "Curve", "audit_sheet", "check", "curves", "grid", "here", "named_curves", "not_below", "notes_sheet",
    "spill", "verdict",
]  # fmt: skip

Value = str | float | None

CAUTIONS = (
    "The answers are steady mole balances of ideal vessels: perfect mixing in the tank, plug flow in the "
    "tube. Poor mixing, bypassing, dispersion, mass transfer and film resistances are not in them.",
    "Temperature is given, not calculated: nothing here says whether the heat can be removed, whether a "
    "reaction can run away, or what pressure can be reached.",
    "Nothing here sizes relief devices, vents or other safeguards, and nothing here replaces a hazard "
    "study. For these follow the local codes and ask a licensed engineer.",
    "Check the rate laws outside the range in which they were measured before you rely on them.",
)

NUMBERS = ("input", "result", "result 2")  # styles of columns of numbers
LEVELS = (("stop", "#F3C9C6", "#7A1F1A"), ("doubt", "#F7E2B5", "#6B4A00"), ("fine", "#CFE6D6", "#1E4D35"))
LINKS = {"input": "link number", "input text": "link"}  # a formula in a table of inputs is no input
NOTE_LINE = 104  # characters in a line of the notes; not every reader fits the heights itself
LEGEND = (
    ("input", "4.2", "an input: type over it"),
    ("law", "k*A*B", "an input in words: a rate law, or what to return"),
    ("link number", "4.2", "taken from another cell: change it there"),
    ("result", "3.1416", "a result: calculated, don't type here"),
    ("check", "1.0E-12", "a balance that has to close: near zero is right"),
)


@dataclass(frozen=True, slots=True)
class Axis:
    """An axis of a chart: its title with the unit, and an optional upper end."""

    text: str
    least: float | None = 0
    most: float | None = None

    def options(self) -> dict[str, object]:
        """As the chart takes them."""
        rule = {"color": GRID, "width": 0.75}
        return {
            "name": self.text,
            "min": self.least,
            "max": self.most,
            "name_font": {"bold": False, "size": 10, "color": INK},
            "num_font": {"size": 9, "color": INK},
            "line": {"color": INK},
            "major_gridlines": {"visible": True, "line": rule},
        }


@dataclass(frozen=True, slots=True)
class Curve:
    """A line of a chart; `name` is a text or, after `=`, the cell that holds it."""

    name: str
    values: Area
    colour: str
    dashed: bool = False


def grid(
    sheet: Worksheet, look: Look, at: tuple[int, int], head: Sequence[str] | None,
    rows: Sequence[Sequence[Value]], styles: Sequence[str],
) -> Area:  # fmt: skip
    """Write a table and say where it stands.

    styles : a style per column; text that starts with `=` is written as a formula in the style "link"
    """
    top, left = at
    row = top
    if head is not None:
        for column, text in enumerate(head):
            style = "head number" if styles[column] in NUMBERS else "head"
            sheet.write_string(row, left + column, text, look[style])
        row += 1
    for values in rows:
        for column, value in enumerate(values):
            _put(sheet, look, (row, left + column), value, styles[column])
        row += 1
    width = len(head or rows[0])
    return Area(sheet.get_name(), top, left, row - 1, left + width - 1)


def _put(sheet: Worksheet, look: Look, at: tuple[int, int], value: Value, style: str) -> None:
    if value is None:
        sheet.write_blank(*at, None, look[style])
    elif isinstance(value, str) and value.startswith("="):
        sheet.write_formula(*at, here(sheet, value), look[LINKS.get(style, style)])
    elif isinstance(value, str):
        sheet.write_string(*at, value, look[style])
    else:
        sheet.write_number(*at, value, look[style])


def here(sheet: Worksheet, formula: str) -> str:
    """A formula as it is typed on this sheet: its own cells without the sheet's name."""
    return formula.replace(f"{sheet.get_name()}!", "")


def spill(
    sheet: Worksheet, look: Look, at: tuple[int, int], shape: tuple[int, int], formula: str,
    style: str = "result", *, head: str = "", names: str = "",
) -> Area:  # fmt: skip
    """A formula whose result fills `shape` cells from `at`; the values come from the recalculation.

    head, names : styles of the result's first row and first column where they differ from `style`
    """
    (top, left), (rows, columns) = at, shape
    area = Area(sheet.get_name(), top, left, top + rows - 1, left + columns - 1)
    sheet.write_dynamic_array_formula(
        top, left, area.bottom, area.right, formula, look[names or head or style]
    )
    for row in range(rows):
        for column in range(columns):
            if row or column:  # a number for now, so that the cell is one of the result's
                kind = (names if column == 0 else "") or (head if row == 0 else "") or style
                sheet.write_number(top + row, left + column, 0, look[kind])
    return area


def check(
    sheet: Worksheet, look: Look, at: tuple[int, int], text: str, formulas: Sequence[str], columns: int = 3
) -> None:
    """A balance that has to close: what it is over `columns` cells, then the deviation of each vessel."""
    row, left = at
    sheet.merge_range(row, left, row, left + columns - 1, text, look["label"])
    for column, formula in enumerate(formulas, left + columns):
        sheet.write_formula(row, column, here(sheet, formula), look["check"])


def verdict(sheet: Worksheet, look: Look, at: tuple[int, int], text: str, call: str, columns: int) -> None:
    """The first row of an audit: the vessel, what was found over `columns` cells, and the level."""
    row, left = at
    last = left + columns + 1
    call = here(sheet, call)
    sheet.set_row(row, 33)
    sheet.write_string(row, left, text, look["label"])
    sheet.merge_range(row, left + 1, row, last - 1, "", look["result text"])
    sheet.write_formula(row, left + 1, f"=INDEX({call},1,3)", look["result text"])
    sheet.write_formula(row, last, f"=INDEX({call},1,1)", look["level"])
    cell = xl_rowcol_to_cell(row, last)
    for level, fill, ink in LEVELS:
        style = look.book.add_format({"bg_color": fill, "font_color": ink})
        rule = {"type": "formula", "criteria": f'={cell}="{level}"', "format": style}
        sheet.conditional_format(row, last, row, last, rule)


def not_below(sheet: Worksheet, area: Area, least: float, what: str, *, equal: bool = True) -> None:
    """Refuse typing errors where they happen: a number, `least` or more (or more than `least`)."""
    wanted = f"a number, {least:g} or more" if equal else f"a number above {least:g}"
    sheet.data_validation(
        area.top, area.left, area.bottom, area.right,
        {
            "validate": "decimal", "criteria": ">=" if equal else ">", "value": least,
            "input_title": what[:32], "input_message": f"{wanted[0].upper()}{wanted[1:]}.",
            "error_title": "Not used", "error_message": f"{what} has to be {wanted}.",
        },
    )  # fmt: skip


def curves(look: Look, x: Area, lines: Sequence[Curve], axes: tuple[Axis, Axis], name: str) -> Chart:
    """A line chart on ranges of the book, so that it follows them."""
    chart = look.book.add_chart({"type": "scatter", "subtype": "smooth"})
    for curve in lines:
        chart.add_series({
            "name": curve.name, "categories": x.ref, "values": curve.values.ref,
            "line": {"color": curve.colour, "width": 2, "dash_type": "dash" if curve.dashed else "solid"},
        })  # fmt: skip
    chart.set_title({"name": name, "name_font": {"size": 12, "bold": True, "color": INK}, "overlay": False})
    chart.set_x_axis(axes[0].options())
    chart.set_y_axis(axes[1].options())
    chart.set_legend({"position": "bottom", "font": {"size": 9, "color": INK}})
    chart.set_chartarea({"border": {"color": GRID}})
    return chart


def named_curves(points: Area, columns: Sequence[int]) -> list[Curve]:
    """A curve per column of a range whose first row holds the names."""
    count = points.bottom - points.top
    return [
        Curve(points.part(0, column, 1, 1).ref, points.part(1, column, count, 1), colour)
        for column, colour in zip(columns, CURVES, strict=False)
    ]


def audit_sheet(look: Look, calls: Sequence[tuple[str, str]], rows: int = 16) -> None:
    """Everything that was read, assumed and checked in a call of each vessel; `calls` = (what, formula)."""
    sheet = look.book.add_worksheet("Audit")
    height = rows + 3
    page(sheet, (2, 9, 30, 110), f"A1:D{3 + height * len(calls)}", fixed=False)
    title(sheet, look, "Audit", "What was read, assumed and checked. The first row of a list is its verdict.")
    for number, (what, formula) in enumerate(calls):
        top = 3 + height * number
        heading(sheet, look, (top, 1), 3, what)
        for column, text in enumerate(("level", "where", "what, and what to do"), 1):
            sheet.write_string(top + 1, column, text, look["head"])
            for row in range(top + 2, top + 2 + rows):  # room for the list to grow in its style
                sheet.write_blank(row, column, None, look["text"])
        spill(sheet, look, (top + 2, 1), (1, 3), formula, "text")
    sheet.freeze_panes(3, 0)


def notes_sheet(look: Look, about: Sequence[str], assumptions: Sequence[str]) -> None:
    """What the book is for, its assumptions, its cautions, and a legend of the styles."""
    sheet = look.book.add_worksheet("Notes")
    page(sheet, (2, 20, 92), "A1:C32", landscape=False, fixed=False)
    title(sheet, look, "Notes", "Read these before you use the numbers.")
    row = 3
    for name, lines in (("About this book", about), ("Assumptions", assumptions), ("Cautions", CAUTIONS)):
        heading(sheet, look, (row, 1), 2, name)
        for line in lines:
            row += 1
            sheet.write_string(row, 2, line, look["text"])
            sheet.set_row(row, 15.5 * (1 + len(line) // NOTE_LINE) + 2)
        row += 2
    heading(sheet, look, (row, 1), 2, "Legend")
    for style, sample, text in LEGEND:
        row += 1
        sheet.write_string(row, 1, sample, look[style])
        sheet.write_string(row, 2, text, look["text"])
