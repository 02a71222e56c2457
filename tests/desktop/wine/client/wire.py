"""Cells as JSON, for both sides of the tests: Linux writes what Windows calls with, and reads what came back.

number, text, true, null        themselves
{"error": "#N/A"}               a true error          {"date": "2024-02-29T00:00:00"}
{"currency": 2.5}               a Currency            {"left out": true}
{"block": [[...]]}              an array              {"range": [[...]]}   the same as a Range object
"""

CODES = {
    "#NULL!": 2000,
    "#DIV/0!": 2007,
    "#VALUE!": 2015,
    "#REF!": 2023,
    "#NAME?": 2029,
    "#NUM!": 2036,
    "#N/A": 2042,
}


def decoded(cell, make):
    """A cell for a client; `make` has a function per kind: error, date, currency, missing, block, range."""
    if not isinstance(cell, dict):
        return float(cell) if isinstance(cell, int) and not isinstance(cell, bool) else cell
    ((kind, value),) = cell.items()
    if kind == "error":
        return make.error(0x800A0000 | CODES[value])
    if kind == "left out":
        return make.error(0x80020004)
    if kind in ("block", "range"):
        rows = [[decoded(c, make) for c in row] for row in value]
        return make.block(rows) if kind == "block" else make.range(rows)
    return getattr(make, kind)(value)
