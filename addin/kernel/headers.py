"""What a compiled library says about itself: ELF (Linux), PE (Windows) and Mach-O (macOS), 64 bit, little-endian.

Read here and not by a tool, since no one tool that every machine has reads all three. Only what decides where a
library can be loaded is read. Field offsets: the ELF-64 object file format (gABI) with the GNU symbol versioning
of the Linux Standard Base; Microsoft's PE format, "Optional header", "Import directory table" and "Export
directory table"; Apple's loader.h and nlist.h.
"""

import struct
from collections.abc import Iterator
from dataclasses import dataclass

__all__ = ["Library", "read_library"]

ELF_MACHINES = {62: "x64", 183: "arm64"}
PE_MACHINES = {0x8664: "x64", 0xAA64: "arm64"}
MACHO_MACHINES = {0x01000007: "x64", 0x0100000C: "arm64"}

# section types
DYNAMIC, DYNAMIC_SYMBOLS, VERSIONS_NEEDED = 6, 11, 0x6FFFFFFE
# load commands
SYMBOLS, LOADS, LOADS_IF_THERE, SIGNATURE, BUILD_VERSION = 0x2, 0xC, 0x80000018, 0x1D, 0x32


@dataclass(frozen=True, slots=True)
class Library:
    """A shared library's header.

    machine : "linux-x64", "windows-x64", "macos-arm64", ...: the name that build.TARGETS has for it
    imports : libraries that it loads
    exports : names that it defines for others
    needs : the oldest system it runs on: (2, 17) for glibc 2.17 or (11, 0) for macOS 11; () on Windows
    signed : whether a code signature is there, without which macOS on arm64 loads nothing
    """

    machine: str
    imports: frozenset[str]
    exports: frozenset[str]
    needs: tuple[int, ...] = ()
    signed: bool = False


def read_library(data: bytes) -> Library:
    """Read a library's content; ValueError if it is none of the three formats."""
    if data[:6] == b"\x7fELF\x02\x01":
        return _elf(data)
    if data[:2] == b"MZ":
        return _pe(data)
    if data[:4] == b"\xcf\xfa\xed\xfe":
        return _macho(data)
    raise ValueError(f"not a 64 bit library of Linux, Windows or macOS: it begins with {data[:6]!r}")


def _text(data: bytes, at: int) -> str:
    return data[at : data.index(b"\0", at)].decode("ascii")


def _version(text: str) -> tuple[int, ...]:
    return tuple(int(part) for part in text.split("."))


def _elf(data: bytes) -> Library:
    (machine,) = struct.unpack_from("<H", data, 18)
    (sections_at,) = struct.unpack_from("<Q", data, 40)
    size, count = struct.unpack_from("<HH", data, 58)
    # a section: name, type, flags, address, offset, size, link, info, alignment, size of an entry
    sections = [struct.unpack_from("<IIQQQQIIQQ", data, sections_at + i * size) for i in range(count)]
    strings = {i: section[4] for i, section in enumerate(sections)}
    imports: set[str] = set()
    exports: set[str] = set()
    needs: list[tuple[int, ...]] = [(0,)]
    for _, kind, _, _, at, length, link, info, _, entry in sections:
        names = strings[link]
        if kind == DYNAMIC:  # pairs of tag and value; tag 1 is a needed library
            pairs = struct.iter_unpack("<qQ", data[at : at + length])
            imports |= {_text(data, names + value) for tag, value in pairs if tag == 1}
        elif kind == DYNAMIC_SYMBOLS:  # name, info, other, section (0: imported), value, size
            symbols = struct.iter_unpack("<IBBHQQ", data[at : at + length // entry * entry])
            exports |= {_text(data, names + s[0]) for s in symbols if s[3] and s[1] >> 4}
        elif kind == VERSIONS_NEEDED:
            found = (name for name in _elf_versions(data, at, names, info) if name.startswith("GLIBC_"))
            needs += [_version(name.removeprefix("GLIBC_")) for name in found]
    where = f"linux-{ELF_MACHINES.get(machine, machine)}"
    return Library(where, frozenset(imports), frozenset(exports), max(needs))


def _elf_versions(data: bytes, at: int, names: int, files: int) -> Iterator[str]:
    for _ in range(files):
        _, count, _, first, following = struct.unpack_from("<HHIII", data, at)
        entry = at + first
        for _ in range(count):
            _, _, _, name, onward = struct.unpack_from("<IHHII", data, entry)
            yield _text(data, names + name)
            entry += onward
        at += following


def _pe(data: bytes) -> Library:
    (header,) = struct.unpack_from("<I", data, 0x3C)
    machine, sections = struct.unpack_from("<HH", data, header + 4)
    (optional_size,) = struct.unpack_from("<H", data, header + 20)
    optional = header + 24
    table = optional + optional_size
    # a section: size and address in memory, size and offset in the file
    spans: list[tuple[int, ...]] = [
        struct.unpack_from("<IIII", data, table + 40 * i + 8) for i in range(sections)
    ]

    def at(address: int) -> int:
        """Offset in the file of an address in memory."""
        for _, start, size, offset in spans:
            if start <= address < start + size:
                return address - start + offset
        raise ValueError(f"address {address:#x} is in no section")

    export_address, _, import_address, _ = struct.unpack_from("<IIII", data, optional + 112)
    imports: set[str] = set()
    exports: set[str] = set()
    if import_address:
        entry = at(import_address)
        while name := struct.unpack_from("<IIIII", data, entry)[3]:
            imports.add(_text(data, at(name)))
            entry += 20
    if export_address:
        count, _, names = struct.unpack_from("<III", data, at(export_address) + 24)
        addresses = struct.unpack_from(f"<{count}I", data, at(names))
        exports = {_text(data, at(address)) for address in addresses}
    return Library(f"windows-{PE_MACHINES.get(machine, machine)}", frozenset(imports), frozenset(exports))


def _macho(data: bytes) -> Library:
    machine, _, _, count = struct.unpack_from("<IIII", data, 4)
    imports: set[str] = set()
    exports: set[str] = set()
    needs: tuple[int, ...] = (0,)
    signed = False
    command = 32  # after the header
    for _ in range(count):
        kind, size, first, second = struct.unpack_from("<IIII", data, command)
        if kind in (LOADS, LOADS_IF_THERE):  # first: where the name is
            imports.add(_text(data, command + first))
        elif kind == BUILD_VERSION:  # second: the oldest system, as 16, 8 and 8 bits
            needs = (second >> 16, second >> 8 & 0xFF)
        elif kind == SIGNATURE:
            signed = True
        elif kind == SYMBOLS:  # first, second: where it is, how many
            (strings,) = struct.unpack_from("<I", data, command + 16)
            exports |= set(_macho_exports(data, first, second, strings))
        command += size
    where = f"macos-{MACHO_MACHINES.get(machine, machine)}"
    return Library(where, frozenset(imports), frozenset(exports), needs, signed)


def _macho_exports(data: bytes, at: int, count: int, strings: int) -> Iterator[str]:
    for name, kind, _, _, _ in struct.iter_unpack("<IBBHQ", data[at : at + 16 * count]):
        # external, not private to the library, and defined in a section of it; the linker adds names of its own,
        # which begin with an underscore like all that C reserves
        found = _text(data, strings + name).removeprefix("_")
        if kind & 0x1F == 0x0F and not found.startswith("_"):
            yield found
