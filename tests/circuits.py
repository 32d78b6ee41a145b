"""Circuits for tests, written as short cards, without the netlist room.

`board("VIN in 0 1", "R1 in out 1k", ...)` gives a Circuit with plain numbers or short suffixes (meg for 10^6), and
name=value parameters. Voltage and current sources take their DC value. E, F, G, H are "E1 a b c d gain" (F, H: the
name of a source in the place of the control nodes) or "E1 a b POLY c d e f : p0 p1 ..."; K is "K1 L1 L2 0.9". An R, C
or L with a model or parameters, or a device, is an Element: nodes, the model's name, parameters; flags are bare.
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from tauledger.circuit import GROUND, Circuit, Drive, Element, Model, Passives, Port, fold

SUFFIXES = {"meg": 1e6, "f": 1e-15, "p": 1e-12, "n": 1e-9, "u": 1e-6, "m": 1e-3, "k": 1e3, "g": 1e9}

# An npn and a pnp of nobody in particular: every part of the model is there, so that leaving one out shows.
NPN = Model(
    "qn",
    "npn",
    1,
    tuple(
        {
            **{"is": 5e-15, "bf": 180.0, "br": 3.0, "vaf": 60.0, "var": 15.0, "ikf": 0.08, "ise": 1e-14, "ne": 1.7},
            **{"rb": 90.0, "rc": 12.0, "re": 1.1, "xcjc": 0.6},
            **{"cje": 8e-12, "vje": 0.7, "mje": 0.35, "cjc": 4e-12, "vjc": 0.6, "mjc": 0.33},
            **{"cjs": 2e-12, "vjs": 0.6, "mjs": 0.4, "fc": 0.5},
            **{"tf": 4e-10, "xtf": 3.0, "vtf": 5.0, "itf": 0.1, "tr": 5e-8, "xtb": 1.5},
        }.items()
    ),
    card=0,
    path=0,
)
PNP = Model("qp", "pnp", 1, NPN.parameters, card=0, path=0)


def changed(model: Model, name: str = "", /, **parameters: float) -> Model:
    """Give the model with some parameters (folded names) set otherwise, under another name if asked."""
    values = {**dict(model.parameters), **parameters}
    return Model(name or model.name, model.type, model.level, tuple(values.items()), model.card, model.path)


def number(text: str) -> float:
    """Read a number with at most one suffix."""
    for suffix, factor in SUFFIXES.items():
        if text.endswith(suffix):
            return float(f"{float(text.removesuffix(suffix)) * factor:.15g}")
    return float(text)


def board(
    *cards: str,
    models: tuple[Model, ...] = (NPN, PNP),
    drive: Mapping[str, complex] | None = None,
    output: str | Port = "out",
    temperature_c: float = 27.0,
    tnom_c: float = 27.0,
    options: tuple[tuple[str, float], ...] = (),
) -> Circuit:
    """Build a circuit from cards.

    drive: AC amplitude by source name. output: a node, or a port. Only models that a card names are kept.
    """
    nodes: dict[str, tuple[int, str]] = {GROUND: (0, GROUND)}

    def node(name: str) -> int:
        return nodes.setdefault(fold(name), (len(nodes), name))[0]

    passives: list[tuple[str, str, int, int, float, int]] = []
    elements: list[Element] = []
    for card, line in enumerate(cards, start=1):
        name, *words = line.split()
        letter = name[0].upper()
        given = dict(word.split("=") for word in words if "=" in word)
        plain = [word for word in words if "=" not in word]
        parameters = [(fold(key), number(value)) for key, value in given.items()]
        model = ""
        references: tuple[str, ...] = ()
        polynomial: tuple[float, ...] = ()
        known = {fold(m.name): m.name for m in models}
        flags = [word for word in plain if word in ("on", "off")]
        plain = [word for word in plain if word not in flags]
        parameters += [(flag, 1.0) for flag in flags]
        if letter in "EFGH" and "POLY" in plain:
            at, colon = plain.index("POLY"), plain.index(":")
            ends, controls = plain[:at], plain[at + 1 : colon]
            polynomial = tuple(number(word) for word in plain[colon + 1 :])
            ends, references = (ends + controls, ()) if letter in "EG" else (ends, tuple(controls))
        elif letter in "FH":
            ends, references, parameters = plain[:2], (plain[2],), [("gain", number(plain[3])), *parameters]
        elif letter in "EG":
            ends, parameters = plain[:4], [("gain", number(plain[4])), *parameters]
        elif letter == "K":
            ends, references, parameters = [], (plain[0], plain[1]), [("coupling", number(plain[2]))]
        elif letter in "VI":
            ends, parameters = plain[:2], [("dc", number(plain[2])), *parameters]
        elif letter in "RCL" and len(plain) == 3 and not parameters and fold(plain[2]) not in known:
            passives.append((letter, name, node(plain[0]), node(plain[1]), number(plain[2]), card))
            continue
        elif letter in "RCL":
            ends = plain[:2]
            model = next((known[fold(word)] for word in plain[2:] if fold(word) in known), "")
            values = [word for word in plain[2:] if fold(word) not in known]
            parameters = [*(("value", number(word)) for word in values), *parameters]
        elif letter == "T":
            ends = plain
        else:
            ends, model = plain[:-1], plain[-1]
            if letter == "W":
                ends, references = plain[:2], (plain[2],)
        numbers = tuple(node(end) for end in ends)
        elements.append(Element(letter, name, numbers, model, tuple(parameters), card, 0, references, polynomial))
    kinds = {fold(element.name): element.letter for element in elements}
    return Circuit(
        title="a board",
        nodes=tuple(name for _, name in nodes.values()),
        passives=Passives(
            "".join(p[0] for p in passives),
            tuple(p[1] for p in passives),
            np.array([p[2] for p in passives], dtype=np.int32),
            np.array([p[3] for p in passives], dtype=np.int32),
            np.array([p[4] for p in passives], dtype=float),
            np.array([p[5] for p in passives], dtype=np.int32),
            np.zeros(len(passives), dtype=np.int32),
        ),
        elements=tuple(elements),
        models=tuple(model for model in models if any(e.model == model.name for e in elements)),
        drive=tuple(
            Drive(source, "voltage" if kinds[fold(source)] == "V" else "current", amplitude)
            for source, amplitude in (drive or {}).items()
        ),
        output=output if isinstance(output, Port) else Port(output),
        temperature_c=temperature_c,
        tnom_c=tnom_c,
        options=options,
    )


def preamp(**keywords: float) -> Circuit:
    """Give a one-transistor common-emitter stage, coupled in and out, emitter bypassed, at the temperature asked."""
    return board(
        "VCC vcc 0 12",
        "VIN echo 0 0",
        "RS echo in 600",
        "C1 in b 220n",
        "R1 vcc b 47k",
        "R2 b 0 12k",
        "RC vcc c 3.9k",
        "RE e 0 1.5k",
        "CE e 0 4.7u",
        "Q1 c b e qn",
        "C3 c out 100n",
        "RL out 0 10k",
        "CL out 0 100p",
        drive={"VIN": 1.0},
        temperature_c=keywords.get("temperature_c", 27.0),
    )
