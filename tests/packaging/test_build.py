"""The command that compiles the kernel, on a small C file in place of it; needs a compiler that works here."""

import ctypes
import importlib.util
import os
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

from kernel import build
from kernel.headers import read_library

SCRIPT = Path(build.__file__)
SMALL = """\
#include <math.h>
#include "small.h"
double hidden(double x) { return log(x); }
API double shown(double x) { return NUMBER + (hidden(x) - log(x)); }
API double twice_rounded(double a, double b, double c) { return a * b + c; }
"""
HEADER = """\
#if defined(_WIN32)
#define API __declspec(dllexport)
#else
#define API __attribute__((visibility("default")))
#endif
#define NUMBER 7.0
"""

needs_compiler = pytest.mark.skipif(
    build.find_compiler() is None, reason="no C compiler works here; `-m wheels` fetches one"
)


@pytest.fixture
def folder(tmp_path) -> Path:
    """A folder like addin/kernel."""
    shutil.copy(SCRIPT, tmp_path / "build.py")
    (tmp_path / "small.c").write_text(SMALL)
    (tmp_path / "small.h").write_text(HEADER)
    return tmp_path


def run(folder, *args, **environment):
    env = {name: value for name, value in os.environ.items() if name != "CC"} | environment
    command = [sys.executable, str(folder / "build.py"), "--out", str(folder / "out"), *args]
    return subprocess.run(command, capture_output=True, text=True, check=False, env=env)


def library(folder) -> Path:
    (found,) = folder.glob("out/_kernel.[sd]*")
    return found


def compiled(folder, **environment) -> bool:
    done = run(folder, **environment)
    assert done.returncode == 0, done.stderr
    assert done.stdout.startswith(library(folder).name)
    assert ("compiled by" in done.stdout) is not ("unchanged" in done.stdout)
    return "compiled by" in done.stdout


@needs_compiler
def test_the_library_computes_and_shows_what_is_marked(folder):
    assert compiled(folder)
    loaded = ctypes.CDLL(str(library(folder)))
    loaded.shown.restype = ctypes.c_double
    loaded.shown.argtypes = (ctypes.c_double,)
    assert loaded.shown(3.0) == 7.0
    assert read_library(library(folder).read_bytes()).exports == {"shown", "twice_rounded"}


@needs_compiler
def test_products_and_sums_are_rounded_one_by_one(folder):
    """Python rounds a product before it adds; an fma wouldn't, and digits would depend on the processor."""
    compiled(folder)
    loaded = ctypes.CDLL(str(library(folder)))
    loaded.twice_rounded.restype = ctypes.c_double
    loaded.twice_rounded.argtypes = (ctypes.c_double,) * 3
    a = 1 + 2.0**-30  # a*a = 1 + 2^-29 + 2^-60, of which the last term is lost in the product
    assert loaded.twice_rounded(a, a, -(a * a)) == 0.0


@needs_compiler
def test_nothing_is_compiled_twice(folder):
    assert compiled(folder)
    before = library(folder).stat().st_mtime_ns
    assert not compiled(folder)
    assert library(folder).stat().st_mtime_ns == before


def change_source(folder):
    (folder / "small.c").write_text(SMALL + "/* another */")


def change_header(folder):
    (folder / "small.h").write_text(HEADER.replace("7.0", "8.0"))


def add_source(folder):
    (folder / "more.c").write_text("int more(void) { return 1; }")


def lose_library(folder):
    library(folder).unlink()


def lose_stamp(folder):
    shutil.rmtree(folder / "out" / "_kernel.built")


@needs_compiler
@pytest.mark.parametrize("change", [change_source, change_header, add_source, lose_library, lose_stamp])
def test_a_change_is_compiled(folder, change):
    compiled(folder)
    assert run(folder, "--check").returncode == 0
    change(folder)
    check = run(folder, "--check")
    assert check.returncode == 1
    assert "build.py" in check.stderr
    assert compiled(folder)
    assert run(folder, "--check").returncode == 0


@needs_compiler
def test_another_compiler_is_a_change(folder):
    compiled(folder)
    assert compiled(folder, CC="cc -g")


@needs_compiler
def test_a_compiler_that_does_not_work_is_passed_over(folder):
    assert compiled(folder, CC=f'"{sys.executable}" -c "import sys; sys.exit(1)"')
    assert compiled(folder, CC="no-such-compiler")


@needs_compiler
def test_what_the_compiler_says_is_shown_and_the_old_library_not_vouched_for(folder):
    compiled(folder)
    (folder / "small.c").write_text("int broken(")
    done = run(folder)
    assert done.returncode == 1
    assert "refused the C sources" in done.stderr
    assert "small.c:1:" in done.stderr
    assert "Traceback" not in done.stderr
    assert run(folder, "--check").returncode == 1


@pytest.mark.skipif(importlib.util.find_spec("ziglang") is not None, reason="ziglang is installed here")
def test_without_any_compiler_it_says_what_to_do(folder, tmp_path):
    done = run(folder, PATH=str(tmp_path))
    assert done.returncode == 1
    assert done.stderr.startswith("not built: no C compiler works here")
    assert "pip install ziglang" in done.stderr


def test_without_the_sources_it_says_so(folder):
    (folder / "small.c").unlink()
    done = run(folder)
    assert done.returncode == 1
    assert done.stderr.startswith("not built: the C sources of the kernel are not here")
