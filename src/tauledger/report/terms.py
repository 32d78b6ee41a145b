"""The terms of the report, each explained once, in a sentence or two, where it first comes up."""

from __future__ import annotations

from collections.abc import Iterable

TERMS = {
    "Mid-band": "the plateau of highest gain. Everything else is referred to the gain there.",
    "Band edge": "f_L and f_H are where the gain has fallen by 3 dB below mid-band, going down and going up.",
    "By hand, exact, simulated": (
        "by hand is what one writes on paper, exact is algebra on the small-signal network that was rebuilt "
        "from the operating point, simulated is the sweep of ngspice."
    ),
    "Signal node": (
        "the netlist nodes that are one at mid-band, joined by coupling capacitors; a transistor's inner node "
        "belongs to its terminal."
    ),
    "R": (
        "the resistance that a capacitance at the node faces, looking into everything connected there; R by hand by "
        "the rules of paper, R exact that of the network."
    ),
    "R inside a device": (
        "behind the series resistance of a transistor’s base, collector or emitter R is another than at the node "
        "outside; the rows “at …” say which place it belongs to."
    ),
    "Time constant": "R·C of one node. The larger it is, the lower the frequency where the node stops following.",
    "Miller factor": (
        "a capacitance between two nodes counts (1 − K) times at the first, K being the gain from there to its other "
        "end: more than once where the two move against each other, less than once where they move together."
    ),
    "1 pF more": "what one more picofarad from that node to ground, a probe or a longer trace, does to f_H.",
    "Share": (
        "how much of f_H one capacitance decides: a share of 40 % means that 1 % less of it raises f_H by "
        "about 0.4 %. Exact, and all shares together make 100 %. A negative share: more of it raises f_H."
    ),
    "Slowest node alone": "the estimate that takes the largest time constant and forgets the others.",
    "Sum of time constants": (
        "the estimate 1/(2π·Σ R·C), here with the exact R·C of every part. It takes every node and "
        "stays a little below the truth as long as the "
        "poles are real."
    ),
    "Coefficients b₁, b₂": (
        "the gain falls as 1/(1 + b₁·s + b₂·s² + …) above mid-band. b₁ is the exact sum of all time constants, in s; "
        "1/b₁ and b₁/b₂ are angular frequencies, in Hz divided by 2π. Below mid-band a₁, in rad/s, is the exact sum of "
        "the lower edges, and a₂/a₁ the second pole. They have nothing to do with nodes called a1 or b1."
    ),
    "σ": (
        "how the capacitances act on each other: 1 means not at all, a small number that the poles have moved far "
        "apart, a large one that they have moved together, then into a complex pair."
    ),
    "Pole, zero": (
        "where the slope of the gain changes, going up in frequency: by 20 dB a decade downwards at each pole, upwards "
        "at each zero. Poles below mid-band therefore end the rise of the gain that zeros at DC began."
    ),
    "Edge alone": "1/(2π·R·C) of one capacitor with all the others taken as shorts.",
    "Bypass zero": "below it a bypass capacitor no longer shorts its resistor and the gain levels off.",
    "gm, r_π, r_o, C_π, C_μ, f_T": (
        "transconductance, input and output resistance, base-emitter and base-collector capacitance, and the "
        "frequency where the current gain is one."
    ),
    "C_bx": (
        "the part of the base-collector capacitance that lies outside the base resistance (1 − XCJC of the model); "
        "C_μ is the part inside. The budget has them apart, for they face different resistances; C_μ + C_bx is what a "
        "data sheet gives."
    ),
    "dQ_be/dV_bc": (
        "a transcapacitance: base-emitter charge that follows the base-collector voltage, because the transit time "
        "does. It is no capacitance between two nodes, so paper leaves it out; it may be negative."
    ),
    "gm, g_mb, r_o, C_gs, C_gd, C_db, C_sb, f_T": (
        "transconductance from gate and from body, output resistance, capacitance between gate and source, gate and "
        "drain, drain and body, source and body, and the frequency where the current gain is one."
    ),
    "Return ratio": (
        "what comes back to a source, or past a wire, for one unit that it sends out. T large: the "
        "feedback elements make the gain, ideal gain A∞. T small: the gain is what leaks past, feedthrough A0."
    ),
    "Agreement": (
        "the largest relative difference between the response of the rebuilt network and the sweep of ngspice."
    ),
    "Unity gain, phase margin, gain margin": (
        "f_u is where the gain has fallen to 1. The phase margin is what the phase there, from 0° or 180° at mid-band, "
        "leaves of 180°; the gain margin how far the gain is from 1 where all 180° are used up. With all of the output "
        "fed back the amplifier rings the more the less is left, and oscillates when nothing is."
    ),
    "Recomputed": "the whole network solved again with that part changed, the operating point held.",
}


def unexplained(wanted: Iterable[str], explained: set[str]) -> tuple[tuple[str, str], ...]:
    """Give the terms not yet explained with their sentences, and note in `explained` that they are now."""
    fresh = [term for term in wanted if term not in explained]
    explained.update(fresh)
    return tuple((term, TERMS[term]) for term in fresh)
