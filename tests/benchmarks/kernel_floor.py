"""The distance to the floor: the same networks as hard-coded C (floor.c), compiled with the kernel's flags."""

import ctypes
import re
import shutil
import subprocess
import sys
import tempfile
from collections.abc import Callable
from pathlib import Path
from typing import NamedTuple

import numpy as np
from measure import amount, in_turn
from problems import PROBLEMS, Problem, error

from moletally.kernel.again import TankAgain, TubeAgain
from moletally.kernel.cases import How, TankAnswers, TubeAnswers
from moletally.kernel.compiled.library import Tanks, Tubes, library
from moletally.kernel.compiled.network import network_of
from moletally.kernel.structure import structures

__all__ = ["floor"]

HERE = Path(__file__).parent
KERNEL = HERE.parents[1] / "addin" / "kernel"
SYMBOLS = {"P1": "P1", "P2": "P2", "Langmuir–Hinshelwood": "LH", "ROBER": "ROBER"}
T, NONE = 300.0, np.zeros((1, 0))
# What controls the steps stands in the kernel's sources; the floor has to follow them.
CONTROL = (
    ("tube.c", r"RELATIVE\[2\] = \{(\S+), (\S+)\};"),  # explicit, stiff
    ("stepper.c", r"#define FIRST_CHANGE (\S+)"),
    ("stepper.c", r"([\d.]+), step_explicit\}"),  # growth of a step
    ("stepper.c", r"([\d.]+), step_stiff\}"),
)
HEAD = """
| beside the floor | kernel in C | floor in C | ratio | kernel from Python | floor from Python | ratio |
|---|---|---|---|---|---|---|"""


def floor(seconds: float) -> None:
    """Print the table, a case at a time on one thread; from Python: one call per case."""
    compiler = next(filter(None, map(shutil.which, ("cc", "gcc", "clang"))), None)
    if compiler is None:
        print("\nNo C compiler here: the distance to the floor is left out.")
        return
    print(HEAD)
    with tempfile.TemporaryDirectory() as folder:
        for name, symbol in SYMBOLS.items():
            problem = next(p for p in PROBLEMS if p.name == name)
            both = _Both(problem, _compiled(compiler, symbol, folder))
            for what, work in (("tank", both.tanks()), ("tube", both.tubes())):
                inside = in_turn(*work.inside, seconds=seconds)
                outside = in_turn(*work.outside, seconds=seconds)
                print(
                    f"| {what} {name} | {amount(inside.seconds[1] / work.n)} | {amount(inside.seconds[0] / work.n)} | "
                    f"{inside.ratios[1]:.2f} | {amount(outside.seconds[1])} | {amount(outside.seconds[0])} | "
                    f"{outside.ratios[1]:.2f} |",
                    flush=True,
                )


def _compiled(compiler: str, symbol: str, folder: str) -> ctypes.CDLL:
    sys.path.append(str(KERNEL))
    from build import FLAGS

    library_file = Path(folder, f"{symbol}.so")
    sources = [str(HERE / "floor.c"), f"-D{symbol}", f"-I{KERNEL}"]
    subprocess.run(
        [compiler, *FLAGS, "-fvisibility=default", *sources, "-lm", "-o", str(library_file)], check=True
    )
    found = ctypes.CDLL(str(library_file))
    pointer, whole = ctypes.c_void_p, ctypes.c_int64
    found.floor_tanks.restype = found.floor_tubes.restype = whole
    found.floor_tanks.argtypes = (whole, pointer, pointer, pointer)
    found.floor_tubes.argtypes = (whole, pointer, pointer, pointer, pointer)
    return found


def _control() -> np.ndarray:
    """The five numbers."""
    found = [re.search(pattern, (KERNEL / name).read_text(encoding="utf-8")) for name, pattern in CONTROL]
    if not all(found):
        raise SystemExit("the kernel's step control has changed: mend CONTROL in kernel_floor.py and floor.c")
    return np.array([float(x) for match in found for x in match.groups()])


Work = Callable[[], object]


class _Pairs(NamedTuple):
    """Work of the floor and of the kernel: n cases in one call of C, and one case in a call from Python."""

    n: int
    inside: tuple[Work, Work]
    outside: tuple[Work, Work]


class _Both:
    """One problem both ways. Residence times differ a little from case to case."""

    def __init__(self, problem: Problem, hard: ctypes.CDLL) -> None:
        self.problem, self.hard, self.soft = problem, hard, library()
        structure, _ = next(structures(problem.model, problem.feed[None] > 0, np.array([T]), NONE))
        self.network = network_of(structure)

    def _many(self, n: int, tau: float) -> dict[str, np.ndarray]:
        rng = np.random.default_rng(1)
        feed = np.repeat(self.problem.feed[None], n, axis=0)
        return {
            "feed": feed,
            "tau": tau * rng.uniform(0.8, 1.2, n),
            "T": np.full(n, T),
            "p": np.zeros((n, 0)),
        }

    def tanks(self) -> _Pairs:
        n, p = 500, self.problem
        given = self._many(n, p.tank)
        guess, c = np.repeat(p.guess[None], n, axis=0), np.empty((n, len(p.feed)))
        out = TankAnswers.empty(n, len(p.feed))
        record = Tanks(n=n, how=How.FROM_GUESS)
        _fill(record, {**given, **out._asdict()})

        def hard_inside() -> int:
            c[:] = guess
            return self.hard.floor_tanks(n, _at(given["feed"]), _at(given["tau"]), _at(c))

        def soft_inside() -> int:
            out.c[:] = guess
            return self.soft.mt_solve_tanks(self.network.handle, ctypes.addressof(record))

        hard_inside(), soft_inside()
        assert not out.status.any()
        np.testing.assert_allclose(c, out.c, rtol=1e-10)
        single = TankAgain(p.model, p.feed, p.tank, T, NONE[0], follow=True)
        one, tau, start = np.empty(len(p.feed)), np.array([p.tank]), p.guess
        hard, feed, where = self.hard.floor_tanks, _at(p.feed), (_at(tau), _at(one))

        def hard_outside(_kept: object = tau) -> int:
            one[:] = start
            return hard(1, feed, *where)

        def soft_outside() -> int:
            single.c[:] = start
            return single.solve()

        return _Pairs(n, (hard_inside, soft_inside), (hard_outside, soft_outside))

    def tubes(self) -> _Pairs:
        n, p = 50, self.problem
        given, c = self._many(n, p.tubes[0]), np.empty((n, len(p.feed)))
        out = TubeAnswers.empty(n, 1, len(p.feed))
        record = Tubes(n=n, m=1)
        _fill(record, {"asked" if k == "tau" else k: v for k, v in given.items()} | out._asdict())
        control = _control()

        def hard_inside() -> int:
            return self.hard.floor_tubes(n, _at(given["feed"]), _at(given["tau"]), _at(control), _at(c))

        def soft_inside(_kept: object = out) -> int:
            return self.soft.mt_solve_tubes(self.network.handle, ctypes.addressof(record))

        hard_inside(), soft_inside()
        assert not out.status.any()
        assert max(map(error, c, out.c[:, 0])) < 1e-7
        tau, one = np.array([p.tubes[0]]), np.empty(len(p.feed))
        hard, feed, where = self.hard.floor_tubes, _at(p.feed), (_at(tau), _at(control), _at(one))

        def hard_outside(_kept: object = (tau, one, control)) -> int:
            return hard(1, feed, *where)

        return _Pairs(
            n,
            (hard_inside, soft_inside),
            (hard_outside, TubeAgain(p.model, p.feed, p.tubes[0], T, NONE[0]).solve),
        )


def _at(array: np.ndarray) -> int:
    return array.ctypes.data


def _fill(record: ctypes.Structure, arrays: dict[str, np.ndarray]) -> None:
    for name, array in arrays.items():
        setattr(record, name, _at(array))
