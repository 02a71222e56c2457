"""Which engine computes, for the command line and the hosts, which may not ask the kernel."""

from moletally.reactors.engine import engine_in_use

__all__ = ["engine_in_use"]
