"""A VBA project as source text alone, [MS-OVBA] 2.3: what Excel compiles when it opens the file."""

import re
import struct
import uuid
from dataclasses import dataclass

from xlam.compound import Tree, compound_file
from xlam.compression import compress

__all__ = ["Module", "stored_source", "vba_project"]

CODE_PAGE = 1252
BASES = {  # the class of the object behind a document module
    "ThisWorkbook": "0{00020819-0000-0000-C000-000000000046}",
    "": "0{00020820-0000-0000-C000-000000000046}",
}
CLASS_BASE = "0{FCFB3D2A-A0FA-1068-A738-08002B3371B5}"  # of a class module, as Excel saves it
REFERENCES = {
    "stdole": r"*\G{00020430-0000-0000-C000-000000000046}#2.0#0#C:\Windows\System32\stdole2.tlb#OLE Automation",
    "Office": r"*\G{2DF8D04C-5BFA-101B-BDE5-00AA0044DE52}#2.0#0#C:\Program Files\Common Files\Microsoft Shared"
    r"\OFFICE16\MSO.DLL#Microsoft Office 16.0 Object Library",
}
HEADER = re.compile(r"\AVERSION .*?\nEND\n", re.DOTALL)
ATTRIBUTE = re.compile(r"^Attribute .*\n", re.MULTILINE)


@dataclass(frozen=True, slots=True)
class Module:
    """A module; `kind` is "document", "standard" or "class", `source` the text of its .bas or .cls file."""

    name: str
    kind: str
    source: str


def stored_source(module: Module) -> bytes:
    """The text as a project stores it: without the header of an exported class, lines ended by CR LF.

    Raises
    ------
    ValueError
        If the text is not that of the module, or has a letter that the code page lacks.
    """
    text = HEADER.sub("", module.source.replace("\r\n", "\n"))
    if module.kind == "document":
        text = _attributes(module.name, BASES.get(module.name, BASES[""]), "True") + ATTRIBUTE.sub("", text)
    elif module.kind == "class":
        text = _attributes(module.name, CLASS_BASE, "False") + ATTRIBUTE.sub("", text)
    if not text.startswith(f'Attribute VB_Name = "{module.name}"\n'):
        raise ValueError(f"{module.name}: the text does not begin with its name")
    for number, line in enumerate(text.split("\n"), 1):
        if bad := [c for c in line if ord(c) > 126 or (ord(c) < 32 and c != "\t")]:
            raise ValueError(f"{module.name}, line {number}: {bad[0]!r} is not plain ASCII")
    return text.rstrip("\n").replace("\n", "\r\n").encode("ascii") + b"\r\n"


def _attributes(name: str, base: str, document: str) -> str:
    """What Excel writes before the code of a document ("True") or a class of our own ("False")."""
    values = {
        "Name": f'"{name}"',
        "Base": f'"{base}"',
        "GlobalNameSpace": "False",
        "Creatable": "False",
        "PredeclaredId": document,
        "Exposed": document,
        "TemplateDerived": "False",
        "Customizable": document,
    }
    return "".join(f"Attribute VB_{key} = {value}\n" for key, value in values.items())


def vba_project(modules: list[Module], name: str, description: str) -> bytes:
    """The bytes of vbaProject.bin.

    Raises
    ------
    ValueError
        If two modules share a name, whatever their capitals, or one has a name or a text that can't be stored.
    """
    names = [m.name.lower() for m in modules]
    if twice := {m.name for m in modules if names.count(m.name.lower()) > 1}:
        raise ValueError(f"modules of the same name: {', '.join(sorted(twice))}")
    modules = sorted(modules, key=lambda m: m.kind != "document")
    streams: Tree = {m.name: compress(stored_source(m)) for m in modules}
    streams["dir"] = compress(_directory(modules, name, description))
    streams["_VBA_PROJECT"] = b"\xcc\x61\xff\xff\x00\x00\x00"  # no compiled code: 2.3.4.1
    return compound_file(
        {"VBA": streams, "PROJECT": _project_text(modules, name), "PROJECTwm": _name_map(modules)}
    )


def _record(kind: int, data: bytes) -> bytes:
    return struct.pack("<HI", kind, len(data)) + data


def _both(kind: int, unicode_kind: int, text: str) -> bytes:
    """A text in the code page and in UTF-16."""
    return _record(kind, text.encode(f"cp{CODE_PAGE}")) + _record(unicode_kind, text.encode("utf-16le"))


def _directory(modules: list[Module], name: str, description: str) -> bytes:
    """The dir stream: 2.3.4.2."""
    out = _record(0x01, struct.pack("<I", 3))  # 64-bit Windows
    out += _record(0x02, struct.pack("<I", 0x409)) + _record(0x14, struct.pack("<I", 0x409))
    out += _record(0x03, struct.pack("<H", CODE_PAGE)) + _record(0x04, name.encode("ascii"))
    out += _both(0x05, 0x40, description) + _record(0x06, b"") + _record(0x3D, b"")
    out += _record(0x07, bytes(4)) + _record(0x08, bytes(4))
    out += struct.pack("<HIIH", 0x09, 4, 0x65BE0257, 17) + _both(0x0C, 0x3C, "")
    for reference, library in REFERENCES.items():
        text = library.encode("ascii")
        out += _both(0x16, 0x3E, reference) + _record(0x0D, struct.pack("<I", len(text)) + text + bytes(6))
    out += _record(0x0F, struct.pack("<H", len(modules))) + _record(0x13, b"\xff\xff")
    for module in modules:
        out += _both(0x19, 0x47, module.name) + _both(0x1A, 0x32, module.name) + _both(0x1C, 0x48, "")
        out += _record(0x31, bytes(4)) + _record(0x1E, bytes(4)) + _record(0x2C, b"\xff\xff")
        out += _record(0x21 if module.kind == "standard" else 0x22, b"") + _record(0x2B, b"")
    return out + _record(0x10, b"")


def _project_text(modules: list[Module], name: str) -> bytes:
    """The PROJECT stream: 2.3.1; not locked, no password."""
    identity = "{" + str(uuid.uuid5(uuid.NAMESPACE_DNS, name)).upper() + "}"
    kinds = {"document": "Document={}/&H00000000", "standard": "Module={}", "class": "Class={}"}
    lines = [
        f'ID="{identity}"',
        *(kinds[m.kind].format(m.name) for m in modules),
        f'Name="{name}"',
        'HelpContextID="0"',
        'VersionCompatible32="393222000"',
        f'CMG="{_encrypted(identity, bytes(4), 0x1C)}"',
        f'DPB="{_encrypted(identity, bytes(1), 0x3A)}"',
        f'GC="{_encrypted(identity, bytes([255]), 0x58)}"',
        "",
        "[Host Extender Info]",
        "&H00000001={3832D640-CF90-11CF-8E43-00A0C911005A};VBE;&H00000000",
        "",
        "[Workspace]",
        *(f"{m.name}=0, 0, 0, 0, C" for m in modules),
    ]
    return ("\r\n".join(lines) + "\r\n").encode("ascii")


def _encrypted(identity: str, data: bytes, seed: int) -> str:
    """Protection state as the PROJECT stream hides it: 2.4.3.2."""
    key, version = sum(identity.encode("ascii")) & 0xFF, 2
    out = bytearray([seed, seed ^ version, seed ^ key])
    before, last, second = key, seed ^ key, seed ^ version
    for byte in bytes([7] * ((seed & 6) // 2)) + struct.pack("<I", len(data)) + data:
        code = byte ^ ((second + before) & 0xFF)
        out.append(code)
        second, last, before = last, code, byte
    return out.hex().upper()


def _name_map(modules: list[Module]) -> bytes:
    return (
        b"".join(m.name.encode("ascii") + b"\0" + m.name.encode("utf-16le") + b"\0\0" for m in modules)
        + b"\0\0"
    )
