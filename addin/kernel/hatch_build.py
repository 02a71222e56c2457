"""Hatchling's build hook: every wheel and every editable install gets the compiled kernel, if it can be had.

MOLETALLY_KERNEL chooses what a build does:

    unset     compile for this machine; where that can't be done, say why and install without: numpy answers
    none      do not compile
    a target  compile for that platform (see TARGETS in build.py), and fail if that can't be done
"""

import os
import platform
import sys
import tempfile
from pathlib import Path
from typing import Any

from hatchling.builders.config import BuilderConfig
from hatchling.builders.hooks.plugin.interface import BuildHookInterface

sys.path.insert(0, str(Path(__file__).parents[1]))  # hatchling runs this file as a text, outside any package

from kernel.build import BINDING, TARGETS, CannotBuild, NoCompiler, build, discard, find_compiler

CHOICE = "MOLETALLY_KERNEL"
# the processors that ziglang has wheels for; asked for on another, it would make the install fail
ZIG_ON_LINUX = ("x86_64", "aarch64", "armv7l", "i686", "ppc64le", "riscv64", "s390x")
ZIG_ON_MACOS = 12


class KernelHook(BuildHookInterface[BuilderConfig]):
    """Compiles the kernel into what is built."""

    _scratch: tempfile.TemporaryDirectory[str] | None = None

    def dependencies(self) -> list[str]:
        """Ziglang, only where the machine has no compiler of its own or compiles for another platform."""
        choice = _choice()
        elsewhere = choice in TARGETS
        here_only = choice is None and find_compiler() is None and _ziglang_is_made_for_this_machine()
        return [self.config["ziglang"]] if elsewhere or here_only else []

    def initialize(self, version: str, build_data: dict[str, Any]) -> None:
        """Compile, and put the library into the wheel or, for an editable install, beside the binding."""
        choice = _choice()
        editable = version == "editable"
        if choice == "none":
            self._go_without(f"{CHOICE} is none", editable)
            return
        if not editable:
            self._scratch = (
                tempfile.TemporaryDirectory()
            )  # a wheel for elsewhere leaves nothing in the sources
        out = Path(self._scratch.name) if self._scratch else BINDING
        try:
            library, compiler = build(choice, out)
        except CannotBuild as error:
            # who works on the C sources has to see that they don't compile; a user needs an install that works
            if choice or (editable and not isinstance(error, NoCompiler)):
                raise
            self._go_without(str(error), editable)
            return
        self.app.display_info(f"the kernel: {library.name}, compiled by {compiler or 'an earlier build'}")
        if not editable:
            inside = BINDING.relative_to(BINDING.parents[2]) / library.name
            build_data["force_include"][str(library)] = inside.as_posix()
            build_data["pure_python"] = False
            build_data["tag"] = f"py3-none-{TARGETS[choice].tag if choice else _this_platform()}"

    def finalize(self, version: str, build_data: dict[str, Any], artifact_path: str) -> None:
        """Remove what is only needed until the wheel is written."""
        if self._scratch:
            self._scratch.cleanup()

    def _go_without(self, why: str, editable: bool) -> None:
        if editable:
            discard()
        self.app.display_warning(
            f"moletally goes without its compiled kernel: {why}.\n"
            "The numpy engine gives the same answers, more slowly. DEVELOPERS.md says how to add the kernel."
        )


def _choice() -> str | None:
    """The target asked for, "none", or None: this machine."""
    choice = os.environ.get(CHOICE) or None
    if choice not in (None, "none", *TARGETS):
        raise ValueError(f"{CHOICE} = {choice!r}: known are none, {', '.join(TARGETS)}")
    return choice


def _ziglang_is_made_for_this_machine() -> bool:
    if sys.platform == "darwin":
        return int(platform.mac_ver()[0].split(".")[0]) >= ZIG_ON_MACOS
    return sys.platform == "win32" or (sys.platform == "linux" and platform.machine() in ZIG_ON_LINUX)


def _this_platform() -> str:
    """The platform tag that pip on this machine accepts; a library from here is not made for older ones."""
    from packaging.tags import platform_tags  # comes with hatchling

    return next(tag for tag in platform_tags() if not tag.startswith(("manylinux", "musllinux")))
