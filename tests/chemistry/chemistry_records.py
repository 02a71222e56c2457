"""Tables written as Python values, for tests that need no sheet: a number is (value, unit)."""

from moletally.chemistry.equations import parse_equation
from moletally.chemistry.errors import Place
from moletally.chemistry.network import build_network
from moletally.chemistry.tables import (
    ConstantRow,
    FeedTable,
    Number,
    Quantity,
    ReactionRow,
    ReactionTable,
    SpeciesRow,
    Stream,
)

FEED_UNITS = ("mol/L",)


class Tables:
    """Reactions and constants with the numbers that stand in them."""

    def __init__(self):
        self.rows, self.shared, self.numbers = [], [], []

    def number(self, pair, place):
        value, unit = pair
        self.numbers.append(float(value))
        return Number(len(self.numbers) - 1, unit, place)

    def reaction(self, equation, rate="", **constants):
        """Names of constants are written with `_` for a blank: T_ref."""
        line = len(self.rows) + 2
        given = []
        for name, pair in constants.items():
            header = {"T_ref": "T ref", "Keq_T_ref": "Keq T ref", "dH_T_ref": "dH T ref"}.get(name, name)
            given.append((header, self.number(pair, Place("Reactions", line, 0, header))))
        self.rows.append(
            ReactionRow(
                str(line - 1), parse_equation(equation), rate, tuple(given), Place("Reactions", line),
                Place("Reactions", line, 0, "Rate"),
            )
        )  # fmt: skip
        return self

    def constant(self, name, value, energy=None, reference=None, pre_exponential=False):
        place = Place("Constants", len(self.shared) + 2)
        self.shared.append(
            ConstantRow(
                name, self.number(value, place), pre_exponential,
                None if energy is None else self.number(energy, place),
                None if reference is None else self.number(reference, place), None, place,
            )
        )  # fmt: skip
        return self

    def network(self, species="A B C D", with_units=True, mass_basis=False, feed_units=FEED_UNITS):
        plain = [n for row in self.rows for _, n in row.constants] + [row.value for row in self.shared]
        exponents = tuple((n.slot, self.numbers[n.slot]) for n in plain if n.unit in (None, "-"))
        return build_network(
            ReactionTable(tuple(self.rows)), tuple(self.shared), tuple(species.split()), with_units, mass_basis,
            feed_units if with_units else (), exponents if with_units else (),
        )  # fmt: skip

    def values(self, **options):
        """Numbers in SI by their labels."""
        network = self.network(**options)
        vector, _ = network.values(tuple(self.numbers))
        return {p.label: float(v) for p, v in zip(network.parameters.items, vector, strict=True)}

    def remarks(self, **options):
        network = self.network(**options)
        return [f.text for f in (*network.findings, *network.values(tuple(self.numbers))[1])]


def feed(amounts, unit="mol/L", streams=({},), columns=None):
    """A feed table: species -> amount, or amounts of several streams; columns: species -> fields of its row."""
    rows = []
    for line, (name, given) in enumerate(amounts.items(), start=2):
        place = Place("Feed", line)
        values = given if isinstance(given, tuple) else (given,)
        units = unit if isinstance(unit, tuple) else (unit,) * len(values)
        extra = {
            k: Quantity(*v, place) if isinstance(v, tuple) else v
            for k, v in (columns or {}).get(name, {}).items()
        }
        rows.append(
            SpeciesRow(
                name, tuple(Quantity(v, u, place) for v, u in zip(values, units, strict=True)), place, **extra
            )
        )
    made = [
        Stream(f"s{i}", Place("Feed"), **{k: Quantity(*v, Place("Feed", 9, i)) for k, v in fields.items()})
        for i, fields in enumerate(streams)
    ]
    return FeedTable(tuple(rows), tuple(made))
