"""Puts the add-in where Excel finds it, and takes it away without trace. Needs no admin rights and no network."""

import re
import shutil
import zipfile
from pathlib import Path

from moletally.hosts.windows import registry, settings
from moletally.hosts.windows.places import Places, packaged_addin
from moletally.hosts.windows.settings import InstallError

__all__ = ["InstallError", "install", "is_ours", "place_addin", "uninstall"]

CLOSE_EXCEL = "Excel holds {file}: close all Excel windows and run this again"


def install(places: Places) -> list[str]:
    """Install or renew; what was done, a line each.

    Raises
    ------
    InstallError
        With the reason and what to do; nothing is changed then.
    """
    made = _prepare(places)
    here = settings.found_here(made)
    place_addin(places, packaged_addin())
    settings.write(places, here)
    return [
        f"placed the macro file: {places.addin}",
        *_unmark(places.addin),
        f"pinned this Python: {here.python}",
        f"wrote what the macro file has to know: {places.settings}",
        *registry.trust(places.startup),
        *(f"IT has to know: {text}" for text in registry.forbidden()),
        "Start Excel again and type a function, such as =MOLE_CSTR(, into a cell.",
    ]


def _prepare(places: Places) -> str:
    """Looks for what is in the way; "yes" if the start-up folder has to be made, now or at an earlier install."""
    if places.addin.exists() and not is_ours(places.addin):
        raise InstallError(f"{places.addin} is another file of that name: move it away and run this again")
    before = settings.read(places)
    if before is not None:
        return before.made
    return "" if places.startup.is_dir() else "yes"


def place_addin(places: Places, source: Path) -> None:
    """Copy a macro file into the start-up folder, whole or not at all.

    Raises
    ------
    InstallError
        If Excel holds the one that is there.
    """
    places.startup.mkdir(parents=True, exist_ok=True)
    unfinished = places.addin.with_suffix(".new")
    shutil.copyfile(source, unfinished)
    try:
        unfinished.replace(places.addin)
    except PermissionError:
        unfinished.unlink(missing_ok=True)
        raise InstallError(CLOSE_EXCEL.format(file=places.addin)) from None


def uninstall(places: Places) -> list[str]:
    """Undo `install`; what was done, a line each.

    Raises
    ------
    InstallError
        If Excel holds the macro file.
    """
    before = settings.read(places)
    done = [*_remove_addin(places), *registry.distrust()]
    for file in (places.settings, places.log):
        if file.is_file():
            file.unlink()
            done.append(f"removed {file}")
    made = [places.startup] if before is not None and before.made else []
    for folder in (places.data, *made):
        if folder.is_dir() and not any(folder.iterdir()):
            folder.rmdir()
            done.append(f"removed the empty folder {folder}")
    return done or ["nothing was installed for this user"]


def _remove_addin(places: Places) -> list[str]:
    if not places.addin.exists():
        return []
    if not is_ours(places.addin):
        return [f"left alone: {places.addin} is another file of that name"]
    try:
        places.addin.unlink()
    except PermissionError:
        raise InstallError(CLOSE_EXCEL.format(file=places.addin)) from None
    return [f"removed {places.addin}"]


def is_ours(file: Path) -> bool:
    """True for a macro file of ours, of any version: it says so in its title."""
    try:
        with zipfile.ZipFile(file) as package:
            title = re.search(rb"<dc:title>([^<]*)", package.read("docProps/core.xml"))
    except (OSError, KeyError, zipfile.BadZipFile):
        return False
    return title is not None and title[1].startswith(b"moletally")


def _unmark(file: Path) -> list[str]:
    """Removes the mark that Windows puts on files from the internet; Excel blocks macros of such files."""
    try:
        Path(f"{file}:Zone.Identifier").unlink()
    except OSError:
        return ["the file carries no mark of coming from the internet"]
    return ["removed the mark of coming from the internet"]
