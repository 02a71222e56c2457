"""Compound files, [MS-CFB] version 3: a tree of named streams in one file, without time stamps."""

import struct
from dataclasses import dataclass, field
from typing import TypeAlias

__all__ = ["Tree", "compound_file"]

Tree: TypeAlias = "dict[str, bytes | Tree]"

SECTOR, MINI_SECTOR, MINI_LIMIT = 512, 64, 4096
FREE, END, FAT = 0xFFFFFFFF, 0xFFFFFFFE, 0xFFFFFFFD
STORAGE, STREAM, ROOT = 1, 2, 5
RED, BLACK = 0, 1
FATS_IN_HEADER = 109
LONGEST_NAME = 31  # UTF-16 units
SEPARATORS = set("/\\:!")


@dataclass(slots=True)
class Entry:
    """A directory entry; `left`, `right`, `child` are numbers of entries."""

    name: str
    kind: int
    data: bytes = b""
    colour: int = BLACK
    left: int = FREE
    right: int = FREE
    child: int = FREE
    start: int = 0
    size: int = 0

    def packed(self) -> bytes:
        """The 128 bytes of the entry: no class id, no times."""
        name = self.name.encode("utf-16le") + b"\0\0"
        head = struct.pack("<HBBIII", len(name), self.kind, self.colour, self.left, self.right, self.child)
        return name.ljust(64, b"\0") + head + bytes(36) + struct.pack("<IQ", self.start, self.size)


@dataclass(slots=True)
class Sectors:
    """The file's sectors and their chains."""

    blocks: list[bytes] = field(default_factory=list)
    chain: list[int] = field(default_factory=list)

    def store(self, data: bytes, fill: bytes = b"\0") -> int:
        """Put data into new sectors; the number of the first."""
        count = -(-len(data) // SECTOR)
        first = len(self.blocks)
        for i in range(count):
            self.blocks.append(data[i * SECTOR : (i + 1) * SECTOR].ljust(SECTOR, fill))
            self.chain.append(first + i + 1 if i + 1 < count else END)
        return first if count else END


def compound_file(tree: Tree) -> bytes:
    """The bytes of a compound file that holds the tree.

    Raises
    ------
    ValueError
        If a name is longer than the format's 31 letters or holds one of its separators, if two names differ in
        capitals alone, or if all of it is larger than about 7 MB.
    """
    entries = [Entry("Root Entry", ROOT)]
    _add(entries, 0, tree)
    sectors = Sectors()
    mini_chain = _store_streams(entries, sectors)
    packed_chain = b"".join(struct.pack("<I", n) for n in mini_chain)
    mini_start = sectors.store(packed_chain, b"\xff")
    directory = b"".join(e.packed() for e in entries)
    while len(directory) % SECTOR:
        directory += bytes(68) + struct.pack("<III", FREE, FREE, FREE) + bytes(48)
    directory_start = sectors.store(directory)
    return _file(sectors, directory_start, mini_start, -(-len(packed_chain) // SECTOR))


def _add(entries: list[Entry], parent: int, tree: Tree) -> None:
    """Add the entries of a storage, and below it as a red-black tree."""
    numbers: list[int] = []
    _check_names(tree)
    for name in sorted(tree, key=_order):
        node = tree[name]
        numbers.append(len(entries))
        if isinstance(node, bytes):
            entries.append(Entry(name, STREAM, node))
        else:
            entries.append(Entry(name, STORAGE))
            _add(entries, numbers[-1], node)
    deepest = (len(numbers) + 1).bit_length() - 1  # levels that are full; what lies below is red
    entries[parent].child = _subtree(entries, numbers, 0, deepest)


def _check_names(tree: Tree) -> None:
    seen: set[str] = set()
    for name in tree:
        if not name or len(name.encode("utf-16le")) > 2 * LONGEST_NAME or SEPARATORS & set(name):
            raise ValueError(
                f"{name!r}: a name in a compound file has 1 to {LONGEST_NAME} letters, none of / \\ : !"
            )
        if name.upper() in seen:
            raise ValueError(f"{name!r} is there twice: capitals make no difference")
        seen.add(name.upper())


def _order(name: str) -> tuple[int, str]:
    """Names compare by their length in UTF-16, then by their capitals."""
    return len(name.encode("utf-16le")), name.upper()


def _subtree(entries: list[Entry], numbers: list[int], level: int, full: int) -> int:
    if not numbers:
        return FREE
    middle = len(numbers) // 2
    entry = entries[numbers[middle]]
    entry.colour = RED if level >= full else BLACK
    entry.left = _subtree(entries, numbers[:middle], level + 1, full)
    entry.right = _subtree(entries, numbers[middle + 1 :], level + 1, full)
    return numbers[middle]


def _store_streams(entries: list[Entry], sectors: Sectors) -> list[int]:
    """Put the streams away, small ones into the root's mini stream; the chain of its sectors."""
    small, chain = bytearray(), list[int]()
    for entry in entries:
        if entry.kind != STREAM:
            continue
        entry.size = len(entry.data)
        if not entry.data:
            entry.start = END
        elif entry.size >= MINI_LIMIT:
            entry.start = sectors.store(entry.data)
        else:
            count = -(-entry.size // MINI_SECTOR)
            entry.start = len(chain)
            chain += [entry.start + i + 1 for i in range(count - 1)] + [END]
            small += entry.data.ljust(count * MINI_SECTOR, b"\0")
    entries[0].start, entries[0].size = sectors.store(bytes(small)), len(small)
    return chain


def _file(sectors: Sectors, directory: int, mini: int, mini_sectors: int) -> bytes:
    """Header and sectors, with the table of chains (FAT) behind the others."""
    count = 0
    while -(-(len(sectors.blocks) + count) // (SECTOR // 4)) > count:
        count += 1
    if count > FATS_IN_HEADER:
        raise ValueError("too large for a compound file without a table of tables")
    first = len(sectors.blocks)
    chain = sectors.chain + [FAT] * count
    chain += [FREE] * (count * SECTOR // 4 - len(chain))
    tables = b"".join(struct.pack("<I", n) for n in chain)
    places = [first + i if i < count else FREE for i in range(FATS_IN_HEADER)]
    header = b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1" + bytes(16)
    header += struct.pack("<HHHHH6x", 0x3E, 3, 0xFFFE, 9, 6)
    header += struct.pack(
        "<IIIIIIIIII", 0, count, directory, 0, MINI_LIMIT, mini, mini_sectors, END, 0, places[0]
    )
    header += b"".join(struct.pack("<I", n) for n in places[1:])
    return header + b"".join(sectors.blocks) + tables
