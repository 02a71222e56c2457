"""What the rules of a computer or a user say about macros and add-ins of Excel."""

from collections.abc import Iterator
from dataclasses import dataclass

from moletally.hosts.windows import registry

__all__ = ["Rule", "rules"]

POLICIES = (r"Software\Policies\Microsoft\Office", r"Software\Policies\Microsoft\Cloud\Office")
OWN = r"Software\Microsoft\Office"
ASK_IT = "ask IT to allow the add-in from Excel's start-up folder"


@dataclass(frozen=True, slots=True)
class Rule:
    """A rule that was found set.

    stops : True if the add-in can't run under it, False if it can, None if that can't be told from here
    mend : what to do about it, "" if it does not stop the add-in
    """

    text: str
    stops: bool | None
    mend: str = ""


# Value below ...\Excel\Security, the numbers that matter, the rule. Macros of a trusted folder run even where
# macros are off without a question: table of settings in Microsoft's reference, Document.MacrosEnabled (Visio).
KNOWN = (
    (r"\Trusted Locations", "AllLocationsDisabled", (1,),
     Rule("a policy switches trusted locations off (AllLocationsDisabled)", True, ASK_IT)),
    ("", "DisableAllAddins", (1,),
     Rule("a policy switches all add-ins off (DisableAllAddins)", True, ASK_IT)),
    ("", "RequireAddinSig", (1,),
     Rule("a policy asks for signed add-ins (RequireAddinSig); this one is not signed", None, ASK_IT)),
    ("", "VBAWarnings", (3, 4),
     Rule("a policy switches macros off outside trusted locations (VBAWarnings)", False)),
    ("", "blockcontentexecutionfrominternet", (1,),
     Rule("a policy blocks macros in files from the internet; the installed file carries no such mark", False)),
)  # fmt: skip
OWN_CHOICE = Rule(
    "trusted locations are switched off in Excel's own options",
    True,
    "in Excel: File, Options, Trust Center, Trust Center Settings, Trusted Locations: "
    'untick "Disable all Trusted Locations"',
)


def rules() -> list[Rule]:
    """All rules set for this user or computer, each once."""
    return list(dict.fromkeys(_found()))


def _found() -> Iterator[Rule]:
    for security in registry.security_keys(*POLICIES):
        for below, name, numbers, rule in KNOWN:
            if registry.number(security, below, name) in numbers:
                yield rule
    for security in registry.security_keys(OWN):
        if registry.number(security, r"\Trusted Locations", "AllLocationsDisabled") == 1:
            yield OWN_CHOICE
