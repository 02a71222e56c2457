"""From the start of a process to its first answer, in fresh processes, beside `import numpy`."""

import subprocess
import sys
import time

from measure import amount, median_of
from sheets import FIRST

__all__ = ["starts"]

NUMPY = "import numpy"
KERNEL = """
import numpy as np
from moletally.kernel.program import Builder, Model, Op
from moletally.kernel.tank import solve_tanks
b = Builder(3, 1)
b.rate(b.apply(Op.MUL, b.apply(Op.MUL, b.parameter(0), b.species(0)), b.apply(Op.SQRT, b.species(1))))
model = Model(b.finish(), np.array([[-1.0, -1.0, 1.0]]))
numbers = np.array([[1.0, 1.5, 0.0]]), np.array([2.0]), np.array([300.0]), np.array([[0.8]])
assert solve_tanks(model, *numbers).status[0] == 0
"""
SCIPY = """
import numpy as np
from scipy.optimize import fsolve
feed = np.array([1.0, 1.5, 0.0])
fsolve(lambda c: feed - c + 2.0 * 0.8 * c[0] * np.sqrt(c[1]) * np.array([-1.0, -1.0, 1.0]), [1.0, 1.5, 1e-3])
"""
ROWS = (("first kernel answer", KERNEL, "≤ 1.3"), ("first worksheet answers of a tank and a tube, units included", FIRST, "< 2.5"),
        ("first answer of `fsolve`", SCIPY, ""))  # fmt: skip


def starts(rounds: int) -> None:
    """Print the table; each round starts one process of each kind."""
    codes = [NUMPY, *(code for _, code, _ in ROWS)]
    _started(NUMPY)
    times = median_of([[_started(code) for code in codes] for _ in range(rounds)])
    print("\n| process start to | time | times `import numpy` | target |\n|---|---|---|---|")
    print(f"| `import numpy` | {amount(times.seconds[0])} | 1 | |")
    for (name, _, target), took, ratio in zip(ROWS, times.seconds[1:], times.ratios[1:], strict=True):
        print(f"| {name} | {amount(took)} | {ratio:.2f} | {target} |", flush=True)


def _started(code: str) -> float:
    begun = time.perf_counter()
    subprocess.run([sys.executable, "-c", code], check=True)
    return time.perf_counter() - begun
