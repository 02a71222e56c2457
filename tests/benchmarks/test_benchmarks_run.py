"""The benchmark scripts run, and their two ways agree; times are not judged."""

import subprocess
import sys
from pathlib import Path

import pytest

HERE = Path(__file__).parent


@pytest.mark.parametrize(
    ("script", "arguments", "rows", "words"),
    [
        ("run.py", ["--quick"], 13, "a column of"),  # 8 single calls, 4 tables of cases, a column
        ("sheets.py", ["--quick"], 8, "times `import numpy`"),
        (
            "kernel_tables.py",
            ["--quick"],
            45,
            "beside the floor",
        ),  # tanks, tubes, batches, starts, books, the floor
        ("random_networks.py", ["20", "10", "1"], 0, "wrong though called right: none"),
    ],
)
def test_the_script_prints_its_tables(script, arguments, rows, words):
    done = subprocess.run(
        [sys.executable, str(HERE / script), *arguments], capture_output=True, text=True, check=False
    )
    assert done.returncode == 0, done.stderr
    assert words in done.stdout
    assert sum(text.startswith("| ") for text in done.stdout.splitlines()) >= rows
