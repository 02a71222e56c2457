"""The compiled kernel for Windows, alone and behind the add-in's COM server, against the same sources on Linux."""

import sys
from pathlib import Path

import kernel_random
import numpy as np
import pytest
from external_stiff import CHECKS
from recorded import BOOKS, answer, as_wire, calls_of
from test_calls import close, rectangle, run_client, without_reasons

from moletally.hosts.headless.book import open_book
from moletally.hosts.headless.calculate import calculate
from moletally.kernel.compiled.engine import CompiledEngine
from moletally.kernel.compiled.pack import pack_structure
from moletally.kernel.engine import ENGINES, using
from moletally.kernel.status import Status
from moletally.kernel.tank import solve_tanks
from moletally.kernel.tube import solve_tubes
from moletally.reactors.solve import MEMORY
from moletally.sheet.functions import call

sys.path.insert(0, str(Path(__file__).parent / "client"))
import alone

RANDOM_TANKS, RANDOM_TUBES = 300, 60
WELL_CONDITIONED = 1e3
TANK, TUBE = 1e-12, 1e-7
TRACE = 1e-16  # of the largest concentration: below it a tube follows a species no closer
COMPILED = "compiled engine (C)"


class Recorder(CompiledEngine):
    """The compiled engine, which keeps what it is asked."""

    jobs: list[dict]

    def __init__(self):
        super().__init__()
        self.jobs = []

    def _note(self, structure, **arrays):
        ints, reals = pack_structure(structure)
        given = {name: np.array(x) for name, x in arrays.items() if x is not None}
        self.jobs.append({"ints": ints, "reals": reals, **given})

    def tanks(self, structure, cases, how):
        named = {
            name: getattr(cases, name) for name in ("feed", "tau", "T", "p", "start", "fed", "scale", "c")
        }
        self._note(structure, how=int(how), **named)
        return super().tanks(structure, cases, how)

    def tubes(self, structure, feed, asked, T, p):
        self._note(structure, feed=feed, asked=asked, T=T, p=p)
        return super().tubes(structure, feed, asked, T, p)


@pytest.fixture(scope="module")
def asked():
    """All jobs: the templates', published stiff and larger problems, and random networks."""
    ENGINES["recorder"] = Recorder
    MEMORY.clear()
    try:
        with using("recorder") as recorder:
            for book in BOOKS:
                calculate(open_book(book))
            for check in CHECKS:
                if check.ask.chain == 1:
                    call(check.ask.function, check.ask.arguments)
            rng = np.random.default_rng(17)
            for n in range(RANDOM_TANKS):
                case = kernel_random.draw(rng)
                one = (case.model, case.feed[None], np.array([case.tau]), np.array([300.0]), np.zeros((1, 0)))
                solve_tanks(*one)
                if n < RANDOM_TUBES:
                    solve_tubes(*one, grid=case.tau * np.geomspace(1e-3, 1.0, 5))
            jobs = recorder.jobs
    finally:
        del ENGINES["recorder"]
        MEMORY.clear()
    return {f"{n}/{name}": x for n, job in enumerate(jobs) for name, x in job.items()}


@pytest.fixture(scope="module")
def told(windows, asked, tmp_path_factory):
    """Answers of Windows and of Linux: arrays by job number and name."""
    folder = tmp_path_factory.mktemp("kernel")
    np.savez(folder / "asked.npz", **asked)
    script = windows.path(Path(alone.__file__))
    done = windows.python(script, *(windows.path(folder / f) for f in ("asked.npz", "told.npz")), timeout=300)
    assert done.returncode == 0, (done.stdout + done.stderr)[-3000:]
    with np.load(folder / "told.npz") as archive:
        there = {name: archive[name] for name in archive.files}
    assert str(there.pop("library")).endswith("_kernel.dll")
    here = alone.play(asked)
    assert str(here.pop("library")).endswith("_kernel.so")
    assert there.keys() == here.keys()
    return there, here


def cases(told, tubes):
    """(Windows, Linux) of each job of tanks or of tubes, as dicts of arrays."""
    there, here = told
    for number in sorted({int(key.split("/")[0]) for key in here}):
        names = [key for key in here if key.startswith(f"{number}/")]
        if (f"{number}/steps" in here) == tubes:
            yield tuple({key.split("/")[1]: side[key] for key in names} for side in (there, here))


def test_tanks_alone(told):
    same = count = 0
    worst = 0.0
    for there, here in cases(told, tubes=False):
        assert there["status"].tolist() == here["status"].tolist()
        fine = (here["status"] == Status.OK) & (here["condition"] < WELL_CONDITIONED) & (here["faded"] == 0)
        a, b = there["c"][fine], here["c"][fine]
        assert a == pytest.approx(b, rel=TANK, abs=0)
        worst = max(worst, float((abs(a - b)[b != 0] / b[b != 0]).max(initial=0.0)))
        same += int((a == b).all(axis=-1).sum())
        count += len(a)
    print(f"tanks: {same} of {count} equal to the last bit, the others to {worst:.1e}")
    assert count > RANDOM_TANKS // 2


def test_tubes_alone(told):
    same = count = 0
    worst = 0.0
    for there, here in cases(told, tubes=True):
        assert there["status"].tolist() == here["status"].tolist()
        fine = here["status"] == Status.OK
        a, b = there["c"][fine], here["c"][fine]
        size = abs(b) + TRACE * abs(b).max(axis=-1, initial=1e-300, keepdims=True)
        assert (abs(a - b) <= TUBE * size).all()
        worst = max(worst, float((abs(a - b) / size).max(initial=0.0)))
        same += int((a == b).all(axis=-1).sum())
        count += len(a)
    print(f"states of tubes: {same} of {count} equal to the last bit, the others to {worst:.1e}")
    assert count > RANDOM_TUBES


def test_the_server_computes_with_the_library(windows, server, tmp_path):
    """What `about` says there, and the worksheet calls of every template."""
    made = [recorded for book in BOOKS for recorded in calls_of(book)]
    calls = [(name, [as_wire(a) for a in arguments]) for name, arguments, _ in made]
    about, *got = run_client(windows, server, "calls.py", [("about", []), *calls], tmp_path)
    assert dict(about)["kernel"].startswith(COMPILED)
    with using("compiled"):
        expected = [answer(name, arguments) for name, arguments, _ in made]
    pairs = [
        (g, e)
        for value, rows in zip(got, expected, strict=True)
        for gs, es in zip(without_reasons(rectangle(value)), rows, strict=True)
        for g, e in zip(gs, es, strict=True)
    ]
    assert all(close(g, e) for g, e in pairs)
    numbers = [(g, e) for g, e in pairs if isinstance(e, float)]
    assert len(numbers) > 100
    print(
        f"cells of the templates: {sum(g == e for g, e in numbers)} of {len(numbers)} numbers equal to the last bit"
    )
