"""The checks again, typed into a real workbook and recalculated by the command a user has."""

import json

import pytest
import xlsxwriter
from click.testing import CliRunner
from external_stiff import CHECKS
from xlsxwriter.utility import xl_range_abs

from moletally.cli import main
from moletally.sheet.cells import OMITTED

LONGEST_CHAIN = 10  # tanks in series as chained cells; longer ones are asked in the other test


class Writer:
    """Writes tables below each other and returns their ranges."""

    def __init__(self, sheet):
        self.sheet, self.row = sheet, 0

    def argument(self, value):
        """An argument as it is typed into a formula."""
        if value is None or value is OMITTED:
            return ""
        if isinstance(value, float | int):
            return repr(value)
        if isinstance(value, str):
            return '"' + value.replace('"', '""') + '"'
        return self.table(value)

    def table(self, block):
        top = self.row
        for line in block:
            for j, cell in enumerate(line):
                if cell is not None:
                    self.sheet.write(self.row, j, cell)
            self.row += 1
        self.row += 1
        return xl_range_abs(top, 0, self.row - 2, len(block[0]) - 1)


def write(path, checks):
    """One workbook with a formula per check in column H; returns cell -> check."""
    book = xlsxwriter.Workbook(str(path))
    sheet = book.add_worksheet("Checks")
    writer, cells = Writer(sheet), {}
    for check in checks:
        ask = check.ask
        reactions, fed, reactor, want, constants = (writer.argument(a) for a in ask.arguments)
        for _ in range(ask.chain - 1):
            fed = chained(sheet, writer, ask, reactions, fed, reactor)
        cell = f"AA{writer.row + 1}"
        tail = f",{constants}" if constants else ""
        sheet.write_formula(cell, f"={ask.function}({reactions},{fed},{reactor},{want}{tail})")
        cells[f"Checks!{cell}"] = check
        writer.row += 2
    book.close()
    return cells


def chained(sheet, writer, ask, reactions, fed, reactor):
    """The outlet of a tank as an array beside its species: the feed table of the next."""
    rows = len(ask.feed)
    top = writer.row
    writer.table([row[:1] if i else row[:2] for i, row in enumerate(ask.feed)])
    area = xl_range_abs(top + 1, 1, top + rows - 1, 1)
    sheet.write_array_formula(area, f"{{={ask.function}({reactions},{fed},{reactor})}}")
    return xl_range_abs(top, 0, top + rows - 1, 1)


def test_every_check_in_one_workbook(tmp_path):
    checks = [c for c in CHECKS if c.ask.chain <= LONGEST_CHAIN]
    assert len(checks) > 250
    cells = write(tmp_path / "checks.xlsx", checks)
    result = CliRunner().invoke(main, ["recalc", str(tmp_path / "checks.xlsx"), "--json"])
    found = json.loads(result.stdout)
    assert found["problems"] == []
    assert result.exit_code == 0
    values = {c["cell"]: c["value"] for c in found["cells"]}
    for cell, check in cells.items():
        expected = float(check.expected)
        assert values[cell] == pytest.approx(expected, rel=check.rel, abs=0.0), (check.case, check.what)
