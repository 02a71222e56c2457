"""The one door: a kind of vessel and a batch of cases in, checked outlets out, each batch solved once."""

from collections import OrderedDict
from collections.abc import Callable

from moletally.reactors.batch import Batch, Outlets
from moletally.reactors.tank import cstr
from moletally.reactors.tube import pfr

__all__ = ["VESSELS", "solve"]

VESSELS: dict[str, Callable[[Batch], Outlets]] = {"CSTR": cstr, "PFR": pfr}

REMEMBERED_CASES = 50_000  # about 50 MB at 20 species; one large case table must not evict a whole book
ENTRY = 3  # cases: what an answer costs besides its cases, so that many single ones keep to that size too


class _Memory:
    """Answers by the numbers that asked for them, least recently used first, bounded by cases."""

    def __init__(self, cases: int) -> None:
        self._answers: OrderedDict[tuple[object, ...], tuple[Batch, Outlets]] = OrderedDict()
        self._room = cases

    def get(self, key: tuple[object, ...]) -> Outlets | None:
        found = self._answers.get(key)
        if found is None:
            return None
        self._answers.move_to_end(key)
        return found[1]

    def put(self, key: tuple[object, ...], batch: Batch, outlets: Outlets) -> None:
        # The batch is kept with its answer: its network's identity is part of the key.
        self._answers[key] = (batch, outlets)
        self._room -= len(batch) + ENTRY
        while self._room < 0 and len(self._answers) > 1:
            _, (old, _) = self._answers.popitem(last=False)
            self._room += len(old) + ENTRY

    def clear(self) -> None:
        for batch, _ in self._answers.values():
            self._room += len(batch) + ENTRY
        self._answers.clear()


MEMORY = _Memory(REMEMBERED_CASES)


def solve(kind: str, batch: Batch) -> Outlets:
    """Outlets of a batch of vessels of one kind (`CSTR`, `PFR`)."""
    key = (kind, *batch.key)
    outlets = MEMORY.get(key)
    if outlets is None:
        outlets = VESSELS[kind](batch)
        MEMORY.put(key, batch, outlets)
    return outlets
