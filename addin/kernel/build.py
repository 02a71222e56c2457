"""Compiles the C kernel into the one library that moletally loads.

    python addin/kernel/build.py                      for this machine, beside the binding
    python addin/kernel/build.py --target windows-x64 --out FOLDER
    python addin/kernel/build.py --check              fail if the library is not that of the sources

Nothing is compiled where the library is already that of these sources. The compiler is the first that works of
$CC, cc, gcc, clang and, where they are all missing, the package `ziglang`, which is a C compiler in a wheel and
the only one that compiles for another platform.

The library is plain C behind a C interface: it knows nothing of Python, so one serves every Python version.
"""

import argparse
import hashlib
import importlib.util
import os
import platform
import shlex
import shutil
import subprocess
import sys
import tempfile
from dataclasses import dataclass
from pathlib import Path

__all__ = [
    "BINDING", "TARGETS", "CannotBuild", "Compiler", "NoCompiler", "Target", "build", "discard", "find_compiler",
    "is_current", "library_name", "this_target",
]  # fmt: skip

HERE = Path(__file__).parent
BINDING = HERE.parent / "moletally" / "kernel" / "compiled"

# Every platform has to give the same digits: products and sums are not contracted (an fma rounds once where
# two operations round twice), no fast-math, no -march=native, and CFLAGS is not read: some environments set
# it to all of these.
FLAGS = ("-std=c99", "-O3", "-fPIC", "-shared", "-fvisibility=hidden", "-fno-math-errno", "-ffp-contract=off")
# else the library is named after the folder that it was made in
MACOS_NAME = "-Wl,-install_name,@rpath/_kernel.dylib"
SYSTEM_NAMES = ("cc", "gcc", "clang")  # not cl: its flags are others, and Windows without gcc has ziglang
PROBE = """\
#include <math.h>
#include <stdlib.h>
double probe(double x) { return exp(x) + (double)abs((int)x); }
"""


class CannotBuild(Exception):
    """The library can't be made; the text says why and what to do."""


class NoCompiler(CannotBuild):
    """No C compiler on this machine works, and ziglang is not installed."""


@dataclass(frozen=True, slots=True)
class Target:
    """A platform that we make wheels for.

    zig : the platform as `zig cc -target` takes it, with the oldest C library or system to run on
    library : name of the library file
    tag : platform tag of the wheel
    """

    zig: str
    library: str
    tag: str


# glibc 2.17 is manylinux2014's, macOS 11 the first for both processors.
TARGETS = {
    "windows-x64": Target("x86_64-windows-gnu", "_kernel.dll", "win_amd64"),
    "macos-x64": Target("x86_64-macos.11.0", "_kernel.dylib", "macosx_11_0_x86_64"),
    "macos-arm64": Target("aarch64-macos.11.0", "_kernel.dylib", "macosx_11_0_arm64"),
    "linux-x64": Target("x86_64-linux-gnu.2.17", "_kernel.so", "manylinux_2_17_x86_64.manylinux2014_x86_64"),
    "linux-arm64": Target(
        "aarch64-linux-gnu.2.17", "_kernel.so", "manylinux_2_17_aarch64.manylinux2014_aarch64"
    ),
}


@dataclass(frozen=True, slots=True)
class Compiler:
    """A command that compiles C, with the flags that only it needs.

    leaves_nothing : whether what it keeps for a next time is removed; ziglang keeps 60 MB in the user's folder
    """

    command: tuple[str, ...]
    flags: tuple[str, ...]
    leaves_nothing: bool = False

    def __str__(self) -> str:
        return "ziglang" if "ziglang" in self.command else " ".join(self.command)

    def compile(self, files: list[Path], library: Path) -> None:
        """Make the library; CannotBuild with the compiler's own words where it refuses."""
        command = [*self.command, *FLAGS, *self.flags, *map(str, files), "-lm", "-o", str(library)]
        with tempfile.TemporaryDirectory(ignore_cleanup_errors=True) as kept:
            env = os.environ | ({"ZIG_GLOBAL_CACHE_DIR": kept} if self.leaves_nothing else {})
            try:
                run = subprocess.run(
                    command, capture_output=True, text=True, errors="replace", check=False, env=env
                )
            except OSError as error:
                raise CannotBuild(f"{self} can't be started: {error}") from error
        if run.returncode or not library.exists():
            raise CannotBuild(f"{self} refused the C sources:\n{run.stderr or run.stdout}")


def find_compiler(target: str | None = None) -> Compiler | None:
    """The first compiler that works, None where there is none.

    target : a key of TARGETS; None is this machine, whose own compilers are then tried first

    A system's compiler works if it makes a library that this Python can load. Its name on the PATH is not
    enough: there are compilers without headers, without a linker, or for another width of pointers than this
    Python's. ziglang brings all that along; to try it would double the half minute that it needs on Windows.
    """
    if target is None:
        own = (_system(command) for command in _system_commands())
        if found := next((compiler for compiler in own if _works(compiler)), None):
            return found
    if importlib.util.find_spec("ziglang") is None:
        return None
    return _zig(target)


def _system_commands() -> list[tuple[str, ...]]:
    named = shlex.split(os.environ.get("CC", ""), posix=os.name == "posix")
    names = SYSTEM_NAMES
    if sys.platform == "darwin" and subprocess.run(["xcode-select", "-p"], capture_output=True).returncode:
        names = ()  # Apple's placeholders: to start one opens a window that offers the developer tools
    commands = [tuple(named)] if named else []
    return commands + [(name,) for name in names if shutil.which(name)]


def _system(command: tuple[str, ...]) -> Compiler:
    if sys.platform == "darwin":
        oldest = f"-mmacosx-version-min={os.environ.get('MACOSX_DEPLOYMENT_TARGET', '11.0')}"
        return Compiler(command, ("-arch", platform.machine(), oldest, MACOS_NAME, "-Wl,-x"))
    return Compiler(command, ("-s", "-static-libgcc") if sys.platform == "win32" else ("-s",))


def _zig(target: str | None) -> Compiler:
    named = target or this_target()
    # without a target zig compiles for this very processor, as -march=native would
    flags = ("-target", TARGETS[named].zig, "-s") if named else ("-mcpu=baseline", "-s")
    if named and named.startswith("macos"):
        flags = (*flags, MACOS_NAME)
    return Compiler((sys.executable, "-m", "ziglang", "cc"), flags, leaves_nothing=target is None)


def this_target() -> str | None:
    """The key of TARGETS that is this machine, if any."""
    system = {"win32": "windows", "darwin": "macos", "linux": "linux"}.get(sys.platform)
    processor = {"amd64": "x64", "x86_64": "x64", "arm64": "arm64", "aarch64": "arm64"}.get(
        platform.machine().lower()
    )
    if sys.maxsize < 2**32 or (system == "linux" and platform.libc_ver()[0] != "glibc"):
        return None
    name = f"{system}-{processor}"
    return name if name in TARGETS else None


def _works(compiler: Compiler) -> bool:
    # its own process loads the library: Windows keeps the file of a loaded one from being removed
    with tempfile.TemporaryDirectory() as scratch:
        source, library = Path(scratch, "probe.c"), Path(scratch, f"probe{_suffix()}")
        source.write_text(PROBE, encoding="utf-8")
        try:
            compiler.compile([source], library)
        except CannotBuild:
            return False
        load = [sys.executable, "-c", "import ctypes, sys; ctypes.CDLL(sys.argv[1])", str(library)]
        return subprocess.run(load, capture_output=True, check=False).returncode == 0


def _suffix() -> str:
    return {"win32": ".dll", "darwin": ".dylib"}.get(sys.platform, ".so")


def library_name(target: str | None = None) -> str:
    """Name of the library file; target: a key of TARGETS, None for this machine."""
    return TARGETS[target].library if target else f"_kernel{_suffix()}"


def _stamp(library: Path) -> Path:
    # in a folder of its own: uv notices (cache-keys in pyproject.toml) if a folder is gone, a file only if it
    # was the newest
    return library.parent / "_kernel.built" / library.name


def _sources() -> list[Path]:
    if not (found := sorted(HERE.glob("*.c"))):
        raise CannotBuild("the C sources of the kernel are not here: take the whole source of moletally")
    return found


def _digest(target: str | None) -> str:
    """Of all that the library depends on: sources, flags, target, and the compiler that $CC asks for.

    Not of a compiler's version: a newer one is no reason to compile again, and to ask costs a process.
    """
    what = hashlib.sha256(repr((FLAGS, target, os.environ.get("CC"), platform.machine())).encode())
    for path in (*_sources(), *sorted(HERE.glob("*.h"))):
        content = path.read_bytes()
        what.update(f"{path.name} {len(content)}\n".encode() + content)
    return what.hexdigest()


def is_current(target: str | None = None, out: Path = BINDING) -> bool:
    """Whether the library in `out` is there and was made from the sources as they are now."""
    library = out / library_name(target)
    stamp = _stamp(library)
    return library.exists() and stamp.exists() and stamp.read_text(encoding="utf-8") == _digest(target)


def discard(target: str | None = None, out: Path = BINDING) -> None:
    """Remove a library: one of other sources must not be loaded in place of one that can't be made."""
    library = out / library_name(target)
    for path in (_stamp(library), library):
        path.unlink(missing_ok=True)


def build(target: str | None = None, out: Path = BINDING) -> tuple[Path, Compiler | None]:
    """Make the library unless it is there already.

    target : a key of TARGETS, None for this machine
    out : folder to put it in

    Returns the library and the compiler, None where nothing had to be compiled. Raises NoCompiler, or
    CannotBuild where the compiler refuses or the library can't be written.
    """
    library = out / library_name(target)
    if is_current(target, out):
        return library, None
    digest = _digest(target)  # before compiling: sources that change meanwhile are compiled again
    if (compiler := find_compiler(target)) is None:
        names = "" if target else "no C compiler works here (tried $CC, cc, gcc, clang), and "
        raise NoCompiler(
            f"{names}the package ziglang is not installed: pip install ziglang, then build again"
        )
    with tempfile.TemporaryDirectory() as scratch:
        made = Path(scratch, library.name)
        compiler.compile(_sources(), made)
        try:
            _put(made, library, digest)
        except OSError as error:
            raise CannotBuild(
                f"{library.name} can't be written ({error}). If it is in use, close Excel and all Python that runs"
                " moletally, and build again"
            ) from error
    return library, compiler


def _put(made: Path, library: Path, digest: str) -> None:
    stamp = _stamp(library)
    stamp.parent.mkdir(parents=True, exist_ok=True)
    stamp.unlink(missing_ok=True)  # it must never vouch for another library
    # replaced, not overwritten: a process that has the old one loaded keeps it
    beside = library.with_name(library.name + ".new")
    shutil.copy(made, beside)
    beside.replace(library)
    stamp.write_text(digest, encoding="utf-8")


def main() -> None:
    """Read the command line and build or check."""
    parser = argparse.ArgumentParser(
        description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter
    )
    parser.add_argument("--target", choices=TARGETS, help="platform to compile for, default this machine")
    parser.add_argument("--out", type=Path, default=BINDING, help="folder to write into")
    parser.add_argument(
        "--check", action="store_true", help="say whether the library is current; build nothing"
    )
    options = parser.parse_args()
    if options.check:
        if not is_current(options.target, options.out):
            raise SystemExit("the library is not that of the sources. Run: python addin/kernel/build.py")
        return
    try:
        library, compiler = build(options.target, options.out)
    except CannotBuild as error:
        raise SystemExit(f"not built: {error}") from error
    how = f"compiled by {compiler}" if compiler else "unchanged"
    print(f"{library.name}: {library.stat().st_size:,} bytes, {how}")


if __name__ == "__main__":
    main()
