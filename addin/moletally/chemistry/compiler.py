"""Rate laws become a program: the tree of each law, and the temperature dependence of its constants."""

from collections.abc import Sequence

from moletally.chemistry.expression import Binary, Call, Name, Node, Num, Unary, fold
from moletally.chemistry.laws import Law
from moletally.chemistry.parameters import GAS_CONSTANT, Parameters, Symbol
from moletally.kernel.program import Builder, Op, Program, Reg

__all__ = ["compile_laws"]

OPERATORS = {"+": Op.ADD, "-": Op.SUB, "*": Op.MUL, "/": Op.DIV, "^": Op.POW}
FUNCTIONS = {"exp": Op.EXP, "ln": Op.LN, "log10": Op.LOG10, "sqrt": Op.SQRT, "abs": Op.ABS,
             "min": Op.MIN, "max": Op.MAX}  # fmt: skip


def compile_laws(laws: Sequence[Law], parameters: Parameters, species: tuple[str, ...]) -> Program:
    """The program of all laws, in order."""
    builder = Builder(len(species), len(parameters.items))
    for law, symbols in zip(laws, parameters.symbols, strict=True):
        builder.rate(_Compiler(builder, species, symbols).of(law.tree))
    return builder.finish()


class _Compiler:
    """Compiles the law of one reaction."""

    def __init__(self, builder: Builder, species: tuple[str, ...], symbols: dict[str, Symbol]) -> None:
        self.builder, self.species, self.symbols = builder, species, symbols

    def of(self, tree: Node) -> Reg:
        return fold(tree, self._value, lambda node: isinstance(node, Call) and node.function in ("p", "x"))

    def _value(self, node: Node, parts: list[Reg]) -> Reg:
        b = self.builder
        match node:
            case Num(value, _):
                return b.number(value)
            case Name():
                return self._name(node)
            case Unary():
                return b.apply(Op.NEG, parts[0])
            case Binary(op, _, _, _):
                return b.apply(OPERATORS[op], parts[0], parts[1])
            case Call(function, _, _):
                return self._call(node, function, parts)

    def _name(self, node: Name) -> Reg:
        if node.text in self.species:
            return self.builder.species(self.species.index(node.text))
        if node.text == "T":
            return self.builder.temperature()
        if node.text == "R":
            return self.builder.number(GAS_CONSTANT)
        return self._constant(self.symbols[node.text])

    def _constant(self, symbol: Symbol) -> Reg:
        """k exp(-E/R (1/T - 1/Tref)), or k0 exp(-E/(R T)), from E/R; the same for K with dH (van 't Hoff)."""
        b = self.builder
        value = b.parameter(symbol.value)
        if symbol.energy < 0:
            return value
        energy, T = b.parameter(symbol.energy), b.temperature()
        if symbol.reference < 0:
            return b.apply(Op.MUL, value, b.apply(Op.EXP, b.apply(Op.NEG, b.apply(Op.DIV, energy, T))))
        one = b.number(1.0)
        gap = b.apply(Op.SUB, b.apply(Op.DIV, one, b.parameter(symbol.reference)), b.apply(Op.DIV, one, T))
        return b.apply(Op.MUL, value, b.apply(Op.EXP, b.apply(Op.MUL, energy, gap)))

    def _call(self, node: Call, function: str, parts: list[Reg]) -> Reg:
        b = self.builder
        if function in ("p", "x"):
            name = node.args[0]
            assert isinstance(name, Name)
            own = b.species(self.species.index(name.text))
            if function == "p":  # ideal gas
                return b.apply(Op.MUL, own, b.apply(Op.MUL, b.number(GAS_CONSTANT), b.temperature()))
            total = b.species(0)
            for i in range(1, len(self.species)):
                total = b.apply(Op.ADD, total, b.species(i))
            return b.apply(Op.DIV, own, total)
        result = parts[0]
        if len(parts) == 1:
            return b.apply(FUNCTIONS[function], result)
        for other in parts[1:]:
            result = b.apply(FUNCTIONS[function], result, other)
        return result
