"""Derivatives of a batch: by the network's own parameters, against differences of whole solutions."""

import numpy as np
import pytest
from chemistry_records import Tables

from moletally.reactors.batch import Batch
from moletally.reactors.slopes import slopes
from moletally.reactors.solve import VESSELS

RELATIVE = 1e-4  # of a central difference


def batch():
    tables = Tables().reaction(
        "A + B -> C", "k*A*B^n/(1 + K*C)^2", k=(0.4, "L/(mol min)"), E=(55.0, "kJ/mol"), T_ref=(330.0, "K"),
        n=(1.0, "-"), K=(0.3, "L/mol"),
    ).reaction("C -> D", "k*C", k=(0.05, "1/min"))  # fmt: skip
    network = tables.network()
    vector, _ = network.values(tuple(tables.numbers))
    one = np.ones(1)
    return Batch(
        network,
        np.array([[2000.0, 3000.0, 100.0, 0.0]]),
        900.0 * one,
        345.0 * one,
        vector[None],
        None,
        one,
        one,
    )


def moved(given, name, column, by):
    array = getattr(given, name).copy()
    array.reshape(1, -1)[0, column] += by
    fields = {f: getattr(given, f) for f in given.__dataclass_fields__} | {name: array}
    return Batch(**fields)


@pytest.mark.parametrize("kind", ["CSTR", "PFR"])
def test_every_number_of_a_batch(kind):
    given = batch()
    answer = slopes(kind, given)
    parts = {"feed": answer.feed[0], "size": answer.tau[0][:, None], "temperature": answer.T[0][:, None],
             "parameters": answer.p[0]}  # fmt: skip
    for name, part in parts.items():
        for column in range(part.shape[1]):
            value = float(getattr(given, name).reshape(1, -1)[0, column])
            by = RELATIVE * (abs(value) or 100.0)
            if name == "feed" and value == 0.0:
                continue  # nothing can be taken from no feed
            ahead, behind = (
                VESSELS[kind](moved(given, name, column, sign * by)).concentration[0] for sign in (1, -1)
            )
            expected = (ahead - behind) / (2 * by)
            size = np.abs(expected).max()
            assert np.abs(part[:, column] - expected).max() <= 1e-5 * size + 1e-9, (name, column)
