"""The compiled engine behind the common face: arrays in, one call, arrays out."""

import ctypes
import os
import weakref
from collections.abc import Callable
from functools import cache
from itertools import pairwise
from typing import TYPE_CHECKING, Any, TypeVar

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.cases import Again, How, TankAnswers, TankCases, TubeAnswers
from moletally.kernel.compiled.library import Rates, Slopes, Tanks, Tubes, library
from moletally.kernel.compiled.network import Network, network_of, network_of_program
from moletally.kernel.program import Program
from moletally.kernel.rates import Floats
from moletally.kernel.structure import Structure

if TYPE_CHECKING:
    from concurrent.futures import ThreadPoolExecutor

__all__ = ["CompiledEngine"]

# Cases below which a second thread costs more than it saves: it is woken in some 50 microseconds, a tank
# takes a few, a tube some tens.
FEW_TANKS, FEW_TUBES = 64, 4
PIECES = 4  # per thread: cases differ in work

Array = NDArray[Any]
Record = TypeVar("Record", Tanks, Tubes, Slopes)


class CompiledEngine:
    """The C kernel."""

    name = "compiled engine (C)"

    def __init__(self) -> None:
        self._library = library()

    def tanks(self, structure: Structure, cases: TankCases, how: How) -> tuple[TankAnswers, bool]:
        """Solve and check tanks."""
        n, species = cases.feed.shape
        out = TankAnswers.empty(n, species)
        if cases.c is not None:
            out.c[:] = cases.c
        rows = _tank_rows(cases, out)
        code = _in_pieces(
            self._library.mt_solve_tanks, network_of(structure), Tanks(how=how), rows, n, FEW_TANKS
        )
        return out, code > 0

    def tank_again(self, structure: Structure, cases: TankCases, out: TankAnswers, how: How) -> Again:
        """Solves one tank anew at each call, from arrays to arrays whose addresses are taken once."""
        rows = _tank_rows(cases, out) | {"condition": None}  # a search has no use for it
        out.condition[:] = np.nan
        return self._again(self._library.mt_tank_again, structure, Tanks(n=1, how=how), rows)

    def tube_again(self, structure: Structure, cases: TankCases, out: TubeAnswers) -> Again:
        """The same for a tube."""
        rows = _tube_rows(cases.feed, cases.tau[:, None], cases.T, cases.p, out)
        return self._again(self._library.mt_tube_again, structure, Tubes(n=1, m=1), rows)

    def _again(
        self, make: Callable[..., int], structure: Structure, record: Tanks | Tubes, rows: dict[str, Array | None]
    ) -> Again:  # fmt: skip
        network = network_of(structure)
        for name, array in rows.items():
            if array is not None:
                setattr(record, name, array.ctypes.data)
        seat = make(network.handle, ctypes.addressof(record))
        if not seat:
            raise MemoryError("the kernel ran out of memory")
        held = ctypes.c_void_p(seat)
        solve = self._library.mt_again_solve

        def again() -> int:
            return int(solve(held))

        weakref.finalize(again, self._library.mt_again_free, seat)
        again.keeps = (network, rows)  # type: ignore[attr-defined]  # the kernel has their addresses
        return again

    def tubes(self, structure: Structure, feed: Floats, asked: Floats, T: Floats, p: Floats) -> TubeAnswers:
        """Follow tubes."""
        n, points = asked.shape
        out = TubeAnswers.empty(n, points, feed.shape[1])
        rows = _tube_rows(feed, asked, T, p, out)
        _in_pieces(self._library.mt_solve_tubes, network_of(structure), Tubes(m=points), rows, n, FEW_TUBES)
        return out

    def tank_slopes(self, structure: Structure, cases: TankCases, root: Floats) -> Floats:
        """Derivatives of outlets of tanks."""
        return self._slopes(self._library.mt_tank_slopes, structure, cases, _floats(root))

    def tube_slopes(self, structure: Structure, cases: TankCases) -> Floats:
        """Derivatives of outlets of tubes."""
        return self._slopes(self._library.mt_tube_slopes, structure, cases, None)

    def _slopes(
        self, function: Callable[..., int], structure: Structure, cases: TankCases, outlet: Floats | None
    ) -> Floats:
        n, species = cases.feed.shape
        slope = np.empty((n, species, species + 2 + cases.p.shape[1]))
        rows = {
            "feed": _floats(cases.feed), "tau": _floats(cases.tau), "T": _floats(cases.T), "p": _floats(cases.p),
            "outlet": outlet, "slope": slope, "status": np.empty(n, dtype=np.int32),
        }  # fmt: skip
        _in_pieces(function, network_of(structure), Slopes(), rows, n, FEW_TUBES)
        return slope

    def evaluate(self, program: Program, c: Floats, T: Floats, p: Floats) -> Floats:
        """Rates; nan where a root of a negative number is taken."""
        rate = np.empty((len(c), program.n_reactions))
        rows = {"c": _floats(c), "T": _floats(T), "p": _floats(p), "rate": rate}
        self._evaluate(program, Rates(n=len(c), strict=1), rows)
        return rate

    def derivatives(
        self, program: Program, c: Floats, T: Floats, p: Floats
    ) -> tuple[Floats, Floats, Floats, Floats]:
        """Rates and their derivatives."""
        n, reactions = len(c), program.n_reactions
        out = (
            np.empty((n, reactions)), np.empty((n, reactions, program.n_species)), np.empty((n, reactions)),
            np.empty((n, reactions, program.n_parameters)),
        )  # fmt: skip
        names = ("rate", "by_c", "by_T", "by_p")
        rows = {"c": _floats(c), "T": _floats(T), "p": _floats(p), **dict(zip(names, out, strict=True))}
        self._evaluate(program, Rates(n=n), rows)
        return out

    def _evaluate(self, program: Program, record: Rates, rows: dict[str, Floats]) -> None:
        for name, array in rows.items():
            setattr(record, name, array.ctypes.data)
        _check(self._library.mt_evaluate(network_of_program(program).handle, ctypes.byref(record)))


def _tank_rows(cases: TankCases, out: TankAnswers) -> dict[str, Array | None]:
    return {
        "feed": _floats(cases.feed), "tau": _floats(cases.tau), "T": _floats(cases.T), "p": _floats(cases.p),
        "start": None if cases.start is None else _floats(cases.start),
        "fed": None if cases.fed is None else np.ascontiguousarray(cases.fed),
        "scale": None if cases.scale is None else _floats(cases.scale),
        **{name: getattr(out, name) for name in TankAnswers._fields},
    }  # fmt: skip


def _tube_rows(
    feed: Floats, asked: Floats, T: Floats, p: Floats, out: TubeAnswers
) -> dict[str, Array | None]:
    return {
        "feed": _floats(feed), "asked": _floats(asked), "T": _floats(T), "p": _floats(p),
        **{name: getattr(out, name) for name in TubeAnswers._fields},
    }  # fmt: skip


def _floats(values: Floats) -> Floats:
    return np.ascontiguousarray(values, dtype=np.float64)


def _check(code: int) -> int:
    if code < 0:
        raise MemoryError(f"the kernel ran out of memory (code {code})")
    return code


@cache
def _threads() -> "ThreadPoolExecutor":
    from concurrent.futures import ThreadPoolExecutor  # slow to load, and a single cell has no use for it

    return ThreadPoolExecutor(_cores(), thread_name_prefix="moletally")


@cache
def _cores() -> int:
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1


def _in_pieces(
    function: Callable[..., int], network: Network, record: Record, rows: dict[str, Array | None], n: int, few: int
) -> int:  # fmt: skip
    """Calls the kernel for n rows: at once where they are few, by pieces on all cores else."""
    pieces = 1 if n < few or _cores() == 1 else min(n, PIECES * _cores())
    if pieces == 1:
        return _call(function, network, record, rows, 0, n)
    edges = [n * k // pieces for k in range(pieces + 1)]
    work = [
        _threads().submit(_call, function, network, type(record).from_buffer_copy(record), rows, a, b)
        for a, b in pairwise(edges)
    ]
    return sum(done.result() for done in work)


def _call(
    function: Callable[..., int], network: Network, record: Record, rows: dict[str, Array | None], first: int, end: int
) -> int:  # fmt: skip
    record.n = end - first
    for name, array in rows.items():
        if array is not None:
            # the array interface is read faster than the ctypes attribute, which makes an object
            setattr(record, name, array.__array_interface__["data"][0] + first * array.strides[0])
    return _check(function(network.handle, ctypes.addressof(record)))
