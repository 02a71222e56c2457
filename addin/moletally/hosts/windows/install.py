"""Puts the add-in where Excel finds it, and takes it away without trace. Needs no admin rights and no network."""

import re
import shutil
import zipfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from moletally.hosts.windows import registry, settings
from moletally.hosts.windows.places import Places, packaged_addin
from moletally.hosts.windows.policies import rules
from moletally.hosts.windows.settings import InstallError

__all__ = ["InstallError", "install", "is_marked", "is_ours", "title", "uninstall"]

HELD = (
    "{file} can't be opened or replaced, most likely because Excel holds it: "
    "close all Excel windows and run this again"
)
MARK = ":Zone.Identifier"  # the stream in which Windows notes that a file came from the internet


def install(places: Places, source: Path | None = None) -> list[str]:
    """Install or renew; what was done, a line each.

    source : the macro file to place, default the packaged one

    Raises
    ------
    InstallError
        With the reason and what to do; what was installed before is then still there.
    """
    made = _prepare(places)
    here = settings.found_here(made)
    _place(places, source or packaged_addin())
    settings.write(places, here)
    return [
        f"placed the macro file: {places.addin}",
        *_unmark(places.addin),
        f"pinned this Python: {here.python}",
        f"wrote what the macro file has to know: {places.settings}",
        *registry.trust(places.startup),
        *(f"careful: {rule.text}; {rule.mend}" if rule.mend else f"noted: {rule.text}" for rule in rules()),
        *(f"careful: {text}" for text in settings.unreadable(places)),
        "Start Excel again and type a function, such as =MOLE_CSTR(, into a cell.",
    ]


def _prepare(places: Places) -> str:
    """Looks for what is in the way; how many folders down to the start-up folder are missing, now or before."""
    with _unless_held(places.addin):
        if places.addin.exists() and not is_ours(places.addin):
            raise InstallError(
                f"{places.addin} is another file of that name: move it away and run this again"
            )
    before = settings.read(places)
    if before is not None:
        return before.made
    missing = [folder for folder in (places.startup, *places.startup.parents) if not folder.exists()]
    return str(len(missing)) if missing else ""


def _place(places: Places, source: Path) -> None:
    """Copy a macro file into the start-up folder, whole or not at all."""
    places.startup.mkdir(parents=True, exist_ok=True)
    unfinished = places.addin.with_suffix(".new")
    try:
        shutil.copyfile(source, unfinished)
        with _unless_held(places.addin):
            unfinished.replace(places.addin)
    finally:
        unfinished.unlink(missing_ok=True)


def uninstall(places: Places) -> list[str]:
    """Undo `install`; what was done, a line each.

    Raises
    ------
    InstallError
        If Excel holds the macro file; nothing is removed then.
    """
    before = settings.read(places)
    done = [*_remove_addin(places), *registry.distrust(places.startup)]
    for file in (places.settings, places.log):
        if file.is_file():
            file.unlink()
            done.append(f"removed {file}")
    made = int(before.made) if before is not None and before.made.isdigit() else 0
    return [
        *done,
        *_remove_empty([places.data]),
        *_remove_empty([places.startup, *places.startup.parents][:made]),
    ] or ["nothing was installed for this user"]


def _remove_empty(folders: list[Path]) -> list[str]:
    """Remove folders, the innermost first, up to one that holds something."""
    done: list[str] = []
    for folder in folders:
        if not folder.is_dir():
            continue
        if any(folder.iterdir()):
            return [*done, f"left alone: {folder} holds other files"]
        folder.rmdir()
        done.append(f"removed the empty folder {folder}")
    return done


def _remove_addin(places: Places) -> list[str]:
    with _unless_held(places.addin):
        if not places.addin.exists():
            return []
        if not is_ours(places.addin):
            return [f"left alone: {places.addin} is another file of that name"]
        places.addin.unlink()
    return [f"removed {places.addin}"]


def is_ours(file: Path) -> bool:
    """True for a macro file of ours, of any version: it says so in its title."""
    return title(file).startswith("moletally")


def title(file: Path) -> str:
    """The title of a workbook; "" if the file is none.

    Raises
    ------
    PermissionError
        If another program holds it: whose file it is can't be told then.
    """
    try:
        with zipfile.ZipFile(file) as package:
            found = re.search(
                r"<dc:title>([^<]*)", package.read("docProps/core.xml").decode("utf-8", "replace")
            )
    except (KeyError, zipfile.BadZipFile):
        return ""
    return found[1] if found else ""


def is_marked(file: Path) -> bool:
    """True if Windows noted that the file came from the internet; Excel blocks macros of such files."""
    try:
        Path(f"{file}{MARK}").open("rb").close()
    except OSError:  # no such stream, or a file system without streams
        return False
    return True


def _unmark(file: Path) -> list[str]:
    if not is_marked(file):
        return ["the file carries no mark of coming from the internet"]
    try:
        Path(f"{file}{MARK}").unlink()
    except OSError:
        return [
            "the mark of coming from the internet can't be removed: right-click the file, Properties, Unblock"
        ]
    return ["removed the mark of coming from the internet"]


@contextmanager
def _unless_held(file: Path) -> Iterator[None]:
    try:
        yield
    except PermissionError:
        raise InstallError(HELD.format(file=file)) from None
