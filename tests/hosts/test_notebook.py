"""The Python face: the same tables as DataFrames, the same answers as DataFrames."""

import subprocess
import sys

import numpy as np
import pandas as pd
import pytest

import moletally

REACTIONS = pd.DataFrame(
    {"Reaction": ["A -> B", "B -> C"], "k [1/h]": [0.5, 0.2]},
)
FEED = pd.DataFrame({"Species": ["A", "B", "C"], "Feed [mol/L]": [2.0, 0.0, 0.0]})


def exact_tank(tau):
    """First-order series in a stirred tank, solved by hand."""
    a = 2.0 / (1 + 0.5 * tau)
    b = 0.5 * tau * a / (1 + 0.2 * tau)
    return [a, b, 2.0 - a - b]


def test_one_tank():
    outlet = moletally.solve("CSTR", REACTIONS, FEED, 4.0)
    assert list(outlet.columns) == ["A", "B", "C"]
    np.testing.assert_allclose(outlet.iloc[0], exact_tank(4.0), rtol=1e-10)


def test_a_row_per_case():
    outlet = moletally.solve("CSTR", REACTIONS, FEED, [1.0, 2.0, 4.0])
    np.testing.assert_allclose(outlet, [exact_tank(t) for t in (1.0, 2.0, 4.0)], rtol=1e-10)


@pytest.mark.parametrize("reactor", [4.0, {"Volume": (80.0, "L"), "Flow [L/h]": 20.0}])
def test_wants_and_reactors(reactor):
    outlet = moletally.solve("cstr", REACTIONS, FEED, reactor, want=["B/C", "conversion(A)"])
    a, b, c = exact_tank(4.0)
    np.testing.assert_allclose(outlet, [[b / c, 1 - a / 2.0]], rtol=1e-10)


def test_cases_as_a_frame_and_a_failed_case():
    cases = pd.DataFrame({"Residence time [h]": [4.0, -1.0], "k(1) [1/min]": [None, 0.01]})
    outlet = moletally.solve("CSTR", REACTIONS, FEED, cases, want="A")
    assert outlet["A"][0] == pytest.approx(exact_tank(4.0)[0], rel=1e-10)
    assert np.isnan(outlet["A"][1])
    assert "row 3, Residence time" in outlet.attrs["problems"][0]


def test_profile_is_the_exponential():
    profile = moletally.profile(REACTIONS, FEED, 4.0, points=9)
    assert list(profile.columns) == ["tau [h]", "A [mol/L]", "B [mol/L]", "C [mol/L]"]
    np.testing.assert_allclose(profile["A [mol/L]"], 2.0 * np.exp(-0.5 * profile["tau [h]"]), rtol=1e-8)


def test_rates_and_audit():
    rates = moletally.rates(REACTIONS, FEED)
    assert list(rates["Name"]) == ["A -> B", "B -> C", "A", "B", "C"]
    np.testing.assert_allclose(rates["Rate [mol/(L h)]"], [1.0, 0.0, -1.0, 1.0, 0.0])
    audit = moletally.audit("CSTR", REACTIONS, FEED, 4.0)
    assert audit["level"][0] == "fine"
    assert "unique (proven)" in set(audit["what"])


def test_a_call_without_an_answer_raises_the_reason():
    wrong = REACTIONS.rename(columns={"k [1/h]": "k [L/(mol h)]"})
    with pytest.raises(moletally.BalanceError, match="give k in 1/h"):
        moletally.solve("CSTR", wrong, FEED, 4.0)


def test_pandas_is_loaded_only_for_frames():
    code = "import sys, moletally.sheet.functions; print([m for m in ('pandas', 'scipy', 'pint', 'lxml') if m in sys.modules])"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
