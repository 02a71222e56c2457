"""The reactor argument: a number, a range of numbers, a block of labels, or a table of cases."""

import marshal
from collections.abc import Callable, Collection
from dataclasses import dataclass
from functools import cached_property, lru_cache
from math import isfinite, nan
from typing import Any

from moletally.chemistry.errors import InputError, Place, SheetError, near_miss
from moletally.chemistry.tables import Quantity
from moletally.sheet.cells import OMITTED, Argument, Block, Cell
from moletally.sheet.reading.grid import Grid, as_block, fold, is_empty, split_header, text_of, trimmed
from moletally.sheet.reading.labels import LABELS, Kind, canonical
from moletally.sheet.reading.numbers import check_length, is_blank, read_number, refuse_odd

__all__ = ["BARE", "NOTHING", "CaseColumn", "Layout", "ReactorInput", "read_reactor"]

TABLE = "Reactor"
HEADERS = {"label", "value", "unit", "quantity", "name"}


@dataclass(frozen=True, slots=True)
class CaseColumn:
    """A label that has a number, or a number per case."""

    label: str
    unit: str | None
    place: Place


@dataclass(frozen=True, eq=False)
class Layout:
    """What the reactor argument says apart from its numbers; there is one object for all that say the same.

    fixed, columns : labels with a number for all cases, labels with a number per case
    words : label -> word
    bare : True where the values are residence times without a label, in the time unit of the constants
    single : True where there is one case that is not a row of a table
    """

    fixed: tuple[CaseColumn, ...] = ()
    columns: tuple[CaseColumn, ...] = ()
    words: tuple[tuple[str, str], ...] = ()
    bare: bool = False
    single: bool = True

    @cached_property
    def where(self) -> dict[str, int]:
        """Label -> index in `columns`, or that in `fixed` less their number, and so negative."""
        fixed = {column.label: i - len(self.fixed) for i, column in enumerate(self.fixed)}
        return fixed | {column.label: i for i, column in enumerate(self.columns)}

    def column(self, label: str) -> CaseColumn | None:
        """Unit and place of a label that has numbers."""
        where = self.where.get(label)
        return None if where is None else self.columns[where] if where >= 0 else self.fixed[where]

    @property
    def labels(self) -> tuple[str, ...]:
        """All labels, those that vary last."""
        return (*(word for word, _ in self.words), *self.where)


# A fresh object per content, so that what is worked out for a layout is found by identity.
_layout = lru_cache(maxsize=512)(Layout)
NO_LABELS = _layout()


@dataclass(frozen=True, slots=True)
class ReactorInput:
    """What the reactor argument says.

    numbers : those of the layout's fixed labels
    rows : the numbers of its columns per case (nan where a cell is empty), or the fault that makes a case an error
    shape : of the answer to one want, where the argument is a range of residence times
    """

    layout: Layout
    numbers: tuple[float, ...] = ()
    rows: tuple[tuple[float, ...] | SheetError, ...] = ((),)
    shape: tuple[int, int] | None = None

    @property
    def fixed(self) -> dict[str, Quantity | str]:
        """Label -> quantity or word, the same for all cases."""
        found: dict[str, Quantity | str] = dict(self.layout.words)
        for column, value in zip(self.layout.fixed, self.numbers, strict=True):
            found[column.label] = Quantity(value, column.unit, column.place)
        return found

    @property
    def single(self) -> bool:
        """True where there is one case that is not a row of a table."""
        return self.layout.single


NOTHING = ReactorInput(NO_LABELS)  # where no vessel is meant
BARE = CaseColumn("Residence time", None, Place(TABLE))
ONE_TIME = _layout(columns=(BARE,), bare=True)
MANY_TIMES = _layout(columns=(BARE,), bare=True, single=False)
MOST_LINES = 50  # of a block of labels that is remembered

Known = Callable[[str], bool]


def read_reactor(argument: Argument, names: Collection[str]) -> ReactorInput:
    """Read the reactor argument.

    names : the labels of constants, `k(2)` and `in(A)` of this call
    """
    block = argument if isinstance(argument, tuple) else None
    cell = block[0][0] if block is not None and len(block) == len(block[0]) == 1 else argument
    if type(cell) is float and isfinite(cell):
        return ReactorInput(ONE_TIME, rows=((cell,),))
    if block is not None and len(block) <= MOST_LINES and all(type(row[0]) is str for row in block):
        known = _read_like_before(block, tuple(names))
        if known is not None:
            return known
    return _read(argument, names)


def _read_like_before(block: Block, names: tuple[str, ...]) -> ReactorInput | None:
    """A block of labels that differs in its numbers alone from one that was read; None for all else.

    What remains without the finite numbers of its second column is the key, in bytes as in `tables`.
    """
    rest: list[Any] = []
    numbers: list[float] = []
    for row in block:
        value = row[1] if len(row) > 1 else None
        if type(value) is float and isfinite(value):
            numbers.append(value)
            rest.append((row[0], ..., *row[2:]))
        else:
            rest.append(row)
    try:
        layout = _layout_without_numbers(marshal.dumps(tuple(rest), 2), names) if numbers else None
    except ValueError:  # dates and error values
        return None
    return None if layout is None else ReactorInput(layout, tuple(numbers))


@lru_cache(maxsize=512)
def _layout_without_numbers(key: bytes, names: tuple[str, ...]) -> Layout | None:
    """The layout of a block of labels, None where the numbers left out have a say in it."""
    rest = marshal.loads(key)
    block = tuple(tuple(0.0 if cell is ... else cell for cell in row) for row in rest)
    left_out = [i for i, row in enumerate(rest, start=1) if ... in row]
    try:
        read = _read(block, names)
    except SheetError:  # it may quote a number, so the true one has to be there
        return None
    layout = read.layout
    places = [column.place.row for column in layout.fixed]
    return layout if layout.single and not layout.columns and places == left_out else None


def _read(argument: Argument, names: Collection[str]) -> ReactorInput:
    if is_empty(argument):
        raise InputError(
            f"the reactor {_emptiness(argument)}: give a residence time, a range of them, a block of"
            " label | value | unit, or a table of cases",
            Place(TABLE),
        )
    block = as_block(argument, Place(TABLE))
    if len(block) == 1 and len(block[0]) == 1:
        place = Place(TABLE, 1, 1) if isinstance(argument, tuple) else Place(TABLE)
        return ReactorInput(ONE_TIME, rows=((read_number(block[0][0], place),),))
    cells = trimmed(block)
    if _is_range(cells):
        return _range(cells)
    return _labelled(Grid(TABLE, cells), names.__contains__, tuple(names))


def _emptiness(argument: Argument) -> str:
    if argument is OMITTED:
        return "is missing"
    blank = argument is None or (
        isinstance(argument, tuple) and all(c is None for row in argument for c in row)
    )
    return "is blank" if blank else 'is an empty text ("")'


def _is_text(cell: Cell) -> bool:
    return isinstance(cell, str) and bool(cell.strip())


def _is_word(cell: Cell) -> bool:
    """True for a text that can be a label; one that begins like a number is a bad number."""
    return _is_text(cell) and not _numeric(cell)


def _is_range(cells: Block) -> bool:
    """True for residence times without labels: labels begin at the first cell."""
    first = cells[0][0]
    number = _numeric(first) or (isinstance(first, float | int) and not isinstance(first, bool))
    if number and len(cells[0]) == 2 and all(_is_word(row[1]) for row in cells):
        raise InputError(
            "a residence time with a unit needs its label: Residence time | 5 | min", Place(TABLE, 1, 2)
        )
    return number or not any(_is_word(cell) for row in cells for cell in row)


def _range(block: Block) -> ReactorInput:
    """A case for every cell of the range, in reading order; its shape is kept."""
    rows = tuple(
        _guarded(lambda cell=cell, i=i, j=j: (read_number(cell, Place(TABLE, i, j)),))  # type: ignore[misc]
        for i, row in enumerate(block, start=1)
        for j, cell in enumerate(row, start=1)
    )
    return ReactorInput(MANY_TIMES, rows=rows, shape=(len(block), len(block[0])))


def _guarded(read: Callable[[], tuple[float, ...]]) -> tuple[float, ...] | SheetError:
    """The values of a case, or the fault in it: a bad case is no other case's business."""
    try:
        return read()
    except SheetError as error:
        return error


def _labelled(grid: Grid, known: Known, names: tuple[str, ...]) -> ReactorInput:
    blank = [i for i, row in enumerate(grid.cells) if all(is_blank(cell) for cell in row)]
    if len(blank) > 1:
        raise InputError("more than one blank row in the reactor table", grid.place(blank[1], 0, ""))
    if blank:
        cut = blank[0]
        if _starts_cases(Grid(TABLE, grid.cells[:cut]), known):
            raise InputError("a blank row inside the table of cases: delete it", grid.place(cut, 0, ""))
        fixed = _block(grid, 0, cut, known, names)
        return _cases(grid, cut + 1, fixed, known, names)
    if _starts_cases(grid, known):
        return _cases(grid, 0, {}, known, names)
    return _laid_out(_block(grid, 0, len(grid.cells), known, names))


def _laid_out(fixed: dict[str, Quantity | str], columns: tuple[CaseColumn, ...] = (),
              rows: tuple[tuple[float, ...] | SheetError, ...] = ((),), single: bool = True) -> ReactorInput:  # fmt: skip
    """Layout and numbers apart."""
    given = {label: q for label, q in fixed.items() if isinstance(q, Quantity)}
    layout = _layout(
        fixed=tuple(CaseColumn(label, q.unit, q.place) for label, q in given.items()),
        columns=columns,
        words=tuple((label, q) for label, q in fixed.items() if isinstance(q, str)),
        single=single,
    )
    return ReactorInput(layout, tuple(q.value for q in given.values()), rows)


def _starts_cases(grid: Grid, known: Known) -> bool:
    """A header row of texts, and a first column that holds values: no label below the first row."""
    if len(grid.cells) < 2 or not all(is_blank(cell) or _is_text(cell) for cell in grid.cells[0]):
        return False
    column = [row[0] for row in grid.cells[1:]]
    labels = [cell for cell in column if _is_word(cell)]
    if any(_is_label(str(cell), known) for cell in labels):
        return False
    return len(labels) < len(column)


def _is_label(text: str, known: Known) -> bool:
    whole = " ".join(text.split())
    name = split_header(whole)[0]
    return known(whole) or known(name) or fold(name) in LABELS


def _numeric(cell: Cell) -> bool:
    """True for a text that begins like a number: a bad number in a case, not a label."""
    return isinstance(cell, str) and cell.strip()[:1] in set("0123456789.,+-−–≈~<>")


def _label(text: str, known: Known, names: tuple[str, ...], place: Place) -> tuple[str, str | None]:
    """Canonical label and unit of a text."""
    whole = check_length(" ".join(text.split()), place, "a label")
    if known(whole):
        return whole, None
    name, unit = split_header(whole)
    if known(name):
        return name, unit
    if fold(name) in LABELS:
        return canonical(name), unit
    hint = near_miss(name, [*(label.name for label in LABELS.values()), *names])
    raise InputError(f"unknown label {name!r}. {hint}", place)


def _block(
    grid: Grid, first: int, last: int, known: Known, names: tuple[str, ...]
) -> dict[str, Quantity | str]:
    """Rows of label | value | unit, in any order; a label with an empty value is as if it were not there."""
    fixed: dict[str, Quantity | str] = {}
    for i in range(first, last):
        cells = grid.cells[i]
        place = grid.place(i, 0, "")
        refuse_odd(cells[0], place, "a label")
        if not _is_text(cells[0]):
            raise InputError("a label is missing at the start of the row", place)
        if i == first and {fold(c) for c in cells if isinstance(c, str) and c.strip()} <= HEADERS:
            continue
        label, unit = _label(str(cells[0]), known, names, place)
        value_place = grid.place(i, 1, label)
        if len(cells) < 2 or is_blank(cells[1]):
            continue
        if label in fixed:
            raise InputError(f"the label {label!r} stands twice", place)
        if len(cells) > 3 and any(not is_blank(cell) for cell in cells[3:]):
            raise InputError("more than label, value and unit stand in the row", grid.place(i, 3, label))
        own = text_of(cells[2], grid.place(i, 2, label)) if len(cells) > 2 else None
        if own and unit and own != unit:
            raise InputError(f"two units, {unit!r} and {own!r}", place)
        fixed[label] = _value(label, cells[1], own or unit, value_place)
    return fixed


def _value(label: str, cell: Cell, unit: str | None, place: Place) -> Quantity | str:
    if fold(label) in LABELS and LABELS[fold(label)].kind is Kind.TEXT:
        text = text_of(cell, place)
        assert text is not None
        return text
    return Quantity(read_number(cell, place), unit, place)


def _cases(grid: Grid, head: int, fixed: dict[str, Quantity | str], known: Known,
           names: tuple[str, ...]) -> ReactorInput:  # fmt: skip
    """A header row of labels and a row per case."""
    if head >= len(grid.cells):
        raise InputError("the table of cases has no header row", grid.place(head - 1, 0, ""))
    columns: list[tuple[int, CaseColumn]] = []
    for j, cell in enumerate(grid.cells[head]):
        place = grid.place(head, j, "")
        if is_blank(cell):
            if any(not is_blank(row[j]) for row in grid.cells[head + 1 :]):
                raise InputError("the column of cases has no header", place)
            continue
        refuse_odd(cell, place, "a label")
        if not isinstance(cell, str):
            raise InputError(
                "a number where a label belongs: after a blank row comes a table of cases, with its labels in"
                " one row (a blank row inside a block of labels has to go)",
                place,
            )
        label, unit = _label(cell, known, names, place)
        if fold(label) in LABELS and LABELS[fold(label)].kind is Kind.TEXT:
            raise InputError(f"{label} can't change from case to case: give it in the block above", place)
        if label in fixed or any(label == other.label for _, other in columns):
            raise InputError(f"the label {label!r} stands twice", place)
        columns.append((j, CaseColumn(label, unit, grid.place(head, j, label))))
    rows = tuple(_guarded(lambda i=i: _case(grid, i, columns))  # type: ignore[misc]
                 for i in range(head + 1, len(grid.cells)))  # fmt: skip
    if not rows:
        raise InputError("the table of cases has a header row but no case", grid.place(head, 0, ""))
    return _laid_out(fixed, tuple(column for _, column in columns), rows, single=False)


def _case(grid: Grid, row: int, columns: list[tuple[int, CaseColumn]]) -> tuple[float, ...]:
    cells = grid.cells[row]
    return tuple(
        nan if is_blank(cells[j]) else read_number(cells[j], grid.place(row, j, column.label))
        for j, column in columns
    )
