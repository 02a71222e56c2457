"""Networks for the tests of the kernel: equations and laws as text, in a few lines of their own.

Python's own parser reads the laws: the grammar of the sheet is not the kernel's business.
"""

import ast
import re

import numpy as np

from moletally.kernel.program import Builder, Model, Op, Reg

OPERATORS = {ast.Add: Op.ADD, ast.Sub: Op.SUB, ast.Mult: Op.MUL, ast.Div: Op.DIV, ast.Pow: Op.POW}
FUNCTIONS = {
    "exp": Op.EXP, "ln": Op.LN, "log10": Op.LOG10, "sqrt": Op.SQRT, "abs": Op.ABS, "min": Op.MIN, "max": Op.MAX,
}  # fmt: skip
TERM = re.compile(r"([\d.]+(?:e[-+]?\d+)?)?\s*([A-Za-z_]\w*)")


def network(species: str, reactions: list[str], parameters: str = "") -> Model:
    """A model from species names, `A + 2 B -> C : k*A*B^2` and parameter names."""
    names, constants = species.split(), parameters.split()
    writer = _Writer(names, constants)
    stoichiometry = np.zeros((len(reactions), len(names)))
    for row, text in zip(stoichiometry, reactions, strict=True):
        equation, law = text.split(":")
        for sign, side in zip((-1.0, 1.0), equation.split("->"), strict=True):
            for coefficient, name in TERM.findall(side):
                row[names.index(name)] += sign * float(coefficient or 1)
        tree = ast.parse(law.strip().replace("^", "**"), mode="eval")
        writer.builder.rate(writer.write(tree.body))
    return Model(writer.builder.finish(), stoichiometry)


class _Writer:
    def __init__(self, names: list[str], constants: list[str]) -> None:
        self.names, self.constants = names, constants
        self.builder = Builder(len(names), len(constants))

    def write(self, node: ast.expr) -> Reg:
        match node:
            case ast.Constant(value=value):
                return self.builder.number(value)
            case ast.Name(id="T"):
                return self.builder.temperature()
            case ast.Name(id=name) if name in self.names:
                return self.builder.species(self.names.index(name))
            case ast.Name(id=name):
                return self.builder.parameter(self.constants.index(name))
            case ast.UnaryOp(op=ast.USub(), operand=operand):
                return self.builder.apply(Op.NEG, self.write(operand))
            case ast.BinOp(left=left, op=op, right=right):
                return self.builder.apply(OPERATORS[type(op)], self.write(left), self.write(right))
            case ast.Call(func=ast.Name(id=name), args=args):
                return self.builder.apply(FUNCTIONS[name], *map(self.write, args))
        raise ValueError(ast.dump(node))


def case(*numbers: float) -> np.ndarray:
    """One case: a row."""
    return np.array([numbers], dtype=np.float64)
