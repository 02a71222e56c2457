"""A tube packed with an acid resin whose sites are shared: Langmuir-Hinshelwood rate laws."""

from dataclasses import dataclass

from workbook_templates.look import CURVES, Area, Look, heading, open_book, page, title
from workbook_templates.parts import (
    Axis,
    Curve,
    audit_sheet,
    check,
    curves,
    grid,
    named_curves,
    not_below,
    notes_sheet,
    spill,
    verdict,
)
from xlsxwriter.worksheet import Worksheet

__all__ = ["DESCRIPTION", "NAME", "build"]

NAME = "Tube with adsorbing species"
DESCRIPTION = "Langmuir-Hinshelwood rates with a constants table: profile, rates at the inlet, temperatures"

REACTIONS = (
    (
        "Carbinol -> Olefin + Water",
        0.21,
        "mol/(L min)",
        88.0,
        95.0,
        "k*K_C*Carbinol/(1 + K_C*Carbinol + K_W*Water)",
    ),
    (
        "Carbinol + Olefin -> Ether",
        0.062,
        "1/min",
        71.0,
        95.0,
        "k*K_C*Carbinol*Olefin/(1 + K_C*Carbinol + K_W*Water)^2",
    ),
)
CONSTANTS = (("K_C", 0.74, "L/mol", -29.0, 95.0), ("K_W", 3.1, "L/mol", -42.0, 95.0))
FEED = (("Carbinol", 2.6), ("Olefin", 0.0), ("Ether", 0.0), ("Water", 0.08), ("Solvent", 6.1))
SPECIES = tuple(name for name, _ in FEED)
ROOM = 6
WANTS = (
    ("Residence time in the bed", "tau [min]", "min"),
    ("Conversion of carbinol", "100*conversion(Carbinol)", "%"),
    ("Olefin made per carbinol fed", "100*yield(Olefin, Carbinol)", "%"),
    ("Olefin made per ether made", "selectivity(Olefin, Ether)", "mol/mol"),
    ("Water in the outlet", "100*x(Water)", "mol %"),
    ("Olefin made", "flow(Olefin) [mol/min]", "mol/min"),
)
TEMPERATURES = (80, 85, 90, 95, 100, 105, 110, 115, 120)
SWEPT = ("100*conversion(Carbinol)", "100*yield(Olefin, Carbinol)", "selectivity(Olefin, Ether)")
SHOWN = ("Carbinol converted, %", "Olefin, % of carbinol", "Olefin per ether")
ABOUT = (
    "A carbinol loses water over an acid resin and adds to the olefin it has formed. Carbinol and "
    "water occupy the same sites; the water made slows both reactions along the bed.",
    "Invented data: species, rate constants, energies and adsorption constants stand for no real "
    "substance. Put your own in.",
    "The constants K_C and K_W are shared by both rate laws and stand in a table of their own, the "
    "last argument of the functions.",
    "Without the add-in the cells keep their last values; moletally recalc BOOK.xlsx calculates them "
    "without Excel.",
)
ASSUMPTIONS = (
    "Isothermal liquid of constant density, in plug flow; no pressure drop.",
    "Rates are per litre of packed bed, and the volume is that of the bed, so the residence time is "
    "bed volume over flow.",
    "Rate constants follow k(T) = k exp(-E/R (1/T - 1/T ref)); adsorption constants follow the same "
    "form with their heat of adsorption dH, which is negative: they fall as the bed gets warmer.",
    "Intrinsic kinetics: no resistance in the film or in the pores of the resin, no loss of activity.",
)


@dataclass(frozen=True, slots=True)
class Inputs:
    """Where the tables of the design sheet stand."""

    reactions: Area
    constants: Area
    feed: Area
    tube: Area

    def call(self, *between: str) -> str:
        """The arguments of a call, with `between` standing between the tube and the constants."""
        tables = (self.reactions, self.feed, self.tube)
        return ", ".join([*(t.qualified for t in tables), *between, self.constants.qualified])


def build(path: str) -> None:
    """Write the book; its results are zeros until it is recalculated."""
    look = open_book(path, NAME, DESCRIPTION)
    design = look.book.add_worksheet("Design")
    profile = look.book.add_worksheet("Profile")
    page(design, (2, 30, 14, 15, 12, 13, 62, 2, 29, 37, 10, 12), "A1:L41")
    title(
        design, look, NAME, "Carbinol to olefin over an acid resin: water and carbinol compete for the sites"
    )
    inputs = write_inputs(design, look)
    write_results(design, look, inputs)
    write_rates(design, look, inputs)
    points = write_profile(profile, look, inputs)
    chart = curves(
        look,
        points.part(1, 0, 51, 1),
        named_curves(points, range(2, 6)),
        (Axis("residence time in the bed [min]"), Axis("concentration [mol/L]")),
        "Along the tube",
    )
    chart.set_size({"width": 1030, "height": 400})
    design.insert_chart(23, 1, chart, {"object_position": 2})
    design.freeze_panes(3, 0)
    write_temperatures(look.book.add_worksheet("Temperatures"), look, inputs)
    audit_sheet(look, [("Tube", f'=MOLE_AUDIT("PFR", {inputs.call("")})')])
    notes_sheet(look, ABOUT, ASSUMPTIONS)
    look.book.close()


def write_inputs(sheet: Worksheet, look: Look) -> Inputs:
    """Reactions, constants, feed and tube, with names for what is changed most."""
    heading(sheet, look, (3, 1), 6, "Reactions")
    head = ("Reaction", "k", "k unit", "E [kJ/mol]", "T ref [degC]", "Rate")
    styles = ("law", "input", "input text", "input", "input", "law")
    reactions = grid(sheet, look, (4, 1), head, [*REACTIONS, (None,) * 6], styles)
    heading(sheet, look, (9, 1), 2, "Feed")
    rows = [*FEED, *[(None, None)] * (ROOM - len(FEED))]
    feed = grid(sheet, look, (10, 1), ("Species", "Feed [mol/L]"), rows, ("input text", "input"))
    heading(sheet, look, (9, 3), 3, "Tube")
    tube = grid(
        sheet,
        look,
        (10, 3),
        ("Label", "Value", "Unit"),
        [("Volume", 95.0, "L"), ("Flow", 3.8, "L/min"), ("Temperature", 100.0, "degC")],
        ("label", "input", "unit"),
    )
    heading(sheet, look, (18, 1), 5, "Constants of the sites")
    constants = grid(
        sheet,
        look,
        (19, 1),
        ("Name", "Value", "Unit", "dH [kJ/mol]", "T ref [degC]"),
        CONSTANTS,
        ("law", "input", "input text", "input", "input"),
    )
    not_below(sheet, reactions.part(1, 1, 3, 1), 0, "The rate constant k")
    not_below(sheet, feed.part(1, 1, ROOM, 1), 0, "A feed concentration")
    not_below(sheet, constants.part(1, 1, 2, 1), 0, "An adsorption constant")
    not_below(sheet, tube.part(1, 1, 1, 1), 0, "The volume of the bed")
    not_below(sheet, tube.part(2, 1, 1, 1), 0, "The flow", equal=False)
    not_below(sheet, tube.part(3, 1, 1, 1), -273.15, "The temperature", equal=False)
    for name, cell in (
        ("Carbinol_feed", feed.cell(1, 1)),
        ("Water_feed", feed.cell(4, 1)),
        ("Bed_volume", tube.cell(1, 1)),
        ("Feed_flow", tube.cell(2, 1)),
        ("Bed_temperature", tube.cell(3, 1)),
    ):
        look.book.define_name(name, f"={cell}")
    return Inputs(reactions, constants, feed, tube)


def write_results(sheet: Worksheet, look: Look, inputs: Inputs) -> None:
    """The outlet, what it means, the balances and the verdict."""
    heading(sheet, look, (3, 8), 4, "Outlet of the tube")
    names = [f'={inputs.feed.cell(1 + i, 0)}&""' for i in range(ROOM)]
    grid(
        sheet,
        look,
        (4, 8),
        ("Quantity", "Return", "Unit", "Tube"),
        [(name, "concentration", "mol/L", None) for name in names],
        ("label", "unit", "unit", "result"),
    )
    out = spill(sheet, look, (5, 11), (len(SPECIES), 1), f"=MOLE_PFR({inputs.call('')})")
    top = 5 + ROOM
    wants = grid(sheet, look, (top, 8), None, WANTS, ("label", "law", "unit")).part(0, 1, len(WANTS), 1)
    spill(sheet, look, (top, 11), (len(WANTS), 1), f"=MOLE_PFR({inputs.call(wants.qualified)})")
    heading(sheet, look, (18, 8), 4, "Do the balances close? (deviation, share of the feed)")
    fed = inputs.feed
    check(
        sheet,
        look,
        (19, 8),
        "Carbon skeletons",
        [
            f"=({out.cell(0, 0)}+{out.cell(1, 0)}+2*{out.cell(2, 0)})/"
            f"({fed.cell(1, 1)}+{fed.cell(2, 1)}+2*{fed.cell(3, 1)})-1"
        ],
    )
    check(
        sheet,
        look,
        (20, 8),
        "Oxygen",
        [
            f"=({out.cell(0, 0)}+{out.cell(2, 0)}+{out.cell(3, 0)})/"
            f"({fed.cell(1, 1)}+{fed.cell(3, 1)}+{fed.cell(4, 1)})-1"
        ],
    )
    heading(sheet, look, (22, 8), 4, "Verdict")
    verdict(sheet, look, (23, 8), "Tube", f'MOLE_AUDIT("PFR", {inputs.call("")})', 2)


def write_rates(sheet: Worksheet, look: Look, inputs: Inputs) -> None:
    """How fast the reactions are where the feed enters."""
    heading(sheet, look, (26, 8), 4, "Rates at the inlet")
    spill(
        sheet,
        look,
        (27, 8),
        (3 + len(SPECIES), 2),
        f"=MOLE_RATES({inputs.call()})",
        head="result head",
        names="result text",
    )


def write_profile(sheet: Worksheet, look: Look, inputs: Inputs) -> Area:
    """The tube from inlet to outlet; the chart of the design sheet stands on this range."""
    page(sheet, (2, *(13,) * 7), "A1:H56", landscape=False)
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
        (52, 2 + len(SPECIES)),
        f"=MOLE_PROFILE({inputs.call('51', '')})",
        head="result head",
    )
    sheet.freeze_panes(4, 2)
    return area


def write_temperatures(sheet: Worksheet, look: Look, inputs: Inputs) -> None:
    """The same tube over a column of temperatures: constants and adsorption both shift."""
    page(sheet, (2, 18, 11, 9, *(30,) * 3), f"A1:G{34 + len(TEMPERATURES)}", landscape=False)
    title(sheet, look, "Sweep over temperature", "Feed, volume and flow as on the design sheet")
    rows = [
        (label, f"={inputs.tube.cell(i, 1)}", unit)
        for i, label, unit in ((1, "Volume", "L"), (2, "Flow", "L/min"))
    ]
    grid(sheet, look, (3, 1), None, rows, ("label", "input", "unit"))
    count = len(TEMPERATURES)
    top = 6
    cases = grid(sheet, look, (top, 1), ("Temperature [degC]",), [(t,) for t in TEMPERATURES], ("input",))
    not_below(sheet, cases.part(1, 0, count, 1), -273.15, "A temperature", equal=False)
    block = Area("Temperatures", 3, 1, cases.bottom, 3)
    grid(sheet, look, (top - 1, 4), None, [SHOWN], ("label",) * 3)
    want = grid(sheet, look, (top, 4), None, [SWEPT], ("law",) * 3)
    tables = f"{inputs.reactions.qualified}, {inputs.feed.qualified}, {block.qualified}, {want.qualified}"
    out = spill(
        sheet,
        look,
        (top + 1, 4),
        (count, 3),
        f"=MOLE_PFR({tables}, {inputs.constants.qualified})",
        "result 2",
    )
    sheet.set_row(top, 32)
    sheet.freeze_panes(top + 1, 2)
    lines = [Curve(SHOWN[i], out.part(0, i, count, 1), CURVES[i]) for i in range(2)]
    chart = curves(
        look,
        cases.part(1, 0, count, 1),
        lines,
        (Axis("temperature [°C]", least=None), Axis("share of the carbinol fed [%]", most=100)),
        "Effect of temperature",
    )
    chart.set_size({"width": 900, "height": 400})
    sheet.insert_chart(cases.bottom + 2, 1, chart, {"object_position": 2})
