"""Which engine computes: the compiled kernel, or the numpy reference where its library can't be loaded.

The choice is made once, at the first use. The environment variable MOLETALLY_ENGINE (compiled or
reference) overrides it: for tests, and for a second opinion on a number.
"""

import os
from collections.abc import Iterator
from contextlib import contextmanager
from typing import Protocol

from moletally.kernel.cases import Again, How, TankAnswers, TankCases, TubeAnswers
from moletally.kernel.program import Program
from moletally.kernel.rates import Floats
from moletally.kernel.structure import Structure

__all__ = ["ENGINES", "Engine", "engine", "engine_name", "using"]

VARIABLE = "MOLETALLY_ENGINE"


class Engine(Protocol):
    """What both engines can do. Cases of one call have one structure."""

    @property
    def name(self) -> str:
        """What users are shown."""

    def tanks(self, structure: Structure, cases: TankCases, how: How) -> tuple[TankAnswers, bool]:
        """Solve and check tanks; False if no answer calls for a second look, True if some may."""

    def tank_again(self, structure: Structure, cases: TankCases, out: TankAnswers, how: How) -> Again:
        """A function that solves one tank anew, from arrays to arrays."""

    def tube_again(self, structure: Structure, cases: TankCases, out: TubeAnswers) -> Again:
        """The same for a tube with one point."""

    def tubes(self, structure: Structure, feed: Floats, asked: Floats, T: Floats, p: Floats) -> TubeAnswers:
        """Follow tubes; asked, shape (N, M) - residence times [s]."""

    def tank_slopes(self, structure: Structure, cases: TankCases, root: Floats) -> Floats:
        """Derivatives of outlets, shape (N, S, S + 2 + P): by feed, tau, T, p; nan where there is none."""

    def tube_slopes(self, structure: Structure, cases: TankCases) -> Floats:
        """The same of tubes."""

    def evaluate(self, program: Program, c: Floats, T: Floats, p: Floats) -> Floats:
        """Rates, shape (N, R); nan or inf where a law is undefined."""

    def derivatives(
        self, program: Program, c: Floats, T: Floats, p: Floats
    ) -> tuple[Floats, Floats, Floats, Floats]:
        """Rates (N, R) and their derivatives by c (N, R, S), T (N, R) and p (N, R, P)."""


def _compiled() -> Engine:
    from moletally.kernel.compiled.engine import CompiledEngine

    return CompiledEngine()


def _reference() -> Engine:
    from moletally.kernel.reference.engine import ReferenceEngine

    return ReferenceEngine()


ENGINES = {"compiled": _compiled, "reference": _reference}
_chosen: list[Engine] = []


def engine() -> Engine:
    """The engine in use."""
    if not _chosen:
        _chosen.append(_choose(os.environ.get(VARIABLE, "")))
    return _chosen[0]


def engine_name() -> str:
    """The engine in use, in words."""
    return engine().name


def _choose(wanted: str) -> Engine:
    if wanted in ENGINES:
        return ENGINES[wanted]()
    try:
        return _compiled()
    except (OSError, AttributeError):  # no library, one that this machine refuses, or an older one
        return _reference()


@contextmanager
def using(name: str) -> Iterator[Engine]:
    """One engine for as long as the context lasts: to compare the two."""
    before = _chosen.copy()
    _chosen[:] = [ENGINES[name]()]
    try:
        yield _chosen[0]
    finally:
        _chosen[:] = before
