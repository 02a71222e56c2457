"""The VBA run in LibreOffice, which compiles the same texts."""

import json
import os
import shutil
import subprocess
from pathlib import Path

import build as addin

__all__ = ["ADDIN", "ON_SHEETS", "WITH_STAND_INS", "compiles", "run_basic"]

HERE = Path(__file__).parent
ADDIN = Path(addin.__file__).with_name(addin.ADDIN)
BASIC = {path.name: path.read_text(encoding="utf-8") for path in (HERE / "basic").glob("*.bas")}
ON_SHEETS = {"MoleSheets.bas": BASIC.pop("MoleSheets.bas")}  # beside the add-in's own modules
WITH_STAND_INS = BASIC  # in place of those that need Excel or Python
PYTHON = os.environ.get("OFFICE_PYTHON", "/usr/bin/python3")  # the one that can import LibreOffice's uno


def run_basic(file, calls, env=None, timeout=120):
    """Results of Basic functions, each called with texts or floats."""
    assert shutil.which("soffice"), (
        "these tests need LibreOffice: apt-get install libreoffice-calc python3-uno"
    )
    done = subprocess.run(
        [PYTHON, str(HERE / "run_basic.py"), str(file)], input=json.dumps(calls), capture_output=True, text=True,
        timeout=timeout, env={**os.environ, **(env or {})}, check=False,
    )  # fmt: skip
    assert done.returncode == 0, done.stderr[-3000:]
    return json.loads(done.stdout)


def compiles(texts, scratch):
    """Names of the modules that LibreOffice can't compile; one that it can't blanks the others, so each is tried alone."""
    probes = {}
    for name, text in texts.items():
        stem = Path(name).stem
        probes[name] = (
            f'{text.rstrip()}\n\nPublic Function Probe{stem}() As String\n    Probe{stem} = "yes"\nEnd Function\n'
        )
    file = scratch / "probes.xlam"
    addin.write(file, probes)
    calls = [[f"{Path(name).stem}.Probe{Path(name).stem}", []] for name in probes]
    return [name for name, answer in zip(probes, run_basic(file, calls), strict=True) if answer != "yes"]
