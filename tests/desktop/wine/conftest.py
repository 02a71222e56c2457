"""Windows Python under Wine, with our wheel in it: made once, kept in the folder that --windows names."""

import json
import os
import shutil
import signal
import subprocess
import tempfile
import uuid
import zipfile
from dataclasses import dataclass
from pathlib import Path

import pytest

from kernel.wheels import build_wheel

HERE = Path(__file__).parent
ROOT = HERE.parents[2]


def pytest_addoption(parser):
    parser.addoption(
        "--windows", default=str(ROOT / ".windows"), help="folder for Wine and Windows Python (1.2 GB)"
    )


@dataclass(frozen=True)
class Windows:
    """A Windows Python with our wheel; `folder` as setup_windows_python.sh makes it."""

    folder: Path

    @property
    def prefix(self) -> Path:
        return self.folder / "prefix"

    @property
    def executable(self) -> str:
        return self.path(self.folder / "py" / "python.exe")

    @property
    def library(self) -> Path:
        """The compiled kernel."""
        return (
            self.folder / "py" / "Lib" / "site-packages" / "moletally" / "kernel" / "compiled" / "_kernel.dll"
        )

    @staticmethod
    def path(file: Path) -> str:
        """A file of this machine as Windows names it."""
        return "Z:" + str(file).replace("/", "\\")

    def python(self, *args, env=None, timeout=120):
        """Run Windows Python and wait."""
        with tempfile.TemporaryDirectory() as scratch:
            file = Path(scratch, "environment.json")
            file.write_text(json.dumps(env or {}), encoding="utf-8")
            return self._run(
                "winpy", [self.path(HERE / "client" / "launch.py"), self.path(file), *args], timeout
            )

    def wine(self, *args, timeout=120):
        """Run any Windows program and wait."""
        return self._run("wine", args, timeout)

    def _run(self, program, args, timeout):
        return subprocess.run(
            [str(self.folder / program), *map(str, args)], capture_output=True, text=True, timeout=timeout,
            check=False, encoding="utf-8", errors="replace",
        )  # fmt: skip

    def start(self, *args):
        """Start Windows Python and go on; ended by `stop`."""
        return subprocess.Popen(
            [str(self.folder / "winpy"), *map(str, args)], stdout=subprocess.PIPE, stderr=subprocess.STDOUT,
            start_new_session=True,
        )  # fmt: skip


def stop(process):
    if process.poll() is None:
        os.killpg(process.pid, signal.SIGTERM)
    process.wait(20)
    process.stdout.close()


@pytest.fixture(scope="session")
def windows(request, tmp_path_factory) -> Windows:
    folder = Path(request.config.getoption("--windows")).resolve()
    subprocess.run([str(HERE / "setup_windows_python.sh"), str(folder)], check=True)
    wheel = build_wheel("windows-x64", tmp_path_factory.mktemp("wheel"))
    packages = folder / "py" / "Lib" / "site-packages"
    for old in packages.glob("moletally*"):
        shutil.rmtree(old)
    with zipfile.ZipFile(wheel) as archive:
        archive.extractall(packages)
    return Windows(folder)


@pytest.fixture
def server(windows):
    """A server of its own, ready for a client; gives its class id. It ends when its last client lets go."""
    class_id = "{" + str(uuid.uuid4()) + "}"
    process = windows.start("-P", "-m", "moletally.hosts.windows.serve", class_id, "1")
    first = process.stdout.readline().decode()
    assert "server running" in first, first + process.stdout.read().decode()
    yield class_id
    stop(process)
