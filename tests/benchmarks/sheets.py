"""What worksheets cost: the start of a process, and a book full of different reactor cells; where the time goes.

    python tests/benchmarks/sheets.py [--quick]

The book is recalculated by the same engine twice: with our functions, and with functions that call scipy as a
user writes it. Nothing is asserted but that both give the same numbers where scipy's are concentrations.
"""

import argparse
import compileall
import gc
import os
import statistics
import subprocess
import sys
import tempfile
import time
from collections import Counter
from pathlib import Path

import numpy as np
import xlsxwriter
from plain import chain_rates, plain_tank, plain_tube

import moletally
from moletally.hosts.headless import report
from moletally.hosts.headless.book import open_book
from moletally.hosts.headless.calculate import calculate
from moletally.hosts.headless.write_back import patched
from moletally.reactors.solve import VESSELS
from moletally.sheet.functions import FUNCTIONS, call
from moletally.sheet.outcome import Outcome

REACTIONS = (
    ("Reaction", "Rate", "k"),
    ("s0 -> s1", "k*sqrt(s0)", 0.5),
    ("s1 -> s2", "k*s1^2", 0.6),
    ("s2 -> s3", "k*s2", 0.7),
)
FEED = (("Species", "Feed"), ("s0", 2.0), ("s1", 0.0), ("s2", 0.0), ("s3", 0.0))

FIRST = """
from moletally.sheet.functions import call
reactions = (("Reaction", "Rate", "k", "k unit", "E", "E unit", "T ref", "T ref unit"),
             ("A + B -> C", "k*A*B", 0.35, "L/(mol min)", 52.0, "kJ/mol", 60.0, "degC"),
             ("C + B -> D", "k*C*B", 0.08, "L/(mol min)", 61.0, "kJ/mol", 60.0, "degC"))
feed = (("Species", "Feed [mol/L]"), ("A", 1.2), ("B", 2.0), ("C", 0.0), ("D", 0.0))
vessel = (("Volume", 2.5, "m3"), ("Flow", 1500.0, "L/h"), ("Temperature", 70.0, "degC"))
for name in ("MOLE_CSTR", "MOLE_PFR"):
    assert not call(name, [reactions, feed, vessel, "A/C"]).problems
"""


def start(repeats):
    """Fresh processes, taken in turn; our modules compiled beforehand, as an install does."""
    compileall.compile_dir(Path(moletally.__file__).parent, quiet=2)
    environment = {k: v for k, v in os.environ.items() if k != "PYTHONDONTWRITEBYTECODE"}
    spent = {FIRST: [], "import numpy": []}
    for _ in range(repeats):
        for code, times in spent.items():
            begun = time.perf_counter()
            subprocess.run([sys.executable, "-c", code], check=True, env=environment)
            times.append(time.perf_counter() - begun)
    ours, numpy = (statistics.median(times) for times in spent.values())
    print(f"process start to first answer of a tank and a tube, units included: {ours * 1e3:.0f} ms,"
          f" {ours / numpy:.2f} times `import numpy` ({numpy * 1e3:.0f} ms)\n")  # fmt: skip


def write_book(path, cells):
    """Tanks and tubes in turn, each of its own residence time."""
    with xlsxwriter.Workbook(str(path)) as book:
        sheet = book.add_worksheet("Design")
        for i, row in enumerate(REACTIONS):
            sheet.write_row(i, 0, row)
        for i, row in enumerate(FEED):
            sheet.write_row(i, 4, row)
        for i in range(cells):
            name = "MOLE_PFR" if i % 2 else "MOLE_CSTR"
            sheet.write(i, 7, 0.1 + 5e-4 * i)  # below 5.6 s0 lasts in a tube
            sheet.write_formula(i, 8, f'={name}($A$1:$C$4,$E$1:$F$5,H{i + 1},"s1/s0")')


def with_scipy(name, arguments):
    """The same cell by scipy: the network is written in Python, the residence time comes from the sheet."""
    change, fed = chain_rates(4), np.array([2.0, 0.0, 0.0, 0.0])
    c = (plain_tube if name == "MOLE_PFR" else plain_tank)(change, fed, arguments[2][0][0])
    return Outcome(((float(c[1] / c[0]),),))


class Clock:
    """Seconds by part."""

    def __init__(self):
        self.spent = Counter()

    def timed(self, part, work):
        def run(*arguments):
            begun = time.perf_counter()
            try:
                return work(*arguments)
            finally:
                self.spent[part] += time.perf_counter() - begun

        return run


def recalculated(path, answer, clock):
    """From file to file, as the command does; the values of its cells."""
    book = clock.timed("reading the file", open_book)(path)
    done = clock.timed("recalculation", calculate)(book, clock.timed("our functions", answer))
    found = clock.timed("report", report.as_json)(done, FUNCTIONS)
    clock.timed("report", report.json_text)(found)
    clock.timed("writing the file", patched)(book, done.results, {})
    assert not found["problems"]
    return [cell["value"] for cell in found["cells"]]


def book(cells):
    """The table of where the time goes, per cell."""
    call("MOLE_CSTR", [REACTIONS, FEED, 1.0])
    ours, theirs, solvers = Clock(), Clock(), dict(VESSELS)
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder, "book.xlsx")
        write_book(path, cells)
        recalculated(path, lambda name, arguments: Outcome(((1.0,),)), Clock())  # loads what it needs
        VESSELS.update({kind: ours.timed("solver", solve) for kind, solve in solvers.items()})
        values = recalculated(path, call, ours)
        VESSELS.update(solvers)
        plain = recalculated(path, with_scipy, theirs)
    right = np.array(plain) >= 0  # fsolve goes to a negative concentration here and there
    np.testing.assert_allclose(np.array(values)[right], np.array(plain)[right], rtol=1e-6)
    rows = [
        ("reading the file", lambda s: s["reading the file"]),
        ("engine: formulas, ranges, order", lambda s: s["recalculation"] - s["our functions"]),
        ("functions: arguments to answer", lambda s: s["our functions"] - s["solver"]),
        ("solver", lambda s: s["solver"]),
        ("report", lambda s: s["report"]),
        ("writing the file", lambda s: s["writing the file"]),
        ("all", lambda s: sum(s.values()) - s["our functions"] - s["solver"]),
    ]
    theirs.spent["solver"] = theirs.spent["our functions"]
    print(f"| a book of {cells} cells, µs per cell | ours | scipy, plain | ratio |\n|---|---|---|---|")
    for what, of in rows:
        mine, other = (of(clock.spent) / cells * 1e6 for clock in (ours, theirs))
        print(
            f"| {what} | {mine:.1f} | {other:.1f} | {other / mine:.2g} |"
            if mine
            else f"| {what} | 0 | {other:.1f} | |"
        )
    print(f"\nCells with a negative concentration: ours {sum(v < 0 for v in values)}, scipy {sum(~right)}")


if __name__ == "__main__":
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--quick", action="store_true", help="small sizes, to see that it runs")
    quick = parser.parse_args().quick
    gc.set_threshold(200_000, 50, 100)  # as the command does
    start(1 if quick else 21)
    book(100 if quick else 10_000)
