"""The file excel.conf: which Python and which DLL the macro file starts."""

import importlib.metadata
import sys
from dataclasses import dataclass
from pathlib import Path

import moletally
from moletally.hosts.windows.places import Places

__all__ = ["InstallError", "Settings", "found_here", "read", "unreadable", "write"]

ENCODING = "mbcs" if sys.platform == "win32" else "ascii"  # VBA and the DLL read the code page of Windows


class InstallError(Exception):
    """Why something can't be installed, and what to do."""


@dataclass(frozen=True, slots=True)
class Settings:
    """The lines of excel.conf: versions, full paths, and how many folders install made for the macro file."""

    moletally: str
    xlwings: str
    python: str
    dll64: str
    dll32: str
    made: str = ""

    def text(self) -> str:
        """As it stands in the file."""
        lines = [f"{name} = {getattr(self, name)}" for name in self.__slots__]
        return "\n".join(["# written by: moletally excel install", *lines]) + "\n"


def read(places: Places) -> Settings | None:
    """What is installed for this user; None if nothing is."""
    if not places.settings.is_file():
        return None
    lines = places.settings.read_text(encoding=ENCODING, errors="replace").splitlines()
    pairs = (line.split("=", 1) for line in lines if "=" in line and not line.startswith("#"))
    values = {key.strip(): value.strip() for key, value in pairs}
    return Settings(**{name: values.get(name, "") for name in Settings.__slots__})


def write(places: Places, settings: Settings) -> None:
    """Write the file, at once."""
    places.data.mkdir(parents=True, exist_ok=True)
    unfinished = places.settings.with_suffix(".new")
    unfinished.write_text(settings.text(), encoding=ENCODING)
    unfinished.replace(places.settings)


def unreadable(places: Places) -> list[str]:
    """Why Excel's macro language may not find the file; empty if nothing speaks against it."""
    try:
        str(places.settings).encode(ENCODING)
    except UnicodeEncodeError:
        return [
            f"{places.settings} has letters outside the code page of this Windows, which macros may not find"
        ]
    return []


def found_here(made: str) -> Settings:
    """The settings for the Python that runs this.

    Raises
    ------
    InstallError
        If xlwings or its DLL is missing, or a path can't be told to the DLL.
    """
    try:
        version = importlib.metadata.version("xlwings")
    except importlib.metadata.PackageNotFoundError:
        raise InstallError("xlwings is missing: run pip install moletally again, in this Python") from None
    dll64 = _dll(f"xlwings64-{version}.dll")
    if dll64 is None:
        raise InstallError(
            f"xlwings64-{version}.dll is missing: run pip install --force-reinstall xlwings=={version}"
        )
    dll32 = _dll(f"xlwings32-{version}.dll")
    return Settings(moletally.__version__, version, _ansi(_python()), _ansi(dll64),
                    _ansi(dll32) if dll32 else "", made)  # fmt: skip


def _python() -> Path:
    """This Python, with a window for its words: pythonw.exe keeps them to itself."""
    here = Path(sys.executable)
    return here.with_name("python.exe") if here.name.lower() == "pythonw.exe" else here


def _dll(name: str) -> Path | None:
    """A DLL of xlwings: where its installation says, or beside Python."""
    listed = [Path(str(f.locate())) for f in importlib.metadata.files("xlwings") or () if f.name == name]
    for path in (*listed, Path(sys.prefix, name), Path(sys.base_prefix, name)):
        if path.is_file():
            return path.resolve()
    return None


def _ansi(path: Path) -> str:
    """A path in letters that the code page of Windows has; the short form of Windows if it must be."""
    for text in (str(path), _short(path)):
        try:
            text.encode(ENCODING)
        except UnicodeEncodeError:
            continue
        return text
    raise InstallError(
        f"the path {path} has letters that Excel's macro language can't pass on: install Python in another folder"
    )


def _short(path: Path) -> str:
    if sys.platform != "win32":
        return str(path)
    import ctypes

    buffer = ctypes.create_unicode_buffer(1024)
    length = ctypes.windll.kernel32.GetShortPathNameW(str(path), buffer, len(buffer))
    return buffer.value if length else str(path)
