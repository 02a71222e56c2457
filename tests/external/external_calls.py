"""How a check asks: a worksheet call with its tables, and the tables themselves in short."""

from dataclasses import dataclass

from moletally.sheet.cells import OMITTED
from moletally.sheet.functions import call

__all__ = ["Call", "Check", "feed", "laws", "value", "vessel"]


@dataclass(frozen=True)
class Call:
    """A worksheet call; `chain` tanks in series, each fed with the outlet of the one before."""

    function: str
    reactions: tuple
    feed: object
    reactor: object
    want: object
    constants: object = OMITTED
    chain: int = 1

    @property
    def arguments(self):
        return [self.reactions, self.feed, self.reactor, self.want, self.constants]


@dataclass(frozen=True)
class Check:
    """One number to reproduce: `expected` in the digits of its source, `rel` the accepted relative error."""

    case: str
    what: str
    expected: str
    rel: float
    ask: Call


def laws(*rows, **units):
    """A reactions table from (equation, law, {constant: value}) rows; units by constant name."""
    names = list(dict.fromkeys(name for row in rows for name in row[2]))
    head = ("Reaction", "Rate", *(f"{n} [{units[n]}]" if n in units else n for n in names))
    return (head, *((eq, law, *(k.get(n) for n in names)) for eq, law, k in rows))


def feed(unit=None, start=None, **amounts):
    """A feed table; `start` gives first contents."""
    head = ("Species", f"Feed [{unit}]" if unit else "Feed")
    if start is None:
        return (head, *amounts.items())
    return ((*head, f"Start [{unit}]" if unit else "Start"), *((n, x, start[n]) for n, x in amounts.items()))


def vessel(**labels):
    """A reactor block from Label=(value, unit); underscores stand for blanks."""
    return tuple((label.replace("_", " "), *pair) for label, pair in labels.items())


def value(ask: Call) -> float:
    """The answer of a call; a chain of tanks hands its outlet on as the next feed."""
    table = ask.feed
    for _ in range(ask.chain - 1):
        column = call(ask.function, [ask.reactions, table, ask.reactor, OMITTED, ask.constants]).block
        table = (table[0][:2], *((row[0], cell[0]) for row, cell in zip(table[1:], column, strict=True)))
    outcome = call(ask.function, [ask.reactions, table, *ask.arguments[2:]])
    assert not outcome.problems, outcome.problems
    return outcome.block[0][0]
