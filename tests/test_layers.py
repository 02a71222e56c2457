"""Imports go downwards only; the rule is read from the files, so it can't rot."""

import ast
from pathlib import Path

import moletally

PACKAGE = Path(moletally.__file__).parent

# room -> rooms it may import from; a module of the package's own top level counts as its name
MAY_IMPORT = {
    "kernel": {"kernel"},
    "chemistry": {"chemistry", "kernel.program"},
    "reactors": {"reactors", "chemistry", "kernel"},
    "sheet": {"sheet", "reactors", "chemistry", "kernel.status"},
    "hosts": {"sheet", "chemistry.errors"},  # and the host itself, never another
    "cli": {"hosts", "sheet", "chemistry.errors"},
    "__init__": {"hosts"},
    "__main__": {"cli"},
}

# loaded only inside the function that needs them: process start must stay quick
LAZY = {"scipy", "pandas", "pint", "openpyxl", "lxml", "formualizer"}


def modules():
    for path in sorted(PACKAGE.rglob("*.py")):
        parts = path.relative_to(PACKAGE).with_suffix("").parts
        yield path, tuple(p for p in parts if p != "__init__") or ("__init__",)


def imports(tree):
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            yield from (alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, "imports are absolute"
            yield node.module


def top_level_imports(tree):
    return {name.split(".")[0] for node in tree.body for name in imports(ast.Module([node], []))
            if isinstance(node, ast.Import | ast.ImportFrom)}  # fmt: skip


def allowed(own: tuple[str, ...], target: str) -> bool:
    if target == "moletally":  # the version
        return True
    inner = target.removeprefix("moletally.")
    rooms = set(MAY_IMPORT[own[0]])
    if own[0] == "hosts":
        rooms.add(".".join(own[:2]))
    return any(inner == room or inner.startswith(room + ".") for room in rooms)


def test_imports_go_downwards():
    wrong = [
        f"{path.name}: {target}"
        for path, own in modules()
        for target in imports(ast.parse(path.read_text(encoding="utf-8")))
        if target.split(".")[0] == "moletally" and not allowed(own, target)
    ]
    assert wrong == []


def test_every_room_is_listed():
    assert {own[0] for _, own in modules()} <= set(MAY_IMPORT)


def test_large_libraries_are_imported_late():
    wrong = [
        f"{path.name}: {name}"
        for path, _ in modules()
        for name in top_level_imports(ast.parse(path.read_text(encoding="utf-8"))) & LAZY
    ]
    assert wrong == []
