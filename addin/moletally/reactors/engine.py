"""Which engine solves the balances, for those who show it."""

from moletally.kernel.engine import engine_name as engine_in_use

__all__ = ["engine_in_use"]
