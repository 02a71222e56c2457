"""The compiled kernel against the reference: tanks, single steps, whole tubes, derivatives, tables.

The two share the analysis of a network and nothing of what computes: agreement shows that the C does what
the readable engine says; that this is right is the other tests' business.
"""

import re
from pathlib import Path

import numpy as np
import pytest
from kernel_cases import network
from kernel_random import draw

from moletally.kernel.cases import How, TankCases
from moletally.kernel.compiled.library import library
from moletally.kernel.compiled.network import network_of
from moletally.kernel.depth import DEPTH
from moletally.kernel.engine import using
from moletally.kernel.reference import explicit, rosenbrock
from moletally.kernel.reference.cutoff import Laws
from moletally.kernel.reference.flow import Flow
from moletally.kernel.reference.stepping import METHODS
from moletally.kernel.slopes import tank_slopes, tube_slopes
from moletally.kernel.status import Status
from moletally.kernel.structure import structures
from moletally.kernel.tank import solve_tanks
from moletally.kernel.tube import solve_tubes

SOURCES = Path(__file__).parents[2] / "addin" / "kernel"
T, NO_PARAMETERS = np.array([300.0]), np.zeros((1, 0))
TANKS = 1e-12  # relative, where the condition is below WELL_POSED
WELL_POSED = 1e3
TUBES = 1e-7  # ten times the tolerance of a step


def both(solve, *args):
    answers = []
    for name in ("compiled", "reference"):
        with using(name):
            answers.append(solve(*args))
    return answers


def off(ours, theirs):
    """Largest relative difference, zeros equal."""
    different = ours != theirs
    return float(
        np.max(np.abs(ours - theirs)[different] / np.abs(np.maximum(theirs, 1e-300))[different], initial=0)
    )


def test_tanks_agree_to_twelve_digits():
    rng = np.random.default_rng(41)
    compared = 0
    for _ in range(150):
        case = draw(rng)
        ours, theirs = both(solve_tanks, case.model, case.feed[None], np.array([case.tau]), T, NO_PARAMETERS)
        assert ours.status[0] == theirs.status[0], case.text
        assert (ours.exhausted == theirs.exhausted).all(), case.text
        assert ours.unique[0] == theirs.unique[0]
        assert ours.from_transient[0] == theirs.from_transient[0]
        if ours.status[0] == Status.OK and ours.condition[0] < WELL_POSED:
            assert off(ours.c[0], theirs.c[0]) <= TANKS, case.text
            compared += 1
    assert compared > 130


def test_tubes_agree_to_ten_times_the_tolerance():
    rng = np.random.default_rng(42)
    for _ in range(25):
        case = draw(rng, lowest_order=0.5)
        ours, theirs = both(solve_tubes, case.model, case.feed[None], np.array([case.tau]), T, NO_PARAMETERS)
        assert ours.status[0] == theirs.status[0], case.text
        large = theirs.c[0] > 1e-9 * case.feed.max()
        if ours.status[0] == Status.OK:
            assert off(ours.c[0][large], theirs.c[0][large]) <= TUBES, case.text


@pytest.mark.parametrize("method", [0, 1])
def test_single_steps_agree(method):
    rng = np.random.default_rng(43)
    for _ in range(40):
        case = draw(rng, lowest_order=0.5)
        feed = case.feed + 0.1 * case.feed.max()  # all there: no species at a corner of its laws
        structure, _ = next(structures(case.model, feed[None] > 0, T, NO_PARAMETERS))
        here = structure.present
        laws = Laws.of(
            structure, structure.edged, np.full((1, len(here)), feed.max()), T, NO_PARAMETERS, DEPTH
        )
        flow = Flow(laws, structure.coefficients)
        c = feed[here]
        speed = np.abs(flow.slope(c[None])[0] / c).max()
        h = 0.01 / speed if speed > 0 else 1.0
        least = np.full((1, len(here)), 1e-25 * feed.max())
        after, error, _ = METHODS[method].step(flow, c[None], np.array([h]), least)
        got, missed = np.empty(len(here)), np.empty(len(here))
        code = library().mt_step(
            network_of(structure).handle, method, c.ctypes.data, 300.0, None, c.ctypes.data, h,
            got.ctypes.data, missed.ctypes.data,
        )  # fmt: skip
        assert code == 0
        assert off(got, after[0]) <= 1e-12, case.text
        assert np.abs(missed - error[0]).max() <= 1e-12 * feed.max()


SLOPES = [
    (["A + B -> C : k*exp(-E/(8.314*T))*A*B^n", "C + B -> D : 0.3*C*B^n"], "A B C D", "k E n", (1, 1.5, 0, 0), 2.0,
     (2430.0, 20000.0, 0.5)),
    (["A -> B : k1*A", "2 B -> B + C : k2*B^2", "B + C -> A + C : k3*B*C"], "A B C", "k1 k2 k3", (1, 0, 0), 40.0,
     (0.04, 3e7, 1e4)),
    (["A + B -> C : k*A*B/(1 + K*A + 0.7*C)^2"], "A B C", "k K", (1, 1.2, 0), 3.0, (2.0, 1.5)),
    (["A -> B : k", "D -> A : 0.05*D"], "A B D", "k", (2, 0, 1), 28.0, (0.1,)),
]  # fmt: skip


@pytest.mark.parametrize(("reactions", "species", "names", "feed", "tau", "constants"), SLOPES)
def test_derivatives_agree(reactions, species, names, feed, tau, constants):
    model = network(species, reactions, names)
    numbers = (np.array([feed], dtype=float), np.array([tau]), T, np.array([constants]))

    def of_tank(*args):
        return tank_slopes(model, solve_tanks(model, *args), *args)

    for of, near in ((of_tank, 1e-12), (lambda *args: tube_slopes(model, *args), 1e-5)):
        ours, theirs = both(of, *numbers)
        for part, other in zip(ours, theirs, strict=True):
            assert (np.isnan(part) == np.isnan(other)).all()
            size = np.nanmax(np.abs(other), initial=0.0)
            assert np.nanmax(np.abs(part - other), initial=0.0) <= near * (size + 1e-3)


def test_a_guess_is_followed_by_both():
    model = network("A B", ["A + 2 B -> 3 B : A*B^2"])
    feed = np.array([[60 / 11, 6 / 11]])
    structure, _ = next(structures(model, feed > 0, T, NO_PARAMETERS))
    for b in (1.0, 3.0):
        near = TankCases(feed, np.array([1 / 11]), T, NO_PARAMETERS, c=np.array([[6 - b + 0.1, b - 0.1]]))
        for name in ("compiled", "reference"):
            with using(name) as engine:
                answers, _ = engine.tanks(structure, near, How.FROM_GUESS)
            assert answers.c[0] == pytest.approx([6 - b, b], rel=1e-12)


def table(name):
    """A table of tables.h as a list of rows."""
    text = (SOURCES / "tables.h").read_text(encoding="utf-8")
    body = re.search(rf"{name}(?:\[\d+\])* =\s*(.*?);", text, re.DOTALL).group(1)
    rows = re.findall(r"\{([^{}]*)\}", body) or [body]
    return [[float(x) for x in row.split(",")] for row in rows]


@pytest.mark.parametrize(
    ("name", "rows"),
    [
        ("DOP853_A", [row.tolist() or [0.0] for row in explicit.A]),
        ("DOP853_B", [explicit.B.tolist()]),
        ("DOP853_E3", [explicit.E3.tolist()]),
        ("DOP853_E5", [explicit.E5.tolist()]),
        ("RODAS5P_A", [list(row) or [0.0] for row in rosenbrock.A]),
        ("RODAS5P_C", [list(row) or [0.0] for row in rosenbrock.C]),
        ("RODAS5P_GAMMA", [[rosenbrock.GAMMA]]),
    ],
)
def test_the_tables_are_those_whose_order_conditions_are_tested(name, rows):
    assert table(name) == rows


def test_the_states_are_numbered_alike():
    text = (SOURCES / "moletally.h").read_text(encoding="utf-8")
    assert dict(re.findall(r"MT_(\w+) = (\d+)", text.split("What a call returns")[0])) == {
        status.name: str(status.value) for status in Status
    }
