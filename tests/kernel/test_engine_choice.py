"""The compiled engine is used where it can be, the reference where its library can't be loaded, and one is told which."""

import subprocess
import sys

import numpy as np
import pytest
from kernel_cases import case, network

from moletally.kernel.again import TankAgain
from moletally.kernel.engine import engine_name, using
from moletally.kernel.status import Status
from moletally.kernel.tank import solve_tanks

ASK = "from moletally.kernel.engine import engine_name; print(engine_name())"
WITHOUT = "import moletally.kernel.compiled.library as library; library.FILE = 'no such file'; "


def in_a_process(code, **env):
    import os

    run = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, check=True, env=os.environ | env
    )
    return run.stdout.strip()


def test_the_compiled_engine_is_the_first_choice():
    assert in_a_process(ASK, MOLETALLY_ENGINE="") == "compiled engine (C)"


def test_the_reference_answers_where_there_is_no_library():
    assert in_a_process(WITHOUT + ASK, MOLETALLY_ENGINE="") == "reference engine (numpy)"


def test_it_can_be_asked_for():
    assert in_a_process(ASK, MOLETALLY_ENGINE="reference") == "reference engine (numpy)"


@pytest.mark.parametrize("name", ["compiled", "reference"])
def test_a_tank_again(name):
    with using(name):
        assert name in engine_name()
        model = network("A B", ["A -> B : k*A"], "k")
        tank = TankAgain(model, np.array([2.0, 0.0]), 12.0, 300.0, np.array([0.1]))
        for tau, fed, k in (
            (12.0, 2.0, 0.1),
            (3.0, 2.0, 0.1),
            (3.0, 1.0, 0.1),
            (3.0, 1.0, 0.7),
            (0.0, 1.0, 0.7),
        ):
            tank.tau[0], tank.feed[0], tank.p[0] = tau, fed, k
            assert tank.solve() == Status.OK
            assert tank.c == pytest.approx([fed / (1 + k * tau), fed - fed / (1 + k * tau)], rel=1e-12)


@pytest.mark.parametrize("name", ["compiled", "reference"])
def test_a_tank_again_sees_that_another_species_is_fed(name):
    with using(name):
        model = network("A B X", ["A -> B : 0.1*A", "A + X -> 2 X : A*X"])
        tank = TankAgain(model, np.array([2.0, 0.0, 0.0]), 5.0, 300.0, np.zeros(0))
        tank.solve()
        tank.feed[2] = 0.5
        assert tank.solve() == Status.OK
        fresh = solve_tanks(model, case(2, 0, 0.5), np.array([5.0]), np.array([300.0]), np.zeros((1, 0)))
        assert tank.c == pytest.approx(fresh.c[0], rel=1e-12)


@pytest.mark.parametrize("name", ["compiled", "reference"])
def test_a_branch_is_followed_and_left_with_a_reason(name):
    """A + 2 B -> 3 B: the upper of three states, from its middle to where it ends."""
    with using(name):
        model = network("A B", ["A + 2 B -> 3 B : A*B^2"])
        tank = TankAgain(model, np.array([60 / 11, 6 / 11]), 1 / 11, 300.0, np.zeros(0), follow=True)
        tank.c[:] = 3.0, 3.0
        assert tank.solve() == Status.OK
        assert tank.c == pytest.approx([3, 3], rel=1e-12)
        tank.tau[0] *= 0.999
        assert tank.solve() == Status.OK
        assert tank.c[1] == pytest.approx(3, rel=0.01)
        tank.c[:] = 4.0, 2.0
        tank.tau[0] = 1 / 11
        assert tank.solve() == Status.UNSTABLE
        assert np.isnan(tank.c).all()
