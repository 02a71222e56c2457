"""Random networks, and judges that share nothing with the engines but the text of the laws.

Reactions conserve a random mass, so that nothing grows without bound. Orders are 0 to 2.5 in halves,
constants span 12 decades, two fifths of the species are not fed, a third of the laws has an
adsorption term, a fifth can run backwards.
"""

from dataclasses import dataclass
from fractions import Fraction
from itertools import count

import mpmath
import numpy as np
from kernel_cases import network
from scipy.integrate import solve_ivp

from moletally.kernel.program import Model

DIGITS, MORE_DIGITS = 60, 250
MOST_EVALUATIONS = 20_000  # of the laws, for the judge of a tube


@dataclass(frozen=True)
class Term:
    """sign * k * prod c_i^order / (1 + K c_m)^2 of one reaction."""

    nu: np.ndarray
    k: float
    orders: dict[int, float]
    inhibitor: tuple[int, float] | None

    def rate(self, c: list, number: type = mpmath.mpf) -> mpmath.mpf | float:
        value = number(self.k)
        for i, order in self.orders.items():
            if order:
                value *= c[i] ** number(order) if c[i] else number(0)
        if self.inhibitor:
            m, K = self.inhibitor
            value /= (1 + number(K) * c[m]) ** 2
        return value


@dataclass(frozen=True)
class Case:
    model: Model
    terms: list[Term]
    feed: np.ndarray
    tau: float
    text: list[str]


def draw(rng: np.random.Generator, lowest_order: float = 0.0) -> Case:
    species = int(rng.integers(2, 9))
    mass = rng.integers(1, 4, species)
    orders = [o for o in (0.0, 0.5, 1.0, 1.5, 2.0, 2.5) if o >= lowest_order]
    texts, terms = [], []
    for _ in range(int(rng.integers(1, 9))):
        _reaction(rng, mass, orders, texts, terms)
    feed = np.where(rng.random(species) < 0.4, 0.0, 10 ** rng.uniform(-3, 2, species))
    if not feed.any():
        feed[0] = 1.0
    names = " ".join(f"s{i}" for i in range(species))
    return Case(network(names, texts), terms, feed, float(10 ** rng.uniform(-3, 6)), texts)


def _reaction(rng, mass, orders, texts, terms):
    species = len(mass)
    left = rng.choice(species, int(rng.integers(1, min(3, species))), replace=False)
    product = int(rng.choice([i for i in range(species) if i not in left]))
    coefficients = rng.integers(1, 3, len(left))
    made = float((mass[left] * coefficients).sum() / mass[product])
    nu = np.zeros(species)
    nu[left], nu[product] = -coefficients, made
    k = float(10 ** rng.uniform(-6, 6))
    forward = {int(i): float(rng.choice(orders)) for i in left}
    inhibitor = (int(rng.integers(species)), float(10 ** rng.uniform(-2, 3))) if rng.random() < 0.33 else None
    law = _power(k, forward)
    terms.append(Term(nu, k, forward, inhibitor))
    if rng.random() < 0.2:
        back, order = k * float(10 ** rng.uniform(-3, 3)), float(rng.choice([o for o in orders if o]))
        law = f"({law} - {_power(back, {product: order})})"
        terms.append(Term(-nu, back, {product: order}, inhibitor))
    if inhibitor:
        law = f"{law}/(1 + {inhibitor[1]!r}*s{inhibitor[0]})^2"
    equation = " + ".join(f"{c} s{i}" for c, i in zip(coefficients, left, strict=True))
    texts.append(f"{equation} -> {made!r} s{product} : {law}")


def _power(k: float, orders: dict[int, float]) -> str:
    return repr(k) + "".join(f"*s{i}^{o!r}" for i, o in orders.items() if o)


def tank_error(case: Case, c: np.ndarray, exhausted: np.ndarray) -> tuple[float, float]:
    """Scaled residual of an outlet, and its largest relative distance from a root in 60 digits.

    Exhausted species are zero; laws of order zero that consume them carry an unknown factor between 0
    and 1 per such species in their place. Distance is inf where Newton's method does not end near the
    outlet. In 60 digits it may lose traces of 1e-90: it is tried in 250 before an outlet is called far off.
    """
    found = _tank_error(case, c, exhausted, DIGITS)
    if found[1] <= 1e-9:
        return found
    return min(found, _tank_error(case, c, exhausted, MORE_DIGITS), key=lambda pair: pair[1])


def _tank_error(case, c, exhausted, digits):
    with mpmath.workdps(digits):
        residual, distance = _error(case, c, exhausted, 0.0)
        if exhausted.any() and distance > 1e-9:
            # Where supply and demand balance to the last digit an amount may be nothing but rounding.
            residual, distance = min(
                (residual, distance), _error(case, c, exhausted, 1e-15 * case.feed.max())
            )
        return residual, distance


def tube_error(case: Case, c: np.ndarray) -> float | None:
    """Largest error of a tube's outlet beside a tight integration by Radau; None where that one gives up.

    Relative for what is above a thousandth of the largest feed; below, smaller amounts count less. Only for
    laws of order one and more: beside a root of nothing the judge itself is lost.
    """

    evaluations = count()

    def change(_: float, now: np.ndarray) -> np.ndarray:
        if next(evaluations) > MOST_EVALUATIONS:
            raise OverflowError
        there = np.maximum(now, 0.0).tolist()
        return sum(term.nu * term.rate(there, float) for term in case.terms)

    try:
        with np.errstate(all="ignore"):
            run = solve_ivp(
                change, (0.0, case.tau), case.feed, method="Radau", rtol=1e-10, atol=1e-14 * case.feed.max()
            )
    except (OverflowError, ValueError):  # too long, or its differences for a Jacobian run away
        return None
    if run.status != 0:
        return None
    exact = run.y[:, -1]
    return float((np.abs(c - exact) / (np.abs(exact) + 1e-3 * case.feed.max())).max())


def _error(case, c, exhausted, rounding):
    gone = [i for i in range(len(c)) if exhausted[i]]
    c = np.where(c > rounding, c, 0.0)
    cut = _supplied(case, c, gone)
    idle = set(gone) - set(cut)
    cut = _apart(case, c, cut)
    unknown = [i for i in range(len(c)) if c[i] > 0 or i in cut]
    x = [mpmath.mpf(1) / 2 if i in cut else mpmath.mpf(float(c[i])) for i in unknown]
    residual = mpmath.mpf(0)
    start = list(x)
    for step in range(60):
        f, scale, jacobian = _balance(case, unknown, cut, idle, x)
        if step == 0 and not cut and f:
            residual = max(abs(a) / s for a, s in zip(f, scale, strict=True))
        try:
            y = mpmath.lu_solve(jacobian, mpmath.matrix([-a for a in f])) if f else []
        except ZeroDivisionError:
            return float(residual), float("inf")
        x = [a * max(1 + d, mpmath.mpf("0.1")) for a, d in zip(x, y, strict=True)]
        if not f or max(abs(d) for d in y) < mpmath.mpf(10) ** -30:
            break
    else:
        return float(residual), float("inf")
    fair = all(0 <= x[n] <= 1 + mpmath.mpf(10) ** -9 for n, i in enumerate(unknown) if i in cut)
    moved = [abs(a / b - 1) for a, b, i in zip(x, start, unknown, strict=True) if i not in cut]
    return float(residual), float(max(moved, default=0)) if fair else float("inf")


def _balance(case, unknown, cut, idle, x):
    """F, the sum of its terms' sizes, and dF/d ln x."""
    size = len(case.feed)
    c, factor = [mpmath.mpf(0)] * size, {}
    for i, value in zip(unknown, x, strict=True):
        if i in cut:
            factor[i] = value
        else:
            c[i] = value
    tau = mpmath.mpf(case.tau)
    f = [mpmath.mpf(float(case.feed[i])) - c[i] for i in range(size)]
    scale = [mpmath.mpf(float(case.feed[i])) + c[i] for i in range(size)]
    slope = {(i, i): -c[i] for i in range(size)}
    for term in case.terms:
        if any(term.nu[i] < 0 and i in term.orders for i in idle):
            continue
        rate = term.rate(c)
        elastic = {i: o for i, o in term.orders.items() if o}
        if term.inhibitor:
            m, K = term.inhibitor
            elastic[m] = elastic.get(m, 0) - 2 * mpmath.mpf(K) * c[m] / (1 + mpmath.mpf(K) * c[m])
        for i, o in term.orders.items():
            if i in factor and not o and term.nu[i] < 0:
                rate *= factor[i]
                elastic[i] = 1
        for i in range(size):
            if term.nu[i]:
                flow = _meant(term.nu[i]) * rate * tau
                f[i] += flow
                scale[i] += abs(flow)
                for k, e in elastic.items():
                    slope[i, k] = slope.get((i, k), mpmath.mpf(0)) + flow * e
    jacobian = mpmath.matrix(len(unknown), len(unknown))
    for a, i in enumerate(unknown):
        for b, k in enumerate(unknown):
            jacobian[a, b] = slope.get((i, k), mpmath.mpf(0))
    return [f[i] for i in unknown], [scale[i] for i in unknown], jacobian


def _supplied(case, c, gone):
    """Species used up that are fed or still made; where nothing arrives there is nothing to cut."""
    state = [mpmath.mpf(float(x)) for x in c]
    supplied = {i for i in gone if case.feed[i] > 0}
    while True:
        more = set(supplied)
        for term in case.terms:
            needs = [i for i in term.orders if term.nu[i] < 0 and not term.orders[i]]
            if term.rate(state) > 0 and all(i in supplied for i in needs if i in gone):
                more |= {int(i) for i in np.flatnonzero(term.nu > 0) if i in gone}
        if more == supplied:
            return sorted(supplied)
        supplied = more


def _apart(case, c, cut):
    """Species used up, less those held back by the very laws that hold back another: one factor counts."""
    state = [mpmath.mpf(float(x)) for x in c]
    running = [t.rate(state) > 0 for t in case.terms]
    kept = {}
    for i in cut:
        laws = [k for k, t in enumerate(case.terms) if running[k] and t.nu[i] < 0 and t.orders.get(i) == 0.0]
        kept.setdefault(tuple(laws), i)
    return sorted(kept.values())


def _meant(x):
    """A coefficient as the fraction that was meant: products are made in the ratio of masses 1 to 3."""
    near = Fraction(float(x)).limit_denominator(1000)
    return mpmath.mpf(near.numerator) / near.denominator
