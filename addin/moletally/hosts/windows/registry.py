"""What Windows' registry knows of Excel: whether it is there, which folders it trusts, what it has disabled."""

import os
import sys
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

__all__ = [
    "Location", "distrust", "excel_is_registered", "is_disabled", "number", "security_keys", "trust", "untrusting",
]  # fmt: skip

OURS = "moletally"  # the description of an entry that we made
OFFICE = r"Software\Microsoft\Office"


@dataclass(frozen=True, slots=True)
class Location:
    """A trusted location of Excel, as its key holds it; Excel's user may have renumbered it."""

    name: str
    path: str
    description: str = ""
    subfolders: bool = False

    def covers(self, folder: str) -> bool:
        """True if files in that folder are trusted by this entry."""
        here, there = (_plain(path) for path in (self.path, folder))
        return here == there or (self.subfolders and here != "" and there.startswith(here + "\\"))

    def is_ours(self, folder: str) -> bool:
        """True for an entry that `trust` added: somebody else's may carry the same description."""
        return self.description == OURS and _plain(self.path) == _plain(folder)


def _plain(path: str) -> str:
    return os.path.expandvars(path).replace("/", "\\").rstrip("\\").lower()


if sys.platform == "win32":
    import winreg

    Key = tuple[int, str]
    USER, COMPUTER = winreg.HKEY_CURRENT_USER, winreg.HKEY_LOCAL_MACHINE

    def excel_is_registered() -> bool:
        """True if programs can start Excel on this computer."""
        return any(_has(root, rf"{path}Excel.Application\CLSID") for root, path in (
            (winreg.HKEY_CLASSES_ROOT, ""), (USER, "Software\\Classes\\"), (COMPUTER, "Software\\Classes\\"),
        ))  # fmt: skip

    def trust(folder: Path) -> list[str]:
        """Make sure that Excel trusts a folder; what was found or done, a line per version of Excel."""
        done = []
        for version, key in _trusted_keys():
            locations = _locations(key)
            if any(location.covers(str(folder)) for location in locations):
                done.append(f"Excel {version} trusts that folder already")
                continue
            free = 1 + max((_digits(location.name) for location in locations), default=-1)
            with winreg.CreateKey(USER, rf"{key}\Location{free}") as entry:
                winreg.SetValueEx(entry, "Path", 0, winreg.REG_SZ, str(folder) + os.sep)
                winreg.SetValueEx(entry, "Description", 0, winreg.REG_SZ, OURS)
                winreg.SetValueEx(entry, "AllowSubfolders", 0, winreg.REG_DWORD, 0)
            done.append(f"added that folder to the trusted locations of Excel {version}")
        return done or ["Excel trusts its start-up folder by itself"]

    def distrust(folder: Path) -> list[str]:
        """Take back what `trust` added for that folder."""
        done = []
        for version, key in _trusted_keys():
            for location in _locations(key):
                if location.is_ours(str(folder)):
                    winreg.DeleteKey(USER, rf"{key}\{location.name}")
                    done.append(f"removed our entry from the trusted locations of Excel {version}")
        return done

    def untrusting(folder: Path) -> list[str]:
        """The versions of Excel that keep a list of trusted locations on which the folder is missing."""
        return [version for version, key in _trusted_keys()
                if not any(location.covers(str(folder)) for location in _locations(key))]  # fmt: skip

    def is_disabled() -> bool:
        """True if Excel put the add-in on its list of disabled items after a crash."""
        for version in _subkeys(USER, OFFICE):
            for data in _values(rf"{OFFICE}\{version}\Excel\Resiliency\DisabledItems"):
                if isinstance(data, bytes) and OURS.encode("utf-16le") in data.lower():
                    return True
        return False

    def security_keys(*parents: str) -> list[Key]:
        """Excel's keys of security below each parent, for the user and the computer, of every version."""
        return [(root, rf"{parent}\{version}\Excel\Security")
                for root in (USER, COMPUTER) for parent in parents for version in _subkeys(root, parent)]  # fmt: skip

    def number(security: Key, below: str, name: str) -> object:
        """A value below a key of `security_keys`; None if it is not set."""
        try:
            with winreg.OpenKey(security[0], security[1] + below) as key:
                return _value(key, name)
        except OSError:
            return None

    def _trusted_keys() -> Iterator[tuple[str, str]]:
        for version in _subkeys(USER, OFFICE):
            key = rf"{OFFICE}\{version}\Excel\Security\Trusted Locations"
            if _has(USER, key):
                yield version, key

    def _locations(key: str) -> list[Location]:
        found = []
        for name in _subkeys(USER, key):
            with winreg.OpenKey(USER, rf"{key}\{name}") as entry:
                path, description = (str(_value(entry, n) or "") for n in ("Path", "Description"))
                found.append(Location(name, path, description, _value(entry, "AllowSubfolders") == 1))
        return found

    def _has(root: int, path: str) -> bool:
        try:
            winreg.OpenKey(root, path).Close()
        except OSError:
            return False
        return True

    def _subkeys(root: int, path: str) -> list[str]:
        try:
            with winreg.OpenKey(root, path) as key:
                return [winreg.EnumKey(key, i) for i in range(winreg.QueryInfoKey(key)[0])]
        except OSError:
            return []

    def _values(path: str) -> list[object]:
        try:
            with winreg.OpenKey(USER, path) as key:
                return [winreg.EnumValue(key, i)[1] for i in range(winreg.QueryInfoKey(key)[1])]
        except OSError:
            return []

    def _value(key: winreg.HKEYType, name: str) -> object:
        try:
            return winreg.QueryValueEx(key, name)[0]
        except OSError:
            return None

    def _digits(location: str) -> int:
        digits = location.removeprefix("Location")
        return int(digits) if digits.isdigit() else -1

else:
    Key = tuple[int, str]

    def excel_is_registered() -> bool:
        """There is no Excel for Windows here."""
        return False

    def trust(folder: Path) -> list[str]:
        """Nothing to do without Excel."""
        return []

    def distrust(folder: Path) -> list[str]:
        """Nothing to do without Excel."""
        return []

    def untrusting(folder: Path) -> list[str]:
        """No Excel that could distrust a folder."""
        return []

    def is_disabled() -> bool:
        """No list without Excel."""
        return False

    def security_keys(*parents: str) -> list[Key]:
        """No keys without Windows."""
        return []

    def number(security: Key, below: str, name: str) -> object:
        """No values without Windows."""
        return None
