"""A book recalculated: the engine does the formulas around, our function table does our calls."""

from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from moletally.hosts.headless import matrix
from moletally.hosts.headless.book import Book, FormulaCell, StoredError, Value
from moletally.hosts.headless.knowledge import knows
from moletally.hosts.headless.references import Rect, address
from moletally.hosts.headless.rewrite import HOLD, PICK, SPILL, TOP, Rewritten, Site, rewrite
from moletally.hosts.headless.values import argument, from_engine, to_engine
from moletally.sheet.cells import Argument
from moletally.sheet.functions import FUNCTIONS, call
from moletally.sheet.outcome import Outcome, Problem

__all__ = ["Asked", "Calculation", "Result", "calculate"]

Place = tuple[str, int, int]
Call = Callable[[str, Sequence[Argument]], Outcome]
NOT_AVAILABLE = {"type": "Error", "kind": "Na"}
UNRELIABLE = ("NImpl", "Name", "Circ", "Cancelled", "Error")


@dataclass(frozen=True, slots=True)
class Asked:
    """A call of ours as it was made: the arguments it had, and what was wrong."""

    function: str
    arguments: tuple[Argument, ...]
    problems: tuple[Problem, ...]


@dataclass(slots=True)
class Result:
    """A formula cell after the recalculation.

    block : its values, one row and column unless it is an array; calls : our functions in it
    asked : those of the calls that were made (not those in a branch of an IF that was not taken)
    stale : why it could not be recalculated; it then keeps its old value
    """

    cell: FormulaCell
    block: list[list[Value]]
    calls: tuple[str, ...]
    asked: tuple[Asked, ...] = ()
    stale: str = ""

    @property
    def problems(self) -> list[Problem]:
        """What was wrong in its calls."""
        return [problem for asked in self.asked for problem in asked.problems]

    @property
    def area(self) -> Rect:
        """The cells it fills now."""
        cell = self.cell
        if cell.kind == "dynamic":
            bottom, right = cell.row + len(self.block) - 1, cell.column + len(self.block[0]) - 1
            return Rect(cell.sheet, cell.row, cell.column, bottom, right)
        return cell.area


@dataclass(slots=True)
class Calculation:
    """All formula cells of a book after the recalculation, in the order of the book."""

    results: list[Result]


def calculate(book: Book, answer: Call = call, names: Iterable[str] = FUNCTIONS,
              progress: Callable[[int, int], None] = lambda done, of: None) -> Calculation:  # fmt: skip
    """Recalculate every formula of a book in memory.

    answer : what answers a call of ours; names : the functions that are ours
    progress : told how many of our calls are done, and how many there are
    """
    run = _Run(book, answer, frozenset(names), progress)
    # What the engine turns out not to know is set aside with all that depends on it, and the rest done again.
    while run.evaluate():
        pass
    return Calculation(run.results())


class _Run:
    """One recalculation; cells that are set aside keep their old values."""

    def __init__(
        self, book: Book, answer: Call, names: frozenset[str], progress: Callable[[int, int], None]
    ) -> None:
        self.book, self.answer, self.names, self.progress = book, answer, names, progress
        self.cells = [c for sheet in book.sheets.values() for c in sheet.formulas.values()]
        self.rewritten: dict[Place, Rewritten] = {}
        self.sites: list[Site] = []
        for cell in self.cells:
            made = rewrite(book, cell, names, len(self.sites))
            self.rewritten[cell.sheet, cell.row, cell.column] = made
            self.sites += made.sites
        self.stale: dict[Place, str] = {}
        self.held: dict[int, Any] = {}
        self.asked: dict[int, Asked] = {}
        self.done = 0
        self.engine: Any = None

    def evaluate(self) -> bool:
        """Evaluate; True if cells had to be set aside and it has to be done again."""
        self.engine = self.prepared()
        for place, made in self.rewritten.items():
            if place not in self.stale and (why := self.obstacle(made)):
                self.stale[place] = why
        self.spread()
        self.held.clear()
        self.done = 0
        before = len(self.stale)
        self.load()
        if len(self.stale) > before:
            return True
        self.engine.evaluate_all()
        self.find_unknown()
        return len(self.stale) > before

    def prepared(self) -> Any:
        import formualizer as fz

        # One thread: our functions are Python, and a second thread only waits for the first to let go of it.
        how = fz.EvaluationConfig()
        how.enable_parallel = False
        engine = fz.Workbook(config=fz.WorkbookConfig(mode=fz.WorkbookMode.Ephemeral, eval_config=how))
        for name in self.book.sheets:
            engine.add_sheet(name)
        for name, function in matrix.FUNCTIONS.items():
            engine.register_function(name, function, min_args=1, allow_override_builtin=True)
        engine.register_function(HOLD, self.hold, min_args=2)
        engine.register_function(SPILL, self.spill, min_args=2)
        engine.register_function(PICK, self.pick, min_args=4)
        engine.register_function(TOP, _top, min_args=1)
        for name in self.names:
            engine.register_function(name, lambda *a, name=name: self.our_call(name, a), min_args=0)
        return engine

    def obstacle(self, made: Rewritten) -> str:
        if made.obstacle:
            return made.obstacle
        unknown = next((name for name in sorted(made.functions) if not knows(name)), "")
        return f"the function {unknown} is not known here" if unknown else ""

    def spread(self) -> None:
        """Whatever reads a stale cell is stale."""
        fresh = list(self.stale)
        while fresh:
            rects = [self.area_of(place) for place in fresh]
            origin = dict(zip(rects, fresh, strict=True))
            fresh = []
            for place, made in self.rewritten.items():
                if place in self.stale:
                    continue
                hit = next((r for need in made.needs for r in rects if need.meets(r)), None)
                if hit is not None:
                    sheet, row, column = origin[hit]
                    self.stale[place] = (
                        f"it reads {address(Rect(sheet, row, column, row, column))}, which is stale"
                    )
                    fresh.append(place)

    def area_of(self, place: Place) -> Rect:
        return self.book.sheets[place[0]].formulas[place[1], place[2]].area

    def load(self) -> None:
        """Hand values and formulas to the engine."""
        for name, sheet in self.book.sheets.items():
            for row, column, values in _runs(sheet.constants):
                self.engine.set_values_batch(name, row, column, values)
        for number, cell in enumerate(self.cells):
            place = (cell.sheet, cell.row, cell.column)
            if place in self.stale:
                self.load_old(cell)
                continue
            try:
                self.load_formula(number, cell, self.rewritten[place].text)
            except RuntimeError as error:
                self.stale[place] = f"the formula can't be read here: {error}"

    def load_old(self, cell: FormulaCell) -> None:
        """The last values of a cell that can't be recalculated, and of what it filled."""
        sheet = self.book.sheets[cell.sheet]
        self.engine.set_value(cell.sheet, cell.row, cell.column, _plain(cell.cached))
        for row in range(cell.area.top, cell.area.bottom + 1):
            for column in range(cell.area.left, cell.area.right + 1):
                if (row, column) in sheet.cached:
                    self.engine.set_value(cell.sheet, row, column, _plain(sheet.cached[row, column]))

    def load_formula(self, number: int, cell: FormulaCell, text: str) -> None:
        """A plain formula shows one value, an array fills its stored cells, a dynamic one spills."""
        wrap = SPILL if cell.kind == "dynamic" else HOLD
        self.engine.set_formula(cell.sheet, cell.row, cell.column, f"={wrap}({number},{text})")
        if cell.kind != "legacy":
            return
        top = address(Rect(cell.sheet, cell.row, cell.column, cell.row, cell.column))
        for row in range(cell.area.top, cell.area.bottom + 1):
            for column in range(cell.area.left, cell.area.right + 1):
                if (row, column) != (cell.row, cell.column):
                    pick = f"={PICK}({number},{row - cell.row},{column - cell.column},{top})"
                    self.engine.set_formula(cell.sheet, row, column, pick)

    def hold(self, number: float, value: Any) -> Any:
        self.held[int(number)] = value
        return _top(value)

    def spill(self, number: float, value: Any) -> Any:
        shown = (
            [[0.0 if v is None else v for v in row] for row in value] if isinstance(value, list) else value
        )
        self.held[int(number)] = shown
        return 0.0 if shown is None else shown

    def pick(self, number: float, row: float, column: float, _: Any) -> Any:
        return _picked(self.held.get(int(number)), int(row), int(column))

    def our_call(self, name: str, values: Sequence[Any]) -> Any:
        site = self.sites[int(values[0])]
        areas = [*site.areas, *[None] * len(values)]
        given = [argument(v, area, self.book) for v, area in zip(values[1:], areas, strict=False)]
        outcome = self.answer(name, given)
        self.asked[site.number] = Asked(name, tuple(given), outcome.problems)
        self.done += 1
        self.progress(self.done, len(self.sites))
        block = [[to_engine(cell) for cell in row] for row in outcome.block]
        return block[0][0] if len(block) == 1 and len(block[0]) == 1 else block

    def find_unknown(self) -> None:
        """Set aside what the engine could not do, though its functions are known."""
        for number, cell in enumerate(self.cells):
            place = (cell.sheet, cell.row, cell.column)
            if place in self.stale:
                continue
            value = self.engine.get_value(*place)
            kind = str(value.get("kind")) if isinstance(value, dict) else ""
            held = self.held.get(number)
            if kind in UNRELIABLE and not (kind == "Name" and cell.cached == StoredError("#NAME?")):
                self.stale[place] = _why(kind)
            elif cell.kind == "plain" and not self.rewritten[place].sites and _is_array(held):
                self.stale[place] = "it takes one value out of a range in a way that is not followed here"

    def results(self) -> list[Result]:
        return [self.result(number, cell) for number, cell in enumerate(self.cells)]

    def result(self, number: int, cell: FormulaCell) -> Result:
        place = (cell.sheet, cell.row, cell.column)
        made = self.rewritten[place]
        calls = tuple(site.function for site in made.sites)
        if place in self.stale:
            return Result(cell, self.old_block(cell), calls, stale=self.stale[place])
        asked = tuple(self.asked[site.number] for site in made.sites if site.number in self.asked)
        top = from_engine(self.engine.get_value(*place))
        held = self.held.get(number)
        if cell.kind == "legacy":
            rows, columns = cell.area.shape
            block = [[from_engine(_picked(held, i, j)) for j in range(columns)] for i in range(rows)]
        elif cell.kind == "dynamic" and isinstance(held, list) and top != StoredError("#SPILL!"):
            block = [[from_engine(v) for v in row] for row in held]
        else:
            block = [[0.0 if top is None else top]]
        return Result(cell, block, calls, asked)

    def old_block(self, cell: FormulaCell) -> list[list[Value]]:
        sheet = self.book.sheets[cell.sheet]
        return [
            [cell.cached if (r, c) == (cell.row, cell.column) else sheet.cached.get((r, c))
             for c in range(cell.area.left, cell.area.right + 1)]
            for r in range(cell.area.top, cell.area.bottom + 1)
        ]  # fmt: skip


def _runs(constants: Mapping[tuple[int, int], Value]) -> Iterator[tuple[int, int, list[list[Any]]]]:
    """Constants as pieces of columns: first row, column, values. The engine takes one by one in quadratic time."""
    run: list[list[Any]] = []
    first = (0, 0)
    for column, row in sorted((column, row) for row, column in constants):
        if run and (column, row) != (first[0], first[1] + len(run)):
            yield first[1], first[0], run
            run = []
        if not run:
            first = (column, row)
        run.append([_plain(constants[row, column])])
    if run:
        yield first[1], first[0], run


def _is_array(held: Any) -> bool:
    return isinstance(held, list) and len(held) * len(held[0]) > 1


def _why(kind: str) -> str:
    if kind == "Circ":
        return "it refers to itself through other cells: a circular reference is not followed"
    if kind == "Name":
        return "it holds a name that is not known here"
    return "it uses what is not known here"


def _plain(value: Value) -> Any:
    if not isinstance(value, StoredError):
        return value
    import formualizer as fz

    return fz.LiteralValue.error(to_engine(value)["kind"], None)


def _top(value: Any) -> Any:
    """The upper left value: what a cell shows of an array."""
    first = value[0][0] if isinstance(value, list) else value
    return 0.0 if first is None else first


def _picked(held: Any, row: int, column: int) -> Any:
    """A cell of an array entered over a range: single rows, columns and values are repeated, as in Excel."""
    if not isinstance(held, list):
        return 0.0 if held is None else held
    row = 0 if len(held) == 1 else row
    column = 0 if len(held[0]) == 1 else column
    if row >= len(held) or column >= len(held[0]):
        return NOT_AVAILABLE
    value = held[row][column]
    return 0.0 if value is None else value
