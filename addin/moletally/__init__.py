"""Worksheet functions that solve the steady mole balances of stirred tanks and plug-flow tubes."""

__version__ = "0.1.0"
