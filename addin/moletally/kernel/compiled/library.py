"""Loads the compiled kernel and declares its functions; the records are those of addin/kernel/moletally.h."""

import ctypes
import os.path
import sys
from ctypes import POINTER, c_double, c_int, c_int32, c_int64, c_void_p
from functools import cache

__all__ = ["FILE", "FORMAT", "Rates", "Slopes", "Tanks", "Tubes", "library"]

FORMAT = 1
SUFFIX = {"win32": "dll", "darwin": "dylib"}.get(sys.platform, "so")
FILE = os.path.join(os.path.dirname(__file__), f"_kernel.{SUFFIX}")  # pathlib is slow to load


class Tanks(ctypes.Structure):
    """mt_tanks."""

    _fields_ = (
        ("n", c_int64), ("how", c_int64),
        *((name, c_void_p) for name in (
            "feed", "tau", "T", "p", "start", "fed", "scale", "c", "status", "from_start", "faded", "exhausted",
            "residual", "condition", "error", "root", "iterations", "work",
        )),
    )  # fmt: skip


class Tubes(ctypes.Structure):
    """mt_tubes."""

    _fields_ = (
        ("n", c_int64), ("m", c_int64),
        *((name, c_void_p) for name in ("feed", "asked", "T", "p", "c", "status", "exhausted_at", "steps", "work")),
    )  # fmt: skip


class Slopes(ctypes.Structure):
    """mt_slopes."""

    _fields_ = (
        ("n", c_int64),
        *((name, c_void_p) for name in ("feed", "tau", "T", "p", "outlet", "slope", "status")),
    )


class Rates(ctypes.Structure):
    """mt_rates."""

    _fields_ = (
        ("n", c_int64), ("strict", c_int64),
        *((name, c_void_p) for name in ("c", "T", "p", "rate", "by_c", "by_T", "by_p")),
    )  # fmt: skip


@cache
def library() -> ctypes.CDLL:
    """The library; OSError where it is not there, can't be loaded or is of another version."""
    found = ctypes.CDLL(FILE)
    found.mt_format.restype = c_int
    if found.mt_format() != FORMAT:
        raise OSError(f"{FILE} is of another version of moletally: install it again")
    found.mt_network_new.restype = c_void_p
    found.mt_network_new.argtypes = (POINTER(c_int32), c_int64, POINTER(c_double), c_int64)
    found.mt_network_free.restype = None
    found.mt_network_free.argtypes = (c_void_p,)
    for name in ("mt_solve_tanks", "mt_solve_tubes", "mt_tank_slopes", "mt_tube_slopes", "mt_evaluate"):
        function = getattr(found, name)
        function.restype = c_int
        function.argtypes = (c_void_p, c_void_p)
    found.mt_step.restype = c_int
    found.mt_step.argtypes = (
        c_void_p, c_int, c_void_p, c_double, c_void_p, c_void_p, c_double, c_void_p, c_void_p,
    )  # fmt: skip
    return found
