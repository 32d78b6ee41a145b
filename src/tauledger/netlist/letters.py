"""Element letters: which are read, and in which words a message speaks of the others."""

from __future__ import annotations

from tauledger.devices.catalogue import FAMILIES

PASSIVES = {"R": "resistor", "C": "capacitor", "L": "inductor"}
SOURCES = {"V": "voltage source", "I": "current source"}
OWN = {**PASSIVES, **SOURCES, "G": "voltage-controlled current source", "X": "subcircuit"}

# Letters with a model, read by their family's own table.
DEVICES = {family.letter: family for family in FAMILIES if family.model_types}

READ = frozenset(OWN) | frozenset(DEVICES)

NOT_READ = {
    "A": "XSPICE code models",
    "B": "behavioural sources",
    "D": "diodes",
    "E": "voltage-controlled voltage sources",
    "F": "current-controlled current sources",
    "H": "current-controlled voltage sources",
    "J": "junction field-effect transistors",
    "K": "coupled inductors",
    "M": "MOS transistors",
    "N": "compiled device models (OSDI)",
    "O": "lossy lines",
    "P": "coupled lines",
    "Q": "bipolar transistors",
    "S": "voltage-controlled switches",
    "T": "transmission lines",
    "U": "RC lines and digital parts",
    "W": "current-controlled switches",
    "Y": "single lossy lines",
    "Z": "MESFETs",
}

TIME_FUNCTIONS = frozenset(["pulse", "sin", "sine", "exp", "pwl", "sffm", "am"])
