"""What Excel's compiler would refuse in the VBA texts, and no other compiler here finds.

LibreOffice, which runs the same texts, sees broken syntax, but takes names that nothing declares. This looks
for those: undeclared names, members that a module of ours doesn't have, calls with too few or too many
arguments, labels that are not there, names declared twice, lines that are too long.
"""

import re
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path

__all__ = ["complaints"]

LONGEST_LINE = 1023
MOST_CONTINUATIONS = 24
WORDS = """and as boolean byref byval call case class collection compare const currency date declare dim do double each
    else elseif empty end error event exit explicit false for function get goto if implements in integer is let lib
    like long longptr loop mod module new next not nothing null object on option optional or paramarray preserve
    private property ptrsafe public redim resume select set single static stop string sub then to true until variant
    wend while with withevents xor alias step attribute vb_name open close input output line"""
FUNCTIONS = """abs activecell activeworkbook application array ascw cbool cdbl chr clng cstr cverr dir environ eof err
    format freefile getattr instr instrrev isarray isempty iserror ismissing isobject kill lbound left len mid msgbox now
    replace right split strcomp thisworkbook trim typename ubound ucase val vartype workbook worksheet range
    iribboncontrol xlcalculation vba7 win64"""
KEYWORDS, KNOWN = set(WORDS.split()), set(FUNCTIONS.split())  # of the language; of VBA and Excel
CONSTANT = re.compile(r"(xl|vb)[A-Z]\w*$")
NAME = re.compile(r"[A-Za-z]\w*")
PROCEDURE = re.compile(
    r"(?:(Public|Private)\s+)?(?:Declare\s+PtrSafe\s+)?(Sub|Function)\s+(\w+)(?:\s+Lib\s+\S+(?:\s+Alias\s+\S+)?)?\s*\((.*)\)",
    re.IGNORECASE,
)
DECLARATION = re.compile(
    r"^(?:Dim|Static|Private|Public|ReDim(?:\s+Preserve)?)\s+(?:WithEvents\s+|Const\s+)?(.*)$", re.IGNORECASE
)
LABEL = re.compile(r"^(\w+):$")


@dataclass(slots=True)
class Procedure:
    """A Sub or Function: its arguments and the lines inside."""

    name: str
    public: bool
    least: int
    most: float
    locals: set[str]
    lines: list[tuple[int, str]] = field(default_factory=list)


@dataclass(slots=True)
class ModuleText:
    """A module: what it declares at its top, and its procedures by lower-case name."""

    name: str
    top: dict[str, bool] = field(default_factory=dict)  # name: public
    procedures: dict[str, Procedure] = field(default_factory=dict)


def complaints(texts: dict[str, str]) -> list[str]:
    """Everything found in the texts of the modules, by file name; empty if all is well."""
    found: list[str] = []
    project: dict[str, ModuleText] = {}
    for name, text in texts.items():
        project[Path(name).stem.lower()] = _module(name, text, found)
    for name in texts:
        module = project[Path(name).stem.lower()]
        for procedure in module.procedures.values():
            for number, line in procedure.lines:
                found += [f"{name}:{number}: {what}" for what in _line(line, procedure, module, project)]
    return found


def _statements(name: str, text: str, found: list[str]) -> Iterator[tuple[int, str]]:
    """Logical lines without comments; what stands in quotes is emptied."""
    waiting, begun, parts = "", 0, 0
    for number, line in enumerate(text.splitlines(), 1):
        if len(line) > LONGEST_LINE:
            found.append(f"{name}:{number}: longer than {LONGEST_LINE} characters")
        bare = re.sub(r'"(?:[^"]|"")*"', '""', line)
        bare = bare.split("'", 1)[0].rstrip()
        begun = begun or number
        if bare.endswith(" _"):
            waiting, parts = waiting + bare[:-1], parts + 1
            continue
        if parts > MOST_CONTINUATIONS:
            found.append(f"{name}:{begun}: more than {MOST_CONTINUATIONS} continued lines")
        if (waiting + bare).strip():
            yield begun, (waiting + bare).strip()
        waiting, begun, parts = "", 0, 0


def _module(name: str, text: str, found: list[str]) -> ModuleText:
    module = ModuleText(Path(name).stem)
    current: Procedure | None = None
    for number, line in _statements(name, text, found):
        head = PROCEDURE.match(line)
        if head:
            current = _procedure(head, declared_only="Declare" in line)
            if current.name.lower() in module.procedures and "Declare" not in line:
                found.append(f"{name}:{number}: {current.name} is defined twice")
            module.procedures[current.name.lower()] = current
            if "Declare" in line:
                current = None
        elif re.match(r"End (Sub|Function)$", line):
            current = None
        elif current is None:
            if match := DECLARATION.match(line):
                public = line.lower().startswith("public")
                module.top |= dict.fromkeys(_declared(match[1]), public)
        else:
            if (match := DECLARATION.match(line)) and not line.lower().startswith("redim"):
                names = _declared(match[1])
                found += [f"{name}:{number}: {n} is declared twice" for n in names if n in current.locals]
                current.locals |= set(names)
            current.lines.append((number, line))
    return module


def _procedure(head: re.Match[str], *, declared_only: bool) -> Procedure:
    arguments = [a.strip() for a in _split(head[4]) if a.strip()]
    names = {
        NAME.findall(re.sub(r"^(Optional\s+)?(ByVal\s+|ByRef\s+|ParamArray\s+)?", "", a))[0].lower()
        for a in arguments
    }
    if declared_only:
        names = set()
    optional = sum(a.startswith(("Optional", "ParamArray")) for a in arguments)
    most = float("inf") if any(a.startswith("ParamArray") for a in arguments) else len(arguments)
    public = (head[1] or "Public").lower() == "public"
    return Procedure(head[3], public, len(arguments) - optional, most, names | {head[3].lower()})


def _declared(text: str) -> list[str]:
    return [NAME.findall(part)[0].lower() for part in _split(text) if NAME.findall(part)]


def _line(line: str, here: Procedure, module: ModuleText, project: dict[str, ModuleText]) -> Iterator[str]:
    labels = {m[1].lower() for _, text in here.lines if (m := LABEL.match(text))}
    if LABEL.match(line):
        return
    if (jump := re.search(r"GoTo (\w+)", line)) and jump[1].lower() not in labels | {"0"}:
        yield f"there is no label {jump[1]}"
    for match in NAME.finditer(line):
        name, before, after = match[0], line[: match.start()], line[match.end() :]
        key = name.lower()
        if before.endswith("."):
            owner = re.search(r"(?<![\w.)])(\w+)\.$", before)
            if owner and owner[1].lower() in project and owner[1].lower() not in here.locals:
                yield from _member(project[owner[1].lower()], name, before[: owner.start()], after)
        elif (
            CONSTANT.match(name)
            or after.lstrip().startswith(":=")
            or any(key in names for names in (KEYWORDS, KNOWN, here.locals, module.top, labels, project))
        ):
            continue
        elif key in module.procedures:
            yield from _count(module.procedures[key], before, after)
        else:
            owners = [m for m in project.values() if key in m.procedures and m.procedures[key].public]
            if not owners:
                yield f"nothing declares {name}"
            else:
                yield from _count(owners[0].procedures[key], before, after)


def _member(module: ModuleText, name: str, before: str, after: str) -> Iterator[str]:
    procedure = module.procedures.get(name.lower())
    if procedure is not None and procedure.public:
        yield from _count(procedure, before, after)
    elif not module.top.get(name.lower()) and module.name != "ThisWorkbook":  # Excel gives that one more
        yield f"{module.name} has no public {name}"


def _count(procedure: Procedure, before: str, after: str) -> Iterator[str]:
    """Arguments of a call: in parentheses, or behind the name where the call is a statement."""
    if after.startswith("("):
        given = _split(_inside(after))
    elif not before.strip() or re.search(r"(Then|Else)\s*$", before):
        given = _split(re.split(r"\bElse\b", after)[0])
    else:
        given = []
    count = 0 if given in ([], [""]) or not "".join(given).strip() else len(given)
    if not procedure.least <= count <= procedure.most:
        yield f"{procedure.name} is called with {count} arguments, takes {procedure.least} to {procedure.most:g}"


def _inside(text: str) -> str:
    depth = 0
    for i, char in enumerate(text):
        depth += (char == "(") - (char == ")")
        if depth == 0:
            return text[1:i]
    return text[1:]


def _split(text: str) -> list[str]:
    """At the commas that stand outside of parentheses."""
    parts, depth, begun = [], 0, 0
    for i, char in enumerate(text):
        depth += (char == "(") - (char == ")")
        if char == "," and depth == 0:
            parts.append(text[begun:i])
            begun = i + 1
    return [*parts, text[begun:]]
