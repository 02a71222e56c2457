"""What Windows' registry knows of Excel: whether it is there, which folders it trusts, what a policy forbids."""

import os
import sys
from collections.abc import Iterator
from pathlib import Path

__all__ = ["distrust", "excel_is_registered", "forbidden", "is_disabled", "trust"]

OURS = "moletally"  # the description of an entry that we made
OFFICE = r"Software\Microsoft\Office"
POLICIES = r"Software\Policies\Microsoft\Office"

if sys.platform == "win32":
    import winreg

    def excel_is_registered() -> bool:
        """True if programs can start Excel on this computer."""
        return any(_has(root, rf"{path}Excel.Application\CLSID") for root, path in (
            (winreg.HKEY_CLASSES_ROOT, ""),
            (winreg.HKEY_CURRENT_USER, "Software\\Classes\\"),
            (winreg.HKEY_LOCAL_MACHINE, "Software\\Classes\\"),
        ))  # fmt: skip

    def trust(folder: Path) -> list[str]:
        """Make sure that Excel trusts a folder; what was found or done, a line per version of Excel."""
        done = []
        for version, key in _trusted_keys():
            if any(_same(path, folder) for _, path, _ in _locations(key)):
                done.append(f"Excel {version} trusts that folder already")
                continue
            number = 1 + max((_number(name) for name, _, _ in _locations(key)), default=-1)
            with winreg.CreateKey(winreg.HKEY_CURRENT_USER, rf"{key}\Location{number}") as entry:
                winreg.SetValueEx(entry, "Path", 0, winreg.REG_SZ, str(folder) + os.sep)
                winreg.SetValueEx(entry, "Description", 0, winreg.REG_SZ, OURS)
                winreg.SetValueEx(entry, "AllowSubfolders", 0, winreg.REG_DWORD, 0)
            done.append(f"added that folder to the trusted locations of Excel {version}")
        return done or ["Excel trusts its start-up folder by itself"]

    def distrust() -> list[str]:
        """Take back what `trust` added."""
        done = []
        for version, key in _trusted_keys():
            for name, _, description in _locations(key):
                if description == OURS:
                    winreg.DeleteKey(winreg.HKEY_CURRENT_USER, rf"{key}\{name}")
                    done.append(f"removed our entry from the trusted locations of Excel {version}")
        return done

    def forbidden() -> list[str]:
        """What a policy of this computer or user forbids that the add-in needs."""
        found = []
        for root in (winreg.HKEY_CURRENT_USER, winreg.HKEY_LOCAL_MACHINE):
            for version in _subkeys(root, POLICIES):
                security = rf"{POLICIES}\{version}\Excel\Security"
                if _number_at(root, security, "VBAWarnings") == 4:
                    found.append("a policy switches all macros off (VBAWarnings)")
                if _number_at(root, rf"{security}\Trusted Locations", "AllLocationsDisabled") == 1:
                    found.append("a policy switches trusted locations off (AllLocationsDisabled)")
        return found

    def is_disabled() -> bool:
        """True if Excel put the add-in on its list of disabled items after a crash."""
        for version in _subkeys(winreg.HKEY_CURRENT_USER, OFFICE):
            for data in _values(rf"{OFFICE}\{version}\Excel\Resiliency\DisabledItems"):
                if isinstance(data, bytes) and OURS.encode("utf-16le") in data.lower():
                    return True
        return False

    def _trusted_keys() -> Iterator[tuple[str, str]]:
        for version in _subkeys(winreg.HKEY_CURRENT_USER, OFFICE):
            key = rf"{OFFICE}\{version}\Excel\Security\Trusted Locations"
            if _has(winreg.HKEY_CURRENT_USER, key):
                yield version, key

    def _locations(key: str) -> list[tuple[str, str, str]]:
        """Name, path and description of the trusted locations under a key."""
        found = []
        for name in _subkeys(winreg.HKEY_CURRENT_USER, key):
            with winreg.OpenKey(winreg.HKEY_CURRENT_USER, rf"{key}\{name}") as entry:
                found.append(
                    (name, str(_value(entry, "Path") or ""), str(_value(entry, "Description") or ""))
                )
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
            with winreg.OpenKey(winreg.HKEY_CURRENT_USER, path) as key:
                return [winreg.EnumValue(key, i)[1] for i in range(winreg.QueryInfoKey(key)[1])]
        except OSError:
            return []

    def _value(key: winreg.HKEYType, name: str) -> object:
        try:
            return winreg.QueryValueEx(key, name)[0]
        except OSError:
            return None

    def _number_at(root: int, path: str, name: str) -> object:
        try:
            with winreg.OpenKey(root, path) as key:
                return _value(key, name)
        except OSError:
            return None

    def _number(location: str) -> int:
        digits = location.removeprefix("Location")
        return int(digits) if digits.isdigit() else -1

    def _same(path: str, folder: Path) -> bool:
        return os.path.normcase(os.path.expandvars(path)).rstrip("\\") == os.path.normcase(str(folder))

else:

    def excel_is_registered() -> bool:
        """There is no Excel for Windows here."""
        return False

    def trust(folder: Path) -> list[str]:
        """Nothing to do without Excel."""
        return []

    def distrust() -> list[str]:
        """Nothing to do without Excel."""
        return []

    def forbidden() -> list[str]:
        """No policies without Windows."""
        return []

    def is_disabled() -> bool:
        """No list without Excel."""
        return False
