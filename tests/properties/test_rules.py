"""Rules that hold for every ideal vessel, on drawn networks and through the worksheet functions.

Identities (scaling, splitting, renaming, balances) follow from the equations; the inequalities between
tank and tube are common practice (e.g. Levenspiel, Chemical Reaction Engineering, ch. 5-8, from memory)
and were checked on thousands of cases when the list was made.
"""

import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from random_networks import draw, numbers

from moletally.sheet.cells import OMITTED
from moletally.sheet.functions import call

SEEDS = st.integers(0, 10**9)
few = settings(max_examples=25, deadline=None, derandomize=True)
many = settings(max_examples=60, deadline=None, derandomize=True)


def outlet(kind, network, tau=None, reactions=None, fed=None):
    return numbers(
        call(kind, [reactions or network.reaction_table(), fed or network.feed_table(), tau or network.tau])
    )


def one(kind, reactions, fed, tau, want):
    outcome = call(kind, [reactions, fed, tau, want])
    assert not outcome.problems, outcome.problems
    return outcome.block[0][0]


def power(n, k):
    return (("Reaction", "Rate", "k"), ("A -> B", f"k*A^({n!r})", k))


AB = (("Species", "Feed"), ("A", 1.0), ("B", 0.0))


def mild(seed):
    """A network whose time scales are within reach of a tube of moderate length."""
    return draw(seed, decades=1.0, orders=(1.0, 1.5, 2.0), most=4)


def close(one, other, rel, floor):
    return all(abs(a - b) <= rel * max(abs(a), abs(b)) + floor for a, b in zip(one, other, strict=True))


@many
@given(st.floats(0.05, 3.0), st.floats(0.05, 20.0))
def test_g01_a_tube_converts_more_than_a_tank_for_positive_orders(n, tau):
    assert one("MOLE_PFR", power(n, 1.0), AB, tau, "A") <= one("MOLE_CSTR", power(n, 1.0), AB, tau, "A") * (
        1 + 1e-9
    )


@many
@given(st.floats(-2.0, -0.05), st.floats(0.01, 0.14))
def test_g01_and_less_for_negative_orders(n, tau):
    assert one("MOLE_PFR", power(n, 1.0), AB, tau, "A") >= one("MOLE_CSTR", power(n, 1.0), AB, tau, "A") * (
        1 - 1e-9
    )


def test_g02_tanks_in_series_approach_the_tube():
    k, last = 2.0, math.inf
    for n in (1, 2, 4, 8, 16, 32, 64):
        fed = AB
        for _ in range(n):
            column = call("MOLE_CSTR", [power(1, k), fed, 1.0 / n]).block
            fed = (AB[0], ("A", column[0][0]), ("B", column[1][0]))
        c = column[0][0]
        assert c < last
        last = c
    excess = last - one("MOLE_PFR", power(1, k), AB, 1.0, "A")
    assert excess == pytest.approx(k**2 * math.exp(-k) / (2 * 64), rel=0.05)


@many
@given(st.floats(0.1, 100.0), st.floats(0.1, 5.0))
def test_g03_axial_dispersion_lies_between_tube_and_tank(pe, kt):
    """Closed vessel, first order (Danckwerts 1953): a = sqrt(1 + 4 k tau/Pe)."""
    a = math.sqrt(1 + 4 * kt / pe)
    dispersed = 4 * a * math.exp(pe * (1 - a) / 2) / ((1 + a) ** 2 - (1 - a) ** 2 * math.exp(-a * pe))
    assert one("MOLE_PFR", power(1, kt), AB, 1.0, "A") <= dispersed * (1 + 1e-9)
    assert dispersed <= one("MOLE_CSTR", power(1, kt), AB, 1.0, "A") * (1 + 1e-9)


@few
@given(st.floats(0.1, 10.0), st.floats(0.1, 10.0))
def test_g04_the_best_yield_of_an_intermediate_is_the_tubes(k1, k2):
    series = (("Reaction", "k"), ("A -> B", k1), ("B -> C", k2))
    fed = (*AB, ("C", 0.0))
    in_tube = 1 / k1 if math.isclose(k1, k2) else math.log(k2 / k1) / (k2 - k1)
    in_tank = 1 / math.sqrt(k1 * k2)
    best = one("MOLE_PFR", series, fed, in_tube, "B")
    assert best >= one("MOLE_CSTR", series, fed, in_tank, "B")
    assert in_tube <= in_tank * (1 + 1e-9)
    for off in (0.8, 1.25):
        assert best >= one("MOLE_PFR", series, fed, in_tube * off, "B") * (1 - 1e-9)


@few
@given(
    st.floats(0.1, 10.0), st.floats(0.1, 10.0), st.floats(0.01, 3.0), st.floats(0.0, 2.0), st.floats(0.0, 1e4)
)
def test_g10_equilibrium_is_never_passed(k, keq, a, b, tau):
    reversible = (("Reaction", "k", "Keq"), ("A <-> B", k, keq))
    fed = (("Species", "Feed"), ("A", a), ("B", b))
    at_rest = (a + b) / (1 + keq)
    low, high = min(a, at_rest), max(a, at_rest)
    for kind in ("MOLE_CSTR", "MOLE_PFR"):
        assert low * (1 - 1e-9) <= one(kind, reversible, fed, tau, "A") <= high * (1 + 1e-9)
        assert one(kind, reversible, fed, 1e12, "A") == pytest.approx(at_rest, rel=1e-8)
    still = (("Species", "Feed"), ("A", at_rest), ("B", a + b - at_rest))
    rate = call("MOLE_RATES", [reversible, still]).block[1][1]
    assert abs(rate) <= 1e-12 * k * (a + b)


@few
@given(SEEDS, st.floats(0.1, 10.0), st.floats(0.1, 10.0))
def test_g11_scaling_time_or_concentration(seed, s, c):
    network = draw(seed, decades=2.0)
    table = network.reaction_table()
    faster = (table[0], *((eq, law, k * s) for eq, law, k in table[1:]))
    powers = [sum(order for _, order in orders) for _, _, orders, _ in network.reactions]
    thicker = (
        table[0],
        *((eq, law, k * c ** (1 - n)) for (eq, law, k), n in zip(table[1:], powers, strict=True)),
    )
    more = (
        ("Species", "Feed"),
        *((name, x * c) for name, x in zip(network.species, network.feed, strict=True)),
    )
    plain = outlet("MOLE_CSTR", network)
    assert plain is not None
    floor = 1e-20 * max(network.feed)
    assert close(plain, outlet("MOLE_CSTR", network, network.tau / s, faster), 1e-8, floor)
    scaled = outlet("MOLE_CSTR", network, None, thicker, more)
    assert close([x * c for x in plain], scaled, 1e-8, floor * c)


@few
@given(SEEDS, st.integers(2, 4))
def test_g12_a_tube_in_pieces_is_the_same_tube(seed, pieces):
    network = mild(seed)
    tau = min(network.tau, 10.0)
    fed, c = network.feed_table(), None
    for _ in range(pieces):
        c = outlet("MOLE_PFR", network, tau / pieces, None, fed)
        fed = (("Species", "Feed"), *zip(network.species, c, strict=True))
    assert close(c, outlet("MOLE_PFR", network, tau), 1e-7, 1e-12 * max(network.feed))


@few
@given(SEEDS, st.randoms(use_true_random=False))
def test_g13_order_names_and_splitting_of_reactions_do_not_matter(seed, rng):
    network = draw(seed, decades=3.0)
    table, fed = network.reaction_table(), network.feed_table()
    plain = dict(zip(network.species, outlet("MOLE_CSTR", network), strict=True))
    rows = list(table[1:])
    rng.shuffle(rows)
    eq, law, k = rows.pop()
    halves = (table[0], *rows, (eq, law, k / 2), (eq, law, k / 2))
    names = list(fed[1:])
    rng.shuffle(names)
    swapped = numbers(call("MOLE_CSTR", [halves, (fed[0], *names), network.tau]))
    assert close([plain[name] for name, _ in names], swapped, 1e-7, 1e-18 * max(network.feed))
    renamed = tuple(
        tuple(c.replace("s", "Zx") if isinstance(c, str) else c for c in row) for row in table[1:]
    )
    other = (fed[0], *((name.replace("s", "Zx"), x) for name, x in fed[1:]))
    assert close(
        plain.values(), numbers(call("MOLE_CSTR", [(table[0], *renamed), other, network.tau])), 1e-9, 0.0
    )


@few
@given(SEEDS)
def test_g14_a_reaction_written_twice_as_large(seed):
    network = draw(seed, decades=3.0)
    table = network.reaction_table()

    def doubled(equation):
        return " -> ".join(" + ".join(f"{2 * float(t.split()[0]):.17g} {t.split()[1]}" for t in side.split(" + "))
                           for side in equation.split(" -> "))  # fmt: skip

    twice = (table[0], *((doubled(eq), f"{law}/2", k) for eq, law, k in table[1:]))
    assert close(
        outlet("MOLE_CSTR", network),
        outlet("MOLE_CSTR", network, None, twice),
        1e-8,
        1e-18 * max(network.feed),
    )


@few
@given(SEEDS)
def test_g15_g16_g17_balances_close_and_masses_are_conserved(seed):
    network = draw(seed)
    c = outlet("MOLE_CSTR", network)
    assert c is not None  # the drawn networks are fixed; refusals at large are counted in the long run
    assert min(c) >= 0.0
    at = (("Species", "Feed"), *zip(network.species, c, strict=True))
    rates = [
        row[1]
        for row in call("MOLE_RATES", [network.reaction_table(), at]).block[1 : 1 + len(network.reactions)]
    ]
    for i in range(len(c)):
        made = [network.tau * row[i] * r for row, r in zip(network.change(), rates, strict=True)]
        terms = network.feed[i] + c[i] + sum(map(abs, made))
        assert abs(network.feed[i] - c[i] + sum(made)) <= 1e-10 * terms
    mass_in = sum(m * x for m, x in zip(network.masses, network.feed, strict=True))
    assert sum(m * x for m, x in zip(network.masses, c, strict=True)) == pytest.approx(mass_in, rel=1e-9)


@few
@given(SEEDS)
def test_g16_a_tube_conserves_what_no_reaction_changes(seed):
    network = mild(seed)
    c = outlet("MOLE_PFR", network, min(network.tau, 10.0))
    assert min(c) >= 0.0
    mass_in = sum(m * x for m, x in zip(network.masses, network.feed, strict=True))
    assert sum(m * x for m, x in zip(network.masses, c, strict=True)) == pytest.approx(mass_in, rel=1e-9)


@few
@given(SEEDS, st.sampled_from(["MOLE_CSTR", "MOLE_PFR"]))
def test_g18_nothing_happens_without_time_or_rate_and_inerts_pass(seed, kind):
    network = draw(seed, decades=2.0)
    feed = [float(x) for x in network.feed]
    assert numbers(call(kind, [network.reaction_table(), network.feed_table(), 0.0])) == feed
    table = network.reaction_table()
    still = (table[0], *((eq, law, 0.0) for eq, law, _ in table[1:]))
    assert close(outlet(kind, network, None, still), feed, 1e-12, 0.0)
    with_inert = (*network.feed_table(), ("Inert", 0.7))
    assert numbers(call(kind, [table, with_inert, 1e-3]))[-1] == pytest.approx(0.7, rel=1e-12)
    short = call(kind, [table, network.feed_table(), 1e-30])
    assert close(numbers(short), feed, 1e-12, 1e-15 * max(feed))


def test_no_blank_argument_is_read_as_nothing():
    assert call("MOLE_CSTR", [power(1, 1.0), AB, None]).problems[0].code == "#VALUE!"
    assert call("MOLE_CSTR", [power(1, 1.0), AB, OMITTED]).problems[0].code == "#VALUE!"
