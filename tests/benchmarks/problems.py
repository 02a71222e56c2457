"""The problems of the benchmark, for both ways, with answers that neither of them has given.

Stiff problems and their published answers are those of tests/external (the source stands in sources.json);
answers to the others come from mpmath in 40 digits (tanks) and from DOP853 at its tightest (tubes).
"""

import json
import sys
from dataclasses import dataclass, field
from functools import cached_property
from pathlib import Path

import mpmath
import numpy as np
from plain import Change, as_arrays, as_expressions, fsolved, law_text
from scipy.integrate import solve_ivp

sys.path.append(str(Path(__file__).parents[1] / "kernel"))
sys.path.append(str(Path(__file__).parents[1] / "external"))

from external_stiff import EIGHT, HIRES, POLLU_TABLE, TWENTY
from kernel_cases import network

DIGITS = json.loads((Path(__file__).parents[1] / "external" / "stiff.json").read_text(encoding="utf-8"))
SEEN = 1e-13  # of the largest concentration: below that no digits are asked for


@dataclass(frozen=True)
class Problem:
    """A network with a tank and tubes.

    tank, tubes : residence times; answers : published outlets, by residence time
    atol : absolute tolerance that scipy is given for the tube, over the relative one
    """

    name: str
    species: str
    reactions: list[str]
    feed: np.ndarray
    tank: float
    tubes: tuple[float, ...]
    tank_answer: list[str] = field(default_factory=list)
    tube_answers: dict[float, list[str]] = field(default_factory=dict)
    atol: float = 1e-6

    @cached_property
    def model(self):
        """The network for the kernel."""
        return network(self.species, self.reactions)

    @cached_property
    def styles(self) -> dict[str, Change]:
        """dc/dt as a user writes it, in two styles."""
        laws = [law_text(text.split(":")[1]) for text in self.reactions]
        names, nu = self.species.split(), self.model.stoichiometry
        return {"floats": as_expressions(names, laws, nu), "arrays": as_arrays(names, laws, nu)}

    @property
    def guess(self) -> np.ndarray:
        """Where Newton's method begins in both ways."""
        return np.maximum(self.feed, 1e-3 * self.feed.max())

    def fsolved(self, change: Change) -> tuple[np.ndarray, bool]:
        """The tank the plain way."""
        return fsolved(change, self.feed, self.tank, self.guess)

    @cached_property
    def tank_outlet(self) -> np.ndarray:
        """The tank's answer."""
        if self.tank_answer:
            return np.array([float(x) for x in self.tank_answer])
        rates = self.styles["floats"].of_scalars

        def balance(*c: mpmath.mpf) -> list[mpmath.mpf]:
            return [f - x + self.tank * g for f, x, g in zip(self.feed.tolist(), c, rates(*c), strict=True)]

        with mpmath.workdps(40):
            # From the end of the start-up, which settles which state is meant.
            near = solve_ivp(
                lambda _, c: (self.feed - c) / self.tank + self.styles["arrays"](c),
                (0.0, 60 * self.tank), self.feed, method="Radau", rtol=1e-8, atol=1e-12,
            ).y[:, -1]  # fmt: skip
            root = mpmath.findroot(balance, near.tolist())
            return np.array([float(x) for x in root])

    def tube_outlet(self, tau: float) -> np.ndarray:
        """The answer of the tube of that length."""
        if tau in self.tube_answers:
            return np.array([float(x) for x in self.tube_answers[tau]])
        run = solve_ivp(
            lambda _, c: self.styles["arrays"](c), (0.0, tau), self.feed, method="DOP853", rtol=3e-14, atol=1e-20
        )  # fmt: skip
        return np.array(run.y[:, -1])


def error(found: np.ndarray, answer: np.ndarray) -> float:
    """The largest relative error of what is there; inf for what is no number."""
    seen = answer > SEEN * answer.max()
    off = np.abs(found - answer)[seen] / answer[seen]
    return float(off.max()) if np.isfinite(off).all() else np.inf


def fed(table: tuple) -> np.ndarray:
    """The numbers of a feed table."""
    return np.array([row[1] for row in table[1:]], dtype=np.float64)


def mass_action(equation: str, k: float) -> str:
    """A reaction with the law that its left side implies."""
    left = [term.split() for term in equation.split("->")[0].split("+")]
    return f"{equation} : {k!r}*" + "*".join(term[-1] for term in left)


PROBLEMS = [
    Problem("P1", "A B C D", ["A + B -> C : 0.8*A*B^0.5", "C + B -> D : 0.3*C*B^0.5"],
            np.array([1.0, 1.5, 0.0, 0.0]), 2.0, (2.0,)),
    Problem("P2", "A B C D", ["A -> B : 0.5*A", "B -> C : 0.2*B", "2 A -> D : 0.1*A^2"],
            np.array([3.0, 0.0, 0.0, 0.0]), 4.0, (4.0,)),
    Problem("Langmuir–Hinshelwood", "A B C", ["A + B -> C : 2*A*B/(1 + 1.5*A + 0.7*C)^2"],
            np.array([1.0, 1.2, 0.0]), 3.0, (3.0,)),
    Problem("ROBER", "A B C", ["A -> B : 0.04*A", "2 B -> B + C : 3e7*B^2", "B + C -> A + C : 1e4*B*C"],
            np.array([1.0, 0.0, 0.0]), 100.0, (40.0, 1e11), DIGITS["tanks"]["ROBER_100"],
            {40.0: ["7.158270687e-01", "9.185534765e-06", "2.841637457e-01"], 1e11: DIGITS["tubes"]["ROBER"]}),
    Problem("HIRES", " ".join(row[0] for row in EIGHT[1:]),
            [f"{equation} : {law}" for equation, law in HIRES],
            fed(EIGHT), 10.0, (321.8122,), DIGITS["tanks"]["HIRES_10"], {321.8122: DIGITS["tubes"]["HIRES"]}),
    Problem("POLLU", " ".join(row[0] for row in TWENTY[1:]),
            [mass_action(equation, k) for equation, k in POLLU_TABLE[1:]],
            fed(TWENTY), 60.0, (60.0,), DIGITS["tanks"]["POLLU_60"], {60.0: DIGITS["tubes"]["POLLU"]}, 1e-10),
]  # fmt: skip
