"""All that the hand side knows, as a list: looking-in rules, forms for loops, Miller's split, methods for a band edge.

The list is what `tauledger methods` prints; rules come from the rules themselves, so that neither can drift.
"""

from __future__ import annotations

from msgspec import Struct

from tauledger.hand.compensation import FORMULAS, GRAY
from tauledger.hand.rules import RULES
from tauledger.hand.rules.transformer import FORMULA as TRANSFORMER_FORMULA
from tauledger.hand.rules.transformer import SOURCE as TRANSFORMER_SOURCE
from tauledger.hand.rules.transformer import VALID as TRANSFORMER_VALID

HAJIMIRI = "Hajimiri, IEEE Trans. Circuits Syst. I 57(6), 2010 (time and transfer constants)"
MEASURED = "measured over 311 networks: own boards, published cases and random ones of one to three stages"
SEDRA = "Sedra and Smith, Microelectronic Circuits, 8th ed."


class Entry(Struct, frozen=True):
    """One rule or method: group, name, formula as written on paper, where it holds, and who published it.

    short: the form that paper has instead where it is good enough, empty without one.
    """

    group: str
    name: str
    formula: str
    valid: str
    source: str
    short: str = ""


LOOPS: tuple[Entry, ...] = (
    Entry(
        "loops and bridges",
        "one loop",
        "R = R0/(1 + T)",
        "one gm closes the loop; R0 with that gm at zero is reached by the rules; exact, T from the solved network",
        "Blackman, Bell Syst. Tech. J. 22(3), 1943 (from memory)",
    ),
    Entry(
        "loops and bridges",
        "bridging resistor by Miller",
        "R_F/(1 − K) at the node from which K is driven",
        "K between the two ends by hand, driven from the node itself; not at the far end",
        "Miller, Scientific Papers of the Bureau of Standards 15(351), 1920",
    ),
    Entry(
        "loops and bridges",
        "branch form",
        "1/R = Σ (1 − K_m)/R_m",
        "all branches at the node passive; K_m of their far ends from the solved network",
        "Kirchhoff's current law at the node",
    ),
    Entry(
        "loops and bridges",
        "half circuit",
        "axis at ground, bridging R/2 and 2·C",
        "both halves equal within 1e-6 and driven in opposite phase",
        f"{GRAY}, sec. 3.5.5 (from memory)",
    ),
    Entry(
        "loops and bridges",
        "both ends",
        "R = R_a·(1 − K_ab) + R_b·(1 − K_ba)",
        "a capacitance between two live nodes; across a common emitter's C_μ it is R_B·(1 + gm·R_C) + R_C",
        f"{GRAY}, sec. 7.3.2",
    ),
)

INDUCTORS: tuple[Entry, ...] = (
    Entry("looking in", "through a transformer", TRANSFORMER_FORMULA, TRANSFORMER_VALID, TRANSFORMER_SOURCE),
    Entry(
        "inductors",
        "transformer drawn out",
        "leakage L1·(1 − k²), magnetising inductance k²·L1, turns n = √(L2/L1)/k",
        "two windings of k ≥ 0.9; exact, not an approximation",
        TRANSFORMER_SOURCE,
    ),
    Entry(
        "inductors",
        "lower edge",
        "f = R/(2π·L)",
        "an inductor that is open at mid-band, as L_m or a choke; R across it, source and load in parallel",
        TRANSFORMER_SOURCE,
    ),
    Entry(
        "inductors",
        "upper edge",
        "τ = L/R, beside R·C in the sums",
        "an inductor that is short at mid-band, as leakage or a peaking coil; R faces it, source and load in series; "
        "no node has a pole of its own where a pair of poles becomes complex",
        HAJIMIRI,
    ),
)

RECOMMENDED: tuple[Entry, ...] = (
    Entry(
        "which method",
        "sum of time constants",
        "where σ < 0.5 and b1²/b2 > 10",
        "σ = b2/Σ τ_i·τ_j: well below 1 the poles split and the first is 1/b1; the sum is then 0 to 14 % low",
        MEASURED,
    ),
    Entry(
        "which method",
        "all nodes (capacitors) together",
        "where 0.5 ≤ σ ≤ 1.5 and the dominant poles are real",
        "the time constants hardly act on each other: each is a pole of its own",
        MEASURED,
    ),
    Entry(
        "which method",
        "two coefficients",
        "where σ > 1.5, poles are complex or close together, or are hidden under zeros",
        "f0 and Q from b1 and b2; more than two poles make it low",
        MEASURED,
    ),
    Entry(
        "which method",
        "another one",
        "where it is at least 4 % nearer than the one above: the simplest within 4 % of the best",
        "the conditions were measured over many networks, a circuit may be an odd one",
        MEASURED,
    ),
    Entry(
        "which method",
        "none",
        "where a zero moves the edge by more than 10 %, no method comes within 10 %, or one time constant alone is "
        "nearer by 5 %",
        "no sum of time constants sees zeros; one that is right alone is so by luck, its errors cancel",
        MEASURED,
    ),
)

LOWER_POLES: tuple[Entry, ...] = (
    Entry(
        "poles",
        "of one capacitor",
        "f = 1/(2π·R·C), R/(2π·L) of an inductor",
        "one capacitor owns the pole by 60 % or more; those of higher poles open, those of lower ones short",
        "Cochrun and Grabel, IEEE Trans. Circuit Theory CT-20(1), 1973, with 1/s for s",
    ),
    Entry(
        "poles",
        "k-th of the lower edge",
        "f = a_k/(2π·a_(k−1))",
        "a factor of 4 or more to the poles on either side",
        "Cochrun and Grabel, IEEE Trans. Circuit Theory CT-20(1), 1973, with 1/s for s",
    ),
)

GLOBAL: tuple[Entry, ...] = (
    Entry(
        "global feedback",
        "return ratio",
        "T0 = gm·R_C·K1·K2·…, R_C and every gain K round to the base with that gm at zero",
        "one loop; opened at its last inverting transistor, whose own r_e and r_o count in T",
        f"Bode, Network Analysis and Feedback Amplifier Design, 1945; {GRAY}, sec. 8.8 (from memory)",
    ),
    Entry(
        "global feedback",
        "ideal gain, shunt feedback",
        "A∞ = −R_F for a current, −R_F/R_S for a voltage behind R_S",
        "one resistor from the output to the base or gate of the first transistor; T0 large",
        f"{GRAY}, sec. 8.5 (from memory)",
    ),
    Entry(
        "global feedback",
        "ideal gain, series feedback",
        "A∞ = 1 + R_F/R_E",
        "R_F from the output to the emitter or source of the first transistor, R_E from there to ground; T0 large",
        f"{GRAY}, sec. 8.4 (from memory)",
    ),
    Entry(
        "global feedback",
        "asymptotic gain",
        "A = A∞·T/(1 + T) + A0/(1 + T)",
        "always, T, A∞ (T → ∞) and A0 (T = 0) of one source; paper leaves A0 out",
        "Rosenstark, IEEE Trans. Education E-17(4), 1974 (from memory)",
    ),
    Entry(
        "global feedback",
        "closed-loop band edge",
        "f_H = f_T·(1 + T0), f_T the edge of T; β·GBW where T0 is large",
        "T has one pole up to where |T| = 1, and nothing outside of the loop falls before; source and load are in T",
        "common practice",
    ),
    Entry(
        "global feedback",
        "noise gain",
        "f_H = GBW/(1/β), 1/β = output of the amplifier over what of it comes back to its inputs",
        "an operational amplifier with one pole; 1/β flat up to f_H",
        "common practice",
    ),
    Entry(
        "global feedback",
        "double injection",
        "1/(1 + T) = v1 + i1 = 1/(1 + T_v) + 1/(1 + T_i)",
        "any wire of the closed loop; equals the return ratio where nothing passes the wire backwards but by a "
        "reciprocal way, and at the wire of a controlled source",
        "Middlebrook, Int. J. Electronics 38(4), 1975 (from memory)",
    ),
)

CAPACITANCES: tuple[Entry, ...] = (
    Entry(
        "Miller's split",
        "at the driven end",
        "C·(1 − K), K the gain driven from this node to the other end",
        "the gain is still the mid-band one at the edge; the signed gain of the bridged nodes, not the overall one",
        "Miller, 1920; Gray et al., sec. 7.2",
    ),
    Entry(
        "Miller's split",
        "at the far end",
        "C·(1 + 1/|A|)",
        "gain −|A| with |A| ≥ 1; no pole of its own follows from it",
        "Gray et al., sec. 7.2",
    ),
)

METHODS: tuple[Entry, ...] = (
    Entry(
        "band edge",
        "lowest node alone",
        "f = 1/(2π·max R·C)",
        "one node dominates and the others together hold less than a few per cent of Σ R·C",
        "common practice",
    ),
    Entry(
        "band edge",
        "all nodes together",
        "Π √(1 + (2πf·R·C)²) = √2",
        "nodes that do not act on each other (0.5 ≤ σ ≤ 1.5), real poles",
        "common practice",
    ),
    Entry(
        "band edge",
        "sum of time constants",
        "f_H = 1/(2π·Σ R·C); f_L = Σ 1/(2π·R·C)",
        "a dominant real pole (σ < 0.5, b1²/b2 > 10), no zero near: then on the safe side",
        f"{GRAY}, sec. 7.3.2 and 7.4",
    ),
    Entry(
        "band edge",
        "weighted sum",
        "f_H = 1/(2π·Σ w·R·C), w = 1 − H(C shorted)/H",
        "as the sum, where capacitances that the output does not see (decoupling) are in it; Σ w·R·C is the delay",
        HAJIMIRI,
    ),
    Entry(
        "band edge",
        "root of sum of squares",
        "f = 1/(2π·√(Σ 1/p² − 2·Σ 1/z²))",
        "real poles; 0.5 % off for two poles ten to one apart, 10 % for two equal ones",
        f"{SEDRA}, sec. 10.3.2 (from memory)",
    ),
    Entry(
        "band edge",
        "two coefficients",
        "|1 + b1·jω + b2·(jω)²| = √2, b1 = Σ τ_i, b2 = Σ τ_i·τ_j with i shorted",
        "two poles count, real or complex, no zero near",
        "Cochrun and Grabel, IEEE Trans. Circuit Theory CT-20(1), 1973",
    ),
    Entry("band edge", "all poles", "Π |1 − jω/p| = √2", "no zero near the edge", f"{GRAY}, sec. 7.3"),
    Entry("band edge", "exact", "|H(jω)| = |H_mid|/√2 of the rebuilt network", "always", "algebra"),
    Entry("band edge", "simulated", "the same crossing in ngspice's sweep, refined to 1e-6", "always", "ngspice"),
)


def entries() -> tuple[Entry, ...]:
    """Give every rule and method, in the order in which a reader needs them."""
    rules = tuple(Entry("looking in", rule.name, rule.formula, rule.valid, rule.source, rule.short) for rule in RULES)
    compensation = tuple(Entry("unity gain", f.name, f.written, f.valid, f.source) for f in FORMULAS)
    return (*rules, *INDUCTORS, *LOOPS, *GLOBAL, *CAPACITANCES, *METHODS, *RECOMMENDED, *LOWER_POLES, *compensation)
