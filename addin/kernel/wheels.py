"""Builds the wheels from this one machine: one for each platform in build.TARGETS, each with its library.

    uv run python addin/kernel/wheels.py                          all of them, into dist
    uv run python addin/kernel/wheels.py windows-x64 --out FOLDER

Every wheel is looked into before it is kept: tag, library, processor, what the library loads and offers. The
compiler for other platforms is the package `ziglang` (100 MB), in the version that pyproject.toml names: uv
fetches it once and keeps it.
"""

import argparse
import os
import re
import shutil
import subprocess
import tempfile
import tomllib
import zipfile
from pathlib import Path

from kernel.build import TARGETS
from kernel.headers import Library, read_library

__all__ = ["BadWheel", "build_wheel", "examine"]

HERE = Path(__file__).parent
ROOT = HERE.parents[1]

# What a library may load: the C library that is part of each system, and nothing that would have to be
# installed. Windows has its C library under the api-ms-win-crt names from version 10 on.
LOADS = {
    "windows": r"KERNEL32\.dll|api-ms-win-crt-\w+-l1-1-0\.dll",
    "macos": r"/usr/lib/libSystem\.B\.dylib",
    "linux": r"libc\.so\.6|libm\.so\.6",
}
NEEDS_AT_MOST = {"windows": (), "macos": (11, 0), "linux": (2, 17)}


class BadWheel(Exception):
    """A wheel can't be built or is not what its name says; the text is the list of what is wrong."""


def build_wheel(name: str, out: Path, project: Path = ROOT) -> Path:
    """Build the wheel for the target `name` into `out`; returns its path.

    By hatchling as a tool and not by `uv build`, whose folder has another name each time: what zig keeps of the
    Windows C library, half a minute's work, counts for one place of zig only.
    """
    with open(project / "pyproject.toml", "rb") as file:
        settings = tomllib.load(file)
    (hatchling,) = settings["build-system"]["requires"]
    ziglang = settings["tool"]["hatch"]["build"]["targets"]["wheel"]["hooks"]["custom"]["ziglang"]
    tool = ["uv", "tool", "run", "--quiet", "--from", hatchling, "--with", ziglang, "hatchling"]
    with tempfile.TemporaryDirectory() as scratch:
        run = subprocess.run(
            [*tool, "build", "--target", "wheel", "--directory", scratch],
            cwd=project, env={**os.environ, "MOLETALLY_KERNEL": name}, capture_output=True, text=True, check=False,
        )  # fmt: skip
        if run.returncode:
            raise BadWheel(f"the wheel for {name} was not built:\n{run.stderr}")
        (made,) = Path(scratch).glob("*.whl")
        out.mkdir(parents=True, exist_ok=True)
        return Path(shutil.move(made, out / made.name))


def examine(wheel: Path, name: str) -> Library:
    """Look into the wheel for the target `name`.

    Returns the header of its library; raises BadWheel with all that is wrong.
    """
    target = TARGETS[name]
    tag = f"py3-none-{target.tag}"
    wrong = [] if wheel.stem.endswith(f"-{tag}") else [f"the name does not end with {tag}"]
    with zipfile.ZipFile(wheel) as archive:
        (about,) = (file for file in archive.namelist() if file.endswith(".dist-info/WHEEL"))
        lines = archive.read(about).decode().splitlines()
        wrong += [
            f"WHEEL lacks Tag: py3-none-{t}"
            for t in target.tag.split(".")
            if f"Tag: py3-none-{t}" not in lines
        ]
        if "Root-Is-Purelib: false" not in lines:
            wrong.append("WHEEL says that it is pure Python")
        libraries = [file for file in archive.namelist() if file.endswith((".dll", ".dylib", ".so"))]
        if libraries != [f"moletally/kernel/compiled/{target.library}"]:
            raise BadWheel("; ".join([*wrong, f"libraries inside: {libraries}"]))
        library = read_library(archive.read(libraries[0]))
    if wrong := wrong + complaints(library, name):
        raise BadWheel(f"{wheel.name}: " + "; ".join(wrong))
    return library


def complaints(library: Library, name: str) -> list[str]:
    """What keeps a library from running on every machine of the target `name`."""
    system = name.split("-")[0]
    wrong = [] if library.machine == name else [f"the library is for {library.machine}"]
    wrong += [f"it loads {file}" for file in sorted(library.imports) if not re.fullmatch(LOADS[system], file)]
    if library.needs > NEEDS_AT_MOST[system]:
        wrong.append(f"it needs {'.'.join(map(str, library.needs))} of {system}")
    if name == "macos-arm64" and not library.signed:
        wrong.append("it is not signed")
    if missing := declared() ^ library.exports:
        wrong.append(f"declared and offered names differ: {', '.join(sorted(missing))}")
    return wrong


def declared() -> frozenset[str]:
    """The functions that moletally.h declares for Python."""
    header = (HERE / "moletally.h").read_text(encoding="utf-8")
    return frozenset(re.findall(r"^MT_API\b[^;(]*?(\w+)\(", header, re.MULTILINE))


def main() -> None:
    """Read the command line, build and examine."""
    parser = argparse.ArgumentParser(
        description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter
    )
    parser.add_argument("names", nargs="*", metavar="NAME", help=f"of {', '.join(TARGETS)}; default all")
    parser.add_argument("--out", type=Path, default=ROOT / "dist", help="folder to write into")
    options = parser.parse_args()
    if unknown := set(options.names) - set(TARGETS):
        parser.error(f"unknown: {', '.join(sorted(unknown))}; known are {', '.join(TARGETS)}")
    for name in options.names or TARGETS:
        try:
            library = examine(wheel := build_wheel(name, options.out), name)
        except BadWheel as error:
            raise SystemExit(str(error)) from error
        needs = ".".join(map(str, library.needs)) or "-"
        print(
            f"{wheel.name}: {wheel.stat().st_size:,} bytes, loads {', '.join(sorted(library.imports))}; needs {needs}"
        )


if __name__ == "__main__":
    main()
