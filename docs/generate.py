"""Writes the pages that come from tables in the code: functions.md and errors.md.

python docs/generate.py           write them
python docs/generate.py --check   fail if a committed page is stale
"""

import sys
from collections.abc import Iterable, Sequence
from pathlib import Path

from moletally.kernel.status import STATUS, Status
from moletally.sheet.functions import FUNCTIONS, Function

HERE = Path(__file__).parent

FUNCTIONS_HEAD = """\
# Worksheet functions

Generated from the function table; do not edit.

Arguments in `[ ]` may be left out. Ranges include their header row. A failed case or want makes only its
own cells errors; the reason is in the first row of `MOLE_AUDIT` and in the report of `moletally recalc`.
"""

ERRORS_HEAD = """\
# Errors and what to do

Generated from the status table; do not edit.

A cell gets a true Excel error, never text posing as a number and never a guess.

| cell | meaning | what to do |
|---|---|---|
| `#VALUE!` | The input can't be used. | Read the reason: it names the table, row, column and header, and says what to mend. |
| `#NUM!` | There is no trustworthy answer. | See the table below; the reason in words is the same. |
| `#N/A` | The quantity is undefined (0/0), such as a conversion of a species that is not fed. | Ask for another quantity, or feed the species. |
| `#N/A` in Excel, in a cell that never had a value | There is no Python behind the cells. | Read the message, or run `moletally excel status`. |
| `#SPILL!` | The cells a result needs are not empty. | Clear them. |
| any other | An error in an input range is passed on. | Mend it where it arises. |

The reason stands in the first row of `MOLE_AUDIT("CSTR", …the same arguments)`, in the report of
`moletally recalc BOOK.xlsx` and in its `--json` output; in Excel, *Reason* on the moletally tab shows it.

## Why there is no trustworthy answer (`#NUM!`)
"""


def table(head: Sequence[str], rows: Iterable[Sequence[str]]) -> str:
    """A Markdown table."""
    lines = ["| " + " | ".join(head) + " |", "|" + "---|" * len(head)]
    lines += ["| " + " | ".join(cell.replace("|", "\\|") for cell in row) + " |" for row in rows]
    return "\n".join(lines) + "\n"


def function_section(function: Function) -> str:
    """One function: call, summary, result, arguments."""
    rows = [(a.name, "optional" if a.optional else "", a.help) for a in function.arguments]
    return (
        f"\n## {function.name}\n\n`{function.signature}`\n\n{function.summary}\n\n"
        f"Result: {function.result}.\n\n" + table(("argument", "", "what it is"), rows)
    )


def pages() -> dict[str, str]:
    """Every generated page by file name."""
    functions = FUNCTIONS_HEAD + "".join(function_section(f) for f in FUNCTIONS.values())
    statuses = [(f"`{s.name}`", STATUS[s].sentence, STATUS[s].remedy) for s in Status if s is not Status.OK]
    return {
        "functions.md": functions,
        "errors.md": ERRORS_HEAD + "\n" + table(("status", "meaning", "what to do"), statuses),
    }


def main(arguments: Sequence[str]) -> int:
    """Write the pages, or check them."""
    stale = []
    for name, text in pages().items():
        path = HERE / name
        if "--check" in arguments:
            if not path.exists() or path.read_text(encoding="utf-8") != text:
                stale.append(name)
        else:
            path.write_text(text, encoding="utf-8")
    if stale:
        print("stale, run python docs/generate.py:", ", ".join(stale))
    return 1 if stale else 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
