"""Rates of the reactions at given concentrations."""

from moletally.kernel.evaluate import evaluate
from moletally.reactors.batch import Batch, Floats

__all__ = ["rates_at"]


def rates_at(batch: Batch) -> Floats:
    """Rates r_j at the feed of each case, shape (N, R) [mol/(m3 s), or mol/(kg s) per mass of catalyst]."""
    return evaluate(batch.network.model.program, batch.feed, batch.temperature, batch.parameters)
