"""The workbook engine with two functions that do with scipy what a user would: prints one answer a line.

    python tests/benchmarks/plain_book.py BOOK.xlsx

Texts of laws are compiled once; everything else is what a user would write.
"""

import re
import sys
from collections.abc import Callable
from functools import cache

import formualizer as fz
import numpy as np
from plain import as_expressions, fsolved, integrated, law_text

Table = list[list[object]]


def _side(text: str, sign: float, row: dict[str, float]) -> None:
    for part in text.split("+"):
        number, name = re.fullmatch(r"\s*([\d.]*)\s*(\w+)\s*", part).groups()
        row[name] = row.get(name, 0.0) + sign * float(number or 1)


@cache
def _network(rows: tuple[tuple[str, str, float], ...], species: tuple[str, ...]) -> Callable:
    nu = np.zeros((len(rows), len(species)))
    laws = []
    for j, (equation, law, k) in enumerate(rows):
        coefficients: dict[str, float] = {}
        for sign, side in zip((-1.0, 1.0), equation.split("->"), strict=True):
            _side(side, sign, coefficients)
        for name, value in coefficients.items():
            nu[j, species.index(name)] = value
        laws.append(law_text(re.sub(r"\bk\b", repr(k), law)))
    return as_expressions(list(species), laws, nu)


def _read(reactions: Table, feed: Table) -> tuple[Callable, np.ndarray, list[str]]:
    species = [row[0] for row in feed[1:]]
    change = _network(tuple((r[0], r[1], float(r[2])) for r in reactions[1:]), tuple(species))
    return change, np.array([float(row[1]) for row in feed[1:]]), species


def tank(reactions: Table, feed: Table, tau: float, want: str) -> float:
    """A species at the outlet of a tank."""
    change, c0, species = _read(reactions, feed)
    c, _ = fsolved(change, c0, tau, np.maximum(c0, 1e-3 * c0.max()))
    return float(c[species.index(want)])


def tube(reactions: Table, feed: Table, tau: float, want: str) -> float:
    """A species at the outlet of a tube."""
    change, c0, species = _read(reactions, feed)
    return float(integrated(change, c0, tau, 1e-8, 1e-14)[species.index(want)])


def main(path: str) -> None:
    """Load, register, evaluate, read."""
    book = fz.load_workbook(path)
    book.register_function("MOLE_CSTR", tank, min_args=4)
    book.register_function("MOLE_PFR", tube, min_args=4)
    book.evaluate_all()
    row = 1
    while (value := book.get_value("Design", row, 9)) is not None:
        print(value)
        row += 1


if __name__ == "__main__":
    main(sys.argv[1])
