"""Ranges in, cells out: table readers, `want`, errors with reasons, the one table of worksheet functions."""
