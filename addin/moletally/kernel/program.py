"""Rate laws as a register program: what the engines run, and the builder that writes it.

Registers are numbered: species concentrations first, then temperature, then parameters, then
literal numbers, then temporaries. An instruction is (operation, target, a, b); b is -1 for
operations of one argument. The *prelude* holds all that depends on temperature, parameters and
literals only (k(T) = k exp(...)); after it come the instructions of reaction 0, 1, ...
A subexpression that two reactions share and that depends on concentrations stays with the first.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from enum import IntEnum
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

__all__ = ["UNARY", "Builder", "Model", "Op", "Program"]

NONE = -1


class Op(IntEnum):
    """Operations of the register machine; the numbers are the file format of later engines."""

    ADD = 0
    SUB = 1
    MUL = 2
    DIV = 3
    POW = 4
    MIN = 5
    MAX = 6
    NEG = 7
    SQRT = 8
    EXP = 9
    LN = 10
    LOG10 = 11
    ABS = 12


UNARY = frozenset({Op.NEG, Op.SQRT, Op.EXP, Op.LN, Op.LOG10, Op.ABS})


@dataclass(frozen=True, eq=False, repr=False)
class Program:
    """Rate laws r_j(c, T, p) of all reactions.

    n_species, n_parameters : int
    literals : ndarray, shape (n_literals,)
    code : int32 ndarray, shape (n_instructions, 4) - operation, target, a, b
    prelude : int - the first `prelude` instructions depend on no concentration
    segments : int32 ndarray, shape (n_reactions, 2) - start and stop of each reaction's instructions
    outputs : int32 ndarray, shape (n_reactions,) - the register that holds each rate
    """

    n_species: int
    n_parameters: int
    literals: NDArray[np.float64]
    code: NDArray[np.int32]
    prelude: int
    segments: NDArray[np.int32]
    outputs: NDArray[np.int32]

    @property
    def n_reactions(self) -> int:
        """Number of rates."""
        return len(self.outputs)

    @property
    def temperature(self) -> int:
        """Register of the temperature, K."""
        return self.n_species

    @property
    def first_parameter(self) -> int:
        """Register of parameter 0."""
        return self.n_species + 1

    @property
    def first_literal(self) -> int:
        """Register of literal 0."""
        return self.first_parameter + self.n_parameters

    @property
    def first_temporary(self) -> int:
        """Register of the first instruction's result."""
        return self.first_literal + len(self.literals)

    @property
    def n_registers(self) -> int:
        """Size of the register file."""
        return self.first_temporary + len(self.code)


@dataclass(frozen=True, eq=False, repr=False)
class Model:
    """A program and what its rates do: species i changes at sum_j stoichiometry[j, i] r_j.

    stoichiometry : ndarray, shape (n_reactions, n_species)
    """

    program: Program
    stoichiometry: NDArray[np.float64]


class Reg(NamedTuple):
    """A handle for a value under construction: its kind ('s', 'T', 'p', 'n' or 't') and index there."""

    kind: str
    place: int


class Builder:
    """Writes a Program: ask for leaves, apply operations, close each reaction with `rate`.

    >>> b = Builder(n_species=2, n_parameters=1)
    >>> b.rate(b.apply(Op.MUL, b.parameter(0), b.species(1)))
    >>> program = b.finish()
    """

    def __init__(self, n_species: int, n_parameters: int) -> None:
        self._n_species = n_species
        self._n_parameters = n_parameters
        self._literals: dict[float, int] = {}
        self._instructions: list[tuple[Op, Reg, Reg | None]] = []
        self._owner: list[int] = []  # -1: prelude, else the reaction that computes it
        self._known: dict[tuple[Op, Reg, Reg | None], Reg] = {}
        self._outputs: list[Reg] = []

    def species(self, index: int) -> Reg:
        """The concentration of species `index`, mol/m3."""
        return Reg("s", index)

    def parameter(self, index: int) -> Reg:
        """Parameter `index`."""
        return Reg("p", index)

    def temperature(self) -> Reg:
        """The temperature, K."""
        return Reg("T", 0)

    def number(self, value: float) -> Reg:
        """A literal number."""
        return Reg("n", self._literals.setdefault(float(value), len(self._literals)))

    def apply(self, op: Op, a: Reg, b: Reg | None = None) -> Reg:
        """The result of one operation; an equal subexpression is computed once."""
        if (b is None) != (op in UNARY):
            raise ValueError(f"{op.name} takes {1 if op in UNARY else 2} argument(s)")
        key = (op, a, b)
        if key not in self._known:
            varies = any(self._varies(r) for r in (a, b) if r is not None)
            self._known[key] = Reg("t", len(self._instructions))
            self._instructions.append(key)
            self._owner.append(len(self._outputs) if varies else -1)
        return self._known[key]

    def rate(self, value: Reg) -> None:
        """Close the current reaction: its rate is `value`."""
        self._outputs.append(value)

    def finish(self) -> Program:
        """The program of all closed reactions."""
        order = sorted(range(len(self._instructions)), key=lambda i: (self._owner[i], i))
        position = {old: new for new, old in enumerate(order)}
        base_t = self._n_species
        base_p = base_t + 1
        base_n = base_p + self._n_parameters
        base_i = base_n + len(self._literals)
        bases = {"s": 0, "T": base_t, "p": base_p, "n": base_n}

        def number(reg: Reg | None) -> int:
            if reg is None:
                return NONE
            return base_i + position[reg.place] if reg.kind == "t" else bases[reg.kind] + reg.place

        code = [(op, base_i + new, number(a), number(b))
                for new, (op, a, b) in enumerate(self._instructions[old] for old in order)]  # fmt: skip
        owners = sorted(self._owner)
        segments = [(_first(owners, j), _first(owners, j + 1)) for j in range(len(self._outputs))]
        return Program(
            n_species=self._n_species,
            n_parameters=self._n_parameters,
            literals=np.array(list(self._literals), dtype=np.float64),
            code=np.array(code, dtype=np.int32).reshape(-1, 4),
            prelude=_first(owners, 0),
            segments=np.array(segments, dtype=np.int32).reshape(-1, 2),
            outputs=np.array([number(r) for r in self._outputs], dtype=np.int32),
        )

    def _varies(self, reg: Reg) -> bool:
        return reg.kind == "s" or (reg.kind == "t" and self._owner[reg.place] >= 0)


def _first(owners: Sequence[int], value: int) -> int:
    """Index of the first entry >= value in a sorted list."""
    return next((i for i, owner in enumerate(owners) if owner >= value), len(owners))
