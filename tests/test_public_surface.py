"""The names a workbook or a script relies on, pinned to a committed file.

To accept a change on purpose: python tests/test_public_surface.py > tests/public_surface.txt
"""

from pathlib import Path

from moletally.cli import main
from moletally.sheet.functions import FUNCTIONS

PINNED = Path(__file__).with_name("public_surface.txt")


def commands(group, above=""):
    for name, command in sorted(group.commands.items()):
        if hasattr(command, "commands"):
            yield from commands(command, f"{above}{name} ")
        else:
            yield above + name, command


def surface() -> str:
    lines = ["worksheet functions"]
    lines += [f"  {f.signature}" for f in FUNCTIONS.values()]
    lines.append("command line")
    for name, command in commands(main):
        words = [
            " ".join(p.opts) if p.param_type_name == "option" else (p.metavar or p.name.upper())
            for p in command.params
        ]
        lines.append(f"  moletally {name} {' | '.join(words)}".rstrip())
    lines.append("python")
    import moletally

    lines += [f"  moletally.{name}" for name in sorted(moletally.__all__)]
    return "\n".join(lines) + "\n"


def test_the_public_surface_is_the_pinned_one():
    assert surface() == PINNED.read_text(encoding="utf-8")


if __name__ == "__main__":
    print(surface(), end="")
