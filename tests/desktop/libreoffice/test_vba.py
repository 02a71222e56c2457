"""The add-in's VBA, executed in LibreOffice: everything that needs neither Excel's objects nor Python's process.

Errors are numbered as Excel numbers them: 2015 #VALUE!, 2036 #NUM!, 2042 #N/A (Microsoft's documentation of
CVErr and XlCVError).
"""

import lint
import pytest
from office import ADDIN, ON_SHEETS, WITH_STAND_INS, compiles, run_basic

import build as addin
import moletally
from moletally.hosts.headless.spelling import plain
from moletally.hosts.windows.values import ERRORS, LEFT_OUT
from moletally.sheet.functions import FUNCTIONS

SETTINGS = f"moletally = {moletally.__version__}\nxlwings = {addin.settings()['xlwings']}\npython = {{python}}\ndll64 = {{python}}\n"


@pytest.fixture(scope="module")
def stand_in(tmp_path_factory):
    """The add-in with stand-ins for Excel and for the Python process, and settings that name existing files."""
    folder = tmp_path_factory.mktemp("addin")
    addin.write(folder / "standin.xlam", addin.sources() | WITH_STAND_INS)
    existing = folder / "python.exe"
    existing.write_text("")
    # LibreOffice takes the backslashes of the VBA as part of one file name.
    (folder / r"local\moletally\excel.conf").write_text(SETTINGS.format(python=existing))
    return folder / "standin.xlam", {"LOCALAPPDATA": str(folder / "local")}


def scenario(stand_in, name, *arguments):
    file, env = stand_in
    (answer,) = run_basic(file, [[f"MoleScenarios.{name}", list(arguments)]], env)
    return answer.split("\n")


def test_every_module_compiles(tmp_path):
    assert compiles(addin.sources(), tmp_path) == []


BROKEN = "Public Sub Broken()\n    If True Then\nEnd Sub\n"


@pytest.mark.parametrize("name", ["MoleCopy.bas", "MoleEvents.cls", "MoleFunctions.bas"])
def test_a_syntax_error_in_a_module_is_seen(name, tmp_path):
    texts = addin.sources()
    texts[name] += BROKEN
    assert name in compiles(texts, tmp_path)


@pytest.mark.parametrize(
    "code, complaint",
    [
        ("    undeclared = 1", "nothing declares undeclared"),
        ("    NoSuchProcedure 1, 2", "nothing declares NoSuchProcedure"),
        ("    MoleHost.NotThere", "MoleHost has no public NotThere"),
        ("    MoleHost.ShowStatus", "ShowStatus is called with 0 arguments, takes 1 to 1"),
        ("    MoleHost.ShowStatus 1, 2", "ShowStatus is called with 2 arguments, takes 1 to 1"),
        ('    Debug.Print MoleReasons.Marked("x")', "Marked is called with 1 arguments, takes 2 to 2"),
        ("    On Error GoTo Nowhere", "there is no label Nowhere"),
        ("    Dim a As Long\n    Dim a As Long", "a is declared twice"),
    ],
)
def test_what_only_excel_would_refuse_stops_the_build(code, complaint, tmp_path):
    texts = addin.sources()
    texts["MoleCopy.bas"] += f"Public Sub Broken()\n{code}\nEnd Sub\n"
    assert any(complaint in c for c in lint.complaints(texts))
    with pytest.raises(SystemExit, match="does not compile"):
        addin.build(tmp_path / "x.xlam", texts)


def test_wrappers_hand_over_what_was_typed(stand_in):
    """Arrays as arrays, what was left out as left out, booleans and empty text as such."""
    assert scenario(stand_in, "Wrappers") == [
        "String MOLE_CSTR|array 2x3 Reaction|array 2x3 Reaction|Double 2.5|String B/A|array 2x3 Reaction",
        "String MOLE_PFR|array 2x3 Reaction|left out|left out|left out|left out",
        "String MOLE_RATES|array 2x3 Reaction|array 2x3 Reaction|left out|left out",
        "String MOLE_AUDIT|String CSTR|array 2x3 Reaction|Double 2.5|Boolean True|String ",
    ]


def test_marked_errors_become_true_errors_and_reasons_are_kept(stand_in):
    assert scenario(stand_in, "Errors") == [
        "error 2036", "keeps oscillating",
        "Double 1.5", "String text", "error 2015", "error 2042", "0/0",
        "row 2: unit", "0/0", "forgotten:",
    ]  # fmt: skip


def test_every_error_has_its_number(stand_in):
    file, env = stand_in
    codes = list(ERRORS.values())
    numbers = run_basic(file, [["MoleReasons.ErrorNumber", [code]] for code in codes], env)
    assert numbers == list(ERRORS)


def test_an_exception_in_python_is_an_error_with_its_words(stand_in):
    number, reason = scenario(stand_in, "Reason")
    assert number == "error 2015"
    assert "ValueError: nothing" in reason


@pytest.mark.parametrize(
    "letters, calls, answers, aside, starts",
    [
        ("see", 2, ["answer", "answer"], False, 1),  # one process serves all calls
        ("sdsee", 2, ["answer", "answer"], False, 2),  # it ended: a new one takes over within the same call
        ("x", 3, ["last"] * 3, True, 1),  # it can't be started: one attempt, then cells keep their values
        ("sdsd", 2, ["last"] * 2, True, 2),  # it ends at every answer: given up after the second
    ],
)
def test_the_life_of_the_process(stand_in, letters, calls, answers, aside, starts):
    *values, state, commands = [
        line for line in scenario(stand_in, "Lives", letters, str(calls)) if "excel status" not in line
    ]
    assert ["last" if v == "String last value" else "answer" for v in values] == answers
    assert state.startswith(f"aside {aside}")
    commands = commands.split("|")[:-1]
    assert len(commands) == starts
    assert len(set(commands)) == starts  # a command that was used is never used again


def test_the_command_of_the_start(stand_in):
    (command,) = scenario(stand_in, "Command", r"C:\Program Files\Python\python.exe")
    assert command == r'"C:\Program Files\Python\python.exe" -P -m moletally.hosts.windows.serve $(CLSID) 7'


@pytest.mark.parametrize(
    "change, words",
    [
        (("moletally = ", "moletally = 0"), "This macro file is moletally"),
        (("xlwings = ", "xlwings = 9"), "This macro file was made for xlwings"),
        (("python = ", "python = /nowhere"), "Python is missing"),
        (("dll64 = ", "dll64 = /nowhere"), "The library that starts Python is missing"),
        ((SETTINGS, None), "is not installed for you on this computer"),
    ],
)
def test_what_is_missing_is_told_before_anything_starts(stand_in, change, words, tmp_path):
    file, _ = stand_in
    existing = tmp_path / "python.exe"
    existing.write_text("")
    if change[1] is not None:
        text = SETTINGS.replace(*change).format(python=existing)
        (tmp_path / r"local\moletally\excel.conf").write_text(text)
    (told,) = run_basic(file, [["MoleSettings.Broken", []]], {"LOCALAPPDATA": str(tmp_path / "local")})
    assert words in told
    assert "moletally excel install" in told


SPELLINGS = [
    "=MOLE_CSTR(A1:B2,,C3)",
    "=[1]!MOLE_CSTR(A1)*2",
    "=IF(A1=\"_xldudf_MOLE_CSTR(\",'C:\\Users\\O''Neil\\moletally.xlam'!MOLE_CSTR(Sheet1!A1:B2,,'My sheet'!C3),_xldudf_MOLE_PFR(T[#All]))",
    '=MyMOLE_CSTR(1)+moletally.xlam!MOLE_RATES(1)+_xll.MOLE_AUDIT("CSTR",2)',
    "=SUM(MOLE_PROFILE(Feed!A1,B1),'Mole'!A1)",
    '="a ""quoted"" [1]!MOLE_CSTR("&[2]!MOLE_PFR(A1)',
]


def test_spellings_are_read_as_everywhere_else(stand_in):
    """The same formulas through the headless reader of spellings."""
    file, env = stand_in
    shown = run_basic(file, [["MoleSpelling.OwnSpelling", [f]] for f in SPELLINGS], env)
    assert shown == ["=" + plain(f[1:], FUNCTIONS) for f in SPELLINGS]
    assert shown[0] == SPELLINGS[0]
    assert shown[1] == "=MOLE_CSTR(A1)*2"


def test_links_of_another_place_are_recognised(stand_in):
    file, env = stand_in
    own = r"C:\Users\me\XLSTART\moletally.xlam"
    links = [
        r"D:\old\moletally.xlam",
        r"d:\OLD\MOLETALLY.XLAM",
        "https://host/x/moletally.xlam",
        own.upper(),
        r"D:\old\prices.xlsx",
    ]
    calls = [["MoleAdopt.IsOldLink", [link, "moletally.xlam", own]] for link in links]
    assert run_basic(file, calls, env) == [True, True, True, False, False]


def test_a_last_answer_is_kept_for_its_own_formula_alone(stand_in):
    """The newest, not for another formula in the cell, not for a cell that shows more than the call gave, not after a book closed."""
    assert scenario(stand_in, "Kept") == ["Double 3.5", "nothing", "nothing", "nothing", "nothing"]


@pytest.mark.parametrize(
    "formula, bare",
    [
        ("=MOLE_CSTR(A1:B2,,C3)", True),
        ("='C:\\x\\moletally.xlam'!MOLE_PFR(A1,INDEX(B1:B3,2),\"a)b\")", True),
        ("=MOLE_CSTR(A1,MOLE_PFR(B1),'odd) sheet'!C3)", True),
        ("=100*MOLE_CSTR(A1)", False),
        ("=MOLE_CSTR(A1)/MOLE_CSTR(A2)", False),
        ("=MOLE_CSTR(A1)*2", False),
        ("=SUM(MOLE_CSTR(A1))", False),
        ("=MOLE_CSTR", False),
        ("", False),
    ],
)
def test_what_is_one_call_and_nothing_else(stand_in, formula, bare):
    assert scenario(stand_in, "Bare", formula) == [str(bare)]


def test_left_out_is_said_alike_on_both_sides(stand_in):
    file, env = stand_in
    assert run_basic(file, [["MoleReasons.LeftOut", []]], env) == [LEFT_OUT]


def test_the_built_add_in_runs_as_it_is():
    """The committed file, without stand-ins."""
    names, signature = run_basic(ADDIN, [["MoleTable.Names", []], ["MoleTable.Signature", ["MOLE_CSTR"]]])
    assert names == list(FUNCTIONS)
    assert signature == FUNCTIONS["MOLE_CSTR"].signature


def test_ranges_are_read_with_the_modules_that_excel_runs(tmp_path):
    """LibreOffice has enough of Excel's objects for these: used cells of whole columns, single cells, empty ones."""
    addin.write(tmp_path / "sheets.xlam", addin.sources() | ON_SHEETS)
    (ranges,) = run_basic(tmp_path / "sheets.xlam", [["MoleSheets.Ranges", []]])
    assert ranges.split("\n") == [
        "2x2 String moletally", "4x2 String moletally", "3x2 String xlwings", "1x1 Double 0.00003217",
        "1x1 String text", "1x1 Empty ", "1x1 Empty ", "this is several ranges; give one range",
    ]  # fmt: skip
