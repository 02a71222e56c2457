"""What `moletally excel` does and says."""

import sys
import tempfile
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path

from moletally.hosts.windows import registry, settings
from moletally.hosts.windows.chain import chain
from moletally.hosts.windows.install import InstallError, install, uninstall
from moletally.hosts.windows.own_excel import make
from moletally.hosts.windows.places import ADDIN, places, vba_folder

__all__ = ["InstallError", "installed", "status", "uninstalled"]

NOT_HERE = "the add-in is for Excel on Windows. Here, recalculate a workbook without Excel: moletally recalc BOOK.xlsx"
NO_EXCEL = (
    "there is no Excel on this computer, so nothing was installed. "
    "Recalculate a workbook without it: moletally recalc BOOK.xlsx"
)
STATES = {True: "ok", False: "broken", None: "unknown"}


def installed(with_excel: bool) -> list[str]:
    """Install the add-in; with_excel: your own Excel makes the macro file, and no prebuilt one is placed.

    Raises
    ------
    InstallError
        With the reason and what to do.
    """
    with _on_windows():
        if not registry.excel_is_registered():
            raise InstallError(NO_EXCEL)
        if not with_excel:
            return install(places())
        here = settings.found_here("")
        with tempfile.TemporaryDirectory(ignore_cleanup_errors=True) as scratch:
            target = Path(scratch, ADDIN)
            make(vba_folder(), target, {"moletally": here.moletally, "xlwings": here.xlwings})
            done = install(places(), target)
        return ["your own Excel made the macro file: it has no tab, its functions are the same", *done]


def uninstalled() -> list[str]:
    """Take the add-in away.

    Raises
    ------
    InstallError
        With the reason and what to do.
    """
    with _on_windows():
        return uninstall(places())


def status(show: Callable[[str], None]) -> bool:
    """Show each link of the chain and the mend for each that does not hold; True if all hold.

    Raises
    ------
    InstallError
        On another system than Windows.
    """
    with _on_windows():
        links = chain(places())
    for link in links:
        show(f"{STATES[link.state]:7} {link.name}: {link.found}")
        if link.mend:
            show(f"        -> {link.mend}")
    return all(link.state for link in links)


@contextmanager
def _on_windows() -> Iterator[None]:
    """What Windows refuses becomes a sentence."""
    if sys.platform != "win32":
        raise InstallError(NOT_HERE)
    try:
        yield
    except OSError as error:
        raise InstallError(f"Windows refuses {error.filename or 'it'}: {error.strerror or error}") from None
