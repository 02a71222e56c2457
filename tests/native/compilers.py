"""The C compilers of this machine, for builds that only tests need."""

import subprocess
import tomllib
from pathlib import Path

from kernel import build

__all__ = ["KERNEL", "ROOT", "SOURCES", "compilers", "run", "zig"]

KERNEL = Path(build.__file__).parent
ROOT = KERNEL.parents[1]
SOURCES = sorted(KERNEL.glob("*.c"))


def compilers() -> list[tuple[str, ...]]:
    """Commands that compile C for this machine: $CC, cc, gcc, clang, as many as work; ziglang where it is installed."""
    found = [c for c in map(build._system, build._system_commands()) if build._works(c)]
    return [c.command for c in found] or [c.command for c in [build.find_compiler()] if c]


def zig() -> tuple[str, ...]:
    """ziglang as uv fetches it, in the version that pyproject.toml pins."""
    with open(ROOT / "pyproject.toml", "rb") as file:
        hook = tomllib.load(file)["tool"]["hatch"]["build"]["targets"]["wheel"]["hooks"]["custom"]
    return "uv", "run", "--quiet", "--no-project", "--with", hook["ziglang"], "python", "-m", "ziglang", "cc"


def run(*command, **options) -> subprocess.CompletedProcess:
    """Run and wait, its words kept."""
    return subprocess.run([*map(str, command)], capture_output=True, text=True, check=False, **options)
