"""The reference engine behind the common face."""

from collections.abc import Callable

import numpy as np

from moletally.kernel.cases import How, TankAnswers, TankCases, TubeAnswers
from moletally.kernel.program import Program
from moletally.kernel.rates import Floats
from moletally.kernel.reference import evaluate, slopes, tank, tube
from moletally.kernel.structure import Structure

__all__ = ["ReferenceEngine"]


class ReferenceEngine:
    """numpy, readable; the judge of the other."""

    name = "reference engine (numpy)"

    def tanks(self, structure: Structure, cases: TankCases, how: How) -> tuple[TankAnswers, bool]:
        """Solve and check tanks."""
        return tank.solve(structure, cases, how), True

    def tank_again(
        self, structure: Structure, cases: TankCases, out: TankAnswers, how: How
    ) -> Callable[[], bool]:
        """Solves one tank anew at each call."""

        def again() -> bool:
            given = cases._replace(c=out.c.copy())
            out.put(np.zeros(1, dtype=np.intp), tank.solve(structure, given, how))
            return True

        return again

    def tubes(self, structure: Structure, feed: Floats, asked: Floats, T: Floats, p: Floats) -> TubeAnswers:
        """Follow tubes."""
        return tube.solve(structure, feed, asked, T, p)

    def tank_slopes(self, structure: Structure, cases: TankCases, root: Floats) -> Floats:
        """Derivatives of outlets of tanks."""
        return slopes.of_tanks(structure, cases, root)

    def tube_slopes(self, structure: Structure, cases: TankCases) -> Floats:
        """Derivatives of outlets of tubes."""
        return slopes.of_tubes(structure, cases)

    def evaluate(self, program: Program, c: Floats, T: Floats, p: Floats) -> Floats:
        """Rates."""
        return evaluate.evaluate(program, c, T, p)

    def derivatives(
        self, program: Program, c: Floats, T: Floats, p: Floats
    ) -> tuple[Floats, Floats, Floats, Floats]:
        """Rates and their derivatives."""
        return evaluate.derivatives(program, c, T, p)
