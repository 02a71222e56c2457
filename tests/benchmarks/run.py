"""What a call costs, as a ratio to scipy written the plain way in the same run.

    python tests/benchmarks/run.py [--quick]

Ratios above 1: ours is that many times faster. Nothing is asserted: machines differ, ratios less so.
"""

import argparse
import json
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import numpy as np
import xlsxwriter
from plain import chain_rates, plain_tank, plain_tube

from moletally.sheet.cells import OMITTED
from moletally.sheet.functions import call


def tables(species):
    """The chain of plain.py as tables on a sheet."""
    laws = [("sqrt(s0)" if i == 0 else "s1^2" if i == 1 else f"s{i}") for i in range(species - 1)]
    rows = [(f"s{i} -> s{i + 1}", f"k*{law}", 0.5 + 0.1 * i) for i, law in enumerate(laws)]
    feed = [(f"s{i}", 2.0 if i == 0 else 0.0) for i in range(species)]
    return (("Reaction", "Rate", "k"), *rows), (("Species", "Feed"), *feed)


def median(work, repeats):
    """Median seconds of `work(i)`; each i is another case, so that nothing is remembered."""
    spent = []
    for i in range(repeats):
        begun = time.perf_counter()
        work(i)
        spent.append(time.perf_counter() - begun)
    return statistics.median(spent)


def line(what, ours, plain):
    """A row of the table."""
    print(f"| {what} | {ours * 1e3:.3g} ms | {plain * 1e3:.3g} ms | {plain / ours:.2g} |", flush=True)


def single_calls(repeats):
    """One cell at a time, warm, by number of species."""
    for species in (2, 4, 8, 16):
        reactions, feed = tables(species)
        change, fed = chain_rates(species), np.array([row[1] for row in feed[1:]])
        for name, function, plain, n in (
            ("tank", "MOLE_CSTR", plain_tank, repeats),
            ("tube", "MOLE_PFR", plain_tube, repeats // 4),
        ):
            call(function, [reactions, feed, 1.0])
            ours = median(lambda i, f=function, r=reactions, s=feed: call(f, [r, s, 1.0 + 1e-3 * (i + 1)]), n)
            theirs = median(lambda i, p=plain, c=change, s=fed: p(c, s, 1.0 + 1e-3 * (i + 1)), n)
            line(f"one {name}, {species} species, warm", ours, theirs)


def case_tables(most):
    """A column of cases in one call."""
    reactions, feed = tables(4)
    change, fed = chain_rates(4), np.array([2.0, 0.0, 0.0, 0.0])
    for n in (10, 100, 1000, 10000):
        if n > most:
            continue
        cases = (("Residence time", "in(s0)"), *((0.1 + 1e-3 * i, 1.0 + 1e-4 * i) for i in range(n)))
        for name, function, plain in (("tanks", "MOLE_CSTR", plain_tank), ("tubes", "MOLE_PFR", plain_tube)):
            begun = time.perf_counter()
            call(function, [reactions, feed, cases, "s1"])
            ours = time.perf_counter() - begun
            sample = range(0, n, max(1, n // 200))
            begun = time.perf_counter()
            for i in sample:
                plain(change, np.array([1.0 + 1e-4 * i, 0.0, 0.0, 0.0]), 0.1 + 1e-3 * i)
            line(f"{n} {name} in one call", ours, (time.perf_counter() - begun) / len(sample) * n)
    taus = tuple((0.01 * i,) for i in range(min(most, 1000)))
    begun = time.perf_counter()
    call("MOLE_PFR", [reactions, feed, taus, "s1"])
    ours = time.perf_counter() - begun
    plain = median(lambda i: plain_tube(change, fed, 0.05 * (i + 1)), 40) * len(taus)
    line(f"a column of {len(taus)} residence times of one tube", ours, plain)


def cold(repeats):
    """From the start of a process to its first answer."""
    reactions, feed = tables(4)
    ours = f"from moletally.sheet.functions import call; call('MOLE_CSTR', [{reactions!r}, {feed!r}, 1.0])"
    plain = "import numpy as np; from scipy.optimize import fsolve; fsolve(lambda c: 1 - c - np.sqrt(abs(c)), 1.0)"
    numpy = "import numpy"
    spent = {
        code: median(lambda _, c=code: subprocess.run([sys.executable, "-c", c], check=True), repeats)
        for code in (ours, plain, numpy)
    }
    line("process start to first answer", spent[ours], spent[plain])
    line("the same beside `import numpy` alone", spent[ours], spent[numpy])


def book(cells):
    """A workbook full of different calls, recalculated by the command; the plain way is a loop of fsolve."""
    reactions, feed = tables(4)
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder, "book.xlsx")
        workbook = xlsxwriter.Workbook(str(path))
        sheet = workbook.add_worksheet("Design")
        for i, row in enumerate(reactions):
            sheet.write_row(i, 0, row)
        for i, row in enumerate(feed):
            sheet.write_row(i, 4, row)
        for i in range(cells):
            sheet.write(i, 7, 0.1 + 1e-3 * i)
            sheet.write_formula(i, 8, f'=MOLE_CSTR($A$1:$C$4,$E$1:$F$5,H{i + 1},"s1/s0")')
        workbook.close()
        begun = time.perf_counter()
        done = subprocess.run(
            [sys.executable, "-m", "moletally", "recalc", str(path), "--json"],
            capture_output=True,
            check=True,
        )
        ours = time.perf_counter() - begun
        assert len(json.loads(done.stdout)["cells"]) == cells
    change, fed = chain_rates(4), np.array([2.0, 0.0, 0.0, 0.0])
    plain = median(lambda i: plain_tank(change, fed, 0.1 + 1e-3 * i), 200) * cells
    line(f"a book with {cells} function cells, file to answers", ours, plain)


def same_answers():
    """The two ways agree, or the table means nothing."""
    reactions, feed = tables(4)
    change, fed = chain_rates(4), np.array([2.0, 0.0, 0.0, 0.0])
    for function, plain in (("MOLE_CSTR", plain_tank), ("MOLE_PFR", plain_tube)):
        ours = [row[0] for row in call(function, [reactions, feed, 1.5, OMITTED]).block]
        np.testing.assert_allclose(ours, plain(change, fed, 1.5), rtol=1e-6)


def main(quick):
    """Print the table."""
    same_answers()
    print("| work | ours | scipy, plain | ratio |\n|---|---|---|---|")
    single_calls(20 if quick else 200)
    case_tables(100 if quick else 10000)
    cold(1 if quick else 7)
    book(50 if quick else 10000)


if __name__ == "__main__":
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--quick", action="store_true", help="small sizes, to see that it runs")
    main(parser.parse_args().quick)
