"""What the tables say, before it means anything: the records a reader hands to chemistry.

The reactions and the constants are split in two: *structure* (texts, units, coefficients: hashable,
so a network is built once for all tables of the same make) and the *numbers* in it, one per slot.
Feeds change from cell to cell; their numbers stay where they are read.
"""

from dataclasses import dataclass, field

from moletally.chemistry.errors import Place

__all__ = [
    "ConstantRow", "Equation", "FeedTable", "Number", "Quantity", "ReactionRow", "ReactionTable",
    "SpeciesRow", "Stream",
]  # fmt: skip


@dataclass(frozen=True, slots=True)
class Number:
    """A number of the reactions or constants table: its unit as written and its slot in the numbers."""

    slot: int
    unit: str | None
    place: Place


@dataclass(frozen=True, slots=True)
class Quantity:
    """A number read from a feed or a reactor table, its unit as written (None: none was given)."""

    value: float
    unit: str | None
    place: Place


@dataclass(frozen=True, slots=True)
class Equation:
    """A reaction equation; coefficients are positive, a species may stand on both sides."""

    left: tuple[tuple[str, float], ...]
    right: tuple[tuple[str, float], ...]
    reversible: bool
    text: str


@dataclass(frozen=True, slots=True)
class ReactionRow:
    """One reaction: `rate` is its law as typed (empty: mass action), `constants` maps names to numbers.

    Names of fixed columns are canonical (`k`, `k0`, `E`, `T ref`, `Keq`, `Keq T ref`, `dH`, `dH T ref`),
    all other headers are the user's own constants, spelled as on the sheet.
    """

    label: str
    equation: Equation
    rate: str
    constants: tuple[tuple[str, Number], ...]
    place: Place
    rate_place: Place


@dataclass(frozen=True, slots=True)
class ReactionTable:
    """All reactions of a call, in the order of the sheet."""

    rows: tuple[ReactionRow, ...]


@dataclass(frozen=True, slots=True)
class ConstantRow:
    """One row of the constants table; `pre_exponential` when the column is `Value0`."""

    name: str
    value: Number
    pre_exponential: bool
    energy: Number | None  # E or dH, J/mol or K
    reference: Number | None  # T ref
    deviation: Number | None  # SE
    place: Place


@dataclass(frozen=True, slots=True)
class SpeciesRow:
    """One row of the feed table; `feed` has an amount per stream."""

    name: str
    feed: tuple[Quantity, ...]
    place: Place
    start: Quantity | None = None
    formula: str | None = None
    molar_mass: Quantity | None = None
    heat_capacity: Quantity | None = None
    heat_capacity_slope: Quantity | None = None


@dataclass(frozen=True, slots=True)
class Stream:
    """A feed column `Feed <name>` with the rows that stand below its species."""

    name: str
    place: Place
    flow: Quantity | None = None
    temperature: Quantity | None = None
    pressure: Quantity | None = None


@dataclass(frozen=True, slots=True)
class FeedTable:
    """Species in the order of the sheet (the order of every result column) and their streams."""

    species: tuple[SpeciesRow, ...]
    streams: tuple[Stream, ...]
    place: Place = field(default=Place("Feed"))

    @property
    def names(self) -> tuple[str, ...]:
        """The species' names, in feed order."""
        return tuple(row.name for row in self.species)
