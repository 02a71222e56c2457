"""The compiled engine is used where it can be, the reference where its library can't be loaded, and one is told which."""

import subprocess
import sys

import numpy as np
import pytest
from kernel_cases import case, network

from moletally.kernel.again import TankAgain, TubeAgain
from moletally.kernel.engine import engine_name, using
from moletally.kernel.status import Status
from moletally.kernel.tank import solve_tanks
from moletally.kernel.tube import solve_tubes

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


@pytest.mark.parametrize("name", ["compiled", "reference"])
def test_a_tube_again(name):
    with using(name):
        tube = TubeAgain(
            network("A B", ["A -> B : k*A"], "k"), np.array([2.0, 0.0]), 12.0, 300.0, np.array([0.1])
        )
        for tau, k in ((12.0, 0.1), (3.0, 0.1), (3.0, 0.7), (0.0, 0.7)):
            tube.tau[0], tube.p[0] = tau, k
            assert tube.solve() == Status.OK
            assert tube.c == pytest.approx([2 * np.exp(-k * tau), -2 * np.expm1(-k * tau)], rel=1e-9)


def test_many_vessels_at_once_are_what_each_is_alone():
    """On all cores, in pieces: 500 tanks and 50 tubes of several structures."""
    rng = np.random.default_rng(5)
    model = network("A B C", ["A -> B : k1*A^n", "B -> C : k2*B"], "k1 k2 n")
    for solve, n in ((solve_tanks, 500), (solve_tubes, 50)):
        feed = np.where(rng.random((n, 3)) < 0.3, 0.0, rng.uniform(0.1, 3, (n, 3)))
        tau, T = rng.uniform(0, 9, n), np.full(n, 300.0)
        p = np.column_stack([rng.uniform(0.1, 2, (n, 2)), rng.choice([0.5, 1.0, 1.5], n)])
        together = solve(model, feed, tau, T, p)
        for k in range(0, n, 7):
            one = slice(k, k + 1)
            alone = solve(model, feed[one], tau[one], T[one], p[one])
            assert (together.c[k] == alone.c[0]).all()
            assert together.status[k] == alone.status[0]
