"""The add-in file: compression and compound file by their specifications, read back by other programs."""

import io
import json
import re
import struct
import subprocess
import sys
import zipfile
from pathlib import Path

import generate
import olefile
import openpyxl
import openxml_audit
import pytest
from hypothesis import given
from hypothesis import strategies as st
from lxml import etree
from xlam.compound import compound_file
from xlam.compression import compress, decompress
from xlam.project import Module, stored_source

import build as addin

TEXTS = addin.sources()
ADDIN = Path(addin.__file__).with_name(addin.ADDIN)


def vba_bytes():
    with zipfile.ZipFile(ADDIN) as package:
        return package.read("xl/vbaProject.bin")


@given(
    st.lists(st.sampled_from([b"Function ", b"End ", b"x", b"\r\n", b"    "]), max_size=2500).map(b"".join)
)
def test_texts_survive_compression(text):
    assert decompress(compress(text)) == text


@pytest.mark.parametrize("length", [0, 1, 2, 3, 4095, 4096, 4097, 8192, 45000])
def test_lengths_around_a_chunk_survive(length):
    text = (b"Public Function MOLE_CSTR(ByVal reactions As Variant)\r\n" * 1000)[:length]
    assert decompress(compress(text)) == text


def test_a_full_chunk_that_does_not_get_shorter_is_stored_as_it_is():
    noise = bytes((i * i * 7 + i // 3 * 101) % 251 for i in range(4096))
    assert decompress(compress(noise + b"end")) == noise + b"end"


def test_the_examples_of_the_specification():
    """[MS-OVBA] 3.2.1 and 3.2.2. Where two copies are as long the second takes the other, as the length shows."""
    plain = bytes.fromhex("0119B000616263646566676800696A6B6C6D6E6F70007172737475762E")
    assert compress(b"abcdefghijklmnopqrstuv.") == plain
    text = b"#aaabcdefaaaaghijaaaaaklaaamnopqaaaaaaaaaaaarstuvwxyzaaa"
    packed = bytes.fromhex(
        "012FB000236161616263646582660070616768696A013808616B6C00306D6E6F70067102700410727374757610777879"
        "7A003C"
    )
    assert decompress(packed) == text
    assert len(compress(text)) == len(packed)


@pytest.mark.parametrize("count", [1, 2, 3, 4, 6, 7, 8, 20, 31, 32])
def test_the_directory_is_a_red_black_tree(count):
    """Root black, no red under red, every way down meets as many black ones, and the order of names holds."""
    names = [f"M{'x' * (i % 7)}{i}" for i in range(count)]
    data = compound_file({name: b"data" * i for i, name in enumerate(names)})
    (start,) = struct.unpack_from("<I", data, 48)
    (fat,) = struct.unpack_from("<I", data, 76)
    entries, sector = [], start
    while sector != 0xFFFFFFFE:
        at = 512 * (sector + 1)
        for i in range(4):
            raw = data[at + 128 * i : at + 128 * (i + 1)]
            (size,) = struct.unpack_from("<H", raw, 64)
            name = raw[: max(size - 2, 0)].decode("utf-16le")
            entries.append((name, raw[67], *struct.unpack_from("<III", raw, 68)))
        (sector,) = struct.unpack_from("<I", data, 512 * (fat + 1) + 4 * sector)
    order, blacks = [], set()

    def walk(number, above_red, black):
        if number == 0xFFFFFFFF:
            blacks.add(black)
            return
        name, colour, left, right, _ = entries[number]
        red = colour == 0
        assert not (red and above_red)
        walk(left, red, black + (not red))
        order.append(name)
        walk(right, red, black + (not red))

    root = entries[0][4]
    assert entries[root][1] == 1
    walk(root, False, 0)
    assert len(blacks) == 1
    assert order == sorted(names, key=lambda n: (len(n), n.upper()))


def test_sizes_that_need_more_than_one_table_are_read_back():
    tree = {f"S{i}": bytes([i]) * (1000 * i) for i in range(1, 40)}
    with olefile.OleFileIO(io.BytesIO(compound_file(tree)), raise_defects=olefile.DEFECT_UNSURE) as ole:
        assert {n: ole.openstream(n).read() for n in tree} == tree
        assert ole.parsing_issues == []


def test_another_reader_finds_every_module_unchanged():
    """oletools' olevba, in a process of its own."""
    script = (
        "import json, sys, warnings\nwarnings.simplefilter('ignore')\nfrom oletools.olevba import VBA_Parser\n"
        "print(json.dumps({n: c for _, _, n, c in VBA_Parser(sys.argv[1]).extract_macros()}))"
    )
    done = subprocess.run(
        [sys.executable, "-c", script, str(ADDIN)], capture_output=True, text=True, check=True
    )
    read = {Path(name).stem: code for name, code in json.loads(done.stdout).items()}
    stored = {m.name: stored_source(m).decode() for m in addin.modules(TEXTS)}
    assert {n: c.split() for n, c in read.items()} == {n: c.split() for n, c in stored.items()}
    assert {n: c.rstrip().splitlines() for n, c in read.items()} == {
        n: c.rstrip().splitlines() for n, c in stored.items()
    }


def test_the_project_is_source_alone_and_names_every_module():
    with olefile.OleFileIO(io.BytesIO(vba_bytes()), raise_defects=olefile.DEFECT_UNSURE) as ole:
        assert ole.parsing_issues == []
        assert ole.openstream("VBA/_VBA_PROJECT").read() == bytes.fromhex("cc61ffff000000")
        project = ole.openstream("PROJECT").read().decode("ascii")
        directory = decompress(ole.openstream("VBA/dir").read())
    for module in addin.modules(TEXTS):
        assert re.search(rf"^(Module|Class|Document)={module.name}\b", project, re.MULTILINE)
        assert module.name.encode("utf-16le") in directory


def test_a_letter_that_the_code_page_lacks_is_refused():
    with pytest.raises(ValueError, match="M, line 2"):
        stored_source(Module("M", "standard", 'Attribute VB_Name = "M"\n\' τ\n'))


def test_the_package_opens_elsewhere(tmp_path):
    done = subprocess.run(
        [sys.executable, "-m", "openxml_audit", str(ADDIN)], capture_output=True, text=True, check=False
    )
    assert "no findings" in done.stdout, done.stdout
    with zipfile.ZipFile(ADDIN) as package, zipfile.ZipFile(tmp_path / "as_book.xlsm", "w") as book:
        for name in package.namelist():  # openpyxl opens no add-ins
            data = package.read(name)
            if name == "[Content_Types].xml":
                data = data.replace(b"excel.addin.macroEnabled", b"excel.sheet.macroEnabled")
            book.writestr(name, data)
    book = openpyxl.load_workbook(tmp_path / "as_book.xlsm", keep_vba=True)
    rows = {row[0].value: row[1].value for row in book["Settings"].iter_rows()}
    book.vba_archive.close()
    assert rows == addin.settings()


def test_the_build_is_reproducible_and_committed(tmp_path):
    addin.build(tmp_path / "a.xlam")
    addin.build(tmp_path / "b.xlam")
    assert (tmp_path / "a.xlam").read_bytes() == (tmp_path / "b.xlam").read_bytes() == ADDIN.read_bytes()


def test_the_made_modules_are_committed():
    for name in addin.MADE:
        assert (ADDIN.parent / "vba" / name).read_text(encoding="utf-8") == TEXTS[name]


def test_a_help_text_that_excel_would_cut_stops_the_build(monkeypatch):
    monkeypatch.setattr(generate, "LONGEST_TEXT", 20)
    with pytest.raises(SystemExit, match="longer than the 20 characters"):
        generate.table_module()


def types_of_ribbon():
    """Elements of the ribbon's namespace as the Open XML SDK's schema data describe them (in openxml-audit)."""
    file = (
        Path(openxml_audit.__file__).parent
        / "data/openxml/schemas/schemas_microsoft_com_office_2009_07_customui.json"
    )
    return {t["Name"]: t for t in json.loads(file.read_text(encoding="utf-8"))["Types"]}


def faults(element, kind, types):
    """What the schema has against an element: unknown attributes, values too long, children out of place."""
    declared = {a["QName"].removeprefix(":"): a for a in types[kind].get("Attributes", [])}
    for name, value in element.attrib.items():
        if name not in declared:
            yield f"{kind}: no attribute {name}"
            continue
        for validator in declared[name].get("Validators", []):
            limits = {a["Name"]: a["Value"] for a in validator.get("Arguments", [])}
            if len(value) > int(limits.get("MaxLength", 10**6)):
                yield f"{kind}: {name} is too long"
            if limits.get("IsNcName") == "True" and not re.fullmatch(r"[A-Za-z_][\w.-]*", value):
                yield f"{kind}: {name}={value} is no name"
    children = {c["Name"].rsplit("mso14:", 1)[1]: c["Name"] for c in types[kind].get("Children", [])}
    for child in element:
        name = etree.QName(child).localname
        if name in children:
            yield from faults(child, children[name], types)
        else:
            yield f"{kind}: no {name} in it"


def ribbon():
    with zipfile.ZipFile(ADDIN) as package:
        return etree.fromstring(package.read("customUI/customUI14.xml"))


def test_the_ribbon_is_valid():
    types = types_of_ribbon()
    root = ribbon()
    assert etree.QName(root).namespace == "http://schemas.microsoft.com/office/2009/07/customui"
    assert list(faults(root, "mso14:CT_CustomUI/mso14:customUI", types)) == []
    root[0][0][0].set("colour", "red")
    assert list(faults(root, "mso14:CT_CustomUI/mso14:customUI", types)) != []


def test_every_command_of_the_ribbon_has_its_macro_and_its_picture():
    buttons = list(ribbon().iter("{*}button"))
    with zipfile.ZipFile(ADDIN) as package:
        relations = package.read("customUI/_rels/customUI14.xml.rels").decode()
        for button in buttons:
            assert re.search(
                rf"Public Sub {button.get('onAction')}\(ByVal control As IRibbonControl\)",
                TEXTS["MoleRibbon.bas"],
            )
            assert f'Id="{button.get("image")}"' in relations
            assert package.read(f"customUI/images/{button.get('image')}.png").startswith(b"\x89PNG")
    assert len({b.get("id") for b in buttons}) == len(buttons) == 6
