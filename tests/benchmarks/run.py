"""What worksheet calls cost, warm, beside scipy written the plain way in the same run.

    python tests/benchmarks/run.py [--quick]

Ratios above 1: ours is that many times faster. Nothing is asserted: machines differ, ratios less so. The
kernel below the worksheet is in kernel_tables.py, where the time of a book goes in sheets.py.
"""

import argparse
from collections.abc import Callable
from itertools import count

import numpy as np
from measure import HEAD, Times, in_turn, line
from plain import chain_rates, plain_tank, plain_tube

from moletally.sheet.cells import OMITTED
from moletally.sheet.functions import call


def tables(species: int) -> tuple[tuple, tuple]:
    """The chain of plain.py as tables on a sheet."""
    laws = [("sqrt(s0)" if i == 0 else "s1^2" if i == 1 else f"s{i}") for i in range(species - 1)]
    rows = [(f"s{i} -> s{i + 1}", f"k*{law}", 0.5 + 0.1 * i) for i, law in enumerate(laws)]
    feed = [(f"s{i}", 2.0 if i == 0 else 0.0) for i in range(species)]
    return (("Reaction", "Rate", "k"), *rows), (("Species", "Feed"), *feed)


VESSELS: dict[str, tuple[str, Callable]] = {
    "tank": ("MOLE_CSTR", plain_tank),
    "tube": ("MOLE_PFR", plain_tube),
}


def single_calls(seconds: float) -> None:
    """One cell at a time, by number of species; each is another case, so that nothing is remembered."""
    for species in (2, 4, 8, 16):
        reactions, feed = tables(species)
        change, fed = chain_rates(species), np.array([row[1] for row in feed[1:]])
        for name, (function, plain) in VESSELS.items():
            mine, other = count(), count()
            times = in_turn(
                lambda f=function, r=reactions, s=feed, n=mine: call(f, [r, s, 1.0 + 1e-6 * next(n)]),
                lambda p=plain, c=change, s=fed, n=other: p(c, s, 1.0 + 1e-6 * next(n)),
                seconds=seconds,
            )
            line(f"one {name}, {species} species, warm", times)


def case_tables(most: int, seconds: float) -> None:
    """A column of cases in one call; the loop of scipy is a sample, scaled."""
    reactions, feed = tables(4)
    change = chain_rates(4)
    for n in (10, 100, 1000, 10000):
        if n > most:
            continue
        sample = range(0, n, max(1, n // 50))
        for name, (function, plain) in VESSELS.items():
            shift = count()

            def ours(function=function, n=n, shift=shift):
                more = 1e-9 * next(shift)
                rows = ((0.1 + 1e-3 * i + more, 1.0 + 1e-4 * i) for i in range(n))
                return call(function, [reactions, feed, (("Residence time", "in(s0)"), *rows), "s1"])

            def loop(plain=plain, sample=sample):
                for i in sample:
                    plain(change, np.array([1.0 + 1e-4 * i, 0.0, 0.0, 0.0]), 0.1 + 1e-3 * i)

            line(f"{n} {name}s in one call", scaled(in_turn(ours, loop, seconds=seconds), n / len(sample)))


def one_column(n: int, seconds: float) -> None:
    """A column of residence times of one tube: one integration for us."""
    reactions, feed = tables(4)
    change, fed, shift = chain_rates(4), np.array([2.0, 0.0, 0.0, 0.0]), count()

    def ours():
        more = 1e-9 * next(shift)
        return call("MOLE_PFR", [reactions, feed, tuple((0.01 * i + more,) for i in range(1, n + 1)), "s1"])

    times = in_turn(ours, lambda: plain_tube(change, fed, 0.005 * n), seconds=seconds)
    line(f"a column of {n} residence times of one tube", scaled(times, n))


def scaled(times: Times, by: float) -> Times:
    """Times of a loop of which a part was measured."""
    return Times((times.seconds[0], times.seconds[1] * by), (1.0, times.ratios[1] * by))


def same_answers() -> None:
    """The two ways agree, or the table means nothing."""
    reactions, feed = tables(4)
    change, fed = chain_rates(4), np.array([2.0, 0.0, 0.0, 0.0])
    for function, plain in VESSELS.values():
        ours = [row[0] for row in call(function, [reactions, feed, 1.5, OMITTED]).block]
        np.testing.assert_allclose(ours, plain(change, fed, 1.5), rtol=1e-6)


def main(quick: bool) -> None:
    """Print the table."""
    same_answers()
    seconds = 0.05 if quick else 2.0
    print(HEAD)
    single_calls(seconds)
    case_tables(100 if quick else 10000, seconds)
    one_column(100 if quick else 1000, seconds)


if __name__ == "__main__":
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--quick", action="store_true", help="small sizes, to see that it runs")
    main(parser.parse_args().quick)
