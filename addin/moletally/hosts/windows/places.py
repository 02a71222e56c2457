"""Where the parts of the add-in are: in the package, and for the user who installs it."""

import os
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

import moletally

__all__ = ["ADDIN", "Places", "packaged_addin", "places", "vba_folder"]

ADDIN = "moletally.xlam"


@dataclass(frozen=True, slots=True)
class Places:
    """The user's files.

    startup : the folder from which Excel loads what it finds; for every colleague at the same relative place
    data : settings and log of the add-in
    """

    startup: Path
    data: Path

    @property
    def addin(self) -> Path:
        """The macro file that Excel loads."""
        return self.startup / ADDIN

    @property
    def settings(self) -> Path:
        """What the macro file has to know of this computer."""
        return self.data / "excel.conf"

    @property
    def log(self) -> Path:
        """What the Python process said at its last start."""
        return self.data / "server.log"


def places(environment: Mapping[str, str] = os.environ) -> Places:
    """The places of the user whose environment this is."""
    home = Path(environment.get("USERPROFILE") or Path.home())
    roaming = Path(environment.get("APPDATA") or home / "AppData" / "Roaming")
    local = Path(environment.get("LOCALAPPDATA") or home / "AppData" / "Local")
    return Places(roaming / "Microsoft" / "Excel" / "XLSTART", local / "moletally")


def packaged_addin() -> Path:
    """The macro file that comes with the package."""
    return _part(ADDIN)


def vba_folder() -> Path:
    """The texts of the macro file's modules."""
    return _part("vba")


def _part(name: str) -> Path:
    """Inside an installed package, or where it is built in a source tree."""
    inside = Path(__file__).parent / name
    return inside if inside.exists() else Path(moletally.__file__).parents[1] / "windows" / name
