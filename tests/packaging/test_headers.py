"""What is refused in a wheel. That good libraries are read right is checked on real ones in test_wheels.py."""

from dataclasses import replace

import pytest

from kernel.build import TARGETS
from kernel.headers import Library, read_library
from kernel.wheels import complaints, declared

GOOD = {
    "windows-x64": Library("windows-x64", frozenset({"KERNEL32.dll"}), declared()),
    "macos-arm64": Library(
        "macos-arm64", frozenset({"/usr/lib/libSystem.B.dylib"}), declared(), (11, 0), True
    ),
    "linux-x64": Library("linux-x64", frozenset({"libc.so.6", "libm.so.6"}), declared(), (2, 17)),
}


def test_what_is_declared_is_read_from_the_header():
    assert {"mt_format", "mt_solve_tanks"} <= declared()


@pytest.mark.parametrize("name", GOOD)
def test_a_good_library_passes(name):
    assert name in TARGETS
    assert complaints(GOOD[name], name) == []


@pytest.mark.parametrize(
    ("name", "changes", "words"),
    [
        ("linux-x64", {"machine": "linux-arm64"}, "the library is for linux-arm64"),
        ("linux-x64", {"needs": (2, 28)}, "it needs 2.28 of linux"),
        ("linux-x64", {"needs": (2, 17, 1)}, "it needs 2.17.1 of linux"),
        ("linux-x64", {"imports": frozenset({"libgcc_s.so.1"})}, "it loads libgcc_s.so.1"),
        ("linux-x64", {"exports": declared() | {"stray"}}, "declared and offered names differ: stray"),
        ("linux-x64", {"exports": declared() - {"mt_step"}}, "declared and offered names differ: mt_step"),
        ("macos-arm64", {"needs": (13, 0)}, "it needs 13.0 of macos"),
        ("macos-arm64", {"signed": False}, "it is not signed"),
        ("windows-x64", {"imports": frozenset({"libgcc_s_seh-1.dll"})}, "it loads libgcc_s_seh-1.dll"),
        ("windows-x64", {"imports": frozenset({"VCRUNTIME140.dll"})}, "it loads VCRUNTIME140.dll"),
    ],
)
def test_a_library_that_would_not_load_everywhere_is_refused(name, changes, words):
    assert complaints(replace(GOOD[name], **changes), name) == [words]


@pytest.mark.parametrize("content", [b"", b"#!/bin/sh", b"\x7fELF\x01\x01", b"\xca\xfe\xba\xbe"])
def test_what_is_no_library_is_refused(content):
    with pytest.raises(ValueError, match="not a 64 bit library"):
        read_library(content)
