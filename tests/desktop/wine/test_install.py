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
        done = self.windows.python("-m", "moletally", "excel", *arguments, env=self.env)
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
    code, said = user.excel("uninstall")
    assert code == 0
    assert "removed our entry from the trusted locations of Excel 16.0" in said
    assert (user.files(), user.registry()) == (files + made_by_windows(files, user), keys)


def made_by_windows(before, user):
    """Parents that Excel itself would have made: the command leaves the path to its start-up folder's parent."""
    return [
        f for f in user.files() if f not in before and f in ("Roaming/Microsoft", "Roaming/Microsoft/Excel")
    ]


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


def test_a_trusted_folder_needs_no_entry(user, registry):
    registry(TRUSTED + r"\Location3", "Path", user.windows.path(user.startup) + "\\")
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


def test_a_policy_is_told(user, registry):
    registry(r"HKCU\Software\Policies\Microsoft\Office\16.0\Excel\Security", "VBAWarnings", "4", "REG_DWORD")
    _, said = user.excel("install")
    assert "IT has to know: a policy switches all macros off" in said
    code, said = user.excel("status")
    assert code == 1
    assert "ask IT to allow macros" in said


def test_a_disabled_add_in_is_told(user, registry):
    user.excel("install")
    blocked = "XLSTART\\moletally.xlam".encode("utf-16le").hex()
    registry(
        r"HKCU\Software\Microsoft\Office\16.0\Excel\Resiliency\DisabledItems", "A1", blocked, "REG_BINARY"
    )
    code, said = user.excel("status")
    assert code == 1
    assert "Manage: Disabled Items" in said


def test_letters_outside_the_code_page_do_not_stop_it(windows, registry, tmp_path):
    registry(EXCEL, value="{00024500-0000-0000-C000-000000000046}")
    user = User(windows, tmp_path / "Anwender Jürgen 日本")
    code, said = user.excel("install")
    assert code == 0, said
    assert user.addin.exists()
    assert user.excel("status")[0] == 0
