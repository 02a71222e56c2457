"""Worksheet functions that solve the steady mole balances of stirred tanks and plug-flow tubes.

From Python, with tables as DataFrames: `solve`, `profile`, `rates`, `audit`.
"""

from typing import TYPE_CHECKING, Any

__all__ = ["BalanceError", "audit", "profile", "rates", "solve"]
__version__ = "0.1.0"

if TYPE_CHECKING:
    from moletally.hosts.notebook import BalanceError, audit, profile, rates, solve


def __getattr__(name: str) -> Any:
    # Loaded on first use: the command line and the spreadsheet hosts start without it.
    if name in __all__:
        from moletally.hosts import notebook

        return getattr(notebook, name)
    raise AttributeError(f"module 'moletally' has no attribute {name!r}")
