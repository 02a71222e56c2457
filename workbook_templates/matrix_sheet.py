"""A network written as one species-and-reaction table, in one tube and in three tanks in series."""

from workbook_templates.look import Area, Look, heading, open_book, page, title
from workbook_templates.parts import (
    Axis,
    audit_sheet,
    check,
    curves,
    grid,
    here,
    named_curves,
    not_below,
    notes_sheet,
    spill,
    verdict,
)
from xlsxwriter.worksheet import Worksheet

__all__ = ["DESCRIPTION", "NAME", "build"]

NAME = "Species-and-reaction table"
DESCRIPTION = (
    "four reactions as a matrix of coefficients, one reversible: three tanks in series against a tube"
)

STEPS = ("Join", "Split", "Grow", "Dimerise")
FEED = (
    ("Ald", 2.4, (-1, None, -1, -2)),
    ("Ket", 3.2, (-1, None, None, None)),
    ("Adduct", 0.0, (1, -1, None, None)),
    ("Enal", 0.0, (None, 1, -1, None)),
    ("Heavy", 0.0, (None, None, 1, None)),
    ("Dimer", 0.0, (None, None, None, 1)),
    ("Water", 1.1, (None, 1, 1, None)),
)
SPECIES = tuple(name for name, _, _ in FEED)
QUANTITIES = (
    ("Rate", (None, "k*Adduct", "k*Enal*Ald", "k*Ald^1.5")),
    ("k", (0.9, 1.7, 0.22, 0.045)),
    ("k unit", ("L/(mol h)", "1/h", "L/(mol h)", "L^0.5/(mol^0.5 h)")),
    ("Keq", (4.2, None, None, None)),
    ("Keq unit", ("L/mol", None, None, None)),
)
WANTS = (
    ("Conversion of Ald", "100*conversion(Ald)", "%"),
    ("Enal made per Ald fed", "100*yield(Enal, Ald)", "%"),
    ("Enal made per Heavy made", "selectivity(Enal, Heavy)", "mol/mol"),
    ("Enal made per Dimer made", "selectivity(Enal, Dimer)", "mol/mol"),
)
TANKS = 3
ABOUT = (
    "An aldehyde and a ketone join to an adduct, which splits off water; the enal so formed grows "
    "into a heavy product, and the aldehyde also dimerises. The enal is wanted.",
    "Invented data: species, rate constants and the equilibrium constant stand for no real substance. "
    "Put your own in.",
    "One table holds everything: species in rows, reactions in columns, an empty cell is a zero. From "
    "the row Rate on, rows are quantities of the reactions. An empty Rate is mass action of the "
    "negative coefficients; with a Keq it runs both ways.",
    "A tank after the first has a feed table as its second argument, which overrides the feed in the "
    "table: here it is the outlet of the tank before, chained by cells.",
    "Without the add-in the cells keep their last values; moletally recalc BOOK.xlsx calculates them "
    "without Excel.",
)
ASSUMPTIONS = (
    "Isothermal; the rate constants hold at the temperature of the vessels. Constant density.",
    "The residence time is a bare number in the time unit of the rate constants, hours here.",
    "The three tanks share the residence time of the tube equally.",
    "The dimerisation is of order 1.5 in the aldehyde, per mole of reaction as written: the aldehyde "
    "disappears at twice that rate.",
)


def build(path: str) -> None:
    """Write the book; its results are zeros until it is recalculated."""
    look = open_book(path, NAME, DESCRIPTION)
    design = look.book.add_worksheet("Design")
    profile = look.book.add_worksheet("Profile")
    page(design, (2, 13, 14, *(17,) * 4, 3, 25, 28, 10, 13, 13), "A1:M42")
    title(
        design,
        look,
        NAME,
        "Coefficients, feed and rate constants in one table: the first argument; the second stays empty",
    )
    matrix, time = write_inputs(design, look)
    last = write_series(design, look, matrix, time)
    write_results(design, look, matrix, time, last)
    points = write_profile(profile, look, matrix, time)
    chart = curves(
        look,
        points.part(1, 0, 51, 1),
        named_curves(points, (1, 3, 4, 5, 6)),
        (Axis("residence time along the tube [h]"), Axis("concentration [mol/L]")),
        "Along the tube",
    )
    chart.set_size({"width": 640, "height": 330})
    design.insert_chart(24, 8, chart, {"object_position": 2})
    design.freeze_panes(3, 0)
    audit_sheet(
        look,
        [
            ("First tank", f'=MOLE_AUDIT("CSTR", {matrix.qualified}, , {time}/{TANKS})'),
            ("Tube", f'=MOLE_AUDIT("PFR", {matrix.qualified}, , {time})'),
        ],
    )
    notes_sheet(look, ABOUT, ASSUMPTIONS)
    look.book.close()


def write_inputs(sheet: Worksheet, look: Look) -> tuple[Area, str]:
    """The table and the total residence time; answers the table and the cell of the time."""
    heading(sheet, look, (3, 1), 6, "Species and reactions")
    rows = [(name, fed, *steps) for name, fed, steps in FEED]
    matrix = grid(
        sheet,
        look,
        (4, 1),
        ("Species", "Feed [mol/L]", *STEPS),
        rows,
        ("input text", "input", *("input",) * 4),
    )
    row = matrix.bottom + 1
    for name, values in QUANTITIES:
        style = "law" if name == "Rate" else "input"
        grid(sheet, look, (row, 1), None, [(name, None, *values)], ("label", "label", *(style,) * 4))
        row += 1
    matrix = Area("Design", matrix.top, matrix.left, row - 1, matrix.right)
    heading(sheet, look, (row + 1, 1), 6, "Residence time")
    grid(sheet, look, (row + 2, 1), None, [("Total", 3.0, "h")], ("label", "input", "unit"))
    time = Area("Design", row + 2, 2, row + 2, 2)
    not_below(sheet, matrix.part(1, 1, len(FEED), 1), 0, "A feed concentration")
    not_below(sheet, time, 0, "The residence time")
    for name, cell in (
        ("Ald_feed", matrix.cell(1, 1)),
        ("Ket_feed", matrix.cell(2, 1)),
        ("Total_time", time.cell(0, 0)),
    ):
        look.book.define_name(name, f"={cell}")
    return matrix, time.cell(0, 0)


def write_series(sheet: Worksheet, look: Look, matrix: Area, time: str) -> Area:
    """Tanks in series: the outlet of each stands under the header of a feed table, the feed of the next."""
    top = 23
    heading(
        sheet, look, (top, 1), 6, "Three equal tanks in series: the outlet of one is the feed of the next"
    )
    feed = ""
    outlet = Area("Design", top + 2, 1, top + 2, 2)
    for tank in range(TANKS):
        left = 1 + 2 * tank
        sheet.merge_range(top + 1, left, top + 1, left + 1, f"Out of tank {tank + 1}", look["label"])
        names = [(f"={matrix.cell(1 + i, 0)}", None) for i in range(len(FEED))]
        table = grid(sheet, look, (top + 2, left), ("Species", "Feed [mol/L]"), names, ("link", "result"))
        formula = f"=MOLE_CSTR({matrix.qualified}, {feed}, {time}/{TANKS})"
        outlet = spill(sheet, look, (top + 3, left + 1), (len(FEED), 1), formula)
        feed = table.qualified
    return outlet


def write_results(sheet: Worksheet, look: Look, matrix: Area, time: str, last: Area) -> None:
    """Tanks in series against the tube, the balances and the verdict."""
    heading(sheet, look, (3, 8), 5, "Outlet")
    rows = [
        (f"={matrix.cell(1 + i, 0)}", "concentration", "mol/L", f"={last.cell(i, 0)}")
        for i in range(len(FEED))
    ]
    grid(
        sheet,
        look,
        (4, 8),
        ("Quantity", "Return", "Unit", "Three tanks", "Tube"),
        [(*row, None) for row in rows],
        ("label", "unit", "unit", "result", "result"),
    )
    tube = spill(sheet, look, (5, 12), (len(FEED), 1), f"=MOLE_PFR({matrix.qualified}, , {time})")
    top = 5 + len(FEED)
    wants = grid(sheet, look, (top, 8), None, WANTS, ("label", "law", "unit")).part(0, 1, len(WANTS), 1)
    spill(
        sheet, look, (top, 12), (len(WANTS), 1), f"=MOLE_PFR({matrix.qualified}, , {time}, {wants.qualified})"
    )
    fed = matrix.part(1, 1, len(FEED), 1)
    ald, enal = fed.cell(0, 0), fed.cell(3, 0)
    for row, formula in enumerate(
        (
            f"=100*({ald}-{last.cell(0, 0)})/{ald}",
            f"=100*({last.cell(3, 0)}-{enal})/{ald}",
            f"=({last.cell(3, 0)}-{enal})/({last.cell(4, 0)}-{fed.cell(4, 0)})",
            f"=({last.cell(3, 0)}-{enal})/({last.cell(5, 0)}-{fed.cell(5, 0)})",
        )
    ):
        sheet.write_formula(top + row, 11, here(sheet, formula), look["result"])
    heading(sheet, look, (17, 8), 5, "Do the balances close? (deviation, share of the feed)")
    for row, (what, weights) in enumerate(
        (("Ald units", "{1;0;1;1;2;2;0}"), ("Ket units", "{0;1;1;1;1;0;0}"))
    ):
        check(
            sheet,
            look,
            (18 + row, 8),
            what,
            [
                f"=SUMPRODUCT({out.qualified},{weights})/SUMPRODUCT({fed.qualified},{weights})-1"
                for out in (last, tube)
            ],
        )
    heading(sheet, look, (21, 8), 5, "Verdict")
    verdict(sheet, look, (22, 8), "Tube", f'MOLE_AUDIT("PFR", {matrix.qualified}, , {time})', 3)


def write_profile(sheet: Worksheet, look: Look, matrix: Area, time: str) -> Area:
    """The tube from inlet to outlet; the chart of the design sheet stands on this range."""
    page(sheet, (2, *(13,) * 8), "A1:I56", landscape=False)
    title(
        sheet,
        look,
        "Profile",
        "From inlet to outlet of the tube; the chart on the design sheet follows these cells",
    )
    area = spill(
        sheet,
        look,
        (3, 1),
        (52, 1 + len(FEED)),
        f"=MOLE_PROFILE({matrix.qualified}, , {time}, 51)",
        head="result head",
    )
    sheet.freeze_panes(4, 2)
    return area
