"""Random networks at length: how many tanks and tubes are answered, refused, and wrong.

    python tests/benchmarks/random_networks.py [TANKS] [TUBES] [SEED]

Every tank is judged in 60 digits or more. Tubes are judged by a second integration where that one can be
trusted, with orders of one and more: a sample of its own, a tenth of the number. A start-up that ends on a
state that a trace of something absent would leave is refused by contract, and is counted apart.
"""

import sys
import time
from collections import defaultdict
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1] / "kernel"))

from kernel_random import Case, draw, tank_error, tube_error

from moletally.kernel.status import Status
from moletally.kernel.tank import solve_tanks
from moletally.kernel.tube import solve_tubes

T, NO_PARAMETERS = np.array([300.0]), np.zeros((1, 0))
CLOSED, NEAR, NEAR_TUBE = 1e-9, 1e-7, 1e-6


@dataclass
class Tally:
    """What became of the networks of one run; refusals by status."""

    name: str
    count: int = 0
    spent: float = 0.0
    work: tuple[int, int] = (0, -1)  # the most evaluations of the laws, and in which case
    slowest: tuple[float, int] = (0.0, -1)
    refused: dict[str, list[int]] = field(default_factory=lambda: defaultdict(list))
    wrong: list[int] = field(default_factory=list)
    unjudged: int = 0

    def show(self) -> None:
        """Print it."""
        by_contract = len(self.refused.get(Status.UNSTABLE.name, ()))
        failed = sum(map(len, self.refused.values())) - by_contract
        print(f"{self.count} {self.name} in {self.spent:.1f} s")
        for status, cases in sorted(self.refused.items()):
            print(
                f"  refused, {status}: {len(cases)} (cases {', '.join(map(str, cases[:20]))}{', …' * (len(cases) > 20)})"
            )
        print(
            f"  refused: {failed / self.count:.3%}, and by contract (UNSTABLE) {by_contract / self.count:.3%}"
        )
        print(f"  wrong though called right: {self.wrong or 'none'}; not judged: {self.unjudged}")
        print(
            f"  most work: {self.work[0]} evaluations of the laws (case {self.work[1]}); "
            f"longest: {self.slowest[0] * 1e3:.1f} ms (case {self.slowest[1]})",
            flush=True,
        )


def run(name: str, solve: Callable, cases: Iterator[Case], count: int, judge: Callable) -> None:
    """Solve `count` networks and print what became of them."""
    tally = Tally(name, count)
    for k in range(count):
        case = next(cases)
        begun = time.perf_counter()
        answer = solve(case.model, case.feed[None], np.array([case.tau]), T, NO_PARAMETERS)
        took = time.perf_counter() - begun
        tally.spent += took
        tally.slowest = max(tally.slowest, (took, k))
        tally.work = max(tally.work, (int(answer.work[0]), k))
        if answer.status[0] != Status.OK:
            tally.refused[Status(int(answer.status[0])).name].append(k)
            continue
        fair = judge(case, answer)
        tally.unjudged += fair is None
        if fair is False:
            tally.wrong.append(k)
    tally.show()


def fair_tank(case: Case, answer) -> bool:
    """Residual and distance from the root in 60 digits or more."""
    residual, distance = tank_error(case, answer.c[0], answer.exhausted[0])
    return residual <= CLOSED and distance <= NEAR


def fair_signs(_: Case, answer) -> bool:
    """What can be judged without a second integration; the kernel itself checks totals."""
    return bool((answer.c[0] >= 0).all())


def fair_tube(case: Case, answer) -> bool | None:
    """Distance from a second integration; None where that one gave up."""
    error = tube_error(case, answer.c[0])
    return None if error is None else error <= NEAR_TUBE


def main(tanks: int = 2000, tubes: int = 200, seed: int = 1) -> None:
    """All runs."""

    def drawn(**more) -> Iterator[Case]:
        rng = np.random.default_rng(seed)
        while True:
            yield draw(rng, **more)

    run("tanks", solve_tanks, drawn(), tanks, fair_tank)
    run("tubes", solve_tubes, drawn(), tubes, fair_signs)
    run(
        "tubes of orders 1 and more, beside Radau", solve_tubes, drawn(lowest_order=1.0),
        max(1, tubes // 10), fair_tube,
    )  # fmt: skip


if __name__ == "__main__":
    main(*map(int, sys.argv[1:]))
