"""What enters a vessel: kinds of feed, mixing, first contents, and feeds that are refused."""

import numpy as np
import pytest
from chemistry_records import feed
from hypothesis import given, settings
from hypothesis import strategies as st

from moletally.chemistry.errors import InputError, Place
from moletally.chemistry.inlet import Inlet, is_mass_basis

REACTOR = Place("Reactor", 3)
UNKNOWN = np.array([np.nan])


def mixed(table, flow=UNKNOWN, with_units=True):
    inlet = Inlet(table, with_units, is_mass_basis(table, with_units))
    c, q = inlet.mixed(flow, REACTOR)
    return c[0], q[0]


def test_concentrations_need_no_flow():
    c, q = mixed(feed({"A": 2.0, "B": 0.0}))
    assert c.tolist() == [2000.0, 0.0]
    assert np.isnan(q)


def test_without_units_numbers_stay():
    c, _ = mixed(feed({"A": 2.0, "B": 0.5}, unit=None), with_units=False)
    assert c.tolist() == [2.0, 0.5]


@pytest.mark.parametrize(
    ("amount", "unit", "expected"),
    [
        # 100 g/L of M = 50 g/mol is 2 mol/L; with 10 L/min: 20 mol/min, 1 kg/min
        (100.0, "g/L", 2000.0),
        (20.0, "mol/min", 2000.0),
        (60.0, "kg/h", 2000.0),
        (2.0, "kmol/m3", 2000.0),
        (1.2, "kmol/h", 2000.0),
    ],
)
def test_every_kind_of_feed_becomes_a_concentration(amount, unit, expected):
    table = feed({"A": amount}, unit, ({"flow": (10.0, "L/min")},), {"A": {"molar_mass": (50.0, "g/mol")}})
    c, q = mixed(table)
    assert c == pytest.approx([expected], rel=1e-13)
    assert q == pytest.approx(10e-3 / 60, rel=1e-14)


def test_a_flow_from_the_reactor_serves_a_molar_feed():
    c, _ = mixed(feed({"A": 20.0}, "mol/min"), np.array([10e-3 / 60]))
    assert c == pytest.approx([2000.0], rel=1e-13)


@settings(max_examples=60, deadline=None)
@given(st.lists(st.tuples(st.floats(0, 10), st.floats(0, 10), st.floats(0.1, 10)), min_size=2, max_size=4))
def test_streams_are_mixed_by_moles_and_volume(streams):
    """C = sum(q C)/sum(q), by its definition."""
    amounts = {"A": tuple(s[0] for s in streams), "B": tuple(s[1] for s in streams)}
    c, q = mixed(feed(amounts, streams=[{"flow": (s[2], "m3/s")} for s in streams]))
    total = sum(s[2] for s in streams)
    assert q == pytest.approx(total, rel=1e-13)
    for i in (0, 1):
        assert c[i] == pytest.approx(1000 * sum(s[i] * s[2] for s in streams) / total, rel=1e-12)


def test_a_stream_in_concentrations_joins_one_in_molar_flow():
    table = feed(
        {"A": (2.0, 0.0), "B": (0.0, 4.0)},
        ("mol/L", "mol/h"),
        ({"flow": (1.0, "L/h")}, {"flow": (3.0, "L/h")}),
    )
    c, _ = mixed(table)  # 2 mol/h of A and 4 mol/h of B in 4 L/h
    assert c == pytest.approx([500.0, 1000.0], rel=1e-13)


def test_masses_without_molar_masses_are_the_amounts():
    table = feed({"A": 5.0, "B": 0.0}, "g/L")
    assert is_mass_basis(table, True)
    c, _ = mixed(table)
    assert c.tolist() == [5.0, 0.0]  # kg/m3


def test_first_contents_default_to_the_feed():
    inlet = Inlet(feed({"A": 2.0, "B": 1.0}, columns={"B": {"start": (3.0, "mol/L")}}), True, False)
    c, _ = inlet.mixed(UNKNOWN, REACTOR)
    assert inlet.start(c)[0] == pytest.approx([2000.0, 3000.0])
    plain = Inlet(feed({"A": 2.0}), True, False)
    assert plain.start(c[:, :1]) is None


def test_temperatures_of_streams():
    def inlet(*degrees):
        streams = [{"flow": (1.0, "L/h"), "temperature": (t, "degC")} for t in degrees]
        return Inlet(feed({"A": (1.0,) * len(degrees)}, streams=streams), True, False)

    assert inlet(20.0, 20.0).temperature() == pytest.approx(293.15)
    assert not inlet(20.0, 20.0).temperatures_differ()
    assert np.isnan(inlet(20.0, 30.0).temperature())
    assert inlet(20.0, 30.0).temperatures_differ()


def test_a_feed_a_little_below_zero_is_round_off():
    inlet = Inlet(feed({"A": 2.0, "B": -1e-12}), True, False)
    c, _ = inlet.mixed(UNKNOWN, REACTOR)
    assert c.tolist() == [[2000.0, 0.0]]
    assert [f.where for f in inlet.findings] == ["Feed row 3"]
    assert "a little below zero" in inlet.findings[0].text


MW = {"A": {"molar_mass": (50.0, "g/mol")}}


@pytest.mark.parametrize(
    ("table", "words"),
    [
        (feed({"A": 2.0, "B": -1e-3}), "the feed of B is negative"),
        (feed({"A": 0.0, "B": -1e-12}), "the feed of B is negative"),
        (feed({"A": 2.0}, None), "the feed of A has no unit"),
        (feed({"A": 2.0}, "1"), "mole fractions need a gas phase, which this version does not solve yet"),
        (feed({"A": 2.0}, "bar"), "a feed can't be in bar"),
        (feed({"A": 2.0}, "M"), "write mol/L"),
        (feed({"A": 1e308}), "too large to compute with"),
        (feed({"A": 2.0}, "g/L", columns={"A": {"molar_mass": (0.0, "g/mol")}}), "MW of A must be more than 0"),
        (feed({"A": 2.0}, "mol/h"), "the feed is given as a flow: give Flow too"),
        (feed({"A": (2.0, 1.0)}, streams=({"flow": (1.0, "L/h")}, {})), "give Flow of s1"),
        (feed({"A": 2.0}, streams=({"flow": (0.0, "L/h")},)), "must be more than 0"),
        (feed({"A": 2.0}, streams=({"flow": (1.0, "kg/h")},)), "Flow can't be in kg/h"),
        (feed({"A": 2.0}, streams=({"flow": (1.0, None)},)), "Flow has no unit"),
        (feed({"A": 2.0, "B": 1.0}, "g/L", columns=MW), "B is fed in mass, others in moles: give its MW"),
        (feed({"A": 2.0}, "g/L", columns={"A": {"molar_mass": (50.0, None)}}), r"MW of A has no unit.*g/mol"),
    ],
)  # fmt: skip
def test_feeds_that_are_refused(table, words):
    with pytest.raises(InputError, match=words) as caught:
        mixed(table)
    assert caught.value.place is not None


@pytest.mark.parametrize(
    ("start", "words"),
    [((-1.0, "mol/L"), "Start of A is negative"), ((1.0, "mol/h"), "a concentration, not a flow"),
     ((1.0, "g/L"), "given in mass: give its MW")],
)  # fmt: skip
def test_first_contents_that_are_refused(start, words):
    inlet = Inlet(feed({"A": 2.0}, columns={"A": {"start": start}}), True, False)
    with pytest.raises(InputError, match=words):
        inlet.start(np.array([[2000.0]]))
