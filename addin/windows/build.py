"""Builds moletally.xlam from the VBA texts, the ribbon and the table of worksheet functions.

    python addin/windows/build.py                 write it here
    python addin/windows/build.py --to FOLDER     write it there
    python addin/windows/build.py --check         fail if what is here is not what would be built

The same input gives the same bytes. The two modules that are made from the function table are written beside
the others, so that Excel itself can import all of them.
"""

import argparse
import re
import tempfile
import tomllib
from pathlib import Path

from generate import functions_module, table_module
from lint import complaints
from xlam.package import write_package
from xlam.project import Module, vba_project

import moletally

__all__ = ["ADDIN", "build", "modules", "settings", "sources", "write"]

HERE = Path(__file__).parent
ADDIN = "moletally.xlam"
TITLE = "moletally - reactor mole balances"
DESCRIPTION = "Worksheet functions for the mole balances of stirred tanks (CSTR) and plug-flow tubes (PFR)"
MADE = {"MoleFunctions.bas": functions_module, "MoleTable.bas": table_module}


def settings() -> dict[str, str]:
    """What belongs together: our version and the version of xlwings whose DLL the VBA names."""
    project = tomllib.loads((HERE.parents[1] / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    pins = [m[1] for d in project["dependencies"] if (m := re.match(r"xlwings==([\d.]+)", d))]
    return {"moletally": moletally.__version__, "xlwings": pins[0]}


def sources(folder: Path = HERE / "vba") -> dict[str, str]:
    """Text of every module by file name, versions filled in; the made ones are made anew."""
    texts = {path.name: path.read_text(encoding="utf-8") for path in sorted(folder.glob("*.[bc][al]s"))}
    texts |= {name: make() for name, make in MADE.items()}
    for key, value in settings().items():
        texts = {name: text.replace("{" + key + "}", value) for name, text in texts.items()}
    return dict(sorted(texts.items()))


def modules(texts: dict[str, str]) -> list[Module]:
    """The modules of the VBA project; the sheet of settings has an empty one."""
    kinds = {"ThisWorkbook.cls": "document"}
    found = [
        Module(Path(name).stem, kinds.get(name, "class" if name.endswith(".cls") else "standard"), text)
        for name, text in texts.items()
    ]
    return [*found, Module("Settings", "document", "")]


def build(target: Path, texts: dict[str, str] | None = None) -> None:
    """Write the add-in; stops where Excel's compiler would.

    texts : VBA by file name, default `sources()`
    """
    texts = sources() if texts is None else texts
    if found := complaints(texts):
        raise SystemExit("\n".join(["the VBA does not compile:", *found]))
    write(target, texts)


def write(target: Path, texts: dict[str, str]) -> None:
    """Put the modules into an add-in file as they are."""
    images = {path.stem: path.read_bytes() for path in sorted((HERE / "ribbon" / "images").glob("*.png"))}
    ribbon = (HERE / "ribbon" / "customUI14.xml").read_text(encoding="utf-8")
    vba = vba_project(modules(texts), name="moletally", description=DESCRIPTION)
    write_package(target, vba=vba, ribbon=ribbon, images=images, settings=list(settings().items()),
                  title=TITLE, description=DESCRIPTION)  # fmt: skip


def main() -> None:
    """Read the command line and build or check."""
    parser = argparse.ArgumentParser(
        description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter
    )
    parser.add_argument("--to", type=Path, default=HERE, help="folder to write into")
    parser.add_argument("--check", action="store_true", help="compare instead of writing")
    options = parser.parse_args()
    texts = sources()
    if options.check:
        check(texts)
        return
    for name in MADE if options.to == HERE else ():
        (HERE / "vba" / name).write_text(texts[name], encoding="utf-8", newline="\n")
    build(options.to / ADDIN, texts)


def check(texts: dict[str, str]) -> None:
    """Stop with a message if a made file or the add-in is not up to date."""
    with tempfile.TemporaryDirectory() as scratch:
        build(Path(scratch, ADDIN), texts)
        stale = [name for name in MADE if (HERE / "vba" / name).read_text(encoding="utf-8") != texts[name]]
        if (HERE / ADDIN).read_bytes() != Path(scratch, ADDIN).read_bytes():
            stale.append(ADDIN)
    if stale:
        raise SystemExit(f"not up to date: {', '.join(stale)}. Run: python addin/windows/build.py")


if __name__ == "__main__":
    main()
