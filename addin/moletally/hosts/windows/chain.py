"""Each link between a cell and its answer: is it there, and if not, what to do."""

import json
import re
import subprocess
import sys
import tempfile
import zipfile
from dataclasses import dataclass
from pathlib import Path

from moletally.hosts.windows import registry, settings
from moletally.hosts.windows.install import is_marked, title
from moletally.hosts.windows.own_excel import TITLE
from moletally.hosts.windows.places import Places, packaged_addin
from moletally.hosts.windows.policies import rules
from moletally.hosts.windows.settings import Settings

__all__ = ["Link", "chain"]

INSTALL = "run: moletally excel install"
REINSTALL = "run: pip install --force-reinstall moletally, then: moletally excel install"
CLOSE = "to have it looked at, close all Excel windows and run this again"
NOT_TRIED = "not tried: no Python that starts is pinned"
START_WITHIN = 120  # s; the first import of everything compiles it, and a virus scanner reads along
VERSIONED = ("moletally", "xlwings")  # what belongs together
NEEDED = ("numpy", "scipy", "pandas", "pythoncom", "win32api", *VERSIONED)
PROBE = f"""
import importlib, json, sys
found = {{}}
for name in {NEEDED!r}:
    try:
        module = importlib.import_module(name)
        found[name] = str(getattr(module, "__version__", "there"))
    except Exception as error:
        found[name] = "! " + " ".join(str(error).split())
try:
    from moletally.sheet.engine import engine_in_use
    found["engine"] = engine_in_use()
except Exception as error:
    found["engine"] = "! " + " ".join(str(error).split())
with open(sys.argv[1], "w", encoding="utf-8") as answer:
    json.dump(found, answer)
"""


@dataclass(frozen=True, slots=True)
class Link:
    """A link of the chain.

    state : True if it holds, False if it is broken, None if that can't be told
    mend : what to do if it does not hold or could do better; "" where another link has to be mended first
    """

    name: str
    state: bool | None
    found: str
    mend: str = ""


def chain(places: Places) -> list[Link]:
    """All links, from Excel to the kernel."""
    found = settings.read(places)
    imports = _imports(found.python) if found else {}
    return [
        _excel(),
        _addin(places),
        _settings(places, found),
        _versions(places, found, imports),
        _trust(places),
        _python(found, imports),
        *_packages(imports),
        *_dlls(found),
        _kernel(imports),
    ]


def _excel() -> Link:
    if registry.excel_is_registered():
        return Link("Excel", True, "registered")
    return Link("Excel", False, "not found",
                "install Excel for Windows; without it: moletally recalc BOOK.xlsx")  # fmt: skip


def _addin(places: Places) -> Link:
    name = "macro file"
    if not places.addin.is_file():
        return Link(name, False, f"{places.addin} is missing", INSTALL)
    if registry.is_disabled():
        return Link(name, False, "Excel has disabled it after a crash",
                    "in Excel: File, Options, Add-ins, Manage: Disabled Items, Go, choose moletally, Enable")  # fmt: skip
    try:
        called = title(places.addin)
        same = places.addin.read_bytes() == packaged_addin().read_bytes()
    except PermissionError:
        return Link(name, None, f"{places.addin} is held, most likely by Excel", CLOSE)
    if not called.startswith("moletally"):
        return Link(name, False, f"{places.addin} is another file", "move it away, then " + INSTALL)
    if is_marked(places.addin):
        return Link(name, False, "marked as coming from the internet: Excel blocks its macros", INSTALL)
    if called == TITLE:
        return Link(name, True, f"{places.addin}, made by your own Excel")
    if not same:
        return Link(name, False, f"{places.addin} is not the file that came with this installation", INSTALL)
    return Link(name, True, str(places.addin))


def _settings(places: Places, found: Settings | None) -> Link:
    if found is None:
        return Link("settings", False, f"{places.settings} is missing", INSTALL)
    if doubts := settings.unreadable(places):
        return Link("settings", None, "; ".join(doubts),
                    "if Excel says that moletally is not installed, use an account with plain letters")  # fmt: skip
    return Link("settings", True, str(places.settings))


def _versions(places: Places, found: Settings | None, imports: dict[str, str]) -> Link:
    """The macro file, the settings and the pinned Python have to be of one version."""
    try:
        wanted = _wanted(places.addin)
    except PermissionError:
        return Link("versions", None, "the macro file is held, most likely by Excel", CLOSE)
    if not wanted or found is None:
        return Link("versions", None, "can't be compared: nothing is installed")
    if not imports:
        return Link("versions", None, "can't be compared: the pinned Python does not start")
    noted = {"moletally": found.moletally, "xlwings": found.xlwings}
    parts = [[source.get(name, "none") for source in (wanted, noted, imports)] for name in VERSIONED]
    if all(len(set(part)) == 1 for part in parts):
        return Link("versions", True, ", ".join(f"{n} {p[0]}" for n, p in zip(VERSIONED, parts, strict=True)))
    shown = (f"{n}: macro file {p[0]}, settings {p[1]}, Python {p[2].removeprefix('! ')}"
             for n, p in zip(VERSIONED, parts, strict=True))  # fmt: skip
    return Link("versions", False, "; ".join(shown), INSTALL if parts[1][0] == parts[1][2] else REINSTALL)


def _wanted(addin: Path) -> dict[str, str]:
    """The versions that a macro file was built for, from its sheet of settings."""
    try:
        with zipfile.ZipFile(addin) as package:
            texts = re.findall(r"<t[^>]*>([^<]*)</t>", package.read("xl/sharedStrings.xml").decode())
    except (FileNotFoundError, KeyError, zipfile.BadZipFile):
        return {}
    return dict(zip(texts[::2], texts[1::2], strict=False))


def _trust(places: Places) -> Link:
    """Macros of the start-up folder have to be allowed, by Excel's list of trusted folders and by IT."""
    found = rules()
    for stops in (True, None):
        if against := [rule for rule in found if rule.stops is stops]:
            mends = dict.fromkeys(rule.mend for rule in against)
            return Link(
                "macros", False if stops else None, "; ".join(r.text for r in against), "; ".join(mends)
            )
    if missing := registry.untrusting(places.startup):
        versions = " and ".join(missing)
        return Link("macros", False, f"Excel {versions} does not trust {places.startup}", INSTALL)
    return Link(
        "macros", True, "; ".join(["Excel trusts its start-up folder", *(rule.text for rule in found)])
    )


def _python(found: Settings | None, imports: dict[str, str]) -> Link:
    if found is None:
        return Link("Python", False, "none is pinned", INSTALL)
    pinned = Path(found.python)
    if not pinned.is_file():
        return Link(
            "Python", False, f"{pinned} is missing", "install Python and moletally again, then " + INSTALL
        )
    if not imports:
        return Link("Python", False, f"{pinned} does not start", REINSTALL)
    same = pinned.samefile(sys.executable)
    return Link(
        "Python", True, f"{pinned}{'' if same else f', not the one that runs this: {sys.executable}'}"
    )


def _packages(imports: dict[str, str]) -> list[Link]:
    names = {
        "pywin32": ("pythoncom", "win32api"),
        "xlwings": ("xlwings",),
        "libraries": ("numpy", "scipy", "pandas"),
    }
    if not imports:
        return [Link(name, None, NOT_TRIED) for name in names]
    links = []
    for name, parts in names.items():
        states = [f"{part} {imports[part]}" for part in parts]
        holds = not any(imports[part].startswith("! ") for part in parts)
        shown = ", ".join(state.replace("! ", "can't be imported: ") for state in states)
        links.append(Link(name, holds, shown, "" if holds else REINSTALL))
    return links


def _dlls(found: Settings | None) -> list[Link]:
    if found is None:
        return [Link("DLL", None, "none is pinned")]
    return [
        _dll(found, found.dll64, "DLL"),
        *([_dll(found, found.dll32, "DLL for a 32-bit Excel")] if found.dll32 else []),
    ]


def _dll(found: Settings, file: str, name: str) -> Link:
    if not Path(file).is_file():
        return Link(name, False, f"{file} is missing", REINSTALL)
    if not file.lower().endswith(f"-{found.xlwings}.dll"):
        return Link(name, False, f"{file} is not of xlwings {found.xlwings}", INSTALL)
    return Link(name, True, file)


def _kernel(imports: dict[str, str]) -> Link:
    """What computes: the compiled library, or numpy in its place, as right but slower."""
    if not imports:
        return Link("kernel", None, NOT_TRIED)
    engine, version = imports["engine"], imports["numpy"]
    if engine.startswith("! "):
        return Link("kernel", False, f"none: {engine.removeprefix('! ')}", REINSTALL)
    found = f"{engine}, numpy {version}"
    if not engine.startswith("compiled"):
        return Link(
            "kernel", True, f"{found}: right but slower, the compiled kernel can't be loaded", REINSTALL
        )
    return Link("kernel", True, found)


def _imports(python: str) -> dict[str, str]:
    """Version or trouble of each package in the pinned Python; empty if it does not start.

    The answer comes in a file: a pipe would be waited for as long as any child of a Python that hangs lives.
    """
    with tempfile.TemporaryDirectory(ignore_cleanup_errors=True) as scratch:
        answer = Path(scratch, "found.json")
        try:
            subprocess.run([python, "-P", "-c", PROBE, str(answer)], timeout=START_WITHIN, check=False,
                           stdin=subprocess.DEVNULL, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)  # fmt: skip
            found: dict[str, str] = json.loads(answer.read_text(encoding="utf-8"))
        except (OSError, subprocess.TimeoutExpired, ValueError):
            return {}
    return found
