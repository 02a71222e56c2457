"""The process behind Excel's cells: python -P -m moletally.hosts.windows.serve {class id}

Started by the add-in through xlwings' DLL, one for all workbooks. It writes to the log what a user needs to
know if it can't start, and ends itself rather than let Excel wait for it.
"""

import importlib
import os
import sys
import threading
import time

from moletally.hosts.windows.places import places

__all__ = ["main"]

START_WITHIN = 30.0  # s; Excel waits for the start
NEEDED = ("numpy", "pythoncom", "win32api", "xlwings.com_server", "moletally.hosts.windows.worksheet")


def main(class_id: str) -> int:
    """Serve until Excel lets go; returns the exit code."""
    note(f"starting with {sys.executable}", fresh=True)
    watch = threading.Timer(START_WITHIN, _too_slow)
    watch.daemon = True
    watch.start()
    begun = time.monotonic()
    # xlwings imports pandas if it is there, for converters that are not used here: half of the start.
    sys.modules["pandas"] = None  # type: ignore[assignment]
    for name in NEEDED:
        try:
            importlib.import_module(name)
        except Exception as error:  # whatever it is, the add-in has to show it
            note(f"failed: {name} can't be imported: {' '.join(str(error).split())}")
            return 3
    watch.cancel()
    note(f"ready after {time.monotonic() - begun:.1f} s")
    from xlwings.com_server import serve

    serve(class_id)
    note("ended: Excel let go of it")
    return 0


def note(text: str, *, fresh: bool = False) -> None:
    """A line in the log; a log that can't be written is no reason not to serve."""
    file = places().log
    try:
        file.parent.mkdir(parents=True, exist_ok=True)
        with file.open("w" if fresh else "a", encoding="utf-8") as log:
            log.write(f"{time.strftime('%Y-%m-%d %H:%M:%S')} {text}\n")
    except OSError:
        pass


def _too_slow() -> None:
    note(f"failed: Python was not ready within {START_WITHIN:.0f} s")
    os._exit(4)


if __name__ == "__main__":
    raise SystemExit(main(sys.argv[1]))
