"""One tank, one tube at a time."""

from collections.abc import Callable

import numpy as np
from measure import amount, in_turn, line
from plain import Change, integrated
from problems import PROBLEMS, Problem, error

from moletally.kernel.again import TankAgain, TubeAgain
from moletally.kernel.status import Status
from moletally.kernel.tank import solve_tanks
from moletally.kernel.tube import solve_tubes

__all__ = ["Tolerance", "reference_solvers", "single_tanks", "single_tubes"]

T, NONE = np.array([300.0]), np.zeros((1, 0))
ACCURATE, WRONG = 1e-8, 1e-6
SMALL = ("P1", "P2", "Langmuir–Hinshelwood", "ROBER")
TANK_TARGETS = dict.fromkeys(SMALL, "≥ 45") | {"HIRES": "≥ 25", "POLLU": "≥ 25"}
TUBE_TARGETS = dict.fromkeys(SMALL, "≥ 100") | {"HIRES": "≥ 50", "POLLU": "≥ 40"}

Tolerance = tuple[Change, float, float]  # the quicker style, rtol, atol


def quicker_first(problem: Problem, run: Callable[[Change], object]) -> list[tuple[str, Change]]:
    """Both styles of dc/dt, the one with which scipy is quicker first."""
    styles = list(problem.styles.items())
    times = in_turn(*(lambda f=f: run(f) for _, f in styles), seconds=0.2)
    return styles if times.ratios[1] > 1 else styles[::-1]


def single_tanks(seconds: float) -> None:
    """fsolve from the same guess, against Newton's method, the checked path, and the general call."""
    for p in PROBLEMS:
        (style, change), (other, slower) = quicker_first(p, p.fsolved)
        found, says = p.fsolved(change)
        off = error(found, p.tank_outlet)
        said = f"fsolve ({style}) {'reports success' if says else 'does not converge'}, error {off:.0e}"
        said += ": **wrong**" if off > WRONG else ""
        newton = TankAgain(p.model, p.feed, p.tank, 300.0, NONE[0], follow=True)
        checked = TankAgain(p.model, p.feed, p.tank, 300.0, NONE[0])
        rows = (p.feed[None], np.array([p.tank]), T, NONE)

        def from_guess(newton=newton, guess=p.guess):
            newton.c[:] = guess
            return newton.solve()

        for how, ours, target in (
            ("Newton", from_guess, TANK_TARGETS[p.name]),
            ("start-up checked", checked.solve, ""),
            ("general call", lambda p=p, rows=rows: solve_tanks(p.model, *rows), ""),
        ):
            times = in_turn(
                ours,
                lambda p=p, f=change: p.fsolved(f),
                lambda p=p, f=slower: p.fsolved(f),
                seconds=seconds,
            )
            mine = f"error {error(newton.c, p.tank_outlet):.0e}; " if how == "Newton" else ""
            against = f"against {other}: {times.ratios[2]:.3g}"
            line(f"tank {p.name}, {how}", times, target, f"{mine}{said}; {against}" if mine else against)


def loosest(p: Problem, tau: float, change: Change, method: str) -> tuple[float, float, float]:
    """The loosest rtol (in thirds of decades) at which the error is small enough, its atol, and the error."""
    answer, best = p.tube_outlet(tau), (np.inf, 0.0, 0.0)
    for k in range(20):
        rtol = 10.0 ** (-6 - k / 3)
        atol = p.atol * rtol
        try:
            off = error(integrated(change, p.feed, tau, rtol, atol, method), answer)
        except ValueError:  # Radau and BDF raise on what is not finite
            off = np.inf
        best = min(best, (off, rtol, atol))
        if off <= ACCURATE:
            break
    return best[1], best[2], best[0]


def single_tubes(seconds: float) -> dict[str, Tolerance]:
    """LSODA at the loosest tolerance that is accurate enough, against ours at its own."""
    tolerances: dict[str, Tolerance] = {}
    for p in PROBLEMS:
        for tau in p.tubes:
            rows = (p.feed[None], np.array([tau]), T, NONE)

            def plain(change, rtol, atol, p=p, tau=tau):
                return integrated(change, p.feed, tau, rtol, atol)

            (style, change), (other, slower) = quicker_first(
                p, lambda f, p=p, x=plain: x(f, 1e-8, p.atol * 1e-8)
            )
            rtol, atol, off = loosest(p, tau, change, "LSODA")
            result, again = solve_tubes(p.model, *rows), TubeAgain(p.model, p.feed, tau, 300.0, NONE[0])
            again.solve()
            ours = error(again.c, p.tube_outlet(tau))
            failed = "" if result.status[0] == Status.OK else f" **{Status(int(result.status[0])).name}**"
            late = " (**not reached**)" if off > ACCURATE else ""
            said = f"error {ours:.0e}{failed} in {result.steps[0]} steps; "
            said += f"LSODA ({style}) at rtol {rtol:.0e}: {off:.0e}{late}; "
            for how, work, target, first in (
                ("", again.solve, TUBE_TARGETS[p.name], said),
                (", general call", lambda p=p, rows=rows: solve_tubes(p.model, *rows), "", ""),
            ):
                times = in_turn(
                    work,
                    lambda x=plain, a=(change, rtol, atol): x(*a),
                    lambda x=plain, a=(slower, rtol, atol): x(*a),
                    seconds=seconds,
                )
                against = f"{first}against {other}: {times.ratios[2]:.3g}"
                line(f"tube {p.name}, τ = {tau:g}{how}", times, target, against)
            tolerances.setdefault(p.name, (change, rtol, atol))
    return tolerances


def reference_solvers(tolerances: dict[str, Tolerance], seconds: float) -> None:
    """For information: scipy's other stiff methods, with differences for a Jacobian, at the same accuracy."""
    print("\n| tube, first τ of the table | Radau | BDF |\n|---|---|---|")
    for p in PROBLEMS:
        cells = []
        for method in ("Radau", "BDF"):
            change, tau = tolerances[p.name][0], p.tubes[0]
            rtol, atol, off = loosest(p, tau, change, method)

            def work(change=change, p=p, tau=tau, rtol=rtol, atol=atol, method=method):
                return integrated(change, p.feed, tau, rtol, atol, method)

            took = in_turn(work, seconds=seconds / 4).seconds[0]
            cells.append(f"{amount(took)} (rtol {rtol:.0e}, error {off:.0e})")
        print(f"| {p.name} | {' | '.join(cells)} |", flush=True)
