"""Fourteen netlists of our own, one per role group, for the table of hand against exact and simulated.

Receiver parts of the river-level gauge; every board names the role that its last stage must get.
"""

from __future__ import annotations

from collections.abc import Mapping

from msgspec import Struct

MODELS = """
.model qn npn(is=6e-15 bf=220 vaf=85 rb=120 re=0.4 rc=3 cje=9p mje=0.34 cjc=3.6p mjc=0.33 tf=350p)
.model qp pnp(is=6e-15 bf=160 vaf=45 rb=90 re=0.5 rc=4 cje=11p mje=0.35 cjc=5p mjc=0.35 tf=600p)
.ac dec 10 1 1g
.print ac v(out)
.end
"""
SOURCE = "VIN in 0 DC 0 AC 1\nRS in s 600\n"
DIVIDER = "VCC vcc 0 12\nC1 s b 10u\nR1 vcc b 82k\nR2 b 0 22k\n"


class RoleBoard(Struct, frozen=True):
    """One netlist, and words that the last stage's role and surroundings must contain."""

    cards: str
    role: str

    @property
    def netlist(self) -> str:
        return f"River-level gauge, {self.role}\n{self.cards}{MODELS}"


ROLE_BOARDS: Mapping[str, RoleBoard] = {
    "common emitter": RoleBoard(
        f"{SOURCE}{DIVIDER}Q1 c b e qn\nRC vcc c 3.3k\nRE e 0 1k\nCE e 0 100u\nC2 c out 10u\nRL out 0 10k\n"
        "CL out 0 33p\n",
        "common emitter",
    ),
    "degenerated": RoleBoard(
        f"{SOURCE}{DIVIDER}Q1 c b e qn\nRC vcc c 3.3k\nRE e f 100\nRF f 0 1k\nCE f 0 100u\nC2 c out 10u\n"
        "RL out 0 10k\nCL out 0 33p\n",
        "common emitter, degenerated",
    ),
    "common base": RoleBoard(
        "VIN in 0 DC 0 AC 1\nRS in s 50\nVCC vcc 0 12\nC1 s e 100u\nRE e 0 1k\nR1 vcc b 82k\nR2 b 0 22k\nCB b 0 10u\n"
        "Q1 c b e qn\nRC vcc c 3.3k\nC2 c out 10u\nRL out 0 10k\nCL out 0 15p\n",
        "common base",
    ),
    "emitter follower": RoleBoard(
        "VIN in 0 DC 0 AC 1\nRS in s 10k\nVCC vcc 0 12\nC1 s b 10u\nR1 vcc b 47k\nR2 b 0 47k\nQ1 vcc b out qn\n"
        "RE out 0 2.2k\nCL out 0 100p\n",
        "emitter follower (common collector)",
    ),
    "cascode": RoleBoard(
        f"{SOURCE}VCC vcc 0 15\nC1 s b 10u\nR0 vcc v 33k\nCV v 0 10u\nR1 v b 15k\nR2 b 0 16k\nQ1 x b e qn\n"
        "Q2 c v x qn\nRC vcc c 3.3k\nRE e 0 1.8k\nCE e 0 100u\nC2 c out 10u\nRL out 0 10k\nCL out 0 22p\n",
        "common base",
    ),
    "folded cascode": RoleBoard(
        f"{SOURCE}{DIVIDER}Q1 x b e qn\nRE e 0 1k\nCE e 0 100u\nRX vcc x 1k\nVB vb 0 8\nQ2 c vb x qp\nRC c 0 2.2k\n"
        "C2 c out 10u\nRL out 0 10k\nCL out 0 22p\n",
        "common base",
    ),
    "Darlington": RoleBoard(
        "VIN in 0 DC 6 AC 1\nRS in b 22k\nVCC vcc 0 12\nQ1 vcc b m qn\nQ2 vcc m out qn\nRB m 0 22k\nRE out 0 470\n"
        "CL out 0 47p\n",
        "Darlington with Q1",
    ),
    "complementary pair": RoleBoard(
        "VIN in 0 DC 5 AC 1\nRS in b 10k\nVCC vcc 0 12\nQ1 m b out qn\nRM vcc m 1k\nQ2 out m vcc qp\nRE out 0 680\n"
        "CL out 0 47p\n",
        "complementary pair with Q1",
    ),
    "balanced pair": RoleBoard(
        "VCC vcc 0 12\nVEE vee 0 -12\nVP ip 0 DC 0 AC 0.5\nVN im 0 DC 0 AC 0.5 180\nRSP ip bp 300\nRSN im bn 300\n"
        "QP out bp ep qn\nQN outn bn en qn\nREP ep t 47\nREN en t 47\nRT t vee 5.6k\nRCP vcc out 5.6k\n"
        "RCN vcc outn 5.6k\nCLP out 0 12p\nCLN outn 0 12p\n",
        "common emitter, degenerated",
    ),
    "pair with mirror load": RoleBoard(
        "VCC vcc 0 12\nVEE vee 0 -12\nVIN in 0 DC 0 AC 1\nRS in bp 1k\nQP m bp t qn\nQN out bn t qn\nRG bn 0 1k\n"
        "RT t vee 11k\nQ3 m m vcc qp\nQ4 out m vcc qp\nVREF ref 0 11\nRL out ref 20k\nCL out 0 10p\n",
        "mirror load Q4",
    ),
    "current mirror": RoleBoard(
        "VCC vcc 0 5\nIIN 0 m DC 1m AC 1\nQ1 m m 0 qn\nQ2 out m 0 qn\nRL vcc out 1k\nCL out 0 10p\n",
        "current mirror output",
    ),
    "class-AB followers at rest": RoleBoard(
        "VCC vcc 0 12\nVEE vee 0 -12\nVIN in 0 DC 0 AC 1\nRS in b 1k\nVB1 bn b 0.65\nVB2 b bp 0.65\nQ1 vcc bn en qn\n"
        "Q2 vee bp ep qp\nRE1 en out 10\nRE2 ep out 10\nRL out 0 600\nCL out 0 220p\n",
        "emitter follower (common collector)",
    ),
    "bootstrapped bias": RoleBoard(
        "VCC vcc 0 12\nVIN in 0 DC 0 AC 1\nRS in s 100k\nC1 s b 1u\nR1 vcc x 100k\nR2 x 0 100k\nR3 x b 100k\n"
        "C2 e x 10u\nQ1 vcc b e qn\nRE e 0 4.7k\nC3 e out 10u\nRL out 0 10k\n",
        "emitter follower (common collector)",
    ),
    "shunt feedback": RoleBoard(
        f"{SOURCE}VCC vcc 0 12\nC1 s b 10u\nRF c b 100k\nQ1 c b 0 qn\nRC vcc c 3.3k\nC2 c out 10u\nRL out 0 10k\n"
        "CL out 0 33p\n",
        "through RF",
    ),
}
