"""Real wheels and real installs, without a compiler too. Fetches ziglang (100 MB, kept by uv):

uv run pytest -m wheels
"""

import os
import shutil
import subprocess
import sys
import tarfile
from dataclasses import dataclass
from pathlib import Path

import pytest

from kernel import build, wheels

pytestmark = pytest.mark.wheels

ROOT = Path(wheels.__file__).parents[2]
UV = os.environ.get("UV") or shutil.which("uv")  # `uv run` says where it is
SCRIPTS = "Scripts" if sys.platform == "win32" else "bin"
OURS = ("CC", "MOLETALLY_KERNEL", "MOLETALLY_ENGINE", "VIRTUAL_ENV", "PYTHONPATH")
WHICH = "from moletally.kernel.engine import engine; print(type(engine()).__name__)"


@pytest.fixture(scope="module")
def project(tmp_path_factory) -> Path:
    """The project as a user has it: what git would hand out, and nothing that was built."""
    listed = subprocess.run(
        ["git", "ls-files", "-z", "--cached", "--others", "--exclude-standard"],
        cwd=ROOT, capture_output=True, check=True,
    )  # fmt: skip
    copy = tmp_path_factory.mktemp("project")
    for name in filter(None, listed.stdout.decode().split("\0")):
        if (ROOT / name).is_file():
            (copy / name).parent.mkdir(parents=True, exist_ok=True)
            shutil.copy(ROOT / name, copy / name)
    return copy


@dataclass(frozen=True)
class Fresh:
    """A new virtual environment on a machine whose PATH is `path`: where it is empty, there is no compiler."""

    folder: Path
    path: str

    def run(self, *command, **environment):
        env = {name: value for name, value in os.environ.items() if name not in OURS}
        env |= {"PATH": self.path} | environment
        command = [str(part) for part in command]
        return subprocess.run(command, env=env, capture_output=True, text=True, check=False, cwd=self.folder)

    @property
    def python(self) -> Path:
        return self.folder / "venv" / SCRIPTS / "python"

    def install(self, *what, **environment) -> str:
        """Install; returns what was said, the build's own words among it."""
        options = ["--verbose", "--refresh-package", "moletally", "--python", self.python]
        done = self.run(UV, "pip", "install", *options, *what, **environment)
        assert done.returncode == 0, done.stderr
        return done.stderr

    def engine(self) -> str:
        """The engine that answers there, after a workbook was calculated with it."""
        moletally = self.folder / "venv" / SCRIPTS / "moletally"
        for words in (["new", "amination", "design.xlsx"], ["recalc", "design.xlsx"]):
            done = self.run(moletally, *words)
            assert done.returncode == 0, done.stderr
        return self.run(self.python, "-c", WHICH).stdout.strip()


@pytest.fixture
def fresh(tmp_path):
    def make(path) -> Fresh:
        machine = Fresh(tmp_path, path)
        done = machine.run(UV, "venv", "--python", sys.executable, tmp_path / "venv")
        assert done.returncode == 0, done.stderr
        return machine

    return make


@pytest.fixture
def bare(fresh, tmp_path) -> Fresh:
    """A machine without a compiler."""
    nothing = tmp_path / "nothing"
    nothing.mkdir()
    machine = fresh(str(nothing))
    found = machine.run(sys.executable, Path(build.__file__), "--out", tmp_path / "out")
    assert "no C compiler works here" in found.stderr
    return machine


@pytest.fixture(scope="module")
def made(project, tmp_path_factory) -> dict[str, Path]:
    out = tmp_path_factory.mktemp("wheels")
    return {name: wheels.build_wheel(name, out, project) for name in build.TARGETS}


@pytest.mark.parametrize("name", build.TARGETS)
def test_a_wheel_holds_the_library_of_its_platform(made, name):
    library = wheels.examine(made[name], name)
    assert library.machine == name
    assert library.exports == wheels.declared()


def test_a_wheel_under_another_name_is_refused(made, tmp_path):
    renamed = tmp_path / made["linux-arm64"].name.replace("aarch64", "x86_64")
    shutil.copy(made["linux-arm64"], renamed)
    with pytest.raises(wheels.BadWheel, match="the library is for linux-arm64"):
        wheels.examine(renamed, "linux-x64")


@pytest.mark.parametrize("name", build.TARGETS)
def test_the_same_sources_give_the_same_wheel(made, project, tmp_path, name):
    """Byte for byte, so no folder or time of the machine that built it is in it."""
    elsewhere = shutil.copytree(project, tmp_path / "elsewhere")
    again = wheels.build_wheel(name, tmp_path, elsewhere)
    assert again.read_bytes() == made[name].read_bytes()


@pytest.mark.skipif(build.this_target() is None, reason="no wheel is made for this platform")
def test_a_wheel_is_all_that_an_install_needs(made, bare):
    bare.install(made[build.this_target()])
    assert bare.engine() == "CompiledEngine"


def test_an_install_from_source_takes_the_compiler_that_is_there(project, fresh):
    if build.find_compiler() is None:
        pytest.skip("no C compiler here")
    said = fresh(os.environ["PATH"]).install(project)
    assert f"compiled by {build.find_compiler()}" in said


def test_an_install_from_source_needs_no_compiler(project, bare):
    assert "compiled by ziglang" in bare.install(project)
    assert bare.engine() == "CompiledEngine"


@pytest.mark.parametrize("how", [(), ("--editable",)], ids=["plain", "editable"])
def test_an_install_with_neither_compiler_nor_ziglang_says_so_and_works(project, bare, tmp_path, how):
    copy = shutil.copytree(project, tmp_path / "copy")
    compiled = copy / build.BINDING.relative_to(ROOT)
    of_other_sources = compiled / build.library_name()
    of_other_sources.write_bytes(b"made of other sources")
    bare.install("hatchling", "editables")  # what builds, without what it would fetch
    said = bare.install("--no-build-isolation", *how, copy)
    assert "moletally goes without its compiled kernel: no C compiler works here" in said
    assert of_other_sources.exists() is not bool(how)  # beside the binding it would be loaded
    assert bare.engine() == "ReferenceEngine"


def test_an_install_can_be_told_not_to_compile(project, fresh):
    machine = fresh(os.environ["PATH"])
    said = machine.install(project, MOLETALLY_KERNEL="none")
    assert "goes without its compiled kernel: MOLETALLY_KERNEL is none" in said
    assert machine.engine() == "ReferenceEngine"


def test_a_platform_that_is_not_known_stops_the_build(project, fresh):
    machine = fresh(os.environ["PATH"])
    done = machine.run(
        UV, "build", "--wheel", project, "--out-dir", machine.folder, MOLETALLY_KERNEL="abacus"
    )
    assert done.returncode != 0
    assert "MOLETALLY_KERNEL = 'abacus': known are none, windows-x64," in done.stderr


def test_who_works_on_the_sources_sees_that_they_do_not_compile(project, fresh, tmp_path):
    if build.find_compiler() is None:
        pytest.skip("no C compiler here")
    copy = shutil.copytree(project, tmp_path / "copy")
    (copy / "addin" / "kernel" / "broken.c").write_text("int broken(")
    machine = fresh(os.environ["PATH"])
    done = machine.run(UV, "pip", "install", "--python", machine.python, "--editable", copy)
    assert done.returncode != 0
    assert "refused the C sources" in done.stderr
    assert "broken.c:1:" in done.stderr


def test_the_source_archive_has_what_a_build_needs(project, fresh, tmp_path):
    machine = fresh(os.environ["PATH"])
    copy = shutil.copytree(project, tmp_path / "copy")
    (copy / build.BINDING.relative_to(ROOT) / build.library_name()).write_bytes(b"built here")
    done = machine.run(UV, "build", "--sdist", copy, "--out-dir", tmp_path)
    assert done.returncode == 0, done.stderr
    (archive,) = tmp_path.glob("*.tar.gz")
    with tarfile.open(archive) as tar:
        inside = {name.partition("/")[2] for name in tar.getnames()}
        tar.extractall(tmp_path / "unpacked", filter="data")
    kernel = {f"addin/kernel/{path.name}" for path in (project / "addin" / "kernel").iterdir()}
    assert kernel <= inside
    assert not [name for name in inside if name.endswith((".so", ".dll", ".dylib", ".built"))]
    (unpacked,) = (tmp_path / "unpacked").iterdir()
    wheel = wheels.build_wheel("linux-x64", tmp_path, unpacked)
    wheels.examine(wheel, "linux-x64")
