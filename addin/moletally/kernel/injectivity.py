"""Proves, where it can, that a tank has at most one steady state, whatever its residence time.

With V = dr/dc the balances' Jacobian is -(I - tau nu^T V). By Cauchy and Binet

    det(I - tau nu^T V) = 1 + sum_k tau^k sum (-1)^k det nu[b, a] det V[b, a]

over all sets of k terms b and k species a. If no product in the sum can be negative the determinant
is at least 1 everywhere, and so is that of the Jacobian averaged along the segment between two
states: there can't be two.

(a) signs: every entry of V has a known sign over all positive concentrations and any size; each
    matching of terms with species is a product of its own. Laws need only be monotone.
(b) powers: r is a product of powers, V = diag(r) M diag(1/c) with numbers M, and det M[b, a] counts.

References
----------
(a) M. Banaji, P. Donnell, S. Baigent, SIAM J. Appl. Math. 67 (2007) 1523.
(b) G. Craciun, M. Feinberg, SIAM J. Appl. Math. 65 (2005) 1526; C. Wiuf, E. Feliu, SIAM J. Appl. Dyn.
    Syst. 12 (2013) 1685; S. Müller et al., Found. Comput. Math. 16 (2016) 69.
"""

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from moletally.kernel.elasticity import UNKNOWN, elasticities
from moletally.kernel.program import Model
from moletally.kernel.rates import Floats, tape_of

__all__ = ["at_most_one_state"]

MOST_MATCHINGS = 4000  # about 20 ms; a network beyond it is "not proven"
ROUNDING = 1e-9  # of a determinant, relative to the lengths of its rows


class Entry(NamedTuple):
    """An entry of V: its signs, and its power where the law is a product of powers."""

    species: int
    signs: tuple[int, ...]
    power: float


class Matching(NamedTuple):
    """Terms in rising order, the species matched to each, the signs of the product of those V, its powers."""

    terms: tuple[int, ...]
    species: tuple[int, ...]
    signs: tuple[int, ...]
    power: float


class Laws(NamedTuple):
    """V by terms, and whether every law is a plain product of powers."""

    entries: list[list[Entry]]
    powers: bool


def at_most_one_state(model: Model, registers: Sequence[float], all_present: bool) -> bool:
    """True if the tank is proven to have one steady state at the most.

    model : Model - laws split into terms
    registers : floats of all that does not change with concentrations, the prelude's results included
    all_present : bool - no species is missing from feed and products; (b) holds for positive states only
    """
    laws = _laws(model, registers)
    nu = model.stoichiometry
    return all(_holds(*_inside(laws, nu, group), all_present) for group in _blocks(laws, nu))


def _blocks(laws: Laws, nu: Floats) -> list[list[int]]:
    """Species in groups that act on each other both ways.

    Upstream groups settle by themselves; with their state given, one group at a time has to be proven,
    and a chain of many species is many small proofs.
    """
    acts = np.eye(nu.shape[1], dtype=np.bool_)
    for j, row in enumerate(laws.entries):
        causes = np.array([entry.species for entry in row], dtype=np.intp)
        acts[np.ix_(causes, np.flatnonzero(nu[j]))] = True
    for _ in range(max(nu.shape[1] - 1, 1).bit_length()):
        acts = (acts.astype(np.intp) @ acts.astype(np.intp)) > 0
    groups = {tuple(np.flatnonzero(row).tolist()) for row in acts & acts.T}
    return [list(group) for group in sorted(groups)]


def _inside(laws: Laws, nu: Floats, group: list[int]) -> tuple[Laws, Floats]:
    """Laws and coefficients as the species of a group see them, numbered anew."""
    number = {species: i for i, species in enumerate(group)}
    seen = [
        j
        for j, row in enumerate(laws.entries)
        if nu[j, group].any() and any(e.species in number for e in row)
    ]
    entries = [
        [e._replace(species=number[e.species]) for e in laws.entries[j] if e.species in number] for j in seen
    ]
    return Laws(entries, laws.powers), nu[np.ix_(seen, group)]


def _holds(laws: Laws, nu: Floats, all_present: bool) -> bool:
    """True if no product in the sum above can be negative for the species of one group."""
    found: dict[tuple[tuple[int, ...], tuple[int, ...]], float] = {}
    level = [Matching((), (), (1,), 1.0)]
    signs_hold, seen = True, 0
    while level:
        level = _next_level(level, laws)
        seen += len(level)
        if seen > MOST_MATCHINGS:
            return False
        if not level:
            break
        determinant = _determinants(nu, level)
        for (terms, species, signs, power), d in zip(level, determinant.tolist(), strict=True):
            if d:
                signs_hold = signs_hold and all(s * d >= 0 for s in signs)
                key = (terms, tuple(sorted(species)))
                found[key] = found.get(key, 0.0) + d * power
        if not signs_hold and not (laws.powers and all_present):
            return False
    return signs_hold or all(total >= -ROUNDING for total in found.values())


def _laws(model: Model, registers: Sequence[float]) -> Laws:
    program = model.program
    tape = tape_of(program, tuple(range(program.n_reactions)), tuple(range(program.n_species)))
    entries, powers = [], True
    for j, law in enumerate(elasticities(tape, registers)):
        row = []
        for i in range(program.n_species):
            low, high = law.by.get(i, (0.0, 0.0))
            # A law of order zero is cut where its species runs out: it rises with it from nothing.
            cut = model.stoichiometry[j, i] < 0 and low == 0 and law.sign != 0
            signs = {s for s, there in ((1, high > 0 or cut), (-1, low < 0)) if there}
            if law.sign == UNKNOWN and signs:
                signs = {1, -1}
            if law.sign == -1:
                signs = {-s for s in signs}
            if signs and law.sign:
                row.append(Entry(i, tuple(signs), low if law.sign == 1 else -low))
            powers = powers and low == high and not cut and law.sign != UNKNOWN
        entries.append(row)
    return Laws(entries, powers)


def _next_level(level: list[Matching], laws: Laws) -> list[Matching]:
    """All matchings with one more pair of term and species."""
    out = []
    for terms, species, signs, power in level:
        for j in range(terms[-1] + 1 if terms else 0, len(laws.entries)):
            for entry in laws.entries[j]:
                if entry.species not in species:
                    both = tuple({s * t for s in signs for t in entry.signs})
                    out.append(Matching((*terms, j), (*species, entry.species), both, power * entry.power))
        if len(out) > MOST_MATCHINGS:
            break
    return out


def _determinants(nu: Floats, level: list[Matching]) -> Floats:
    """(-1)^k det nu[terms, species] for each matching, species in matched order; 0 if rounding."""
    terms = np.array([m[0] for m in level])
    species = np.array([m[1] for m in level])
    minors = nu[terms[:, :, None], species[:, None, :]]
    value = np.linalg.det(minors) * (-1.0) ** terms.shape[1]
    size = np.prod(np.sqrt((minors**2).sum(axis=2)), axis=1)
    return np.where(np.abs(value) > ROUNDING * size, value, 0.0)
