"""The ready workbooks that come with the package."""

import shutil
import zipfile
from pathlib import Path

import moletally
from moletally.chemistry.errors import near_miss
from moletally.hosts.headless.book import BookError

__all__ = ["describe", "new_book", "templates"]


def folder() -> Path:
    """Inside an installed package, or beside it in a source tree."""
    package = Path(moletally.__file__).parent
    inside = package / "workbook_templates"
    return inside if inside.is_dir() else package.parent.parent / "workbook_templates"


def templates() -> dict[str, Path]:
    """Template files by name."""
    return {path.stem: path for path in sorted(folder().glob("*.xlsx")) if not path.name.startswith("~")}


def describe(path: Path) -> str:
    """The title that a workbook carries in its properties."""
    from lxml import etree

    with zipfile.ZipFile(path) as package:
        if "docProps/core.xml" not in package.namelist():
            return ""
        root = etree.fromstring(package.read("docProps/core.xml"))
    title = root.find("{http://purl.org/dc/elements/1.1/}title")
    return "" if title is None else str(title.text or "")


def new_book(name: str, target: Path) -> None:
    """Copy a template to a new file.

    Raises
    ------
    BookError
        If there is no such template or the file exists.
    """
    known = templates()
    if name not in known:
        raise BookError(f"there is no template {name!r}. {near_miss(name, known)}")
    if target.exists():
        raise BookError(f"{target} exists: choose another name or move it away")
    if target.suffix.lower() != ".xlsx":
        raise BookError(f"{target}: the name of the new workbook must end in .xlsx")
    try:
        shutil.copyfile(known[name], target)
    except OSError as error:
        raise BookError(f"{target} can't be written: {error.strerror}") from None
