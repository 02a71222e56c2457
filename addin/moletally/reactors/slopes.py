"""How the outlets of a batch change with feed, size, temperature and constants."""

from moletally.kernel.slopes import Slopes, tank_slopes, tube_slopes
from moletally.kernel.tank import solve_tanks
from moletally.reactors.batch import Batch

__all__ = ["Slopes", "slopes"]


def slopes(kind: str, batch: Batch) -> Slopes:
    """Derivatives of the outlets of N vessels of one kind (`CSTR`, `PFR`).

    By feed (N, S, S), by the size that the batch has (tau, or W/q; N, S), by T (N, S) and by the network's
    parameters (N, S, P); nan where there is no outlet.
    """
    model = batch.network.model
    numbers = (batch.feed, batch.size, batch.temperature, batch.parameters)
    if kind == "PFR":
        return tube_slopes(model, *numbers)
    return tank_slopes(model, solve_tanks(model, *numbers, batch.start), *numbers)
