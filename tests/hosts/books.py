"""Real workbook files for the tests of headless recalculation."""

import json
import re
import zipfile

import pytest
import xlsxwriter
from click.testing import CliRunner

from moletally.cli import main

MATRIX = [
    ["Species", "Feed [mol/L]", "step 1", "step 2"], ["A", 2.0, -1, None], ["B", 0, 1, -1], ["C", 0, None, 1],
    ["k [1/h]", None, 0.5, 0.2],
]  # fmt: skip
RANGE = "$A$1:$D$5"


def tank(tau, k1=0.5, k2=0.2):
    """First-order series in a tank, by hand."""
    a = 2.0 / (1 + k1 * tau)
    b = k1 * tau * a / (1 + k2 * tau)
    return [a, b, 2.0 - a - b]


def write(path, fill, **options):
    """A workbook with the matrix in A1:D5 of `Design` and tau in G1; `fill(book, sheet)` adds the rest."""
    book = xlsxwriter.Workbook(str(path), options)
    sheet = book.add_worksheet("Design")
    for i, row in enumerate(MATRIX):
        for j, cell in enumerate(row):
            if cell is not None:
                sheet.write(i, j, cell)
    sheet.write("G1", 4.0)
    fill(book, sheet)
    book.close()
    return path


def parts(path):
    with zipfile.ZipFile(path) as package:
        return {name: package.read(name) for name in package.namelist()}


def without_values(xml):
    """A sheet's XML with values, their types and the extent of spills taken out, and bare children too."""
    xml = re.sub(rb"<v>[^<]*</v>|<is>.*?</is>", b"", xml, flags=re.DOTALL)
    xml = re.sub(rb'(<c\b[^>]*?) t="\w+"', rb"\1", xml)
    return re.sub(rb'<c r="[A-Z]+\d+"(?: s="\d+")?\s*(?:/>|></c>)', b"", xml)


def replace_in_part(path, part, old, new):
    """Edit a part as bytes: for what the writer library can't make."""
    whole = parts(path)
    assert old in whole[part]
    whole[part] = whole[part].replace(old, new)
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as package:
        for name, data in whole.items():
            package.writestr(name, data)


def run(*arguments):
    return CliRunner().invoke(main, [str(a) for a in arguments])


def recalc(path, *arguments):
    """Exit code, values by cell and problems by cell."""
    result = run("recalc", path, "--json", *arguments)
    found = json.loads(result.stdout)
    assert set(found) == {"cells", "problems"}
    return (
        result.exit_code,
        {c["cell"]: c["value"] for c in found["cells"]},
        {p["cell"]: (p["error"], p["reason"]) for p in found["problems"]},
    )


def near(expected):
    return pytest.approx(expected, rel=1e-10)
