"""Formulas as they are stored become formulas that the engine reads, and what they depend on.

Names and table references are written out as plain ranges, functions lose the prefixes of the file
format, and each call of ours gets the number of its site as first argument, with a marker wherever an
argument is left out: the engine would hand in 0 there.
"""

from collections.abc import Container
from dataclasses import dataclass, field

from moletally.hosts.headless.book import Book, FormulaCell
from moletally.hosts.headless.lexer import Token, significant, tokens
from moletally.hosts.headless.references import Rect, address, parse_area, split_sheet
from moletally.hosts.headless.spelling import builtin, own
from moletally.hosts.headless.structured import structured

__all__ = ["HOLD", "OMITTED_MARK", "PICK", "SPILL", "TOP", "Rewritten", "Site", "rewrite"]

OMITTED_MARK = "\u2400omitted"
HOLD, SPILL, PICK, TOP = "MOLEZ_HOLD", "MOLEZ_SPILL", "MOLEZ_PICK", "MOLEZ_TOP"
MOST_NAMES = 40  # names that refer to names: deeper than that is a circle


@dataclass(slots=True)
class Site:
    """A call of ours in a cell: the function, and for each argument its range if it is a plain one."""

    number: int
    cell: FormulaCell
    function: str
    areas: list[Rect | None] = field(default_factory=list)


@dataclass(slots=True)
class Rewritten:
    """A formula for the engine.

    needs : ranges it reads; functions : builtin ones it calls
    obstacle : why it can't be recalculated here, "" if it can
    """

    text: str
    sites: list[Site]
    needs: list[Rect]
    functions: set[str]
    obstacle: str = ""


def rewrite(book: Book, cell: FormulaCell, ours: Container[str], first_site: int) -> Rewritten:
    """Rewrite the formula of a cell; its calls are numbered from `first_site` on."""
    writer = _Writer(book, cell, ours, first_site)
    writer.write(tokens(cell.formula), 0)
    return Rewritten("".join(writer.out), writer.sites, writer.needs, writer.functions, writer.obstacle)


@dataclass(slots=True)
class _Open:
    """An open parenthesis: the site if it is a call of ours, and where the current argument began."""

    function: str
    site: Site | None
    began: int
    arguments: int = 0


class _Writer:
    """Writes one formula, token by token."""

    def __init__(self, book: Book, cell: FormulaCell, ours: Container[str], first_site: int) -> None:
        self.book, self.cell, self.ours = book, cell, ours
        self.next_site = first_site
        self.out: list[str] = []
        self.sites: list[Site] = []
        self.needs: list[Rect] = []
        self.functions: set[str] = set()
        self.obstacle = ""
        self.open: list[_Open] = []

    def write(self, pieces: list[Token], depth: int) -> None:
        if depth > MOST_NAMES:
            self.obstacle = "names refer to each other in a circle"
            return
        for i, piece in enumerate(pieces):
            match piece.kind:
                case "function":
                    self.function(piece.text[:-1])
                case "reference":
                    self.reference(piece.text, pieces, i)
                case "table":
                    self.table(piece.text)
                case "name":
                    self.name(piece.text, depth)
                case "operator":
                    self.operator(piece.text)
                case _:
                    self.out.append(piece.text)

    def function(self, spelled: str) -> None:
        name = own(spelled, self.ours)
        if name is not None:
            site = Site(self.next_site, self.cell, name)
            self.next_site += 1
            self.sites.append(site)
            self.out.append(f"{name}({site.number},")
            self.open.append(_Open(name, site, len(self.out)))
            return
        plain = builtin(spelled)
        if "!" in spelled:
            self.obstacle = self.obstacle or f"the function {spelled} belongs to another file"
        if plain == "SINGLE":
            plain = TOP
        elif plain == "ANCHORARRAY":
            self.out.append("(")
            self.open.append(_Open(plain, None, len(self.out)))
            return
        else:
            self.functions.add(plain)
        self.out.append(plain + "(")
        self.open.append(_Open(plain, None, len(self.out)))

    def operator(self, text: str) -> None:
        if text == "(":
            self.open.append(_Open("", None, len(self.out) + 1))
        elif text == "," and self.open and self.open[-1].site is not None:
            self.end_argument()
            self.out.append(",")
            self.open[-1].began = len(self.out)
            return
        elif text == ")" and self.open:
            if self.open[-1].site is not None:
                self.end_argument(last=True)
            closed = self.open.pop()
            if closed.function == "ANCHORARRAY":  # `(A1` becomes `A1#`
                self.out[closed.began - 1] = ""
                self.out.append("#")
                return
        self.out.append(text)

    def end_argument(self, last: bool = False) -> None:
        """Mark an argument that is left out; a call without any arguments stays without."""
        opened = self.open[-1]
        assert opened.site is not None
        text = "".join(self.out[opened.began :]).strip()
        opened.arguments += 1
        if text:
            opened.site.areas.append(self.plain_area(text))
            return
        if last and opened.arguments == 1:
            self.out[opened.began - 1] = self.out[opened.began - 1].rstrip(",")
            return
        opened.site.areas.append(None)
        self.out.append(f'"{OMITTED_MARK}"')

    def plain_area(self, text: str) -> Rect | None:
        sheet, rest = split_sheet(text)
        area = parse_area(rest.replace("$", ""))
        return None if area is None else Rect(self.sheet_name(sheet), *area)

    def sheet_name(self, sheet: str) -> str:
        if not sheet:
            return self.cell.sheet
        found = self.book.sheet(sheet)
        return found.name if found else sheet

    def reference(self, text: str, pieces: list[Token], i: int) -> None:
        sheet, rest = split_sheet(text)
        if "[" in sheet:
            self.obstacle = self.obstacle or f"{text} is in another workbook"
        elif ":" in sheet and not text.startswith("'"):
            self.obstacle = self.obstacle or f"{text} goes through several sheets"
        area = parse_area(rest.replace("$", ""))
        if area is None:
            self.out.append(text)
            return
        rect = Rect(self.sheet_name(sheet), *area)
        self.needs.append(rect)
        if self.cell.kind == "plain" and not rect.single and self.intersects(pieces, i):
            rect = self.intersection(rect) or rect
            self.out.append(address(rect))
            return
        self.out.append(text)

    def intersects(self, pieces: list[Token], i: int) -> bool:
        """True for a range that stands where a plain formula takes one value: outside of any function."""
        if any(o.function not in ("", TOP) for o in self.open):
            return False
        before, after = significant(pieces, i - 1, -1), significant(pieces, i + 1, 1)
        joined = any(p is not None and p.text in (":", "#") for p in (before, after))
        return not joined

    def intersection(self, rect: Rect) -> Rect | None:
        """The cell of a column or row that lies beside the formula."""
        row, column = self.cell.row, self.cell.column
        if rect.left == rect.right and rect.top <= row <= rect.bottom:
            return Rect(rect.sheet, row, rect.left, row, rect.left)
        if rect.top == rect.bottom and rect.left <= column <= rect.right:
            return Rect(rect.sheet, rect.top, column, rect.top, column)
        return None

    def table(self, text: str) -> None:
        rect = structured(text, self.book.tables, self.cell)
        if rect is None:
            self.obstacle = self.obstacle or f"the table reference {text} is not understood"
            self.out.append("#REF!")
            return
        self.needs.append(rect)
        self.out.append(address(rect))

    def name(self, text: str, depth: int) -> None:
        sheet, rest = split_sheet(text)
        bare = rest.removeprefix("_xlpm.")
        found = self.book.tables.get(rest.casefold())
        if found is not None:
            self.table(rest + "[]")
            return
        definition = self.book.name(rest, self.sheet_name(sheet))
        if definition is None:
            self.out.append(bare)
            return
        inner = tokens(definition)
        simple = len(inner) == 1 and inner[0].kind in ("reference", "number", "text")
        if not simple:
            self.out.append("(")
        self.write(inner, depth + 1)
        if not simple:
            self.out.append(")")
