"""The start-up of one tank by implicit Euler steps: slow and rough, but hard to stop.

Each step is itself a steady tank: of residence time 1/(1/h + 1/tau), fed with what is there and with
the feed in proportion. Newton's method for tanks solves it to the end, so that corners of the laws
where a species runs out do no harm. It takes over where the Rosenbrock method gets stuck at one.
"""

import numpy as np

from moletally.kernel.rates import Floats
from moletally.kernel.reference.steady import Tanks, newton

__all__ = ["creep"]

MOST_STEPS = 1500
ERROR = 0.02  # of a concentration, per step
TRACE = 1e-12  # of the largest concentration: below it a species may change as it likes
FIRST, LAST = 1e-9, 100.0  # residence times: first step, and when to stop
MOST_GROWTH, MOST_SHRINK = 3.0, 0.2
LOOK_EVERY = 10  # steps between two looks for the state ahead
BEGIN = 1e-6  # depths of the cut: where Newton's method begins
NEARBY = 1e-2  # relative distance at which it is reached, but for traces
NEARBY_TRACE = 1e-9  # of the largest concentration


def creep(tanks: Tanks, c: Floats) -> tuple[Floats, int]:
    """The state at which one tank arrives from c, shape (1, S), and the iterations it took; nan if none."""
    tau = float(tanks.tau[0])
    t, h, iterations = 0.0, FIRST * tau, 0
    largest = max(float(c.max()), float(tanks.feed.max()))
    now, trend = c, np.zeros_like(c)
    for step in range(1, MOST_STEPS + 1):
        new, count = _euler(tanks, now, h)
        iterations += count
        error = np.abs(new - now - h * trend) / (ERROR * np.maximum(new, now) + TRACE * largest)
        size = max(float(error.max()), 1e-6) if np.isfinite(error).all() else np.inf
        if size <= 1.0 or h < 1e-30 * tau:
            t, trend, now = t + h, (new - now) / h, new
        if step % LOOK_EVERY == 0 or t > LAST * tau:
            ahead = newton(tanks, _beginning(tanks, now))
            iterations += int(ahead.iterations[0])
            near = np.abs(ahead.c - now) <= NEARBY * ahead.c + NEARBY_TRACE * largest
            if ahead.settled[0] and near.all():
                return ahead.c, iterations
        h *= min(MOST_GROWTH, max(MOST_SHRINK, 0.9 / size**0.5))
    return np.full_like(c, np.nan), iterations


def _euler(tanks: Tanks, c: Floats, h: float) -> tuple[Floats, int]:
    """c after an implicit step of size h, nan if there is no such step; and the iterations it took."""
    tau = float(tanks.tau[0])
    rate = 1.0 / h + 1.0 / tau
    mixed = (c / h + tanks.feed / tau) / rate
    step = Tanks(tanks.laws, tanks.coefficients, mixed, np.array([1.0 / rate]), tanks.nothing)
    roots = newton(step, _beginning(tanks, c))
    return (roots.c if roots.settled[0] else np.full_like(c, np.nan)), int(roots.iterations[0])


def _beginning(tanks: Tanks, c: Floats) -> Floats:
    """Where Newton's method begins: at c, but for species far below the depth at which their laws are cut.

    From there it would take too many steps up to where supply holds them.
    """
    out = c.copy()
    edged = tanks.laws.edged
    out[:, edged] = np.maximum(c[:, edged], BEGIN * tanks.laws.depth)
    return out
