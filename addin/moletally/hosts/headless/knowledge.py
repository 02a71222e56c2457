"""What the engine knows: asked of the engine itself, once per function."""

from functools import lru_cache

from moletally.hosts.headless import matrix

__all__ = ["knows"]

NOT_FOLLOWED = frozenset({"LAMBDA"})  # answers, but only where it is defined


@lru_cache(maxsize=4096)
def knows(function: str) -> bool:
    """True where the engine has a function of that name (without the prefixes of the file format)."""
    import formualizer as fz

    if function in matrix.FUNCTIONS:
        return True
    if function in NOT_FOLLOWED:
        return False
    engine = fz.Workbook(mode=fz.WorkbookMode.Ephemeral)
    engine.add_sheet("S")
    try:
        engine.set_formula("S", 1, 1, f"={function}()")
        value = engine.evaluate_cell("S", 1, 1)
    except RuntimeError:
        return False
    return not (isinstance(value, dict) and str(value.get("kind")) in ("Name", "NImpl"))
