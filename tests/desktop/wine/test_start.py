"""The Python process, started by xlwings' own DLL with the command line that the add-in's VBA builds."""

import json
import math
import subprocess
from pathlib import Path
from statistics import median

import pytest
from conftest import stop
from office import ADDIN, run_basic
from recorded import as_wire

HERE = Path(__file__).parent
R = (("Reaction", "Rate", "k"), ("A -> B", "k*A^0.5", 0.4))
F = (("Species", "Feed"), ("A", 2.0), ("B", 0.0))
SMALL = ["MOLE_CSTR", [as_wire(R), as_wire(F), 3.0]]
BLOCK = [  # 10 species, 1000 cases: a block of 1000 x 10 comes back
    "MOLE_CSTR",
    [
        as_wire((("Reaction", "k"), *((f"S{i} -> S{i + 1}", 0.1 + 0.05 * i) for i in range(9)))),
        as_wire((("Species", "Feed"), *((f"S{i}", 1.0 if i == 0 else 0.0) for i in range(10)))),
        as_wire(tuple((0.01 * (i + 1),) for i in range(1000))),
    ],
]
ROOT_A = (-0.4 * 3.0 + math.sqrt((0.4 * 3.0) ** 2 + 4 * 2.0)) / 2  # A + k tau sqrt(A) = 2, solved for sqrt(A)
EXPECTED = [ROOT_A**2, 2.0 - ROOT_A**2]
LOST = "0x800706BA"  # RPC server unavailable


def is_right(answer):
    return [row[0] for row in answer] == pytest.approx(EXPECTED, rel=1e-12)


@pytest.fixture(scope="session")
def commands(windows):
    """The command lines of the first, second and third start, out of the built macro file."""
    calls = [["MoleSettings.StartCommand", [windows.executable, float(n)]] for n in (1, 2, 3)]
    made = run_basic(ADDIN, calls)
    assert len(set(made)) == 3
    return made


def play(windows, plan, tmp_path, env=None, timeout=300):
    """The results of a plan, and the log of the server."""
    file, told = tmp_path / "plan.json", tmp_path / "told.json"
    file.write_text(json.dumps(plan), encoding="utf-8")
    dll = windows.path(next((windows.folder / "py").glob("xlwings64-*.dll")))
    local = tmp_path / "local"
    local.mkdir(exist_ok=True)
    done = windows.python(
        windows.path(HERE / "client" / "dll.py"), dll, windows.path(file), windows.path(told),
        env={"LOCALAPPDATA": windows.path(local), **(env or {})}, timeout=timeout,
    )  # fmt: skip
    assert told.exists(), (done.stdout + done.stderr)[-3000:]
    log = local / "moletally" / "server.log"
    return json.loads(told.read_text(encoding="utf-8")), log.read_text(
        encoding="utf-8"
    ) if log.exists() else ""


def test_one_process_serves_and_ends_when_it_is_let_go(windows, commands, tmp_path):
    plan = [["start", commands[0]], ["call", *SMALL], ["start", commands[0]], ["call", *SMALL]]
    (first, answer, second, again), log = play(windows, plan, tmp_path)
    assert first["process"] == second["process"]
    assert is_right(answer)
    assert is_right(again)
    assert " ready after " in log
    print(f"start of the process: {first['seconds']:.1f} s under Wine")


def test_a_killed_process_is_replaced_by_the_next_command(windows, commands, tmp_path):
    """The DLL goes on naming the dead one under the same command: the VBA's count of starts makes a new one."""
    plan = [
        ["start", commands[0]],
        ["kill"],
        ["call", *SMALL],
        ["start", commands[0]],
        ["start", commands[1]],
        ["call", *SMALL],
    ]
    (first, _, lost, same, new, answer), _ = play(windows, plan, tmp_path)
    assert LOST in lost["error"]
    assert "words" in same
    assert new["process"] != first["process"]
    assert is_right(answer)


def test_two_excels_have_a_process_each(windows, commands, tmp_path):
    """Two programs start with the same command line at the same time."""
    running = []
    for name in ("one", "two"):
        folder = tmp_path / name
        folder.mkdir()
        (folder / "plan.json").write_text(json.dumps([["start", commands[0]], *[["call", *SMALL]] * 50]))
        dll = windows.path(next((windows.folder / "py").glob("xlwings64-*.dll")))
        running.append(windows.start(windows.path(HERE / "client" / "dll.py"), dll, windows.path(folder / "plan.json"),
                                     windows.path(folder / "told.json")))  # fmt: skip
    for process in running:
        try:
            process.wait(120)
        except subprocess.TimeoutExpired:
            stop(process)
            raise
        process.stdout.close()
    one, two = (json.loads((tmp_path / name / "told.json").read_text()) for name in ("one", "two"))
    assert one[0]["process"] != two[0]["process"]
    assert all(is_right(answer) for answer in (*one[1:], *two[1:]))


def test_twenty_thousand_calls(windows, commands, tmp_path):
    """Right to the last, and the process does not grow once its memory of answers is full."""
    (_, many), _ = play(windows, [["start", commands[0]], ["many", 20_000]], tmp_path, timeout=900)
    assert many["wrong"] == 0
    before, after = many["memory"]
    assert after - before < 8e6
    print(f"20,000 calls: {many['seconds']:.0f} s, memory {before / 1e6:.0f} to {after / 1e6:.0f} MB")


def test_latency_is_told(windows, commands, tmp_path):
    """Printed, not judged: Wine and a shared machine are noisy."""
    plan = [
        ["start", commands[0]],
        ["time", "about", [], 200],
        ["time", *SMALL, 200],
        ["time", *BLOCK, 10],
        ["call", *BLOCK],
    ]
    (_, bare, small, block, answer), _ = play(windows, plan, tmp_path)
    assert (len(answer), len(answer[0])) == (1000, 10)
    print(
        f"bare call {median(bare):.1f} ms, small tank {median(small):.1f} ms, block of 1000 x 10 {median(block):.0f} ms"
    )


def broken_package(tmp_path, name, code):
    """An environment in which a package of that name is found first."""
    folder = tmp_path / "broken"
    (folder / name).mkdir(parents=True)
    (folder / name / "__init__.py").write_text(code)
    return {"PYTHONPATH": "Z:" + str(folder).replace("/", "\\")}


def test_a_missing_python_is_told_at_once(windows, tmp_path):
    (command,) = run_basic(ADDIN, [["MoleSettings.StartCommand", [r"C:\nowhere\python.exe", 1.0]]])
    (failed,), _ = play(windows, [["start", command]], tmp_path)
    assert "Could not create Python process" in failed["words"]
    assert failed["seconds"] < 2


def test_a_broken_python_is_told_within_two_seconds(windows, commands, tmp_path):
    env = broken_package(tmp_path, "numpy", "raise ImportError('DLL load failed: it is broken')")
    (failed,), log = play(windows, [["start", commands[0]]], tmp_path, env)
    assert "exited" in failed["words"]
    assert failed["seconds"] < 2
    assert "failed: numpy can't be imported: DLL load failed: it is broken" in log


def test_a_slow_start_is_no_failure(windows, commands, tmp_path):
    env = broken_package(tmp_path, "win32api_slow", "")
    (Path(tmp_path) / "broken" / "sitecustomize.py").write_text("import time; time.sleep(8)")
    (started, answer), _ = play(windows, [["start", commands[0]], ["call", *SMALL]], tmp_path, env)
    assert started["seconds"] > 8
    assert is_right(answer)


def test_a_start_that_never_ends_is_ended(windows, commands, tmp_path):
    """After 30 seconds the process ends itself, and the DLL says so: Excel is not held any longer."""
    env = broken_package(tmp_path, "numpy", "import time; time.sleep(600)")
    (failed,), log = play(windows, [["start", commands[0]]], tmp_path, env)
    assert 25 < failed["seconds"] < 45
    assert "failed: Python was not ready within 30 s" in log
