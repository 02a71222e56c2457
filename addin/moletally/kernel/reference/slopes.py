"""Derivatives of outlets by feed, residence time, temperature and parameters.

A tank's follow from its balance. A tube's are differences between neighbours that are stepped on the very
mesh of the tube itself, so that what they differ by is not a difference of meshes (internal numerical
differentiation: H. G. Bock, Springer Ser. Chem. Phys. 18 (1981) 102); where a species is used up, at another
time in each, they go their own ways. The compiled engine differentiates the steps themselves.
"""

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.cases import TankCases
from moletally.kernel.depth import STEADY_DEPTH
from moletally.kernel.rates import Floats
from moletally.kernel.reference import tube
from moletally.kernel.reference.cutoff import Laws
from moletally.kernel.reference.flow import Flow
from moletally.kernel.reference.steady import NOTHING, Tanks
from moletally.kernel.reference.stepping import METHODS, Stepper
from moletally.kernel.reference.tolerance import Tolerance
from moletally.kernel.status import Status
from moletally.kernel.structure import Structure

__all__ = ["of_tanks", "of_tubes"]

NUDGE = 1e-5  # relative difference between neighbours: rounding and curvature weigh about the same
WIDE_NUDGE = 1e-4  # the same where each has its own mesh, whose tolerance counts as rounding
MOST_STEPS = 12000
RELATIVE = (1e-8, 1e-8)


def of_tanks(structure: Structure, cases: TankCases, root: Floats) -> Floats:
    """(I - tau J) dc = d(feed + tau nu^T r) at roots, shape (N, S)."""
    here = structure.present
    species, parameters = cases.feed.shape[1], cases.p.shape[1]
    out = np.full((len(root), species, species + 2 + parameters), np.nan)
    scale = np.broadcast_to(_scale(cases.feed)[:, None], (len(root), len(here)))
    laws = Laws.of(structure, structure.starved, scale, cases.T, cases.p, STEADY_DEPTH)
    c = np.maximum(root[:, here], NOTHING * scale)
    tanks = Tanks(laws, structure.coefficients, cases.feed[:, here], cases.tau, NOTHING * scale[:, :1])
    _, _, matrix = tanks.linear(c)
    by_constants = np.moveaxis(laws.by_constants(structure, c, cases.T, cases.p), 2, 0)
    tau = cases.tau[:, None, None]
    right = np.concatenate(
        [
            np.broadcast_to(np.eye(len(here)), (len(root), len(here), len(here))),
            structure.coefficients.gain(laws.rates(c))[:, :, None],
            tau * np.stack([structure.coefficients.gain(r) for r in by_constants], axis=2),
        ],
        axis=2,
    )
    largest = 1.0 / np.abs(matrix).max(axis=2, keepdims=True)
    with np.errstate(all="ignore"):
        answer = np.linalg.solve(matrix * largest, right * largest) * c[:, :, None]
    _write(out, here, answer)
    return out


def of_tubes(structure: Structure, cases: TankCases) -> Floats:
    """Differences of neighbours on a common mesh, case by case."""
    species, parameters = cases.feed.shape[1], cases.p.shape[1]
    out = np.full((len(cases.tau), species, species + 2 + parameters), np.nan)
    for k in range(len(cases.tau)):
        answer = _of_tube(structure, cases.feed[k], float(cases.tau[k]), float(cases.T[k]), cases.p[k])
        if answer is not None:
            _write(out[k : k + 1], structure.present, answer[None])
    return out


def _of_tube(structure: Structure, feed: Floats, tau: float, T: float, p: Floats) -> Floats | None:
    """Shape (present, present + 2 + P), or None where the tube can't be followed."""
    here = structure.present
    scale = float(_scale(feed[None])[0])
    values = np.concatenate([feed[here], [T], p])
    floor = np.concatenate([np.full(len(here), scale), np.ones(1 + len(p))])
    sizes = np.where(values != 0, np.abs(values), floor)
    rows = _neighbours(values, NUDGE * sizes, len(here))
    c = rows[:, : len(here)].copy()
    family = _Family(structure, c, rows[:, len(here)], rows[:, len(here) + 1 :], scale)
    if not family.follow(tau):
        return None
    ends, nudge = family.c, NUDGE
    if family.has_ends():
        nudge = WIDE_NUDGE
        rows = _neighbours(values, nudge * sizes, len(here))
        fed = np.zeros((len(rows), len(feed)))
        fed[:, here] = rows[:, : len(here)]
        asked = np.full((len(rows), 1), tau)
        ends = tube.solve(structure, fed, asked, rows[:, len(here)], rows[:, len(here) + 1 :]).c[:, 0, here]
    slopes = _differences(ends, values[: len(here)] == 0) / (nudge * sizes)[:, None]
    parts = [slopes[: len(here)].T, family.slope()[:, None], slopes[len(here) :].T]
    return np.concatenate(parts, axis=1)


def _neighbours(values: Floats, step: Floats, fed: int) -> Floats:
    """Rows: the values themselves, each a step ahead, each a step behind.

    What is not fed can't be fed less than nothing: two steps ahead instead (of second order, too).
    """
    ahead = np.diag(step)
    rows = np.concatenate([values[None], values + ahead, values - ahead])
    unfed = np.flatnonzero(values[:fed] == 0)
    rows[1 + len(values) + unfed] = values + 2.0 * ahead[unfed]
    return rows


def _differences(c: Floats, unfed: NDArray[np.bool_]) -> Floats:
    """Changes per step, shape (values, S)."""
    count = (len(c) - 1) // 2
    ahead, behind = c[1 : 1 + count], c[1 + count :]
    change = (ahead - behind) / 2.0
    places = np.flatnonzero(unfed)
    change[places] = (4.0 * ahead[places] - behind[places] - 3.0 * c[0]) / 2.0
    return change


class _Family:
    """A tube (row 0) and its neighbours, all on the mesh of the first."""

    def __init__(self, structure: Structure, c: Floats, T: Floats, p: Floats, scale: float) -> None:
        scales = np.full(c.shape, scale)
        laws = Laws.of(structure, structure.edged, scales, T, p)
        self.flow = Flow(laws, structure.coefficients)
        self.tolerance = Tolerance.of(structure, laws, scales, RELATIVE)
        self.c = c
        one = np.zeros(1, dtype=np.intp)
        self.stepper = Stepper(self.flow.at(one), c[:1], self.tolerance.at(one), MOST_STEPS)

    def follow(self, tau: float) -> bool:
        """Step until tau; False where the tube is given up."""
        stepper = self.stepper
        while stepper.active[0] and tau - stepper.t[0] > 1e-15 * tau:
            stepper.h = np.minimum(stepper.h, tau - stepper.t)
            for stride in stepper.attempt():
                if len(stride.rows):
                    h = np.full(len(self.c), stride.h[0])
                    with np.errstate(all="ignore"):
                        self.c, _, _ = METHODS[stride.method].step(self.flow, self.c, h, self.tolerance.least)
        return bool(stepper.status[0] == Status.OK)

    def has_ends(self) -> bool:
        """True where a species has been used up."""
        laws = self.stepper.flow.laws
        return bool((laws.low(self.stepper.c) & self.tolerance.ends[laws.edged]).any())

    def slope(self) -> Floats:
        """dc/dt of the tube itself, shape (S,)."""
        return np.asarray(self.stepper.flow.slope(self.stepper.c)[0])


def _scale(feed: Floats) -> Floats:
    largest = feed.max(axis=1, initial=0.0)
    return np.where(largest > 0, largest, 1.0)


def _write(out: Floats, here: NDArray[np.intp], answer: Floats) -> None:
    """Puts answers by present species, shape (n, here, here + 2 + P), into all species, shape (n, S, S + 2 + P)."""
    species = out.shape[1]
    columns = np.concatenate([here, np.arange(species, out.shape[2])])
    out[:, :, columns] = 0.0
    out[np.ix_(np.arange(len(out)), here, columns)] = answer
