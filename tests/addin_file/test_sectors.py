"""The containers of the add-in file, sector by sector, and what they refuse."""

import json
import re
import struct
import subprocess
import sys

import pytest
from hypothesis import given
from hypothesis import strategies as st
from xlam.compound import compound_file
from xlam.compression import compress, decompress
from xlam.project import Module, vba_project

import build as addin

NONE, END, FAT, FREE = 0xFFFFFFFF, 0xFFFFFFFE, 0xFFFFFFFD, 0xFFFFFFFF
STORAGE, STREAM, ROOT = 1, 2, 5
TREES = {
    "nothing but empty streams": {"a": b"", "bb": b""},
    "small ones alone": {f"s{i}": b"x" * (i * 63) for i in range(1, 20)},
    "at the limit of the mini stream": {"below": b"b" * 4095, "at": b"a" * 4096, "above": b"c" * 4097},
    "storages in storages": {"A": {"B": {"C": b"deep", "D": {}}, "e": b"e" * 9000}, "f": b"f"},
    "more sectors than a table holds": {f"S{i}": bytes([i]) * 20000 for i in range(1, 20)},
}


def noise(length):
    """Bytes that don't repeat: a linear congruential generator's high byte (Knuth's MMIX constants)."""
    state, out = 1, bytearray()
    for _ in range(length):
        state = (state * 6364136223846793005 + 1442695040888963407) % 2**64
        out.append(state >> 56)
    return bytes(out)


def module_text(length):
    """VBA with numbers that differ, so that copies are short and long."""
    lines = ['Attribute VB_Name = "Long"\r\n']
    while sum(map(len, lines)) < length:
        n = len(lines)
        lines.append(
            f"Public Function F{n}(ByVal x{n * 7} As Double) As Double: F{n} = x{n * 7} * {n * n}\r\n"
        )
    return "".join(lines)[:length]


def built():
    """The project of the add-in, written anew: the committed file could not show a fault of the writer."""
    return vba_project(addin.modules(addin.sources()), name="moletally", description=addin.DESCRIPTION)


class Walk:
    """Reads a compound file by [MS-CFB] 2.2 to 2.6 and notes which sectors each chain used."""

    def __init__(self, data):
        assert data[:8].hex() == "d0cf11e0a1b11ae1"
        assert len(data) % 512 == 0
        self.data, self.used, self.mini_used = data, [], []
        self.count = len(data) // 512 - 1
        fats, directory = struct.unpack_from("<II", data, 44)
        mini_fat, self.mini_fats = struct.unpack_from("<II", data, 60)
        places = struct.unpack_from("<109I", data, 76)
        assert all(p == FREE for p in places[fats:])
        self.fat_sectors = places[:fats]
        self.fat = [n for p in self.fat_sectors for n in struct.unpack("<128I", self.sector(p))]
        self.entries = [self.entry(raw) for raw in parts(self.chain(directory), 128)]
        packed = self.chain(mini_fat)
        self.mini_fat = struct.unpack(f"<{len(packed) // 4}I", packed)
        root = self.entries[0]
        self.mini = self.chain(root["start"])
        self.mini_size = root["size"]

    def sector(self, number):
        assert number < self.count
        return self.data[512 * (number + 1) : 512 * (number + 2)]

    def chain(self, number):
        out = b""
        while number != END:
            assert number not in self.used, "two chains, or a loop, in one sector"
            self.used.append(number)
            out += self.sector(number)
            number = self.fat[number]
        return out

    def mini_chain(self, number):
        out = b""
        while number != END:
            assert number not in self.mini_used
            assert 64 * (number + 1) <= self.mini_size
            self.mini_used.append(number)
            out += self.mini[64 * number : 64 * (number + 1)]
            number = self.mini_fat[number]
        return out

    def entry(self, raw):
        size, kind, colour, left, right, child = struct.unpack_from("<HBBIII", raw, 64)
        start, length = struct.unpack_from("<IQ", raw, 116)
        assert not any(raw[80:116])  # class id, state bits, both times
        return {"name": raw[: max(size - 2, 0)].decode("utf-16le"), "kind": kind, "red": colour == 0,
                "left": left, "right": right, "child": child, "start": start, "size": length}  # fmt: skip

    def content(self, entry):
        """A stream's bytes; what its last sector has beyond them must be zero."""
        small = entry["size"] < 4096
        data = self.mini_chain(entry["start"]) if small else self.chain(entry["start"])
        unit = 64 if small else 512
        assert len(data) == -(-entry["size"] // unit) * unit
        assert not any(data[entry["size"] :])
        return data[: entry["size"]]

    def tree(self, number):
        """Names to bytes or trees under a storage, its red-black tree proven on the way."""
        found, blacks = [], set()

        def down(at, below_red, black):
            if at == NONE:
                blacks.add(black)
                return
            entry = self.entries[at]
            assert not (entry["red"] and below_red)
            down(entry["left"], entry["red"], black + (not entry["red"]))
            found.append(entry)
            down(entry["right"], entry["red"], black + (not entry["red"]))

        top = self.entries[number]["child"]
        assert top == NONE or not self.entries[top]["red"]
        down(top, False, 0)
        assert len(blacks) == 1
        keys = [(len(e["name"]), e["name"].upper()) for e in found]
        assert keys == sorted(set(keys))
        return {
            e["name"]: self.content(e) if e["kind"] == STREAM else self.tree(self.entries.index(e))
            for e in found
        }


def parts(data, length):
    return [data[i : i + length] for i in range(0, len(data), length)]


def walked(data):
    """The tree in a compound file in which every sector belongs to one chain, to the table or to nothing."""
    walk = Walk(data)
    assert walk.entries[0]["kind"] == ROOT
    tree = walk.tree(0)
    assert all(walk.fat[s] == FAT for s in walk.fat_sectors)
    assert sorted([*walk.used, *walk.fat_sectors]) == list(range(walk.count))
    assert all(n == FREE for n in walk.fat[walk.count :])
    assert sorted(walk.mini_used) == list(range(walk.mini_size // 64))
    assert all(n == FREE for n in walk.mini_fat[len(walk.mini_used) :])
    assert all(e["kind"] in (STORAGE, STREAM, ROOT) for e in walk.entries if e["name"])
    return tree


@pytest.mark.parametrize("tree", TREES.values(), ids=TREES.keys())
def test_every_sector_belongs_to_one_chain(tree):
    assert walked(compound_file(tree)) == tree


@given(st.dictionaries(st.text("abcXYZ_1", min_size=1, max_size=31), st.binary(max_size=6000), max_size=12))
def test_any_streams_come_back(tree):
    names = {name.upper(): name for name in tree}
    tree = {name: tree[name] for name in names.values()}
    assert walked(compound_file(tree)) == tree


def test_the_built_project_is_whole():
    tree = walked(built())
    assert set(tree) == {"VBA", "PROJECT", "PROJECTwm"}
    assert {"dir", "_VBA_PROJECT", "ThisWorkbook", "Settings"} < set(tree["VBA"])


@pytest.mark.parametrize("name", ["", "x" * 32, "a/b", "a\\b", "a:b", "a!b"])
def test_a_name_that_the_format_lacks_is_refused(name):
    with pytest.raises(ValueError, match="1 to 31 letters"):
        compound_file({name: b"data"})


def test_names_that_differ_in_capitals_are_one_name():
    with pytest.raises(ValueError, match="twice"):
        compound_file({"Mole": b"a", "MOLE": b"b"})
    texts = [Module(n, "standard", f'Attribute VB_Name = "{n}"\n') for n in ("Mole", "MOLE")]
    with pytest.raises(ValueError, match="MOLE, Mole"):
        vba_project(texts, "moletally", "")


@given(st.binary(max_size=3600))
def test_any_bytes_survive_compression(data):
    """3600 bytes that don't repeat take 9/8 of that: a last chunk holds no more."""
    assert decompress(compress(data)) == data


def test_another_decompressor_reads_what_we_compress():
    """oletools' own, in a process of its own, on texts and on bytes that don't repeat."""
    cases = [module_text(n) for n in (1, 4095, 4096, 4097, 8192, 45_000)]
    cases = [c.encode() for c in cases] + [
        noise(4096),
        noise(4096) + b"end",
        noise(8192 + 3000),
        b"a" * 20000,
    ]
    script = (
        "import json, sys, warnings\nwarnings.simplefilter('ignore')\n"
        "from oletools.olevba import decompress_stream\n"
        "given = json.load(sys.stdin)\n"
        "print(json.dumps([decompress_stream(bytearray.fromhex(g)).hex() for g in given]))"
    )
    packed = [compress(c) for c in cases]
    done = subprocess.run(
        [sys.executable, "-c", script], input=json.dumps([p.hex() for p in packed]),
        capture_output=True, text=True, check=True,
    )  # fmt: skip
    assert [bytes.fromhex(h) for h in json.loads(done.stdout)] == cases
    assert [decompress(p) for p in packed] == cases


def test_a_module_of_45_kb_is_stored_whole():
    text = module_text(45_000)
    tree = walked(vba_project([Module("Long", "standard", text)], "moletally", "long"))
    assert decompress(tree["VBA"]["Long"]).rstrip() == text.encode().rstrip()


@pytest.mark.parametrize("cut", [1, 2, 5, 40])
def test_a_part_of_a_container_is_not_taken_for_the_whole(cut):
    with pytest.raises(ValueError, match="cut off"):
        decompress(compress(module_text(4100).encode())[:-cut])


@pytest.mark.parametrize(
    "container",
    ["0102b0010000", "0103b002610040", "0102b0026100"],
    ids=["at the start", "too far", "half a token"],
)
def test_a_copy_of_nothing_is_refused(container):
    with pytest.raises(ValueError, match="not there"):
        decompress(bytes.fromhex(container))


def test_the_header_of_an_exported_class_is_not_stored():
    text = (
        'VERSION 1.0 CLASS\nBEGIN\n  MultiUse = -1  \'True\nEND\nAttribute VB_Name = "C"\nPublic x As Long\n'
    )
    tree = walked(vba_project([Module("C", "class", text)], "moletally", ""))
    head, *attributes, code = decompress(tree["VBA"]["C"]).decode("ascii").splitlines()
    assert (head, code) == ('Attribute VB_Name = "C"', "Public x As Long")
    # what Excel writes before a class of its own: the class id is from memory
    assert 'Attribute VB_Base = "0{FCFB3D2A-A0FA-1068-A738-08002B3371B5}"' in attributes
    assert all(line.startswith("Attribute VB_") for line in attributes)
    assert b"Class=C\r\n" in tree["PROJECT"]


def revealed(identity, hidden):
    """[MS-OVBA] 2.4.3.3, written from the text: the data behind CMG, DPB or GC."""
    seed, version, key, *rest = bytes.fromhex(hidden)
    assert seed ^ version == 2
    assert seed ^ key == sum(identity.encode()) % 256
    plain, last, second, out = seed ^ key, key, version, []
    for code in rest:
        plain, second, last = code ^ ((second + plain) % 256), last, code
        out.append(plain)
    skip = (seed & 6) // 2
    (length,) = struct.unpack_from("<I", bytes(out), skip)
    assert len(out) == skip + 4 + length
    return bytes(out[skip + 4 :])


# The strings that [MS-OVBA] prints for a project without protection or password, its window visible (2.3.1.15 to
# 2.3.1.17). Numbers of sections and the project's ID from memory; the strings compared with public texts quoting them.
PRINTED = {
    "CMG": ("0705D8E3D8EDDBF1DBF1DBF1DBF1", "00000000"),
    "DPB": ("0E0CD1ECDFF4E7F5E7F5E7", "00"),
    "GC": ("1517CAF1D6F9D7F9D706", "ff"),
}


@pytest.mark.parametrize("field", PRINTED)
def test_the_project_is_open_as_in_the_specification(field):
    printed, plain = PRINTED[field]
    assert revealed("{917DED54-440B-4FD1-A5C1-74ACF261E600}", printed).hex() == plain
    project = walked(built())["PROJECT"].decode()
    identity = re.search(r'ID="(.*?)"', project)[1]
    hidden = re.search(rf'{field}="(.*?)"', project)[1]
    assert revealed(identity, hidden).hex() == plain
