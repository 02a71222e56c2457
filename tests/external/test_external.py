"""Every check against the outside, through the worksheet functions."""

import json
from pathlib import Path

import pytest
from external_calls import feed, laws, value
from external_stiff import CHECKS

from moletally.sheet.functions import call

SOURCES = json.loads((Path(__file__).parent / "sources.json").read_text(encoding="utf-8"))


@pytest.mark.parametrize("check", CHECKS, ids=lambda c: f"{c.case}: {c.what}")
def test_agrees_with_the_source(check, verified):
    got = value(check.ask)
    expected = float(check.expected)
    verified(check, got)
    # what is exhausted or absent is exactly zero
    assert abs(got - expected) <= check.rel * abs(expected)


@pytest.mark.parametrize("kappa, b0, tau", [(0.025, 1 / 15, 300.0), (0.02, 0.15, 1000.0)])
def test_a_unique_but_unstable_state_is_no_answer(kappa, b0, tau):
    """D03b has one state there, an unstable focus: trace of the dynamic balances > 0 (by hand)."""
    reactions = laws(("A + 2 B -> 3 B", "k*A*B^2", {"k": 1.0}), ("B -> C", "k2*B", {"k2": kappa}))
    outcome = call("MOLE_CSTR", [reactions, feed(A=1.0, B=b0, C=0.0), tau, "B"])
    assert [p.code for p in outcome.problems] == ["#NUM!"]
    assert "swinging" in outcome.problems[0].reason


def test_every_case_names_its_source():
    assert {c.case for c in CHECKS} <= set(SOURCES)
    assert all(SOURCES[c.case]["source"] for c in CHECKS)
