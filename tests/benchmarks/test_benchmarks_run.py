"""The benchmark script runs, and its two ways agree; times are not judged."""

import subprocess
import sys
from pathlib import Path


def test_the_script_prints_its_table():
    script = Path(__file__).with_name("run.py")
    done = subprocess.run(
        [sys.executable, str(script), "--quick"], capture_output=True, text=True, check=False
    )
    assert done.returncode == 0, done.stderr
    assert done.stdout.count("\n| ") >= 14


def test_the_script_about_sheets_prints_its_table():
    script = Path(__file__).with_name("sheets.py")
    done = subprocess.run(
        [sys.executable, str(script), "--quick"], capture_output=True, text=True, check=False
    )
    assert done.returncode == 0, done.stderr
    assert "times `import numpy`" in done.stdout
    assert done.stdout.count("\n| ") == 8
