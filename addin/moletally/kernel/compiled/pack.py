"""Writes a structure as the two flat arrays that the compiled kernel reads (network.c says in which order)."""

from collections.abc import Iterable, Sequence
from itertools import accumulate

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.compiled.library import FORMAT
from moletally.kernel.depth import DEPTH, ENDLESS_DEPTH, STEADY_DEPTH
from moletally.kernel.program import NONE, Program
from moletally.kernel.rates import Floats, Tape, tape_of
from moletally.kernel.structure import ZERO_ORDER, Structure, everything
from moletally.kernel.totals import exact_coefficients

__all__ = ["pack_program", "pack_structure"]

Packed = tuple[NDArray[np.int32], Floats]


class _Writer:
    """Two growing arrays: sections of ints, each with its length in front, and bare reals."""

    def __init__(self) -> None:
        self.ints: list[int] = []
        self.reals: list[float] = []

    def section(self, values: Iterable[int]) -> None:
        """A section of ints."""
        numbers = [int(v) for v in values]
        self.ints.append(len(numbers))
        self.ints.extend(numbers)

    def lists(self, rows: Sequence[Sequence[int]]) -> None:
        """Starts of rows, and the rows one after the other."""
        self.section(starts(rows))
        self.section(x for row in rows for x in row)

    def numbers(self, values: Iterable[float]) -> None:
        """Reals."""
        self.reals.extend(float(v) for v in values)

    def packed(self) -> Packed:
        """The arrays."""
        return np.array(self.ints, dtype=np.int32), np.array(self.reals, dtype=np.float64)


def starts(rows: Sequence[Sequence[object]]) -> list[int]:
    """Where each row starts, and the end."""
    return list(accumulate(map(len, rows), initial=0))


def _marks(n: int, places: NDArray[np.intp]) -> list[bool]:
    """n flags, True at the places. (np.isin would import numpy.ma, half as slow as numpy itself.)"""
    marks = [False] * n
    for k in places.tolist():
        marks[k] = True
    return marks


class _Laws:
    """A tape with its registers numbered anew: leaves, T, parameters, literals (an absent species is 0), results."""

    def __init__(self, tape: Tape) -> None:
        program = tape.program
        self.tape = tape
        self.literals = [*program.literals.tolist(), 0.0]
        first_literal = len(tape.leaves) + 1 + program.n_parameters
        nought = first_literal + len(self.literals) - 1
        self.number = dict.fromkeys(range(program.n_species), nought)
        self.number |= {leaf: k for k, leaf in enumerate(tape.leaves)}
        self.number[program.temperature] = len(tape.leaves)
        for k in range(program.n_parameters):
            self.number[program.first_parameter + k] = len(tape.leaves) + 1 + k
        for k in range(len(program.literals)):
            self.number[program.first_literal + k] = first_literal + k
        self.code: list[tuple[int, ...]] = []
        for op, target, a, b in (*tape.prelude, *tape.body):
            self.number[target] = nought + 1 + len(self.code)
            x = self.number[a]
            self.code.append((op, self.number[target], x, x if b == NONE else self.number[b]))
        self.reads = [sorted(self._leaves(j)) for j in range(len(tape.outputs))]

    def _leaves(self, j: int) -> set[int]:
        sources = {source for _, source, *_ in self.tape.paths[j]} | {self.tape.outputs[j]}
        return {self.number[s] for s in sources if s in self.tape.leaves}

    def paths(self) -> list[list[tuple[int, ...]]]:
        """Edges of reverse mode by term: operation, second operand?, first flow?, target, source, x, y."""
        return [self._path(j) for j in range(len(self.tape.outputs))]

    def _path(self, j: int) -> list[tuple[int, ...]]:
        seen = {self.tape.outputs[j]}
        out: list[tuple[int, ...]] = []
        for target, source, x, y, op, second in self.tape.paths[j]:
            first = source not in seen
            seen.add(source)
            known = self.number[x]
            out.append(
                (op, second, first, self.number[target], self.number[source], known,
                 known if y == NONE else self.number[y])
            )  # fmt: skip
        return out

    def write(self, w: _Writer, entries: Sequence[Sequence[int]]) -> None:
        """The program; entries: derivatives of each term by leaf, those of its cut included."""
        w.section(x for row in self.code for x in row)
        w.section(self.number[out] for out in self.tape.outputs)
        paths = self.paths()
        w.section(starts(paths))
        w.section(x for path in paths for row in path for x in row)
        w.lists(entries)
        w.section(leaf in read for row, read in zip(entries, self.reads, strict=True) for leaf in row)
        w.numbers(self.literals)


class _Cut:
    """Where laws are cut near zero of `edged` species: see Laws in the reference engine."""

    def __init__(self, structure: Structure, edged: NDArray[np.intp], share: float) -> None:
        order = structure.order[:, edged]
        reading = (order < ZERO_ORDER) & (structure.nu[:, edged] >= 0)
        power = np.where(reading, 0.0, np.maximum(order, 1.0))
        self.edged = edged
        self.share = np.where(structure.endless[edged], max(ENDLESS_DEPTH, share), share)
        self.which = [np.flatnonzero(row > 0).tolist() for row in power]
        self.power = [row[row > 0].tolist() for row in power]

    def species(self, t: int) -> list[int]:
        """Species whose cut reduces term t."""
        return [int(self.edged[k]) for k in self.which[t]]

    def write(self, w: _Writer, place: list[dict[int, int]]) -> None:
        """The cut; place: number of the entry (term, leaf)."""
        w.section(self.edged)
        w.lists(self.which)
        w.section(place[t][i] for t in range(len(self.which)) for i in self.species(t))
        w.numbers(self.share)
        w.numbers(x for row in self.power for x in row)


def pack_structure(structure: Structure) -> Packed:
    """A structure with all that tanks and tubes need."""
    laws = _Laws(structure.tape)
    cuts = (
        _Cut(structure, structure.starved, STEADY_DEPTH),
        _Cut(structure, structure.edged, DEPTH),
    )
    model = structure.terms.model
    coefficients = structure.coefficients
    owner = [int(np.flatnonzero(row)[0]) for row in coefficients.net]
    sign = structure.terms.sign[structure.firing]
    entries = [sorted({*read, *cuts[0].species(t), *cuts[1].species(t)}) for t, read in enumerate(laws.reads)]
    totals = structure.conserved[:, structure.present]
    totals = totals[totals.any(axis=1)]
    whole = not structure.unique and len(structure.absent) > 0
    w = _Writer()
    w.section(
        (FORMAT, model.program.n_species, len(structure.present), len(structure.firing), len(coefficients.reactions),
         model.program.n_parameters, len(laws.literals), len(structure.tape.prelude), len(structure.tape.body),
         structure.unique, len(totals), whole, len(structure.absent) if whole else 0)
    )  # fmt: skip
    w.section(structure.present)
    laws.write(w, entries)
    _write_gains(w, coefficients.reactions, owner, entries)
    w.numbers(sign)
    w.numbers(structure.order.ravel())
    place: list[dict[int, int]] = []
    for start, row in zip(starts(entries), entries, strict=False):
        place.append({leaf: start + k for k, leaf in enumerate(row)})
    for cut in cuts:
        cut.write(w, place)
    w.section(_marks(len(structure.present), structure.starved))
    w.section(_marks(model.program.n_species, structure.wanted))
    w.numbers(totals.ravel())
    if whole:
        _write_whole(w, structure)
    return w.packed()


def _write_gains(w: _Writer, reactions: Floats, owner: list[int], entries: Sequence[Sequence[int]]) -> None:
    """Who gains what: terms netted by reaction, and each reaction's coefficients."""
    w.section(owner)
    gaining = [np.flatnonzero(row).tolist() for row in reactions]
    w.lists(gaining)
    exact = exact_coefficients(reactions)
    meant = [
        (x, exact[j][i]) for j, row in enumerate(gaining) for i, x in ((i, reactions[j, i]) for i in row)
    ]
    w.numbers(x for x, _ in meant)
    w.numbers(float(fraction - type(fraction)(float(x))) for x, fraction in meant)
    net: list[list[int]] = [
        sorted({leaf for t in [k for k, name in enumerate(owner) if name == j] for leaf in entries[t]})
        for j in range(len(reactions))
    ]
    w.lists(net)
    first = starts(net)
    w.section(first[owner[t]] + net[owner[t]].index(leaf) for t, row in enumerate(entries) for leaf in row)


def _write_whole(w: _Writer, structure: Structure) -> None:
    """All laws by all species: could a trace of an absent species grow?"""
    model = structure.terms.model
    tape = everything(model.program)
    laws = _Laws(tape)
    w.section((len(laws.literals), len(tape.prelude), len(tape.body), model.program.n_reactions))
    laws.write(w, laws.reads)
    w.section(structure.absent)
    w.section(_marks(model.program.n_reactions, structure.held))
    w.numbers(model.stoichiometry[:, structure.absent].ravel())


def pack_program(program: Program) -> Packed:
    """A program alone, uncut, for its rates and derivatives."""
    species, reactions = program.n_species, program.n_reactions
    laws = _Laws(tape_of(program, tuple(range(reactions)), tuple(range(species))))
    w = _Writer()
    w.section(
        (FORMAT, species, species, reactions, reactions, program.n_parameters, len(laws.literals),
         len(laws.tape.prelude), len(laws.tape.body), True, 0, False, 0)
    )  # fmt: skip
    w.section(range(species))
    laws.write(w, laws.reads)
    _write_gains(w, np.zeros((reactions, species)), list(range(reactions)), laws.reads)
    w.numbers([1.0] * reactions)
    w.numbers([0.0] * (reactions * species))
    for _ in range(2):
        w.section(())
        w.lists([()] * reactions)
        w.section(())
    w.section([False] * species)
    w.section([False] * species)
    return w.packed()
