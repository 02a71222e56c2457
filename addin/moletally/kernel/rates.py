"""Runs a rate-law program: rates, and their exact derivatives by reverse mode."""

from collections.abc import Sequence
from functools import lru_cache
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.arithmetic import (
    ARRAY_SLOPES,
    ARRAYS,
    FLOAT_SLOPES,
    FLOATS,
    STRICT,
    Slopes,
    Table,
    Value,
)
from moletally.kernel.program import NONE, Op, Program

__all__ = ["Bound", "Floats", "Tape", "tape_of"]

Floats = NDArray[np.float64]
Edge = tuple[int, int, int, int, int, bool]  # result, argument, operands x and y, operation, second argument?


class Tape:
    """A program cut down to the outputs that are wanted, with the paths that its derivatives take.

    wanted : the reactions, in order
    leaves : registers to differentiate by (species i is register i)
    """

    def __init__(self, program: Program, wanted: Sequence[int], leaves: Sequence[int]) -> None:
        self.program = program
        self.leaves = tuple(leaves)
        self.outputs = [int(program.outputs[j]) for j in wanted]
        code = [tuple(map(int, row)) for row in program.code]
        needed = _needed(code, self.outputs)
        prelude, body = code[: program.prelude], code[program.prelude :]
        self.prelude = [row for row in prelude if row[1] in needed]
        self.body = [row for row in body if row[1] in needed]
        active = set(self.leaves)
        for _, target, a, b in code:
            if a in active or b in active:
                active.add(target)
        self.paths = [_path(code, out, active) for out in self.outputs]
        self.takes_roots = any(
            op in (Op.POW, Op.SQRT) and program.n_species <= a for op, _, a, _ in self.body
        )
        self.reads = [{r for r in _needed(code, [out]) if r < program.n_species} for out in self.outputs]

    def run(self, code: list[tuple[int, ...]], registers: list[Value], table: Table) -> None:
        """Execute instructions in place."""
        for op, target, a, b in code:
            registers[target] = table[op](registers[a], registers[b])

    def slope(self, j: int, registers: list[Value], slopes: Slopes, one: Value = 1.0) -> dict[int, Value]:
        """Derivatives of output j by every register it depends on, from executed registers."""
        out = self.outputs[j]
        adjoint: dict[int, Value] = {out: one}
        for target, source, x, y, op, second in self.paths[j]:
            flow = adjoint[target]
            rule = slopes[second][op]
            if rule is not None:
                flow = flow * rule(registers[x], registers[y], registers[target])
            adjoint[source] = adjoint[source] + flow if source in adjoint else flow
        return adjoint


def _needed(code: Sequence[tuple[int, ...]], outputs: Sequence[int]) -> set[int]:
    needed = set(outputs)
    for _, target, a, b in reversed(code):
        if target in needed:
            needed.add(a)
            if b != NONE:
                needed.add(b)
    return needed


def _path(code: Sequence[tuple[int, ...]], out: int, active: set[int]) -> list[Edge]:
    """The edges from an output down to the active leaves, each register's after all its uses."""
    needed = _needed(code, [out])
    edges = []
    for op, target, a, b in reversed(code):
        if target in needed and target in active:
            if a in active:
                edges.append((target, a, a, b, op, False))
            if b in active:
                edges.append((target, b, a, b, op, True))
    return edges


@lru_cache(maxsize=512)
def tape_of(program: Program, wanted: tuple[int, ...], leaves: tuple[int, ...]) -> Tape:
    """The tape of a program, cut once."""
    return Tape(program, wanted, leaves)


class Bound(NamedTuple):
    """A tape with temperature and parameters put in; the prelude has run. Concentrations come later.

    A single case runs on floats, many on arrays: for one case numpy's overhead is ten times the work.
    registers : a float or an array, shape (n,), for every register that concentrations don't change
    n : int - number of cases
    """

    tape: Tape
    registers: list[Value]
    n: int

    @classmethod
    def of(cls, tape: Tape, T: Floats, p: Floats) -> "Bound":
        """Bind temperatures T, shape (N,), and parameters p, shape (N, P)."""
        program, n = tape.program, len(T)
        registers: list[Value] = [0.0] * (program.n_registers + 1)  # register -1 is the unused operand
        if n == 1:
            registers[program.temperature] = float(T[0])
            registers[program.first_parameter : program.first_literal] = p[0].tolist()
        else:
            registers[program.temperature] = T
            registers[program.first_parameter : program.first_literal] = list(np.ascontiguousarray(p.T))
        registers[program.first_literal : program.first_temporary] = program.literals.tolist()
        with np.errstate(all="ignore"):
            tape.run(tape.prelude, registers, FLOATS if n == 1 else ARRAYS)
        return cls(tape, registers, n)

    def at(self, rows: NDArray[np.intp]) -> "Bound":
        """The cases in `rows`."""
        if self.n == 1 and len(rows) == 1:
            return self
        n = len(rows)
        if self.n == 1:
            return Bound(self.tape, self.registers, n)
        pick = [r[rows] if isinstance(r, np.ndarray) else r for r in self.registers]
        if n == 1:
            pick = [float(r[0]) if isinstance(r, np.ndarray) else r for r in pick]
        return Bound(self.tape, pick, n)

    def filled(self, c: Floats, strict: bool = False) -> list[Value]:
        """All registers at concentrations c, shape (n, number of leaves); call within np.errstate."""
        registers = self.registers.copy()
        if self.n == 1 and not strict:
            for leaf, value in zip(self.tape.leaves, c[0].tolist(), strict=True):
                registers[leaf] = value
            self.tape.run(self.tape.body, registers, FLOATS)
            return registers
        for leaf, column in zip(self.tape.leaves, np.ascontiguousarray(c.T), strict=True):
            registers[leaf] = column
        self.tape.run(self.tape.body, registers, STRICT if strict else ARRAYS)
        return registers

    def rates(self, c: Floats, strict: bool = False) -> Floats:
        """r, shape (n, number of outputs); `strict`: nan where a root of a negative number is taken."""
        with np.errstate(all="ignore"):
            registers = self.filled(c, strict)
        return self._gather(registers)

    def slopes(self, c: Floats) -> tuple[Floats, Floats]:
        """r and dr/dc, shape (n, outputs, leaves)."""
        tape = self.tape
        position = {leaf: i for i, leaf in enumerate(tape.leaves)}
        jacobian = np.zeros((self.n, len(tape.outputs), len(tape.leaves)))
        table = FLOAT_SLOPES if self.n == 1 else ARRAY_SLOPES
        with np.errstate(all="ignore"):
            registers = self.filled(c)
            for j in range(len(tape.outputs)):
                for register, value in tape.slope(j, registers, table).items():
                    if register in position:
                        jacobian[:, j, position[register]] = value
        return self._gather(registers), jacobian

    def _gather(self, registers: list[Value]) -> Floats:
        values = [registers[out] for out in self.tape.outputs]
        if self.n == 1:
            flat = [float(v[0]) if isinstance(v, np.ndarray) and v.ndim else float(v) for v in values]
            return np.array([flat])
        r = np.empty((self.n, len(values)))
        for j, value in enumerate(values):
            r[:, j] = value
        return r
