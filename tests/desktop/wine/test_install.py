"""install, status and uninstall on Windows' file system and registry, as far as Wine has them.

Excel itself is not there: its registration, and the key under which it keeps trusted locations, are made by hand.
"""

import re
from pathlib import Path

import pytest

EXCEL = r"HKCU\Software\Classes\Excel.Application\CLSID"
SECURITY = r"HKCU\Software\Microsoft\Office\16.0\Excel\Security"
TRUSTED = SECURITY + r"\Trusted Locations"


class User:
    """A user of Windows with folders of their own, and the command as they type it."""

    def __init__(self, windows, folder):
        self.windows, self.folder = windows, folder
        for name in ("Roaming", "Local"):
            (folder / name).mkdir(parents=True)
        self.env = {
            "APPDATA": windows.path(folder / "Roaming"),
            "LOCALAPPDATA": windows.path(folder / "Local"),
        }
        self.startup = folder / "Roaming" / "Microsoft" / "Excel" / "XLSTART"
        self.addin = self.startup / "moletally.xlam"
        self.settings = folder / "Local" / "moletally" / "excel.conf"

    def excel(self, *arguments):
        done = self.windows.python("-m", "moletally", "excel", *arguments, env=self.env, timeout=240)
        return done.returncode, done.stdout + done.stderr

    def files(self):
        return sorted(str(p.relative_to(self.folder)) for p in self.folder.rglob("*"))

    def registry(self):
        file = self.folder.parent / "registry.reg"
        self.windows.wine("reg", "export", r"HKCU\Software\Microsoft\Office", self.windows.path(file), "/y")
        return file.read_text(encoding="utf-16") if file.exists() else ""


@pytest.fixture
def registry(windows):
    def add(key, name=None, value="", kind="REG_SZ"):
        named = ["/v", name] if name else ["/ve"]
        done = windows.wine("reg", "add", key, *named, "/t", kind, "/d", value, "/f")
        assert done.returncode == 0, done.stdout + done.stderr

    yield add
    for key in (
        r"HKCU\Software\Classes\Excel.Application",
        r"HKCU\Software\Microsoft\Office",
        r"HKCU\Software\Policies",
    ):
        windows.wine("reg", "delete", key, "/f")


@pytest.fixture
def user(windows, registry, tmp_path):
    registry(EXCEL, value="{00024500-0000-0000-C000-000000000046}")
    return User(windows, tmp_path / "user")


def test_without_excel_nothing_is_installed(windows, tmp_path):
    user = User(windows, tmp_path / "user")
    code, said = user.excel("install")
    assert code == 2
    assert "there is no Excel on this computer" in said
    assert "moletally recalc" in said
    code, said = user.excel("status")
    assert code == 1
    assert "broken  Excel: not found" in said


def test_installed_looked_at_and_taken_away_without_trace(user, registry):
    registry(TRUSTED + r"\Location0", "Path", "C:\\Elsewhere\\")
    files, keys = user.files(), user.registry()
    code, said = user.excel("install")
    assert code == 0, said
    assert (
        user.addin.read_bytes() == (Path(__file__).parents[3] / "addin/windows/moletally.xlam").read_bytes()
    )
    settings = user.settings.read_text()
    assert f"python = {user.windows.executable}" in settings.replace("z:", "Z:")
    assert re.search(r"dll64 = .*xlwings64-\d+\.\d+\.\d+\.dll", settings)
    assert "added that folder to the trusted locations of Excel 16.0" in said
    assert "XLSTART" in user.registry()
    for line in ("placed the macro file", "pinned this Python", "no mark of coming from the internet"):
        assert line in said
    code, said = user.excel("status")
    assert code == 0, said
    for link in (
        "Excel",
        "macro file",
        "settings",
        "versions",
        "macros",
        "Python",
        "pywin32",
        "xlwings",
        "DLL",
        "kernel",
    ):
        assert re.search(rf"^ok +{link}: ", said, re.MULTILINE), said
    assert re.search(r"^ok +kernel: compiled engine \(C\), numpy \d+\.\d+\.\d+$", said, re.MULTILINE), said
    code, said = user.excel("uninstall")
    assert code == 0
    assert "removed our entry from the trusted locations of Excel 16.0" in said
    assert (user.files(), user.registry()) == (files, keys)


def test_twice_is_once_and_a_folder_that_excel_had_stays(user):
    user.startup.mkdir(parents=True)
    files = user.files()
    assert user.excel("install")[0] == 0
    once = user.files()
    code, said = user.excel("install")
    assert code == 0, said
    assert user.files() == once
    assert user.excel("uninstall")[0] == 0
    assert user.files() == files
    code, said = user.excel("uninstall")
    assert code == 0
    assert "nothing was installed for this user" in said


@pytest.mark.parametrize("below", [False, True])
def test_a_trusted_folder_needs_no_entry(user, registry, below):
    trusted = user.startup.parent if below else user.startup
    registry(TRUSTED + r"\Location3", "Path", user.windows.path(trusted) + "\\")
    registry(TRUSTED + r"\Location3", "AllowSubfolders", str(int(below)), "REG_DWORD")
    keys = user.registry()
    _, said = user.excel("install")
    assert "Excel 16.0 trusts that folder already" in said
    assert user.registry() == keys


def test_another_file_of_that_name_is_left_alone(user):
    user.startup.mkdir(parents=True)
    user.addin.write_bytes(b"somebody else's")
    code, said = user.excel("install")
    assert code == 2
    assert "is another file of that name: move it away" in said
    assert not user.settings.exists()
    _, said = user.excel("uninstall")
    assert user.addin.read_bytes() == b"somebody else's"
    assert "left alone" in said


@pytest.mark.parametrize(
    "old, new, link, mend",
    [
        ("python = ", r"python = C:\gone\x", "Python", "install Python and moletally again"),
        ("xlwings = ", "xlwings = 9", "versions", "moletally excel install"),
        ("dll64 = ", r"dll64 = C:\gone\x", "DLL", "pip install --force-reinstall"),
        ("moletally = ", "moletally = 0", "versions", "moletally excel install"),
    ],
)
def test_status_names_the_broken_link_and_its_mend(user, old, new, link, mend):
    user.excel("install")
    user.settings.write_text(user.settings.read_text().replace(old, new, 1))
    code, said = user.excel("status")
    assert code == 1
    assert re.search(rf"^broken +{link}: .*\n +-> .*{re.escape(mend)}", said, re.MULTILINE), said


def test_a_library_that_is_gone_is_told_and_numpy_answers(user):
    user.excel("install")
    library = user.windows.library
    aside = library.rename(library.with_suffix(".aside"))
    try:
        code, said = user.excel("status")
    finally:
        aside.rename(library)
    assert code == 0, said
    told = r"^ok +kernel: reference engine \(numpy\), numpy [\d.]+: right but slower, .*\n +-> .*--force-reinstall"
    assert re.search(told, said, re.MULTILINE), said


HOLD = """
import ctypes, subprocess, sys
open_file = ctypes.windll.kernel32.CreateFileW
open_file.restype = ctypes.c_void_p
assert open_file(sys.argv[1], 0x80000000, int(sys.argv[2]), None, 3, 0, None) != ctypes.c_void_p(-1).value
for command in ("install", "uninstall", "status"):
    done = subprocess.run([sys.executable, "-m", "moletally", "excel", command], capture_output=True, text=True)
    print(command, done.returncode, done.stdout, done.stderr)
"""


@pytest.mark.parametrize("shared", [0, 1], ids=["to nobody", "for reading"])
def test_a_file_that_excel_holds_is_left_as_it_is(user, shared):
    assert user.excel("install")[0] == 0
    files = {f: (user.folder / f).read_bytes() for f in user.files() if (user.folder / f).is_file()}
    done = user.windows.python("-c", HOLD, user.windows.path(user.addin), shared, env=user.env)
    said = done.stdout + done.stderr
    assert {f: (user.folder / f).read_bytes() for f in user.files() if (user.folder / f).is_file()} == files
    assert (
        len(
            re.findall(
                r"^(?:un)?install 2 .*\n* *Error: .*Excel holds it: close all Excel windows", said, re.M
            )
        )
        == 2
    )
    assert "Traceback" not in said
    state = "ok" if shared else "unknown"
    for link in ("macro file", "versions"):
        assert re.search(rf"{state} +{link}: ", said), said
    assert f"status {0 if shared else 1} " in said


def test_the_mark_of_the_internet_is_told_and_removed(user):
    """Wine keeps a stream as a file of that name."""
    user.excel("install")
    mark = user.startup / "moletally.xlam:Zone.Identifier"
    mark.write_text("[ZoneTransfer]\nZoneId=3\n")
    code, said = user.excel("status")
    assert code == 1
    assert re.search(r"^broken +macro file: marked as coming from the internet", said, re.MULTILINE), said
    code, said = user.excel("install")
    assert code == 0
    assert "removed the mark of coming from the internet" in said
    assert not mark.exists()


def test_a_folder_taken_off_the_trusted_ones_is_told_and_anothers_entry_stays(user, registry):
    registry(TRUSTED + r"\Location0", "Path", "C:\\Elsewhere\\")
    registry(TRUSTED + r"\Location0", "Description", "moletally")
    user.excel("install")
    user.windows.wine("reg", "delete", TRUSTED + r"\Location1", "/f")
    code, said = user.excel("status")
    assert code == 1
    assert re.search(r"^broken +macros: Excel 16\.0 does not trust .*XLSTART", said, re.MULTILINE), said
    keys = user.registry()
    user.excel("uninstall")
    assert user.registry() == keys


POLICY = r"HKCU\Software\Policies\Microsoft\Office\16.0\Excel\Security"
CLOUD = r"HKCU\Software\Policies\Microsoft\Cloud\Office\16.0\Excel\Security"


RULES = [
    # "Disable all macros without notification", in a trusted location: macros are enabled. Table in
    # Microsoft's VBA reference, page Document.MacrosEnabled (Visio).
    (POLICY, "VBAWarnings", "4", "ok", "switches macros off outside trusted locations"),
    (POLICY, "blockcontentexecutionfrominternet", "1", "ok", "carries no such mark"),
    (POLICY, "RequireAddinSig", "1", "unknown", "asks for signed add-ins"),
    (POLICY + r"\Trusted Locations", "AllLocationsDisabled", "1", "broken", "switches trusted locations off"),
    (CLOUD, "DisableAllAddins", "1", "broken", "switches all add-ins off"),
    (TRUSTED, "AllLocationsDisabled", "1", "broken", "switched off in Excel's own options"),
]


def test_rules_are_told_and_those_count_that_stop_the_add_in(user, registry):
    for key, name, value, _, _ in RULES:
        registry(key, name, value, "REG_DWORD")
    code, said = user.excel("install")
    assert code == 0
    for _, _, _, state, told in RULES:
        assert re.search(rf"^{'noted' if state == 'ok' else 'careful'}: .*{told}", said, re.MULTILINE), said
    for key, name, _, _, _ in RULES:
        user.windows.wine("reg", "delete", key, "/v", name, "/f")
    for key, name, value, state, told in RULES:
        registry(key, name, value, "REG_DWORD")
        code, said = user.excel("status")
        user.windows.wine("reg", "delete", key, "/v", name, "/f")
        assert code == (0 if state == "ok" else 1)
        assert re.search(rf"^{state} +macros: .*{told}", said, re.MULTILINE), said


def test_before_the_first_install_nothing_else_is_called_broken(user):
    code, said = user.excel("status")
    assert code == 1
    assert re.findall(r"^broken +([\w ]+):", said, re.MULTILINE) == ["macro file", "settings", "Python"]
    assert "pip" not in said


def test_an_excel_that_does_not_start_makes_no_macro_file_and_none_is_placed(user):
    """The class that the fixture registers has no program: Excel can't be run here."""
    files = user.files()
    code, said = user.excel("install", "--with-excel")
    assert code == 2
    assert "Excel does not start" in said
    assert user.files() == files


def test_a_disabled_add_in_is_told(user, registry):
    user.excel("install")
    blocked = "XLSTART\\moletally.xlam".encode("utf-16le").hex()
    registry(
        r"HKCU\Software\Microsoft\Office\16.0\Excel\Resiliency\DisabledItems", "A1", blocked, "REG_BINARY"
    )
    code, said = user.excel("status")
    assert code == 1
    assert "Manage: Disabled Items" in said


def test_letters_outside_the_code_page_do_not_stop_it_but_a_doubt_is_told(windows, registry, tmp_path):
    registry(EXCEL, value="{00024500-0000-0000-C000-000000000046}")
    user = User(windows, tmp_path / "Anwender Jürgen")
    assert user.excel("install")[0] == 0
    assert user.excel("status")[0] == 0
    user = User(windows, tmp_path / "日本")
    code, said = user.excel("install")
    assert code == 0, said
    assert "careful: " in said
    assert user.addin.exists()
    code, said = user.excel("status")
    assert code == 1
    assert re.search(r"^unknown +settings: .*letters outside the code page", said, re.MULTILINE), said


def test_a_python_in_a_folder_with_such_letters_is_pinned_by_its_short_path(windows, registry, tmp_path):
    registry(EXCEL, value="{00024500-0000-0000-C000-000000000046}")
    user = User(windows, tmp_path / "user")
    python = tmp_path / "日本" / "pythonw.exe"
    python.parent.mkdir()
    (python.parent / "python.exe").write_bytes(b"stands for it")
    code = (
        "import sys; sys.executable = sys.argv.pop(1); sys.argv[0] = 'moletally';"
        "from moletally.cli import main; main()"
    )
    done = windows.python("-c", code, windows.path(python), "excel", "install", env=user.env)
    assert done.returncode == 0, done.stdout + done.stderr
    (pinned,) = re.findall(r"^python = (.*)$", user.settings.read_text(encoding="ascii"), re.MULTILINE)
    read = windows.python("-c", "import sys; print(open(sys.argv[1]).read())", pinned)
    assert read.stdout.strip() == "stands for it"
