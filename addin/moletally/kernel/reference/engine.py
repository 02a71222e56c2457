"""The reference engine behind the common face."""

import numpy as np

from moletally.kernel.cases import CHANGED, Again, How, TankAnswers, TankCases, TubeAnswers
from moletally.kernel.program import Program
from moletally.kernel.rates import Floats
from moletally.kernel.reference import evaluate, slopes, tank, tube
from moletally.kernel.structure import Structure

__all__ = ["ReferenceEngine"]


def _numbers(cases: TankCases) -> tuple[bytes, ...]:
    """What the structure of a case may depend on."""
    return (cases.feed > 0).tobytes(), cases.T.tobytes(), cases.p.tobytes()


class ReferenceEngine:
    """numpy, readable; the judge of the other."""

    name = "reference engine (numpy)"

    def tanks(self, structure: Structure, cases: TankCases, how: How) -> tuple[TankAnswers, bool]:
        """Solve and check tanks."""
        return tank.solve(structure, cases, how), True

    def tank_again(self, structure: Structure, cases: TankCases, out: TankAnswers, how: How) -> Again:
        """Solves one tank anew at each call."""
        numbers = _numbers(cases)

        def again() -> int:
            if _numbers(cases) != numbers:
                return CHANGED
            given = cases._replace(c=out.c.copy())
            out.put(np.zeros(1, dtype=np.intp), tank.solve(structure, given, how))
            return 1

        return again

    def tube_again(self, structure: Structure, cases: TankCases, out: TubeAnswers) -> Again:
        """Solves one tube anew at each call."""
        numbers = _numbers(cases)

        def again() -> int:
            if _numbers(cases) != numbers:
                return CHANGED
            answer = tube.solve(structure, cases.feed, cases.tau[:, None], cases.T, cases.p)
            out.put(np.zeros(1, dtype=np.intp), answer)
            return 0

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
