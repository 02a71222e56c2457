"""The start-up of one tank by implicit Euler steps: slow and rough, but hard to stop.

Each step is itself a steady tank: of residence time 1/(1/h + 1/tau), fed with what is there and with
the feed in proportion. Newton's method for tanks solves it to the end, so that corners of the laws
where a species runs out do no harm. It takes over where the Rosenbrock method gets stuck at one.
"""

import numpy as np

from moletally.kernel.rates import Floats
from moletally.kernel.steady import Tanks, newton

__all__ = ["creep"]

MOST_STEPS = 400
ERROR = 0.01  # of a concentration, per step
TRACE = 1e-18  # of the largest concentration: below it a species may change as it likes
FIRST, LAST = 1e-9, 100.0  # residence times: first step, and when to stop
MOST_GROWTH, MOST_SHRINK = 3.0, 0.2


def creep(tanks: Tanks, c: Floats) -> tuple[Floats, int]:
    """The state of one tank a hundred residence times after c, shape (1, S), and the iterations it took.

    nan if it is not reached in a few hundred steps.
    """
    tau = float(tanks.tau[0])
    t, h, iterations = 0.0, FIRST * tau, 0
    trace = TRACE * max(float(c.max()), float(tanks.feed.max()))
    now, trend = np.maximum(c, 1e-12 * trace), np.zeros_like(c)
    for _ in range(MOST_STEPS):
        rate = 1.0 / h + 1.0 / tau
        mixed = (now / h + tanks.feed / tau) / rate
        roots = newton(
            Tanks(tanks.laws, tanks.nu, mixed, np.array([1.0 / rate]), tanks.nothing), now, most=25
        )
        iterations += int(roots.iterations[0])
        new = roots.c
        error = np.abs(new - now - h * trend) / (ERROR * np.maximum(new, now) + trace)
        size = max(float(error.max()), 1e-6) if roots.settled[0] else np.inf
        if size <= 1.0 or h < 1e-30 * tau:
            t, trend, now = t + h, (new - now) / h, new
        if t > LAST * tau:
            return now, iterations
        h *= min(MOST_GROWTH, max(MOST_SHRINK, 0.9 / size**0.5))
    return np.full_like(c, np.nan), iterations
