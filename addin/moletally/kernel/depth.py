"""How near zero laws are cut (see reference/cutoff.py for how): numbers that both engines share."""

__all__ = ["DEPTH", "ENDLESS_DEPTH", "STEADY_DEPTH"]

# Of the largest concentration. It must be small: beside a law of order zero that takes all that is
# supplied, a fast one of order one half would take its share at 1e-15; and a chain carrier of half order
# in its own end may run a reaction from a share of 1e-16.
DEPTH = 1e-30
# Newton's method has no steps to take care of: deep enough that what is left there matters to nothing.
STEADY_DEPTH = 1e-60
# Where a law has no bound at zero there is no answer beyond; what counts is to get there in few steps.
ENDLESS_DEPTH = 1e-15
