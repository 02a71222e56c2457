"""A first answer is quick because nothing heavy is loaded for it."""

import subprocess
import sys

HEAVY = ("scipy", "pandas", "pint", "openpyxl", "lxml", "formualizer", "numpy.testing")

CODE = f"""
import sys
from moletally.sheet.functions import call
reactions = (
    ("Reaction", "Rate", "k", "k unit", "E", "E unit", "T ref", "T ref unit"),
    ("A + B -> C", "k*A*B", 0.35, "L/(mol min)", 52.0, "kJ/mol", 60.0, "degC"),
)
feed = (("Species", "Feed [mol/L]", "MW [g/mol]"), ("A", 1.2, 40.0), ("B", 2.0, 60.0), ("C", 0.0, 100.0))
vessel = (("Volume", 2.5, "m3"), ("Flow", 1500.0, "L/h"), ("Temperature", 70.0, "degC"), ("Pressure", 2.0, "barg"))
for name in ("MOLE_CSTR", "MOLE_PFR"):
    for want in ("A/B", "flow(C) [kmol/h]", "100*conversion(A)", "C [g/L]"):
        assert not call(name, [reactions, feed, vessel, want]).problems
print([module for module in {HEAVY!r} if module in sys.modules])
"""


def test_a_first_answer_with_units_loads_nothing_heavy():
    done = subprocess.run([sys.executable, "-c", CODE], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
