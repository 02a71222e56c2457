"""The .xlam package: the least that a spreadsheet program takes for an add-in, with ribbon and VBA project."""

import zipfile
from collections.abc import Mapping, Sequence
from pathlib import Path
from xml.sax.saxutils import escape, quoteattr

from openpyxl.writer.theme import theme_xml

__all__ = ["write_package"]

STAMP = (1980, 1, 1, 0, 0, 0)
HEAD = '<?xml version="1.0" encoding="UTF-8" standalone="yes"?>\n'
MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
OFFICE = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
PACKAGE = "http://schemas.openxmlformats.org/package/2006"
TYPES = "application/vnd.openxmlformats-officedocument.spreadsheetml."


def write_package(path: Path, *, vba: bytes, ribbon: str, images: Mapping[str, bytes],
                  settings: Sequence[tuple[str, str]], title: str, description: str) -> None:  # fmt: skip
    """Write the add-in file; the same arguments give the same bytes.

    vba : vbaProject.bin; ribbon : the XML of its tab; images : PNG by the name that the ribbon uses
    settings : rows of the sheet Settings; title, description : what Excel's list of add-ins shows
    """
    parts: dict[str, str | bytes] = {
        "[Content_Types].xml": _content_types(),
        "_rels/.rels": _relations({
            "rId1": (f"{OFFICE}/officeDocument", "xl/workbook.xml"),
            "rId2": (f"{PACKAGE}/relationships/metadata/core-properties", "docProps/core.xml"),
            "rId3": (f"{OFFICE}/extended-properties", "docProps/app.xml"),
            "rId4": ("http://schemas.microsoft.com/office/2007/relationships/ui/extensibility",
                     "customUI/customUI14.xml"),
        }),
        "xl/workbook.xml": f'{HEAD}<workbook xmlns="{MAIN}" xmlns:r="{OFFICE}">'
        '<workbookPr codeName="ThisWorkbook"/><sheets><sheet name="Settings" sheetId="1" r:id="rId1"/></sheets>'
        "</workbook>",
        "xl/_rels/workbook.xml.rels": _relations({
            "rId1": (f"{OFFICE}/worksheet", "worksheets/sheet1.xml"),
            "rId2": (f"{OFFICE}/styles", "styles.xml"),
            "rId3": ("http://schemas.microsoft.com/office/2006/relationships/vbaProject", "vbaProject.bin"),
            "rId4": (f"{OFFICE}/theme", "theme/theme1.xml"),
            "rId5": (f"{OFFICE}/sharedStrings", "sharedStrings.xml"),
        }),
        "xl/worksheets/sheet1.xml": _sheet(settings),
        "xl/sharedStrings.xml": _texts(settings),
        "xl/styles.xml": _styles(),
        "xl/theme/theme1.xml": theme_xml,
        "xl/vbaProject.bin": vba,
        "docProps/core.xml": _core(title, description),
        "docProps/app.xml": f'{HEAD}<Properties xmlns="http://schemas.openxmlformats.org/officeDocument/2006/'
        'extended-properties"><Application>Microsoft Excel</Application></Properties>',
        "customUI/customUI14.xml": ribbon,
        "customUI/_rels/customUI14.xml.rels": _relations(
            {name: (f"{OFFICE}/image", f"images/{name}.png") for name in images}
        ),
        **{f"customUI/images/{name}.png": data for name, data in images.items()},
    }  # fmt: skip
    with zipfile.ZipFile(path, "w") as package:
        for name, data in parts.items():
            entry = zipfile.ZipInfo(name, STAMP)
            entry.compress_type = zipfile.ZIP_STORED  # the bytes must not depend on whose zlib it is
            entry.create_system = 0
            package.writestr(entry, data)


def _content_types() -> str:
    defaults = {"rels": "application/vnd.openxmlformats-package.relationships+xml", "xml": "application/xml",
                "bin": "application/vnd.ms-office.vbaProject", "png": "image/png"}  # fmt: skip
    overrides = {
        "/xl/workbook.xml": "application/vnd.ms-excel.addin.macroEnabled.main+xml",
        "/xl/worksheets/sheet1.xml": TYPES + "worksheet+xml",
        "/xl/sharedStrings.xml": TYPES + "sharedStrings+xml",
        "/xl/styles.xml": TYPES + "styles+xml",
        "/xl/theme/theme1.xml": "application/vnd.openxmlformats-officedocument.theme+xml",
        "/docProps/core.xml": "application/vnd.openxmlformats-package.core-properties+xml",
        "/docProps/app.xml": "application/vnd.openxmlformats-officedocument.extended-properties+xml",
    }
    inside = "".join(f'<Default Extension="{k}" ContentType="{v}"/>' for k, v in defaults.items())
    inside += "".join(f'<Override PartName="{k}" ContentType="{v}"/>' for k, v in overrides.items())
    return f'{HEAD}<Types xmlns="{PACKAGE}/content-types">{inside}</Types>'


def _relations(targets: Mapping[str, tuple[str, str]]) -> str:
    inside = "".join(f'<Relationship Id="{i}" Type="{t}" Target="{to}"/>' for i, (t, to) in targets.items())
    return f'{HEAD}<Relationships xmlns="{PACKAGE}/relationships">{inside}</Relationships>'


def _sheet(settings: Sequence[tuple[str, str]]) -> str:
    """Two columns of text: what belongs together."""
    rows = "".join(
        f'<row r="{i + 1}"><c r="A{i + 1}" t="s"><v>{2 * i}</v></c><c r="B{i + 1}" t="s"><v>{2 * i + 1}</v></c></row>'
        for i in range(len(settings))
    )
    return f'{HEAD}<worksheet xmlns="{MAIN}"><sheetPr codeName="Settings"/><sheetData>{rows}</sheetData></worksheet>'


def _texts(settings: Sequence[tuple[str, str]]) -> str:
    count = 2 * len(settings)
    inside = "".join(f"<si><t>{escape(text)}</t></si>" for row in settings for text in row)
    return f'{HEAD}<sst xmlns="{MAIN}" count="{count}" uniqueCount="{count}">{inside}</sst>'


def _styles() -> str:
    fill = "".join(f'<fill><patternFill patternType="{kind}"/></fill>' for kind in ("none", "gray125"))
    return (
        f'{HEAD}<styleSheet xmlns="{MAIN}"><fonts count="1"><font><sz val="11"/><name val="Calibri"/></font></fonts>'
        f'<fills count="2">{fill}</fills>'
        '<borders count="1"><border><left/><right/><top/><bottom/><diagonal/></border></borders>'
        '<cellStyleXfs count="1"><xf numFmtId="0" fontId="0" fillId="0" borderId="0"/></cellStyleXfs>'
        '<cellXfs count="1"><xf numFmtId="0" fontId="0" fillId="0" borderId="0" xfId="0"/></cellXfs>'
        '<cellStyles count="1"><cellStyle name="Normal" xfId="0" builtinId="0"/></cellStyles></styleSheet>'
    )


def _core(title: str, description: str) -> str:
    spaces = {"cp": f"{PACKAGE}/metadata/core-properties", "dc": "http://purl.org/dc/elements/1.1/"}
    declared = " ".join(f"xmlns:{k}={quoteattr(v)}" for k, v in spaces.items())
    return (
        f"{HEAD}<cp:coreProperties {declared}><dc:title>{escape(title)}</dc:title>"
        f"<dc:description>{escape(description)}</dc:description></cp:coreProperties>"
    )
