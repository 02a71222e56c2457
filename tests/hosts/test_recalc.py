"""Recalculation of real workbook files without Excel, through the command a user has."""

import re
import subprocess
import sys

import openpyxl
import pytest
from books import RANGE, near, parts, recalc, replace_in_part, run, tank, without_values, write

from moletally.hosts.headless.book import open_book
from moletally.hosts.headless.calculate import calculate
from moletally.hosts.headless.spelling import plain
from moletally.sheet.cells import OMITTED
from moletally.sheet.functions import FUNCTIONS
from moletally.sheet.outcome import Outcome


def test_a_call_alone_and_inside_formulas(tmp_path):
    def fill(book, sheet):
        sheet.write_formula("G2", f'=MOLE_CSTR({RANGE},,G1,"B/C")')
        sheet.write_formula("G3", f'=100*MOLE_CSTR({RANGE},,G1,"conversion(A)")+G4')
        sheet.write_formula("G4", "=SUM(G1,1)")
        sheet.write_formula("G5", f"=INDEX(MOLE_CSTR({RANGE},,G1),2)")
        sheet.write_formula("G6", f'=IF(G1>1,MOLE_CSTR({RANGE},,G1/2,"A"),0)')
        sheet.write_formula("G7", f"=SUM(MOLE_CSTR({RANGE},,G1))")

    code, values, problems = recalc(write(tmp_path / "b.xlsx", fill))
    a, b, c = tank(4.0)
    assert (code, problems) == (0, {})
    assert values == {
        "Design!G2": near(b / c), "Design!G3": near(100 * (1 - a / 2) + 5), "Design!G5": near(b),
        "Design!G6": near(tank(2.0)[0]), "Design!G7": near(2.0),
    }  # fmt: skip


def test_a_plain_formula_shows_the_first_value_an_array_fills_and_a_dynamic_one_spills(tmp_path):
    def fill(book, sheet):
        sheet.write_formula("G2", f"=MOLE_CSTR({RANGE},,G1)")
        sheet.write_array_formula("H1:I4", f"{{=MOLE_CSTR({RANGE},,G1)}}")
        sheet.write_dynamic_array_formula("K1:K1", f"=MOLE_CSTR({RANGE},,G1)")
        sheet.write_formula("G3", "=SUM(K1:K9)+SUM(H2:H3)")
        sheet.write_dynamic_array_formula("G4:G4", "=SUM(_xlfn.ANCHORARRAY(K1))")

    path, out = write(tmp_path / "b.xlsx", fill), tmp_path / "out.xlsx"
    code, values, problems = recalc(path, "--out", out)
    c = tank(4.0)
    assert values["Design!G2"] == near(c[0])
    assert values["Design!K1"] == [[near(x)] for x in c]
    assert values["Design!H1"][:3] == [[near(x), near(x)] for x in c]
    assert values["Design!H1"][3] == ["#N/A", "#N/A"]
    assert code == 1
    assert set(problems) == {"Design!H4"}
    sheet = openpyxl.load_workbook(out, data_only=True)["Design"]
    assert [sheet[f"K{i}"].value for i in (1, 2, 3)] == [near(x) for x in c]
    assert sheet["G3"].value == near(2.0 + c[1] + c[2])
    assert sheet["G4"].value == near(2.0)
    assert 'ref="K1:K3"' in parts(out)["xl/worksheets/sheet1.xml"].decode()


def test_spills_grow_and_shrink_and_are_blocked(tmp_path):
    def fill(book, sheet):
        sheet.write("G2", 5)
        sheet.write_dynamic_array_formula("K1:L1", f"=MOLE_PROFILE({RANGE},,G1,G2)")
        sheet.write_dynamic_array_formula("T1:T1", f"=MOLE_CSTR({RANGE},,G1)")
        sheet.write("T3", "in the way")

    path, wide, narrow = write(tmp_path / "b.xlsx", fill), tmp_path / "w.xlsx", tmp_path / "n.xlsx"
    code, values, problems = recalc(path, "--out", wide)
    assert len(values["Design!K1"]) == 6
    assert values["Design!T1"] == "#SPILL!"
    assert (code, problems["Design!T1"][0]) == (1, "#SPILL!")
    assert recalc(wide, "--set", "Design!G2=2", "--out", narrow)[1]["Design!K1"][0] == values["Design!K1"][0]
    sheet = openpyxl.load_workbook(narrow, data_only=True)["Design"]
    assert sheet["K3"].value is not None
    assert sheet["K4"].value is None
    assert sheet["T3"].value == "in the way"
    assert recalc(narrow)[1]["Design!K1"] == recalc(wide, "--set", "Design!G2=2")[1]["Design!K1"]


SPELLINGS = ["MOLE_CSTR", "[1]!MOLE_CSTR", "'C:\\Tools\\x y\\moletally.xlam'!MOLE_CSTR", "_xldudf_MOLE_CSTR", "_xll.MOLE_CSTR",
             "mole_cstr"]  # fmt: skip


@pytest.mark.parametrize("spelled", SPELLINGS)
def test_every_spelling_of_a_name_is_understood(tmp_path, spelled):
    path = write(
        tmp_path / "b.xlsx", lambda book, sheet: sheet.write_formula("G2", f'={spelled}({RANGE},,G1,"A")')
    )
    code, values, _ = recalc(path)
    assert (code, values) == (0, {"Design!G2": near(tank(4.0)[0])})
    assert '"formula": "=MOLE_CSTR(' in run("recalc", path, "--json").stdout


def test_a_name_inside_a_text_or_another_name_is_left_alone(tmp_path):
    def fill(book, sheet):
        sheet.write_formula("G2", '="MOLE_CSTR("&1&")"')

    assert recalc(write(tmp_path / "b.xlsx", fill)) == (0, {}, {})


def test_omitted_blank_empty_text_and_zero_are_four_things(tmp_path):
    arguments = {1.0: "", 2.0: "J1", 3.0: '""', 4.0: "0", 5.0: "J2", 6.0: "J1:J1"}

    def fill(book, sheet):
        for number, argument in arguments.items():
            sheet.write_formula(f"G{number + 1:g}", f"=MOLE_CSTR(A1,{argument},{number})")
        sheet.write_formula("G9", "=MOLE_CSTR(A1,,)")
        sheet.write_formula("J2", '=""')

    seen = {}

    def answer(name, given):
        seen[given[2]] = given[1]
        return Outcome(((1.0,),))

    calculate(open_book(write(tmp_path / "b.xlsx", fill)), answer)
    assert seen == {
        1.0: OMITTED,
        2.0: ((None,),),
        3.0: "",
        4.0: 0.0,
        5.0: (("",),),
        6.0: ((None,),),
        OMITTED: OMITTED,
    }


def test_what_the_engine_lacks_is_stale_and_so_is_all_that_reads_it(tmp_path):
    def fill(book, sheet):
        sheet.write_formula("G2", "=_xlfn.MAP(G1,_xlfn.LAMBDA(_xlpm.x,_xlpm.x*2))", None, 8.5)
        sheet.write_formula("G3", f'=MOLE_CSTR({RANGE},,G2,"A")', None, 0.125)
        sheet.write_formula("G4", "=G3*2", None, 0.25)
        sheet.write_formula("G5", f'=MOLE_CSTR({RANGE},,G1,"A")')
        sheet.write_formula("G6", "='[2]Other'!A1", None, 3.0)

    path, out = write(tmp_path / "b.xlsx", fill), tmp_path / "out.xlsx"
    code, values, problems = recalc(path, "--out", out, "--set", "Design!G1=2")
    assert code == 1
    assert values == {"Design!G3": 0.125, "Design!G5": near(tank(2.0)[0])}
    assert {cell: error for cell, (error, _) in problems.items()} == dict.fromkeys(
        ["Design!G2", "Design!G3", "Design!G4", "Design!G6"], "stale"
    )
    assert "LAMBDA" in problems["Design!G2"][1]
    assert "Design!G2" in problems["Design!G3"][1]
    sheet = openpyxl.load_workbook(out, data_only=True)["Design"]
    assert [sheet[c].value for c in ("G2", "G3", "G4", "G6")] == [8.5, 0.125, 0.25, 3.0]


def test_tables_names_and_other_sheets(tmp_path):
    def fill(book, sheet):
        feed = book.add_worksheet("My feed")
        feed.add_table("A1:B4", {"name": "Fed", "columns": [{"header": "Species"}, {"header": "Feed [mol/L]"}],
                                 "data": [["A", 2.0], ["B", 0.0], ["C", 0.0]]})  # fmt: skip
        sheet.write_row("A10", ["Reaction", "k [1/h]"])
        sheet.write_row("A11", ["A -> B", 0.5])
        sheet.write_row("A12", ["B -> C", 0.2])
        book.define_name("Steps", "=Design!$A$10:$B$12")
        book.define_name("tau", "=Design!$G$1")
        sheet.write_formula("G2", '=MOLE_CSTR(Steps,Fed[#All],tau,"A")')
        sheet.write_formula("G3", "=MOLE_CSTR(Steps,'My feed'!A1:B4,tau,\"A\")")
        sheet.write_formula("G4", "=MOLE_CSTR(A10:B12,'My feed'!A:B,tau,\"A\")")
        sheet.write_formula("G5", "=SUM(Fed[Feed '[mol/L']])")

    code, values, problems = recalc(write(tmp_path / "b.xlsx", fill))
    assert (code, problems) == (0, {})
    assert list(values.values()) == [near(tank(4.0)[0])] * 3


def test_shared_formulas_and_matrix_functions(tmp_path):
    def fill(book, sheet):
        for i in (1, 2, 3):
            sheet.write(f"H{i}", float(i))
            sheet.write_formula(f"I{i}", "=0")
        sheet.write_array_formula("K1:L2", "{=MINVERSE({2,0;0,4})}")
        sheet.write_formula("K4", "=MDETERM({1,2;3,4})")
        sheet.write_formula("K5", "=SUM(MMULT({1,2},{3;4}))")

    path, out = write(tmp_path / "b.xlsx", fill), tmp_path / "out.xlsx"
    part = "xl/worksheets/sheet1.xml"
    call = f'MOLE_CSTR({RANGE},,H1,"A")'.encode()
    replace_in_part(
        path,
        part,
        b'<c r="I1"><f>0</f>',
        b'<c r="I1"><f t="shared" ref="I1:I3" si="0">' + call.replace(b'"', b"&quot;") + b"</f>",
    )
    for i in (b"2", b"3"):
        replace_in_part(path, part, b'<c r="I%s"><f>0</f>' % i, b'<c r="I%s"><f t="shared" si="0"/>' % i)
    code, values, _ = recalc(path, "--out", out)
    assert code == 0
    assert values == {f"Design!I{i}": near(tank(float(i))[0]) for i in (1, 2, 3)}
    sheet = openpyxl.load_workbook(out, data_only=True)["Design"]
    assert [[sheet[c].value for c in row] for row in (("K1", "L1"), ("K2", "L2"))] == [[0.5, 0], [0, 0.25]]
    assert (sheet["K4"].value, sheet["K5"].value) == (near(-2.0), near(11.0))


def rich(path, **options):
    """A workbook with much that must not be lost."""

    def fill(book, sheet):
        bold = book.add_format({"bold": True, "bg_color": "#DDEEDD", "num_format": "0.000"})
        sheet.write_formula("G2", f'=MOLE_CSTR({RANGE},,G1,"B/C")', bold, 99.0)
        sheet.write_formula("G3", "=G2*2", bold)
        sheet.write_dynamic_array_formula("K1:K1", f"=MOLE_CSTR({RANGE},,G1)", bold)
        sheet.write_comment("G1", "residence time")
        sheet.conditional_format("G2:G3", {"type": "cell", "criteria": ">", "value": 1, "format": bold})
        sheet.data_validation("G1", {"validate": "decimal", "criteria": ">", "value": 0})
        sheet.add_table("N1:O3", {"columns": [{"header": "a"}, {"header": "b"}], "data": [[1, 2], [3, 4]]})
        chart = book.add_chart({"type": "scatter"})
        chart.add_series({"categories": "=Design!$N$1:$N$3", "values": "=Design!$K$1:$K$3"})
        sheet.insert_chart("P5", chart)
        sheet.insert_textbox("P20", "a note with <angle> & ampersand")
        sheet.set_column("A:A", 14)
        sheet.freeze_panes(1, 0)
        sheet.write_url("A9", "https://example.org/a?b=c&d=e")
        sheet.write_rich_string("A10", "plain ", bold, "bold")
        book.define_name("tau", "=Design!$G$1")
        other = book.add_worksheet("Other & more")
        other.write_formula("A1", "=Design!G2")
        other.protect("secret")

    return write(path, fill, **options)


def test_nothing_but_values_changes_in_a_rich_workbook(tmp_path):
    path, out = rich(tmp_path / "b.xlsx"), tmp_path / "out.xlsx"
    assert run("recalc", path, "--out", out).exit_code == 0
    before, after = parts(path), parts(out)
    assert list(before) == list(after)
    changed = {name for name in before if before[name] != after[name]}
    assert changed == {"xl/worksheets/sheet1.xml", "xl/worksheets/sheet2.xml"}
    for name in changed:
        old = without_values(before[name]).replace(b'ref="K1"', b'ref="K1:K3"')
        assert old == without_values(after[name])
    audit = subprocess.run(
        [sys.executable, "-m", "openxml_audit", str(out)], capture_output=True, text=True, check=False
    )
    assert audit.returncode == 0, audit.stdout


def test_a_book_with_macros_keeps_them(tmp_path):
    macros = tmp_path / "vbaProject.bin"
    macros.write_bytes(bytes(range(256)) * 40)

    path = tmp_path / "b.xlsm"

    def fill(book, sheet):
        book.add_vba_project(str(macros))
        sheet.write_formula("G2", f'=MOLE_CSTR({RANGE},,G1,"A")')

    write(path, fill)
    out = tmp_path / "out.xlsm"
    assert run("recalc", path, "--out", out).exit_code == 0
    before, after = parts(path), parts(out)
    assert after["xl/vbaProject.bin"] == macros.read_bytes()
    assert {n for n in before if before[n] != after[n]} == {"xl/worksheets/sheet1.xml"}


def test_a_book_that_is_up_to_date_stays_the_same_to_the_byte(tmp_path):
    path, once, twice = rich(tmp_path / "b.xlsx"), tmp_path / "1.xlsx", tmp_path / "2.xlsx"
    run("recalc", path, "--out", once)
    run("recalc", once, "--out", twice)
    assert parts(once) == parts(twice)


def test_books_of_another_writer(tmp_path):
    book = openpyxl.Workbook()
    sheet = book.active
    sheet.title = "Design"
    for row in (["Reaction", "k"], ["A -> B", 0.5]):
        sheet.append(row)
    sheet["D1"], sheet["E1"], sheet["D2"], sheet["E2"], sheet["D3"], sheet["E3"] = (
        "Species",
        "Feed",
        "A",
        2.0,
        "B",
        0.0,
    )
    sheet["G2"] = '=MOLE_CSTR(A1:B2,D1:E3,4,"A")'
    path, out = tmp_path / "b.xlsx", tmp_path / "out.xlsx"
    book.save(path)
    code, values, _ = recalc(path, "--out", out)
    assert (code, values) == (0, {"Design!G2": near(2 / 3)})
    assert openpyxl.load_workbook(out, data_only=True)["Design"]["G2"].value == near(2 / 3)


def test_reasons_stand_under_failing_cells_and_nothing_is_written(tmp_path):
    path = write(
        tmp_path / "b.xlsx", lambda book, sheet: sheet.write_formula("G2", f'=MOLE_CSTR({RANGE},,-1,"A")')
    )
    before = path.read_bytes()
    result = run("recalc", path)
    assert result.exit_code == 1
    lines = result.output.splitlines()
    assert lines[0].startswith("Design!G2  =MOLE_CSTR(")
    assert lines[1].strip() == "#VALUE!"
    assert "Residence time is -1" in lines[2]
    assert path.read_bytes() == before
    assert [p.name for p in tmp_path.iterdir()] == ["b.xlsx"]


def test_a_failing_want_of_a_spill_is_named_by_its_own_cell(tmp_path):
    def fill(book, sheet):
        sheet.write_column("I1", ["A", "Bx", "conversion(B)"])
        sheet.write_dynamic_array_formula("K1:K1", f"=MOLE_CSTR({RANGE},,G1,I1:I3)")

    code, values, problems = recalc(write(tmp_path / "b.xlsx", fill))
    assert code == 1
    assert values["Design!K1"] == [[near(tank(4.0)[0])], ["#VALUE!"], ["#N/A"]]
    assert "Did you mean 'B'" in problems["Design!K2"][1]
    assert problems["Design!K3"][0] == "#N/A"


def test_errors_and_dates_in_inputs(tmp_path):
    def fill(book, sheet):
        sheet.write_formula("H1", "=1/0")
        sheet.write_formula("G2", f'=MOLE_CSTR({RANGE},,H1,"A")')
        sheet.write_datetime(
            "J2", __import__("datetime").datetime(2026, 3, 1), book.add_format({"num_format": "d mmm yyyy"})
        )
        sheet.write_row("J1", ["Species", "Feed [mol/L]"])
        sheet.write("K2", 1.0)
        sheet.write_formula("G3", f'=MOLE_CSTR({RANGE},J1:K2,G1,"A")')

    _, values, problems = recalc(write(tmp_path / "b.xlsx", fill))
    assert values == {"Design!G2": "#DIV/0!", "Design!G3": "#VALUE!"}
    assert "contains a date" in problems["Design!G3"][1]


def test_a_circular_reference_is_told(tmp_path):
    def fill(book, sheet):
        sheet.write_formula("G2", f'=MOLE_CSTR({RANGE},,G3,"A")', None, 1.0)
        sheet.write_formula("G3", "=G2+1", None, 2.0)

    code, values, problems = recalc(write(tmp_path / "b.xlsx", fill))
    assert code == 1
    assert values == {"Design!G2": 1.0}
    assert any("circular" in reason for _, reason in problems.values())


def test_constants_of_every_kind_reach_the_formulas(tmp_path):
    """They are handed over as pieces of columns: gaps stay blank, and each kind stays what it is."""

    def fill(book, sheet):
        for row, value in enumerate((1.5, "x", True, None, 2.5, None, None, -3), start=9):
            if value is not None:
                sheet.write(row, 0, value)
        sheet.write("A20", "=NA()")
        sheet.write("C10", "")
        kinds = '=IF(ISBLANK(A{0}),"blank",IF(ISLOGICAL(A{0}),"logical",IF(ISTEXT(A{0}),"text",IF(ISNUMBER(A{0}),"number","?"))))'
        for row in range(10, 19):
            sheet.write_formula(f"B{row}", kinds.format(row) + f'&IF(FALSE,MOLE_CSTR({RANGE},,G1,"A"),"")')
        sheet.write_formula("B19", f'=SUM(A10:A18)*MOLE_CSTR({RANGE},,G1,"A")')

    code, values, problems = recalc(write(tmp_path / "b.xlsx", fill))
    assert (code, problems) == (0, {})
    kinds = [values[f"Design!B{row}"] for row in range(10, 19)]
    assert kinds == ["number", "text", "logical", "blank", "number", "blank", "blank", "number", "blank"]
    assert values["Design!B19"] == near((1.5 + 2.5 - 3) * tank(4.0)[0])


def test_a_long_column_of_calls_is_written_row_by_row(tmp_path):
    """Rows that are there, rows that a spill needs and rows of no formula, in their order."""

    def fill(book, sheet):
        for row in range(9, 300, 2):
            sheet.write(row, 5, row / 10)
            sheet.write_formula(row, 6, f'=MOLE_CSTR({RANGE},,F{row + 1},"A")')
        sheet.write_dynamic_array_formula("K305:K305", f"=MOLE_CSTR({RANGE},,G1)")

    path, out = write(tmp_path / "b.xlsx", fill), tmp_path / "out.xlsx"
    assert recalc(path, "--out", out)[0] == 0
    sheet = openpyxl.load_workbook(out, data_only=True)["Design"]
    for row in range(9, 300, 2):
        assert sheet.cell(row + 1, 7).value == near(tank(row / 10)[0])
        assert sheet.cell(row + 2, 7).value is None
    assert [sheet[f"K{row}"].value for row in (305, 306, 307)] == [near(x) for x in tank(4.0)]
    numbers = [int(n) for n in re.findall(rb'<row r="(\d+)"', parts(out)["xl/worksheets/sheet1.xml"])]
    assert numbers == sorted(numbers)


def test_formulas_are_shown_as_a_person_would_write_them():
    for stored, shown in (
        ('MOLE_CSTR(A1,,B1,"mole_cstr(x)!_xlfn.")', 'MOLE_CSTR(A1,,B1,"mole_cstr(x)!_xlfn.")'),
        ("mole_cstr(A1)+Mole_Pfr(A1)", "MOLE_CSTR(A1)+MOLE_PFR(A1)"),
        ("SUM(Sheet2!A1,'x y'!B2)", "SUM(Sheet2!A1,'x y'!B2)"),
        ("[1]!MOLE_CSTR(Sheet2!A1)", "MOLE_CSTR(Sheet2!A1)"),
        ("'a b.xlam'!mole_pfr(A1)", "MOLE_PFR(A1)"),
        ("_xlfn.LET(_xlpm.a,1,_xlpm.a)", "LET(a,1,a)"),
    ):
        assert plain(stored, FUNCTIONS) == shown
