"""Random networks: no answer that is called right may be wrong, and few may be refused.

A seeded sample of what `python tests/benchmarks/random_networks.py` does at length.
"""

import collections
from dataclasses import replace

import numpy as np
import pytest
from kernel_random import draw, tank_error, tube_error

from moletally.kernel.status import Status
from moletally.kernel.tank import solve_tanks
from moletally.kernel.tube import solve_tubes

T, NO_PARAMETERS = np.array([300.0]), np.zeros((1, 0))
CLOSED = 1e-9  # residual in 60 digits over the sum of the terms
NEAR = 1e-7  # relative distance from the root in 60 digits


def solved(solve, case):
    return solve(case.model, case.feed[None], np.array([case.tau]), T, NO_PARAMETERS)


def test_tanks():
    rng = np.random.default_rng(20)
    statuses = collections.Counter()
    for _ in range(120):
        case = draw(rng)
        answer = solved(solve_tanks, case)
        statuses[Status(int(answer.status[0]))] += 1
        if answer.status[0] == Status.OK:
            assert (answer.c[0] >= 0).all()
            residual, distance = tank_error(case, answer.c[0], answer.exhausted[0])
            assert residual <= CLOSED, case.text
            assert distance <= NEAR, case.text
        else:
            assert np.isnan(answer.c[0]).all()
    assert statuses[Status.OK] >= 118, statuses


@pytest.mark.parametrize("seed", [3, 4])
def test_tubes(seed):
    """Against Radau at tight tolerances, where its own right-hand side is smooth (orders of one and more)."""
    rng = np.random.default_rng(seed)
    for _ in range(12):
        case = draw(rng, lowest_order=1.0)
        case = replace(case, tau=min(case.tau, 1.0))
        answer = solved(solve_tubes, case)
        assert answer.status[0] == Status.OK, case.text
        error = tube_error(case, answer.c[0])
        assert error is None or error <= 1e-6, case.text
