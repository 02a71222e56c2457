"""The labels of a reactor: what each measures, and whether this version solves for it."""

from dataclasses import dataclass
from enum import Enum

from moletally.sheet.reading.grid import fold

__all__ = ["LABELS", "Kind", "Label", "canonical"]


class Kind(Enum):
    """What a label's value is."""

    TEXT = "a word"
    NUMBER = "a number"


@dataclass(frozen=True, slots=True)
class Label:
    """A label of the reactor table; `later` where it belongs to a model that is not solved yet."""

    name: str
    kind: Kind = Kind.NUMBER
    later: bool = False


LABELS: dict[str, Label] = {
    fold(label.name): label
    for label in (
        Label("Residence time"),
        Label("Volume"),
        Label("Flow"),
        Label("Space velocity", later=True),
        Label("Catalyst mass"),
        Label("Bulk density"),
        Label("Temperature"),
        Label("Pressure"),
        Label("Phase", Kind.TEXT),
        Label("Heat", Kind.TEXT),
        Label("Feed temperature", later=True),
        Label("Start temperature", later=True),
        Label("Volumetric heat capacity", later=True),
        Label("UA", later=True),
        Label("UA per volume", later=True),
        Label("U", later=True),
        Label("Heat transfer area", later=True),
        Label("Tube diameter", later=True),
        Label("Coolant temperature", later=True),
        Label("Coolant heat flow", later=True),
        Label("Coolant direction", Kind.TEXT, later=True),
        Label("Particle diameter", later=True),
        Label("Void fraction", later=True),
        Label("Viscosity", later=True),
        Label("Cross-section", later=True),
        Label("Catalyst density", later=True),
        Label("Pressure drop parameter", later=True),
    )
}


def canonical(text: str) -> str:
    """The label's own spelling, or the text as it stands (a constant, k(2), in(A))."""
    label = LABELS.get(fold(text))
    return label.name if label else text
