"""Random networks at length: how many tanks and tubes are answered, refused, and wrong.

    python tests/benchmarks/random_networks.py [TANKS] [TUBES] [SEED]

Tanks are judged in 60 digits, every one; tubes by whether they are answered at all (their accuracy is
judged on samples in tests/kernel). A start-up that ends on an unstable state is a refusal that the
contract asks for, and is counted apart.
"""

import collections
import sys
import time
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1] / "kernel"))

from kernel_random import draw, tank_error

from moletally.kernel.status import Status
from moletally.kernel.tank import solve_tanks
from moletally.kernel.tube import solve_tubes

T, NO_PARAMETERS = np.array([300.0]), np.zeros((1, 0))
CLOSED, NEAR = 1e-9, 1e-7


def run(name, solve, count, seed, judge):
    """Solve `count` networks and print what became of them."""
    rng = np.random.default_rng(seed)
    statuses, wrong, spent = collections.Counter(), [], 0.0
    for k in range(count):
        case = draw(rng)
        begun = time.perf_counter()
        answer = solve(case.model, case.feed[None], np.array([case.tau]), T, NO_PARAMETERS)
        spent += time.perf_counter() - begun
        statuses[Status(int(answer.status[0])).name] += 1
        if answer.status[0] == Status.OK and not judge(case, answer):
            wrong.append(k)
    print(
        f"{count} {name} in {spent:.0f} s: {dict(statuses)}; wrong though called right: {wrong or 'none'}",
        flush=True,
    )


def fair_tank(case, answer):
    """Residual and distance from the root in 60 digits."""
    residual, distance = tank_error(case, answer.c[0], answer.exhausted[0])
    return residual <= CLOSED and distance <= NEAR


def fair_tube(case, answer):
    """What can be judged without a second integration: signs and the conserved mass are checked by the kernel."""
    return bool((answer.c[0] >= 0).all())


if __name__ == "__main__":
    given = [int(a) for a in sys.argv[1:]]
    tanks, tubes, seed = (*given, *(2000, 200, 1)[len(given) :])
    run("tanks", solve_tanks, tanks, seed, fair_tank)
    run("tubes", solve_tubes, tubes, seed, fair_tube)
