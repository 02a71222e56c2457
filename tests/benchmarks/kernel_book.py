"""A workbook full of different reactor cells: our command, and the same workbook engine calling scipy."""

import subprocess
import sys
import tempfile
import time
from pathlib import Path

import numpy as np
import xlsxwriter
from measure import line, median_of

__all__ = ["book"]

PLAIN = Path(__file__).with_name("plain_book.py")
FEEDS = 20  # feed tables; every cell has a residence time of its own
REACTIONS = [("Reaction", "Rate", "k"), ("A + B -> C", "k*A*B^0.5", 0.8), ("C + B -> D", "k*C*B^0.5", 0.3)]


def make_book(path: Path, cells: int) -> None:
    """Half of the cells tanks, half tubes; no two alike."""
    rng = np.random.default_rng(5)
    with xlsxwriter.Workbook(str(path)) as workbook:
        sheet = workbook.add_worksheet("Design")
        for i, row in enumerate(REACTIONS):
            sheet.write_row(i, 0, row)
        for k in range(FEEDS):
            feed = [
                ("Species", "Feed"),
                ("A", rng.uniform(0.5, 2)),
                ("B", rng.uniform(1, 3)),
                ("C", 0),
                ("D", 0),
            ]
            for i, row in enumerate(feed):
                sheet.write_row(6 * k + i, 4, row)
        for i, tau in enumerate(10 ** rng.uniform(-1, 0.5, cells)):
            function, top = ("MOLE_CSTR", "MOLE_PFR")[i % 2], 6 * (i // 2 % FEEDS) + 1
            sheet.write(i, 7, tau)
            formula = f'={function}($A$1:$C$3,$E${top}:$F${top + 4},H{i + 1},"C")'
            sheet.write_formula(i, 8, formula)


def book(cells: int, rounds: int) -> None:
    """Time from the file to the answers, in processes of their own, taken in turn."""
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder, "book.xlsx")
        make_book(path, cells)
        ways = (
            [sys.executable, "-m", "moletally", "recalc", str(path)],
            [sys.executable, str(PLAIN), str(path)],
        )
        times, answers = [], []
        for _ in range(rounds):
            row = []
            for way in ways:
                begun = time.perf_counter()
                done = subprocess.run(way, capture_output=True, text=True, check=True)
                row.append(time.perf_counter() - begun)
                answers.append(_numbers(done.stdout))
            times.append(row)
        assert len(answers[0]) == cells
        ours, plain = np.array(answers[0]), np.array(answers[1])
        there = np.isfinite(plain)
        print(
            "\n| work | ours | the same engine calling scipy | ratio | target | remarks |\n|---|---|---|---|---|---|"
        )
        line(f"a book of {cells:,} different cells, file to answers", median_of(times), "≥ 10",
             f"scipy: no number in {np.count_nonzero(~there)} cells, else within "
             f"{np.abs(ours - plain)[there].max():.0e} mol/m³")  # fmt: skip


def _numbers(text: str) -> list[float]:
    """The last word of each line that ends in a number."""
    found = []
    for row in text.splitlines():
        try:
            found.append(float(row.split()[-1]))
        except (ValueError, IndexError):
            continue
    return found
