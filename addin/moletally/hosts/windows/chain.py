"""Each link between a cell and its answer: is it there, and if not, what to do."""

import json
import re
import subprocess
import sys
import zipfile
from dataclasses import dataclass
from pathlib import Path

import moletally
from moletally.hosts.windows import registry, settings
from moletally.hosts.windows.install import is_ours
from moletally.hosts.windows.places import Places, packaged_addin
from moletally.hosts.windows.settings import Settings

__all__ = ["Link", "chain"]

INSTALL = "run: moletally excel install"
REINSTALL = "run: pip install --force-reinstall moletally, then: moletally excel install"
START_WITHIN = 30  # s
NEEDED = ("numpy", "scipy", "pandas", "pythoncom", "win32api", "xlwings", "moletally")
PROBE = f"""
import importlib, json
found = {{}}
for name in {NEEDED!r}:
    try:
        module = importlib.import_module(name)
        found[name] = str(getattr(module, "__version__", "there"))
    except Exception as error:
        found[name] = "! " + " ".join(str(error).split())
print(json.dumps(found))
"""


@dataclass(frozen=True, slots=True)
class Link:
    """A link of the chain: `mend` is empty if it holds."""

    name: str
    found: str
    mend: str = ""

    @property
    def holds(self) -> bool:
        """True if there is nothing to mend."""
        return not self.mend


def chain(places: Places) -> list[Link]:
    """All links, from Excel to the kernel."""
    found = settings.read(places)
    imports = _imports(found.python) if found else {}
    return [
        _excel(),
        _addin(places),
        _settings(places, found),
        _versions(places, found),
        _trust(),
        _python(found, imports),
        *_packages(imports),
        _dll(found),
        _kernel(imports),
    ]


def _excel() -> Link:
    there = registry.excel_is_registered()
    return Link("Excel", "registered" if there else "not found", "" if there else "install Excel for Windows")


def _addin(places: Places) -> Link:
    name = "macro file"
    if not places.addin.is_file():
        return Link(name, f"{places.addin} is missing", INSTALL)
    if registry.is_disabled():
        return Link(name, "Excel has disabled it after a crash",
                    "in Excel: File, Options, Add-ins, Manage: Disabled Items, Go, choose moletally, Enable")  # fmt: skip
    if not is_ours(places.addin):
        return Link(name, f"{places.addin} is another file", "move it away, then " + INSTALL)
    if Path(f"{places.addin}:Zone.Identifier").is_file():
        return Link(name, "marked as coming from the internet: Excel blocks its macros", INSTALL)
    same = places.addin.read_bytes() == packaged_addin().read_bytes()
    return Link(name, f"{places.addin}{'' if same else ', made by your own Excel or another version'}")


def _settings(places: Places, found: Settings | None) -> Link:
    if found is None:
        return Link("settings", f"{places.settings} is missing", INSTALL)
    return Link("settings", str(places.settings))


def _versions(places: Places, found: Settings | None) -> Link:
    """The macro file, the settings and this installation have to be of one version."""
    wanted = _wanted(places.addin)
    have = {"moletally": found.moletally, "xlwings": found.xlwings} if found else {}
    if not wanted or not have:
        return Link("versions", "can't be compared", INSTALL)
    shown = ", ".join(f"{k}: macro file {wanted.get(k, '?')}, installed {have[k]}" for k in have)
    fits = wanted == have and have["moletally"] == moletally.__version__
    return Link("versions", shown, "" if fits else INSTALL)


def _wanted(addin: Path) -> dict[str, str]:
    """The versions that a macro file was built for, from its sheet of settings."""
    try:
        with zipfile.ZipFile(addin) as package:
            texts = re.findall(r"<t[^>]*>([^<]*)</t>", package.read("xl/sharedStrings.xml").decode())
    except (OSError, KeyError, zipfile.BadZipFile):
        return {}
    return dict(zip(texts[::2], texts[1::2], strict=False))


def _trust() -> Link:
    policies = registry.forbidden()
    if policies:
        return Link("macros", "; ".join(policies), "ask IT to allow macros from Excel's start-up folder")
    return Link("macros", "no policy forbids them")


def _python(found: Settings | None, imports: dict[str, str]) -> Link:
    if found is None:
        return Link("Python", "none is pinned", INSTALL)
    if not Path(found.python).is_file():
        return Link(
            "Python", f"{found.python} is missing", "install Python and moletally again, then " + INSTALL
        )
    if not imports:
        return Link("Python", f"{found.python} does not start", REINSTALL)
    other = (
        ""
        if Path(found.python) == Path(sys.executable)
        else f", not the one that runs this: {sys.executable}"
    )
    return Link("Python", found.python + other)


def _packages(imports: dict[str, str]) -> list[Link]:
    names = {
        "pywin32": ("pythoncom", "win32api"),
        "xlwings": ("xlwings",),
        "libraries": ("numpy", "scipy", "pandas"),
    }
    links = []
    for name, parts in names.items():
        states = [f"{part} {imports.get(part, '! not tried')}" for part in parts]
        broken = any("! " in state for state in states)
        links.append(Link(name, ", ".join(s.replace("! ", "can't be imported: ") for s in states),
                          REINSTALL if broken else ""))  # fmt: skip
    return links


def _dll(found: Settings | None) -> Link:
    if found is None:
        return Link("DLL", "none is pinned", INSTALL)
    if not Path(found.dll64).is_file():
        return Link("DLL", f"{found.dll64} is missing", REINSTALL)
    if f"-{found.xlwings}.dll" not in found.dll64:
        return Link("DLL", f"{found.dll64} is not of xlwings {found.xlwings}", INSTALL)
    without = "" if found.dll32 else "; none for a 32-bit Excel"
    return Link("DLL", found.dll64 + without)


def _kernel(imports: dict[str, str]) -> Link:
    version = imports.get("numpy", "! not tried")
    broken = version.startswith("! ")
    return Link("kernel", "none" if broken else f"numpy {version}", REINSTALL if broken else "")


def _imports(python: str) -> dict[str, str]:
    """Version or trouble of each package in the pinned Python; empty if it does not start."""
    try:
        done = subprocess.run(
            [python, "-P", "-c", PROBE], capture_output=True, text=True, timeout=START_WITHIN, check=False
        )
        found: dict[str, str] = json.loads(done.stdout)
    except (OSError, subprocess.TimeoutExpired, json.JSONDecodeError):
        return {}
    return found
