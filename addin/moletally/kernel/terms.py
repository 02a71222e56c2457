"""Splits rate laws into terms: k*(A*B - C/K) becomes k*A*B forwards and k*C/K backwards.

A law that can run both ways has no order of its own in a species that vanishes; each of its terms has.
A law is a sum of terms where the sum is taken last, or multiplied or divided by a common factor.
"""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from moletally.kernel.program import NONE, Builder, Model, Op, Program, Reg

__all__ = ["Terms", "split"]

MOST_TERMS = 16  # of one law; a longer sum stays whole


class Terms(NamedTuple):
    """A model whose laws are terms, and where they come from.

    model : Model - rates are terms; the sign of a term stands in its stoichiometry
    reaction : int ndarray, shape (n_terms,) - the reaction each term belongs to
    sign : ndarray, shape (n_terms,) - its sign there
    """

    model: Model
    reaction: NDArray[np.intp]
    sign: NDArray[np.float64]


def split(model: Model, whole: frozenset[int] = frozenset()) -> Terms:
    """All laws of a model as terms; the reactions in `whole` stay as they are."""
    writer = _Writer(model.program)
    reaction, signs = [], []
    for j in range(model.program.n_reactions):
        out = int(model.program.outputs[j])
        parts = [(1.0, writer.copy(out))] if j in whole else writer.parts(out)
        if len(parts) > MOST_TERMS:
            parts = [(1.0, writer.copy(out))]
        for sign, reg in parts:
            writer.builder.rate(reg)
            reaction.append(j)
            signs.append(sign)
    owner, direction = np.array(reaction, dtype=np.intp), np.array(signs, dtype=np.float64)
    stoichiometry = model.stoichiometry[owner] * direction[:, None]
    return Terms(Model(writer.builder.finish(), stoichiometry), owner, direction)


class _Writer:
    """Writes a program anew from the registers of another."""

    def __init__(self, program: Program) -> None:
        self.program = program
        self.builder = Builder(program.n_species, program.n_parameters)
        self._code = {int(row[1]): (Op(int(row[0])), int(row[2]), int(row[3])) for row in program.code}
        self._copies: dict[int, Reg] = {}

    def copy(self, register: int) -> Reg:
        """The same value in the new program."""
        if register not in self._copies:
            self._copies[register] = self._write(register)
        return self._copies[register]

    def _write(self, register: int) -> Reg:
        program = self.program
        if register in self._code:
            op, a, b = self._code[register]
            return self.builder.apply(op, self.copy(a), None if b == NONE else self.copy(b))
        if register < program.temperature:
            return self.builder.species(register)
        if register == program.temperature:
            return self.builder.temperature()
        if register < program.first_literal:
            return self.builder.parameter(register - program.first_parameter)
        return self.builder.number(float(program.literals[register - program.first_literal]))

    def parts(self, register: int) -> list[tuple[float, Reg]]:
        """Signs and terms whose sum the register is."""
        op, a, b = self._code.get(register, (None, NONE, NONE))
        if op is Op.ADD:
            return self.parts(a) + self.parts(b)
        if op is Op.SUB:
            return self.parts(a) + [(-sign, reg) for sign, reg in self.parts(b)]
        if op is Op.NEG:
            return [(-sign, reg) for sign, reg in self.parts(a)]
        if op is Op.MUL:
            left, right = self.parts(a), self.parts(b)
            if 1 < len(left) * len(right) <= MOST_TERMS:
                return [(s * t, self.builder.apply(op, x, y)) for s, x in left for t, y in right]
            if len(left) * len(right) == 1:
                return self._single(register, left[0][0] * right[0][0], op, left[0][1], right[0][1])
        if op is Op.DIV:
            above = self.parts(a)
            if len(above) > 1 or above[0][0] < 0:
                return [(sign, self.builder.apply(op, reg, self.copy(b))) for sign, reg in above]
        return [(1.0, self.copy(register))]

    def _single(self, register: int, sign: float, op: Op, x: Reg, y: Reg) -> list[tuple[float, Reg]]:
        return [(1.0, self.copy(register))] if sign > 0 else [(sign, self.builder.apply(op, x, y))]
