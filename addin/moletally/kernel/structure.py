"""What a network can do before a number is computed: which species can be there, which laws run,
and of what order each law is in a species that vanishes.

Species that are neither fed nor made stay exactly zero and leave the balances; so do the laws that
need them. Cases of the same make share one structure, and it is kept.
"""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property, lru_cache

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.coefficients import Coefficients
from moletally.kernel.injectivity import at_most_one_state
from moletally.kernel.limits import Leading, leading
from moletally.kernel.program import Model, Op, Program
from moletally.kernel.rates import Bound, Floats, Tape, tape_of
from moletally.kernel.terms import Terms, split
from moletally.kernel.totals import conserved

__all__ = ["Structure", "everything", "structures"]

ABSENT_ORDER = 1e4  # an absent species vanishes faster than any power of a vanishing one
ZERO_ORDER = 1e-9  # orders are exact but for rounding
KEPT = 2000  # structures; a workbook has tens

Ints = NDArray[np.intp]


@dataclass(frozen=True, eq=False, repr=False)
class Structure:
    """A model cut down to what can happen in a vessel with one kind of feed.

    terms : Terms - all laws as terms
    present, absent : ndarray - species that are fed, in the vessel at the start, or made; and the others
    firing : ndarray - terms that can run
    nu : ndarray, shape (firing, present) - stoichiometry of the terms
    order : ndarray, shape (firing, present) - d ln r/d ln c as c goes to zero, the other species being there
    unbounded : bool - a running term has no bound because an absent species is missing
    wanted : ndarray - absent species that a term of order zero would consume
    held : ndarray - those terms: they are cut to nothing
    undefined : ndarray - positions in `present` of species read by a term that is 0/0 or infinite at zero
    registers : floats of all that does not change with concentrations, of one case of this structure
    """

    terms: Terms
    present: Ints
    absent: Ints
    firing: Ints
    nu: Floats
    order: Floats
    unbounded: bool
    wanted: Ints
    held: Ints
    undefined: Ints
    registers: list[float]

    @cached_property
    def tape(self) -> Tape:
        """The running terms, with derivatives by the present species."""
        return tape_of(self.terms.model.program, tuple(self.firing.tolist()), tuple(self.present.tolist()))

    @cached_property
    def coefficients(self) -> Coefficients:
        """Stoichiometry of the running terms and their reactions, by the present species."""
        return Coefficients.of(self.nu, self.terms.sign[self.firing], self.terms.reaction[self.firing])

    @cached_property
    def starved(self) -> Ints:
        """Positions in `present` of species that a term of order zero consumes: cut when they run out."""
        return np.flatnonzero(((self.nu < 0) & (np.abs(self.order) < ZERO_ORDER)).any(axis=0))

    @cached_property
    def edged(self) -> Ints:
        """Positions in `present` of species whose laws have no finite slope at zero, or must be cut there."""
        steep = (self.order < 1 - ZERO_ORDER) & ~((np.abs(self.order) < ZERO_ORDER) & (self.nu >= 0))
        edged = np.asarray(steep.any(axis=0))
        edged[self.undefined] = True
        return np.flatnonzero(edged)

    @cached_property
    def runaway(self) -> NDArray[np.bool_]:
        """Where a term has a negative order, shape (firing, present)."""
        return self.order < -ZERO_ORDER

    @cached_property
    def endless(self) -> NDArray[np.bool_]:
        """Species, shape (present,), that a term of negative order consumes."""
        return np.asarray((self.runaway & (self.nu < 0)).any(axis=0))

    @cached_property
    def finite_end(self) -> NDArray[np.bool_]:
        """Species, shape (present,), that a term of an order below one can use up entirely."""
        return np.asarray(((self.order < 1 - ZERO_ORDER) & (self.nu < 0)).any(axis=0))

    def reached(self, fed: tuple[bool, ...]) -> NDArray[np.bool_]:
        """Present species that are there if only those marked in `fed` (by present species) are fed."""
        if all(fed):
            return np.ones(len(fed), dtype=np.bool_)
        model = self.terms.model
        there = np.zeros(model.program.n_species, dtype=np.bool_)
        there[self.present[list(fed)]] = True
        return _what_runs(everything(model.program), self.registers, model.stoichiometry, there)[0][
            self.present
        ]

    @cached_property
    def unique(self) -> bool:
        """True where a tank is proven to have one steady state at the most."""
        # Terms that an absent species holds back count too: in another state it might be there.
        return at_most_one_state(self.terms.model, self.registers, all_present=not len(self.absent))

    @cached_property
    def conserved(self) -> Floats:
        """Totals that no reaction changes: rows w with w c = w c_feed, shape (n, S)."""
        return conserved(self.terms.model.stoichiometry)


_KEPT: dict[tuple[Model, bytes], Structure] = {}
_SEEN: dict[tuple[Model, bytes, bytes, bytes], Structure] = {}  # by the very numbers of a single case
_FIRST = np.zeros(1, dtype=np.intp)


def structures(
    model: Model, there: NDArray[np.bool_], T: Floats, p: Floats
) -> Iterator[tuple[Structure, Ints]]:
    """Groups cases by structure: yields structures and the rows that have them.

    there : bool ndarray, shape (N, S) - species fed, or in the vessel at the start
    T, p : as for `solve_tanks`
    """
    if len(there) == 1:
        yield _of_one(model, there, T, p), _FIRST
        return
    marks = np.concatenate([there, _traits(model.program, T, p)], axis=1)
    for rows in _equal_rows(marks):
        i = int(rows[0])
        yield _of(model, there[i], T[i : i + 1], p[i : i + 1], marks[i].tobytes()), rows


def _of_one(model: Model, there: NDArray[np.bool_], T: Floats, p: Floats) -> Structure:
    key = (model, there.tobytes(), T.tobytes(), p.tobytes())
    found = _SEEN.get(key)
    if found is None:
        if len(_SEEN) >= KEPT:
            _SEEN.clear()
        marks = np.concatenate([there, _traits(model.program, T, p)], axis=1)
        found = _SEEN[key] = _of(model, there[0], T, p, marks.tobytes())
    return found


def _of(model: Model, there: NDArray[np.bool_], T: Floats, p: Floats, marks: bytes) -> Structure:
    key = (model, marks)
    if key not in _KEPT:
        if len(_KEPT) >= KEPT:
            _KEPT.clear()
        _KEPT[key] = _analyse(model, there, T, p)
    return _KEPT[key]


def _equal_rows(marks: Floats) -> list[Ints]:
    if len(marks) == 1 or bool((marks == marks[0]).all()):
        return [np.arange(len(marks))]
    _, inverse = np.unique(marks, axis=0, return_inverse=True)
    inverse = inverse.ravel()
    order = np.argsort(inverse, kind="stable")
    return np.split(order, np.flatnonzero(np.diff(inverse[order])) + 1)


@lru_cache(maxsize=512)
def _inputs(program: Program) -> tuple[tuple[int, ...], tuple[int, ...]]:
    """Registers that the laws read besides concentrations and literals: all, and those whose value matters.

    Of most only the sign says something about structure; exponents and the arguments of sums under a
    logarithm or in a difference are read by value.
    """
    first_literal, first_temporary = program.first_literal, program.first_temporary
    made = set(program.code[program.prelude :, 1].tolist())
    read: set[int] = set()
    valued: set[int] = set()
    body = program.code[program.prelude :].tolist()
    for op, _, a, b in body:
        outside = {r for r in (a, b) if r >= program.n_species and r not in made}
        read |= outside
        if op == Op.POW and b in outside:
            valued.add(b)
    read |= {int(r) for r in program.outputs if r >= program.n_species and r not in made}
    if any(op in (Op.LN, Op.LOG10, Op.EXP) for op, *_ in body):
        valued |= read
    changes = {r for r in read if r < first_literal or r >= first_temporary}
    return tuple(sorted(changes)), tuple(sorted(valued & changes))


def everything(program: Program) -> Tape:
    """All rates of a program, with derivatives by all species."""
    return tape_of(program, tuple(range(program.n_reactions)), tuple(range(program.n_species)))


def _traits(program: Program, T: Floats, p: Floats) -> Floats:
    """What the structure depends on besides the feed, shape (N, traits)."""
    signs, values = _inputs(program)
    tape = everything(program)
    registers = Bound.of(tape, T, p).registers
    traits = np.empty((len(T), len(signs) + len(values)))
    for k, register in enumerate(signs):
        traits[:, k] = np.sign(registers[register])
    for k, register in enumerate(values):
        traits[:, len(signs) + k] = registers[register]
    return traits


def _analyse(model: Model, there: NDArray[np.bool_], T: Floats, p: Floats) -> Structure:
    terms = _split(model, T, p)
    program, nu = terms.model.program, terms.model.stoichiometry
    tape = everything(program)
    registers = Bound.of(tape, T, p).registers
    present, firing, unbounded, wanted, held = _what_runs(tape, registers, nu, there)
    absent = np.flatnonzero(~present)
    order = np.zeros((len(firing), int(present.sum())))
    for k, i in enumerate(np.flatnonzero(present)):
        limits = leading(tape, registers, _species(present, vanishing=int(i)))
        order[:, k] = [limits[j].order for j in firing]
    order -= ABSENT_ORDER * np.rint(order / ABSENT_ORDER, where=np.isfinite(order), out=np.zeros_like(order))
    here = np.flatnonzero(present)
    return Structure(
        terms=terms,
        present=here,
        absent=absent,
        firing=firing,
        nu=nu[np.ix_(firing, here)],
        order=np.clip(order, -30.0, 30.0),
        unbounded=unbounded,
        wanted=wanted,
        held=held,
        undefined=_undefined(program, firing, here, T, p),
        registers=registers,
    )


def _split(model: Model, T: Floats, p: Floats) -> Terms:
    """All laws as terms, but those whole whose terms cancel at zero of a species: 1 - exp(-A) is one law."""
    program = model.program
    tape = everything(program)
    registers = Bound.of(tape, T, p).registers
    everywhere = np.ones(program.n_species, dtype=np.bool_)
    whole: set[int] = set()
    for i in range(program.n_species):
        limits = leading(tape, registers, _species(everywhere, vanishing=i))
        whole |= {j for j, limit in enumerate(limits) if limit.cancelled}
    return split(model, frozenset(whole))


def _species(present: NDArray[np.bool_], vanishing: int = -1) -> list[Leading]:
    """Leading terms of all species: constants, e for the one that vanishes, far less for absent ones."""
    out = []
    for i, here in enumerate(present.tolist()):
        value = 1.3 + 0.6180339887 * ((i * 0.7548776662) % 1.0)  # no two alike, no simple ratios
        out.append(Leading((1.0 if i == vanishing else 0.0) if here else ABSENT_ORDER, value))
    return out


def _what_runs(
    tape: Tape, registers: Sequence[float], nu: Floats, there: NDArray[np.bool_]
) -> tuple[NDArray[np.bool_], Ints, bool, Ints, Ints]:
    """Species that can be there, terms that can run, whether one has no bound; species wanted in vain, by
    which terms."""
    present = there.copy()
    while True:
        order = np.array([limit.order for limit in leading(tape, registers, _species(present))])
        order = order.reshape(len(nu)) / ABSENT_ORDER
        missing = (nu < 0) & ~present
        endless = order < -0.5 / ABSENT_ORDER
        would = order < 0.5 / ABSENT_ORDER
        runs = would & (~missing.any(axis=1) | endless)
        more = present | ((nu > 0) & runs[:, None]).any(axis=0)
        if (more == present).all():
            kept = missing & (would & ~runs)[:, None]
            wanted, held = np.flatnonzero(kept.any(axis=0)), np.flatnonzero(kept.any(axis=1))
            return present, np.flatnonzero(runs), bool(endless[runs].any()), wanted, held
        present = more


def _undefined(program: Program, firing: Ints, here: Ints, T: Floats, p: Floats) -> Ints:
    """Positions of the species read by a term that has no finite value or slope where all vanish."""
    tape = tape_of(program, tuple(firing.tolist()), tuple(here.tolist()))
    r, slope = Bound.of(tape, T, p).slopes(np.zeros((1, len(here))))
    bad = ~(np.isfinite(r[0]) & np.isfinite(slope[0]).all(axis=1))
    read = set().union(*(tape.reads[k] for k in np.flatnonzero(bad)))
    return np.array([k for k, i in enumerate(here.tolist()) if i in read], dtype=np.intp)
