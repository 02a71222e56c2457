"""Times of several ways, taken in turn in one run so that what disturbs the machine disturbs all."""

import statistics
import time
from collections.abc import Callable
from typing import NamedTuple

__all__ = ["HEAD", "Times", "amount", "in_turn", "line", "median_of"]

Work = Callable[[], object]
UNITS = (("s", 1.0), ("ms", 1e-3), ("µs", 1e-6))
BLOCK = 2e-4  # s: calls shorter than that are timed several at a time
HEAD = "| work | ours | scipy as a user writes it | ratio | target | remarks |\n|---|---|---|---|---|---|"


class Times(NamedTuple):
    """Median seconds of a call each way, and medians of the ratios of each way to the first."""

    seconds: tuple[float, ...]
    ratios: tuple[float, ...]


def in_turn(*works: Work, seconds: float = 2.0, most: int = 300) -> Times:
    """Times all ways again and again, for about so many seconds."""
    repeats = [_repeats(work) for work in works]
    rounds: list[list[float]] = []
    end = time.perf_counter() + seconds
    while len(rounds) < 3 or (time.perf_counter() < end and len(rounds) < most):
        rounds.append([_timed(work, n) for work, n in zip(works, repeats, strict=True)])
    return median_of(rounds)


def median_of(rounds: list[list[float]]) -> Times:
    """Medians of what rounds of all ways took."""
    return Times(
        tuple(statistics.median(column) for column in zip(*rounds, strict=True)),
        tuple(
            statistics.median(way) for way in zip(*([x / row[0] for x in row] for row in rounds), strict=True)
        ),
    )


def _repeats(work: Work) -> int:
    work()
    return max(1, int(BLOCK / max(_timed(work, 1), 1e-7)))


def _timed(work: Work, repeats: int) -> float:
    begun = time.perf_counter()
    for _ in range(repeats):
        work()
    return (time.perf_counter() - begun) / repeats


def amount(seconds: float) -> str:
    """A time to three digits, in the unit that suits it."""
    unit, size = next((u for u in UNITS if seconds >= u[1]), UNITS[-1])
    value = seconds / size
    return f"{value:.3g} {unit}" if value < 1000 else f"{value:.0f} {unit}"


def line(work: str, times: Times, target: str = "", remarks: str = "") -> None:
    """A row of the table: the first way is ours, the second scipy's."""
    (ours, plain, *_), ratio = times.seconds, times.ratios[1]
    shown = f"{ratio:.3g}" if ratio < 1000 else f"{ratio:.0f}"
    print(f"| {work} | {amount(ours)} | {amount(plain)} | {shown} | {target} | {remarks} |", flush=True)
