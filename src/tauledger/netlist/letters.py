"""Element letters: which are read, how their cards are laid out, and in which words a message speaks of them.

Which of them can be reviewed is not said here: the device families are asked (`families.py`).
"""

from __future__ import annotations

from msgspec import Struct


class Letter(Struct, frozen=True):
    """A letter whose card is nodes, then a model: how many nodes at least and at most, and the types of its model.

    words: what one is called. plural: the same in a list of what is not supported. area: whether a number behind the
    model is the area.
    """

    words: str
    plural: str
    least: int
    most: int
    model_types: tuple[str, ...]
    terminals: tuple[str, ...] = ()
    area: bool = False


PASSIVES = {"R": "resistor", "C": "capacitor", "L": "inductor"}
PASSIVE_MODELS = {"R": ("r", "res"), "C": ("c", "cap"), "L": ("l", "ind")}
SOURCES = {"V": "voltage source", "I": "current source"}
CONTROLLED = {
    "E": "voltage-controlled voltage source",
    "F": "current-controlled current source",
    "G": "voltage-controlled current source",
    "H": "current-controlled voltage source",
}
OWN = {
    **PASSIVES,
    **SOURCES,
    **CONTROLLED,
    "B": "behavioural source",
    "K": "coupling of two inductors",
    "T": "lossless line",
    "X": "subcircuit",
}

MODELLED = {
    "D": Letter("diode", "diodes", 2, 3, ("d",), ("anode", "cathode", "thermal"), area=True),
    "Q": Letter(
        "bipolar transistor",
        "bipolar transistors",
        3,
        5,
        ("npn", "pnp"),
        ("collector", "base", "emitter", "substrate", "thermal"),
        area=True,
    ),
    "J": Letter(
        "junction field-effect transistor",
        "junction field-effect transistors",
        3,
        3,
        ("njf", "pjf"),
        ("drain", "gate", "source"),
        area=True,
    ),
    "M": Letter(
        "MOS transistor",
        "MOS transistors",
        3,
        7,
        ("nmos", "pmos", "vdmos", "nsoi", "psoi"),
        ("drain", "gate", "source", "bulk"),
    ),
    "Z": Letter("MESFET", "MESFETs", 3, 3, ("nmf", "pmf", "nhfet", "phfet"), ("drain", "gate", "source"), area=True),
    "S": Letter(
        "voltage-controlled switch",
        "voltage-controlled switches",
        4,
        4,
        ("sw",),
        ("plus", "minus", "control plus", "control minus"),
    ),
    "W": Letter("current-controlled switch", "current-controlled switches", 2, 2, ("csw",), ("plus", "minus")),
    "O": Letter("lossy line", "lossy lines", 4, 4, ("ltra",), ("near plus", "near minus", "far plus", "far minus")),
    "U": Letter("distributed RC line", "distributed RC lines", 3, 3, ("urc",), ("near", "far", "capacitances")),
    "Y": Letter("single lossy line", "single lossy lines", 4, 4, ("txl",), ("near", "ground", "far", "ground")),
    "P": Letter(
        "set of coupled lines", "coupled lines", 4, 40, ("cpl",), ("near nodes ..", "ground", "far nodes ..", "ground")
    ),
}

READ = frozenset(OWN) | frozenset(MODELLED)

NOT_READ = {"A": "XSPICE code models", "N": "compiled device models (OSDI)"}

PLURAL = {
    "B": "behavioural sources",
    "E": "voltage-controlled voltage sources",
    "F": "current-controlled current sources",
    "H": "current-controlled voltage sources",
    "G": "voltage-controlled current sources",
    "K": "coupled inductors",
    "T": "transmission lines",
    **{letter: entry.plural for letter, entry in MODELLED.items()},
}

MODEL_TYPES = frozenset(kind for entry in MODELLED.values() for kind in entry.model_types) | frozenset(
    kind for kinds in PASSIVE_MODELS.values() for kind in kinds
)

TIME_FUNCTIONS = frozenset(["pulse", "sin", "sine", "exp", "pwl", "sffm", "am", "trnoise", "trrandom"])
