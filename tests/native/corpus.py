"""Real networks as the kernel is handed them, in one file for the fuzzer: python corpus.py FILE."""

import sys
from collections.abc import Iterator
from pathlib import Path

import kernel_random
import numpy as np
from kernel_cases import network

from moletally.kernel.compiled.pack import Packed, pack_program, pack_structure
from moletally.kernel.program import Model
from moletally.kernel.structure import structures

RANDOM = 30
CONSTANTS = "k K"

# species, reactions; the feed is all of them, then the first alone, then the last alone, then none
NETWORKS = {
    "first order": ("A B", ["A -> B : k*A"]),
    "half order": ("A B C D", ["A + B -> C : k*A*B^0.5", "C -> D : K*C^0.5"]),
    "order zero": ("A B C D", ["A -> B : k", "A -> C : 1e5*A^0.5", "D -> A : K", "C -> D : 2*C^0.5"]),
    "negative order": ("A B", ["A -> B : k/A", "B -> A : K*A/B"]),
    "reversible": ("A B C", ["A + B -> C : k*A*B - K*C", "2 C -> A : 1e4*C^2 - 1e-4*A"]),
    "stiff": ("A B C", ["A -> B : 0.04*A", "2 B -> B + C : 3e7*B^2", "B + C -> A + C : 1e4*B*C"]),
    "damped by a long step": (
        "A B C",
        [
            "2 A -> 2 C : 1.2e5*A",
            "2 C + A -> 4.5 B : 550*C^1.5*A^2.5/(1 + 21*A)^2",
            "A + C -> 3 B : 6*A^2.5*C^2 - 0.0153*B",
            "2 B + C -> 2.3333333333333335 A : 0.0094*B^1.5*C^0.5",
        ],
    ),
    "two states": ("A B C", ["A + 2 B -> 3 B : k*A*B^2", "B -> C : 0.025*B", "2 C -> A : K*C^2"]),
    "chain branching": ("A B C D E", ["A + B -> 2 B : k*A*B", "B -> 0 : K*B", "C + D -> 2 D : C*D", "D -> E : D"]),
    "inhibited": ("U P", ["U -> P : k*U/(1 + K*U)^2"]),
    "undefined": ("A B C", ["A + B -> C : A*B/(A + B)", "C -> A : 0.01*(C - 1)^0.5"]),
    "all operations": (
        "A B C",
        [
            "A -> B : exp(-K/T)*A^(1 + k) - B/(2 + ln(1 + A))",
            "B -> C : abs(A - B)*min(A, B)/(0.1 + max(B, C))",
            "C -> A : sqrt(C)*log10(10 + C) + 0.1*C^2",
            "2 A -> C : k*max(A - K, 0)*sqrt(B)",
        ],
    ),
    "oscillating": ("X Y A", ["0 -> X : k", "2 X + Y -> 3 X : X^2*Y", "X -> Y : K*X", "X -> 0 : X", "A -> Y : A"]),
    "no reaction": ("A B", []),
    "runaway": ("A", ["A -> 2 A : k*A^2"]),
    "long chain": (
        " ".join(f"S{i}" for i in range(30)),
        [f"S{i} -> S{i + 1} : {10.0 ** (i % 7 - 3)}*S{i}^{(0.5, 1, 2)[i % 3]}" for i in range(29)],
    ),
}  # fmt: skip


def packed() -> Iterator[tuple[str, Packed]]:
    """All networks, by name."""
    for name, (species, reactions) in NETWORKS.items():
        yield from _of(name, network(species, reactions, CONSTANTS))
    rng = np.random.default_rng(11)
    for n in range(RANDOM):
        case = kernel_random.draw(rng)
        yield from _of(f"random {n}", case.model, [case.feed > 0])
    nothing = network("", [], "")
    yield "nothing at all", pack_program(nothing.program)


def _of(name: str, model: Model, feeds: list[np.ndarray] | None = None) -> Iterator[tuple[str, Packed]]:
    size, p = model.program.n_species, np.full((1, model.program.n_parameters), 0.3)
    if model.program.n_reactions:
        yield f"{name}, program", pack_program(model.program)
    all_there = np.ones(size, dtype=bool)
    first, last, none = all_there.copy(), all_there.copy(), ~all_there
    first[1:], last[:-1] = False, False
    for there in feeds or [all_there, first, last, none]:
        for structure, _ in structures(model, there[None], np.array([300.0]), p):
            yield f"{name}, fed {np.flatnonzero(there).tolist()}", pack_structure(structure)


def write(file: Path) -> int:
    """The corpus as fuzz.c reads it: how many, then lengths and arrays of each; returns how many."""
    blocks = [both for _, both in packed()]
    with file.open("wb") as out:
        out.write(np.int64(len(blocks)).tobytes())
        for ints, reals in blocks:
            out.write(np.array([len(ints), len(reals)], dtype=np.int64).tobytes())
            out.write(ints.tobytes() + reals.tobytes())
    return len(blocks)


if __name__ == "__main__":
    write(Path(sys.argv[1]))
