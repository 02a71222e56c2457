"""Builds the workbook templates, values included.

    python -m workbook_templates.build              write them here
    python -m workbook_templates.build --to FOLDER  write them there

No value is typed: each book is written with its formulas and then recalculated by the command a user has.
"""

import argparse
import tempfile
from pathlib import Path

from workbook_templates import adsorbing_tube, amination, matrix_sheet

from moletally.cli import main as moletally

__all__ = ["TEMPLATES", "build"]

HERE = Path(__file__).parent

TEMPLATES = {
    "amination.xlsx": amination.build,
    "adsorbing_tube.xlsx": adsorbing_tube.build,
    "matrix_sheet.xlsx": matrix_sheet.build,
}


def build(folder: Path) -> None:
    """Write every template into `folder`; stops at the first that has a problem."""
    with tempfile.TemporaryDirectory() as scratch:
        for name, write in TEMPLATES.items():
            bare = Path(scratch, name)
            write(str(bare))
            code = moletally(["recalc", str(bare), "--out", str(folder / name)], standalone_mode=False)
            if code:
                raise SystemExit(f"{name}: the recalculation found problems")


def main() -> None:
    """Read the command line and build."""
    parser = argparse.ArgumentParser(description="Build the workbook templates.")
    parser.add_argument(
        "--to", type=Path, default=HERE, help="folder to write to, default: beside the script"
    )
    build(parser.parse_args().to)


if __name__ == "__main__":
    main()
