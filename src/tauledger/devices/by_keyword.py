"""Transistors by their small-signal values, as a book prints them: keyword calls instead of a netlist.

    review_elements(
        voltage_source("VIN", "s", "0", 1.0),
        resistance("RS", "s", "b", 300),
        bipolar("Q1", base="b", collector="out", emitter="0", gm=40e-3, r_pi=3125, c_pi=20.7e-12, c_mu=0.5e-12),
        resistance("RC", "out", "0", 1200),
        output="out",
    )

Supplies are ground here: for small signals they are the same node.
"""

from __future__ import annotations

from collections.abc import Mapping

from tauledger.circuit import GROUND
from tauledger.devices.family import Device, Terminal, Transconductor, inner_node
from tauledger.devices.parts import Part, capacitance, conductance, resistance, transconductance
from tauledger.errors import InputError


def bipolar(
    name: str,
    *,
    base: str,
    collector: str,
    emitter: str,
    gm: float,
    r_pi: float | None = None,
    r_o: float | None = None,
    r_b: float = 0.0,
    c_pi: float = 0.0,
    c_mu: float = 0.0,
    c_cs: float = 0.0,
) -> Device:
    """Give a bipolar transistor by its hybrid-π values: S, Ω and F; c_cs from collector to ground.

    None or 0 leaves an element out; r_b puts the inner base behind it.
    Raises InputError for a value that is not positive.
    """
    _positive(name, {"gm": gm, "r_pi": r_pi, "r_o": r_o}, {"r_b": r_b, "c_pi": c_pi, "c_mu": c_mu, "c_cs": c_cs})
    inner = inner_node(name, "b") if r_b else base
    parts = [transconductance(name, (collector, emitter), (inner, emitter), gm, "gm")]
    parts += [conductance(name, base, inner, 1.0 / r_b, "g_b")] if r_b else []
    parts += [resistance(name, inner, emitter, r_pi, "g_pi")] if r_pi is not None else []
    parts += [resistance(name, collector, emitter, r_o, "g_o")] if r_o is not None else []
    parts += _charged(
        capacitance(name, inner, emitter, c_pi, "c_pi"),
        capacitance(name, inner, collector, c_mu, "c_mu"),
        capacitance(name, collector, GROUND, c_cs, "c_sub"),
    )
    figures = {"gm": gm, "r_pi": r_pi, "r_o": r_o, "c_pi": c_pi or None, "c_mu": c_mu or None}
    return Device(
        name=name,
        kind="bipolar",
        region="active",
        figures=tuple((symbol, value) for symbol, value in figures.items() if value is not None),
        terminals=(
            Terminal("collector", collector, collector),
            Terminal("base", base, inner),
            Terminal("emitter", emitter, emitter),
        ),
        cell=Transconductor(name, inner, emitter, collector, gm, r_pi, r_o),
        parts=_unshorted(parts),
        without_charge=not any(part.kind == "capacitance" for part in parts),
    )


def field_effect(
    name: str,
    *,
    gate: str,
    drain: str,
    source: str,
    gm: float,
    r_o: float | None = None,
    g_mb: float = 0.0,
    c_gs: float = 0.0,
    c_gd: float = 0.0,
    c_db: float = 0.0,
    c_sb: float = 0.0,
) -> Device:
    """Give a field-effect transistor by its small-signal values: S, Ω and F; the body is ground.

    None or 0 leaves an element out.
    Raises InputError for a value that is not positive.
    """
    charges = {"c_gs": c_gs, "c_gd": c_gd, "c_db": c_db, "c_sb": c_sb}
    _positive(name, {"gm": gm, "r_o": r_o}, {"g_mb": g_mb, **charges})
    parts = [transconductance(name, (drain, source), (gate, source), gm, "gm")]
    parts += [transconductance(name, (drain, source), (GROUND, source), g_mb, "g_mb")] if g_mb else []
    parts += [resistance(name, drain, source, r_o, "g_o")] if r_o is not None else []
    parts += _charged(
        capacitance(name, gate, source, c_gs, "c_gs"),
        capacitance(name, gate, drain, c_gd, "c_gd"),
        capacitance(name, drain, GROUND, c_db, "c_db"),
        capacitance(name, source, GROUND, c_sb, "c_sb"),
    )
    figures = {"gm": gm, "g_mb": g_mb or None, "r_o": r_o, "c_gs": c_gs or None, "c_gd": c_gd or None}
    return Device(
        name=name,
        kind="field-effect",
        region="saturation",
        figures=tuple((symbol, value) for symbol, value in figures.items() if value is not None),
        terminals=(
            Terminal("drain", drain, drain),
            Terminal("gate", gate, gate),
            Terminal("source", source, source),
        ),
        cell=Transconductor(name, gate, source, drain, gm, None, r_o, GROUND if g_mb else None, g_mb),
        parts=_unshorted(parts),
        without_charge=not any(part.kind == "capacitance" for part in parts),
    )


def _positive(name: str, above: Mapping[str, float | None], not_below: Mapping[str, float]) -> None:
    """Raise InputError for the first value that is not above zero, or below it; NaN is neither."""
    wrong = [key for key, value in above.items() if value is not None and not value > 0.0]
    wrong += [key for key, value in not_below.items() if not value >= 0.0]
    if wrong:
        value = {**above, **not_below}[wrong[0]]
        raise InputError(
            f"{name}: {wrong[0]} = {value!r}", "small-signal values are positive; leave out what is not there"
        )


def _charged(*parts: Part) -> list[Part]:
    return [part for part in parts if part.value]


def _unshorted(parts: list[Part]) -> tuple[Part, ...]:
    """Leave out what stands between one node and itself: a diode-connected transistor's c_mu carries nothing."""
    return tuple(part for part in parts if part.nodes[0] != part.nodes[1] and part.nodes[-2] != part.nodes[-1])
