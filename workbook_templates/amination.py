"""A stepwise amination: three steps that use up the same oxide, in a tank and in a tube."""

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

NAME = "Stepwise amination"
DESCRIPTION = "three steps that use up the same oxide, one of order 0.5: tank against tube, profile, sweep"

REACTIONS = (
    ("Amine + Oxide -> Mono", "k*Amine*Oxide", 0.026, "L/(mol min)", 52.0, 70.0),
    ("Mono + Oxide -> Di", "k*Mono*Oxide", 0.011, "L/(mol min)", 57.5, 70.0),
    ("Di + Oxide -> Tri", "k*Di*Oxide^0.5", 0.0065, "L^0.5/(mol^0.5 min)", 63.0, 70.0),
)
FEED = (("Amine", 4.4), ("Oxide", 3.5), ("Mono", 0.0), ("Di", 0.0), ("Tri", 0.0))
ROOM = 7  # rows of the feed table, the spare ones included
SPECIES = tuple(name for name, _ in FEED)
WANTS = (
    ("Residence time", "tau [min]", "min"),
    ("Conversion of oxide", "100*conversion(Oxide)", "%"),
    ("Conversion of amine", "100*conversion(Amine)", "%"),
    ("Mono per di", "Mono/Di", "mol/mol"),
    ("Di per tri", "Di/Tri", "mol/mol"),
    ("Mono made per amine fed", "100*yield(Mono, Amine)", "%"),
    ("Mono made", "flow(Mono) [kmol/h]", "kmol/h"),
)
SWEEP = (5, 10, 15, 20, 30, 40, 50, 60, 80, 100, 120, 150, 180, 240, 300)
SWEPT = (
    "100 * yield(Mono, Amine)",
    "100 * yield(Di, Amine)",
    "100 * yield(Tri, Amine)",
    "100 * conversion(Oxide)",
)
SHOWN = ("Mono, % of amine", "Di, % of amine", "Tri, % of amine", "Oxide converted, %")
ABOUT = (
    "An amine takes up one, two and three molecules of an oxide. The first product is wanted, the "
    "others are not; the sheet shows how the choice of vessel and residence time decides the ratios.",
    "Invented data: species, rate constants and energies stand for no real substance. Put your own in.",
    "The tables of the sheet Design are the arguments of the functions. Reactions and feed have empty "
    "rows to spare at their ends; fill them and the formulas use them.",
    "Without the add-in the cells keep their last values; moletally recalc BOOK.xlsx calculates them "
    "without Excel.",
)
ASSUMPTIONS = (
    "Isothermal, at the temperature of the vessel; constant density (dilution by the oxide is neglected).",
    "Each rate constant follows k(T) = k exp(-E/R (1/T - 1/T ref)).",
    "Rates are moles of reaction per litre of liquid and minute; the third step is of order 0.5 in "
    "the oxide.",
    "Tank and tube have the same volume and flow; the tank is well mixed, the tube is in plug flow.",
)


@dataclass(frozen=True, slots=True)
class Inputs:
    """Where the tables of the design sheet stand."""

    reactions: Area
    feed: Area
    vessel: Area

    @property
    def call(self) -> str:
        """The three tables as they stand in a formula on the design sheet or elsewhere."""
        return f"{self.reactions.qualified}, {self.feed.qualified}, {self.vessel.qualified}"


def build(path: str) -> None:
    """Write the book; its results are zeros until it is recalculated."""
    look = open_book(path, NAME, DESCRIPTION)
    design = look.book.add_worksheet("Design")
    profile = look.book.add_worksheet("Profile")
    sweep = look.book.add_worksheet("Sweep")
    page(design, (2, 27, 18, 10, 22, 12, 13, 2, 25, 26, 11, 12, 12, 13), "A1:N40")
    title(
        design,
        look,
        NAME,
        "One oxide, three steps: what a stirred tank and a tube of the same volume make of it",
    )
    inputs = write_inputs(design, look)
    write_results(design, look, inputs)
    points = write_profile(profile, look, inputs)
    chart = curves(
        look,
        points.part(1, 0, 51, 1),
        named_curves(points, range(2, 2 + len(SPECIES))),
        (Axis("residence time along the tube [min]"), Axis("concentration [mol/L]")),
        "Along the tube",
    )
    chart.set_size({"width": 730, "height": 380})
    design.insert_chart(20, 1, chart, {"object_position": 2})
    design.freeze_panes(3, 0)
    write_sweep(sweep, look, inputs)
    audit_sheet(
        look,
        [("Tank", f'=MOLE_AUDIT("CSTR", {inputs.call})'), ("Tube", f'=MOLE_AUDIT("PFR", {inputs.call})')],
    )
    notes_sheet(look, ABOUT, ASSUMPTIONS)
    look.book.close()


def write_inputs(sheet: Worksheet, look: Look) -> Inputs:
    """Reactions, feed and vessel, with names for what is changed most and a few rows to spare."""
    heading(sheet, look, (3, 1), 6, "Reactions")
    styles = ("law", "law", "input", "input text", "input", "input")
    head = ("Reaction", "Rate", "k", "k unit", "E [kJ/mol]", "T ref [degC]")
    reactions = grid(sheet, look, (4, 1), head, [*REACTIONS, (None,) * 6], styles)
    heading(sheet, look, (10, 1), 2, "Feed")
    rows = [*FEED, *[(None, None)] * (ROOM - len(FEED))]
    feed = grid(sheet, look, (11, 1), ("Species", "Feed [mol/L]"), rows, ("input text", "input"))
    heading(sheet, look, (10, 4), 3, "Vessel (tank and tube alike)")
    labels = (("Volume", 1.2, "m^3"), ("Flow", 20.0, "L/min"), ("Temperature", 70.0, "degC"))
    vessel = grid(sheet, look, (11, 4), ("Label", "Value", "Unit"), labels, ("label", "input", "unit"))
    not_below(sheet, reactions.part(1, 2, 4, 1), 0, "The rate constant k")
    not_below(sheet, feed.part(1, 1, ROOM, 1), 0, "A feed concentration")
    not_below(sheet, vessel.part(1, 1, 1, 1), 0, "The volume")
    not_below(sheet, vessel.part(2, 1, 1, 1), 0, "The flow", equal=False)
    not_below(sheet, vessel.part(3, 1, 1, 1), -273.15, "The temperature", equal=False)
    for name, cell in (
        ("Amine_feed", feed.cell(1, 1)),
        ("Oxide_feed", feed.cell(2, 1)),
        ("Feed_flow", vessel.cell(2, 1)),
        ("Vessel_volume", vessel.cell(1, 1)),
        ("Vessel_temperature", vessel.cell(3, 1)),
    ):
        look.book.define_name(name, f"={cell}")
    return Inputs(reactions, feed, vessel)


def write_results(sheet: Worksheet, look: Look, inputs: Inputs) -> None:
    """Outlets, ratios, balances and verdicts of tank and tube, side by side."""
    heading(sheet, look, (3, 8), 6, "Outlet")
    fed = inputs.feed
    names = [f'={fed.cell(1 + i, 0)}&""' for i in range(ROOM)]
    grid(
        sheet,
        look,
        (4, 8),
        ("Quantity", "Return", "Unit", "Tank", "Tube", "Tube/tank"),
        [(name, "concentration", "mol/L", None, None, None) for name in names],
        ("label", "unit", "unit", "result", "result", "result"),
    )
    tank = spill(sheet, look, (5, 11), (len(SPECIES), 1), f"=MOLE_CSTR({inputs.call})")
    tube = spill(sheet, look, (5, 12), (len(SPECIES), 1), f"=MOLE_PFR({inputs.call})")
    top = 5 + ROOM
    wants = grid(sheet, look, (top, 8), None, WANTS, ("label", "law", "unit")).part(0, 1, len(WANTS), 1)
    for column, name in ((11, "MOLE_CSTR"), (12, "MOLE_PFR")):
        spill(sheet, look, (top, column), (len(WANTS), 1), f"={name}({inputs.call}, {wants.qualified})")
    for row in range(6, top + len(WANTS) + 1):
        sheet.write_formula(row - 1, 13, f'=IF(N(L{row})=0,"",M{row}/L{row})', look["result 2"])
    heading(sheet, look, (20, 8), 6, "Do the balances close? (deviation, share of the feed)")
    check(
        sheet,
        look,
        (21, 8),
        "Amine groups",
        [f"=({a.cell(0, 0)}+SUM({a.part(2, 0, 3, 1).qualified}))/{fed.cell(1, 1)}-1" for a in (tank, tube)],
    )
    check(
        sheet,
        look,
        (22, 8),
        "Oxide groups",
        [
            f"=({a.cell(1, 0)}+SUMPRODUCT({a.part(2, 0, 3, 1).qualified},{{1;2;3}}))/{fed.cell(2, 1)}-1"
            for a in (tank, tube)
        ],
    )
    heading(sheet, look, (24, 8), 6, "Verdict")
    verdict(sheet, look, (25, 8), "Tank", f'MOLE_AUDIT("CSTR", {inputs.call})', 4)
    verdict(sheet, look, (26, 8), "Tube", f'MOLE_AUDIT("PFR", {inputs.call})', 4)


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
        sheet, look, (3, 1), (52, 2 + len(SPECIES)), f"=MOLE_PROFILE({inputs.call}, 51)", head="result head"
    )
    sheet.freeze_panes(4, 2)
    return area


def write_sweep(sheet: Worksheet, look: Look, inputs: Inputs) -> None:
    """Both vessels over a column of residence times, at the temperature of the design sheet."""
    page(sheet, (2, 16, 10, 8, *(17,) * 8), f"A1:L{30 + len(SWEEP)}", landscape=False)
    title(sheet, look, "Sweep over residence time", "Feed, flow and temperature as on the design sheet")
    grid(
        sheet,
        look,
        (3, 1),
        None,
        [("Temperature", f"={inputs.vessel.cell(3, 1)}", "degC")],
        ("label", "input", "unit"),
    )
    last = 5 + len(SWEEP)
    times = grid(sheet, look, (5, 1), ("Residence time [min]",), [(t,) for t in SWEEP], ("input",))
    not_below(sheet, times.part(1, 0, len(SWEEP), 1), 0, "A residence time")
    cases = Area("Sweep", 3, 1, last, 3)
    wants = [Area("Sweep", 5, left, 5, left + 3) for left in (4, 8)]
    results = []
    for want, name, function in zip(wants, ("Tank", "Tube"), ("MOLE_CSTR", "MOLE_PFR"), strict=True):
        sheet.merge_range(3, want.left, 3, want.right, name, look["head"])
        grid(sheet, look, (4, want.left), None, [SHOWN], ("label",) * 4)
        grid(sheet, look, (5, want.left), None, [SWEPT], ("law",) * 4)
        tables = (inputs.reactions, inputs.feed, cases, want)
        formula = f"={function}({', '.join(t.qualified for t in tables)})"
        results.append(spill(sheet, look, (6, want.left), (len(SWEEP), 4), formula, "result 2"))
    sheet.set_row(4, 32)
    sheet.set_row(5, 45)
    sheet.freeze_panes(6, 2)
    count = len(SWEEP)
    lines = [
        Curve(f"{name}: {what}", area.part(0, i, count, 1), CURVES[i], dashed=name == "Tube")
        for name, area in zip(("Tank", "Tube"), results, strict=True)
        for i, what in enumerate(("mono", "di", "tri"))
    ]
    chart = curves(
        look,
        times.part(1, 0, count, 1),
        lines,
        (Axis("residence time [min]"), Axis("made per amine fed [%]")),
        "Tank and tube",
    )
    chart.set_size({"width": 1230, "height": 480})
    sheet.insert_chart(last + 2, 1, chart, {"object_position": 2})
