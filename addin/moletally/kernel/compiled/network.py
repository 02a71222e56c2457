"""Networks in the compiled kernel's hands: made once per structure or program, freed with the last reference."""

from ctypes import POINTER, c_double, c_int32
from functools import lru_cache

from moletally.kernel.compiled.library import library
from moletally.kernel.compiled.pack import Packed, pack_program, pack_structure
from moletally.kernel.program import Program
from moletally.kernel.structure import Structure

__all__ = ["Network", "network_of", "network_of_program"]

KEPT = 2000  # as many as structures are kept


class Network:
    """A network that the kernel has read and found fit; `handle` is its address."""

    __slots__ = ("_free", "handle")

    def __init__(self, packed: Packed) -> None:
        ints, reals = packed
        found = library()
        self._free = found.mt_network_free
        self.handle = found.mt_network_new(
            ints.ctypes.data_as(POINTER(c_int32)),
            len(ints),
            reals.ctypes.data_as(POINTER(c_double)),
            len(reals),
        )
        if not self.handle:
            raise MemoryError("the kernel could not take this network: out of memory, or over 3000 species")

    def __del__(self) -> None:
        if getattr(self, "handle", None):
            self._free(self.handle)


@lru_cache(maxsize=KEPT)
def network_of(structure: Structure) -> Network:
    """The network of a structure."""
    return Network(pack_structure(structure))


@lru_cache(maxsize=KEPT)
def network_of_program(program: Program) -> Network:
    """A program alone."""
    return Network(pack_program(program))
