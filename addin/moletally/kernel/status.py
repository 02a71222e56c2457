"""Every way an answer can end: one table, from which the documents and the reasons in cells are made."""

from enum import IntEnum
from typing import NamedTuple

__all__ = ["STATUS", "Status", "StatusText"]


class Status(IntEnum):
    """How a case ended; 0 is an answer that passed every check."""

    OK = 0
    NOT_CONVERGED = 1
    WORK_CAP = 2
    NOT_FINITE = 3
    UNBOUNDED_AT_ZERO = 4
    UNSTABLE = 5
    OSCILLATES = 6
    RESIDUAL = 7
    NEGATIVE = 8
    INVARIANT = 9
    ILL_CONDITIONED = 10
    BLOW_UP = 11
    STEP_TOO_SMALL = 12


class StatusText(NamedTuple):
    """A status in words: its name, what happened, and what to mend."""

    name: str
    sentence: str
    remedy: str


STATUS: dict[Status, StatusText] = {
    Status.OK: StatusText(
        "fine",
        "The balances are solved and every check passed.",
        "Nothing to do.",
    ),
    Status.NOT_CONVERGED: StatusText(
        "not converged",
        "No outlet was found that satisfies the balances.",
        "Check the units of the rate constants and the residence time: are they the right size?",
    ),
    Status.WORK_CAP: StatusText(
        "too much work",
        "The case was given up after its allowance of steps.",
        "Check the rate constants for a slip in units, or ask for a shorter residence time.",
    ),
    Status.NOT_FINITE: StatusText(
        "rate law undefined",
        "A rate law has no finite value at a concentration met on the way"
        " (division by zero, logarithm of zero or root of a negative number).",
        "Mend the rate law, or feed the species it divides by.",
    ),
    Status.UNBOUNDED_AT_ZERO: StatusText(
        "unbounded at zero",
        "A species is used up (or was never there) whose rate law grows without bound as it vanishes"
        " (negative order).",
        "A negative order holds only above some concentration: use a law with an adsorption term,"
        " such as k*A/(1 + K*A)^2, or a shorter residence time.",
    ),
    Status.UNSTABLE: StatusText(
        "unstable state",
        "The start-up ends on a steady state that the slightest disturbance would leave.",
        "Give Start (first contents of the vessel), for instance a little of the product that drives"
        " the reaction.",
    ),
    Status.OSCILLATES: StatusText(
        "keeps oscillating",
        "The tank does not come to rest: its concentrations keep swinging.",
        "There is no steady outlet to report at these conditions: change the residence time or the feed,"
        " or give Start near the state you mean.",
    ),
    Status.RESIDUAL: StatusText(
        "balance not closed",
        "The balance of a species does not close to rounding.",
        "Check the rate constants for a slip in units.",
    ),
    Status.NEGATIVE: StatusText(
        "negative concentration",
        "A concentration came out below zero.",
        "Check the rate laws: does each vanish when a species that it consumes is used up?",
    ),
    Status.INVARIANT: StatusText(
        "total not conserved",
        "A total that no reaction changes differs between feed and outlet.",
        "Check the rate constants for a slip in units.",
    ),
    Status.ILL_CONDITIONED: StatusText(
        "digits lost",
        "The outlet depends so strongly on the last digits of the inputs that it can't be given reliably.",
        "The conditions sit at an ignition or extinction, or the constants differ by too many decades:"
        " move away a little, or leave out what is negligible.",
    ),
    Status.BLOW_UP: StatusText(
        "concentrations run away",
        "A concentration grows beyond all bounds within a finite residence time.",
        "Check signs and units: the reactions make more than they use up. A real runaway needs the judgement"
        " of a licensed engineer.",
    ),
    Status.STEP_TOO_SMALL: StatusText(
        "could not go on",
        "A rate law changes so abruptly along the tube that it could not be followed any further.",
        "Look for abs, min, max or a division in the rate laws that jumps at the concentrations met.",
    ),
}
