"""What `moletally excel` does and says."""

import sys
import tempfile
from collections.abc import Callable
from pathlib import Path

from moletally.hosts.windows import registry, settings
from moletally.hosts.windows.chain import chain
from moletally.hosts.windows.install import InstallError, install, place_addin, uninstall
from moletally.hosts.windows.own_excel import make
from moletally.hosts.windows.places import ADDIN, places, vba_folder

__all__ = ["InstallError", "installed", "status", "uninstalled"]

NOT_HERE = "the add-in is for Excel on Windows. Here, recalculate a workbook without Excel: moletally recalc BOOK.xlsx"
NO_EXCEL = (
    "there is no Excel on this computer, so nothing was installed. "
    "Recalculate a workbook without it: moletally recalc BOOK.xlsx"
)
WITH_EXCEL = "moletally - made by your own Excel"


def installed(with_excel: bool) -> list[str]:
    """Install the add-in; with_excel: your own Excel makes the macro file.

    Raises
    ------
    InstallError
        With the reason and what to do.
    """
    _only_on_windows()
    if not registry.excel_is_registered():
        raise InstallError(NO_EXCEL)
    done = install(places())
    if not with_excel:
        return done
    here = settings.found_here("")
    with tempfile.TemporaryDirectory() as scratch:
        target = Path(scratch, ADDIN)
        make(vba_folder(), target, {"moletally": here.moletally, "xlwings": here.xlwings}, WITH_EXCEL)
        place_addin(places(), target)
    return [
        *done,
        "replaced the macro file by one that your own Excel made: it has no tab, its functions are the same",
    ]


def uninstalled() -> list[str]:
    """Take the add-in away.

    Raises
    ------
    InstallError
        With the reason and what to do.
    """
    _only_on_windows()
    return uninstall(places())


def status(show: Callable[[str], None]) -> bool:
    """Show each link of the chain and the mend for each that is broken; True if all hold.

    Raises
    ------
    InstallError
        On another system than Windows.
    """
    _only_on_windows()
    links = chain(places())
    for link in links:
        show(f"{'ok' if link.holds else 'broken':7} {link.name}: {link.found}")
        if not link.holds:
            show(f"        -> {link.mend}")
    return all(link.holds for link in links)


def _only_on_windows() -> None:
    if sys.platform != "win32":
        raise InstallError(NOT_HERE)
