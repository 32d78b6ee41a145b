"""Each looking-in rule against the solved network, the printed short forms, and published examples."""

from __future__ import annotations

import math

import pytest
from msgspec.structs import replace

from cells import circuit_of, near
from tauledger.devices.parts import Part, resistance, transconductance
from tauledger.hand.elements import Cell
from tauledger.hand.rules import RULES, Outside
from tauledger.hand.rules.bipolar import BASE, COLLECTOR, EMITTER
from tauledger.hand.rules.field_effect import DRAIN, GATE, SOURCE
from tauledger.hand.rules.rule import Rule
from tauledger.hand.rules.two_terminal import DIODE_BOTTOM, DIODE_TOP, diode_through_resistance_ohm

R_B, R_E, R_C = 1.2e3, 330.0, 4.7e3
GM, BETA, R_O, GMB = 0.04, 150.0, 50e3, 0.008

BIPOLAR = Cell("Q1", "p", "s", "o", GM, BETA / GM, R_O)
FIELD_EFFECT = Cell("M1", "p", "s", "o", GM, math.inf, R_O, "0", GMB)
OUTSIDE = Outside(control=R_B, common=R_E, output=R_C)


def solved(*cell: Part, node: str, opened: str) -> float:
    """Drive the node with what the others see, its own outside resistance left out, and solve the network."""
    around = [
        resistance(f"R{end}", end, "0", ohm) for end, ohm in (("p", R_B), ("s", R_E), ("o", R_C)) if end != opened
    ]
    return circuit_of(*cell, *around, output=node).z(node, node)


HYBRID_PI = (
    transconductance("Q1", ("o", "s"), ("p", "s"), GM, "gm"),
    resistance("Q1", "p", "s", BETA / GM, "g_pi"),
    resistance("Q1", "o", "s", R_O, "g_o"),
)
MOS = (
    transconductance("M1", ("o", "s"), ("p", "s"), GM, "gm"),
    transconductance("M1", ("o", "s"), ("0", "s"), GMB, "gmb"),
    resistance("M1", "o", "s", R_O, "g_o"),
)


@pytest.mark.parametrize(
    ("rule", "cell", "parts", "node"),
    [
        (BASE, BIPOLAR, HYBRID_PI, "p"),
        (EMITTER, BIPOLAR, HYBRID_PI, "s"),
        (COLLECTOR, BIPOLAR, HYBRID_PI, "o"),
        (SOURCE, FIELD_EFFECT, MOS, "s"),
        (DRAIN, FIELD_EFFECT, MOS, "o"),
    ],
    ids=lambda value: value.name if isinstance(value, Rule) else "",
)
def test_the_closed_form_is_the_driving_point_resistance(
    rule: Rule, cell: Cell, parts: tuple[Part, ...], node: str
) -> None:
    assert rule.ohm(cell, OUTSIDE) == near(solved(*parts, node=node, opened=node), rel=1e-9)


def test_a_diode_connected_transistor_with_body_effect_is_exact_from_both_ends() -> None:
    parts = (
        transconductance("M1", ("o", "s"), ("o", "s"), GM, "gm"),
        transconductance("M1", ("o", "s"), ("0", "s"), GMB, "gmb"),
        resistance("M1", "o", "s", R_O, "g_o"),
    )
    cell = Cell("M1", "o", "s", "o", GM, math.inf, R_O, "0", GMB)
    top = circuit_of(*parts, resistance("RS", "s", "0", R_E), output="o").z("o", "o")
    bottom = circuit_of(*parts, resistance("RD", "o", "0", R_C), output="s").z("s", "s")
    assert DIODE_TOP.ohm(cell, OUTSIDE) == near(top, rel=1e-9)
    assert DIODE_BOTTOM.ohm(cell, OUTSIDE) == near(bottom, rel=1e-9)


def test_a_transistor_diode_connected_outside_its_series_resistances_is_one_resistance() -> None:
    parts = (
        resistance("rb", "m", "p", 120.0),
        resistance("rc", "m", "o", 3.0),
        transconductance("Q1", ("o", "0"), ("p", "0"), GM, "gm"),
        resistance("Q1", "p", "0", BETA / GM, "g_pi"),
        resistance("Q1", "o", "0", R_O, "g_o"),
    )
    assert diode_through_resistance_ohm(BIPOLAR, 120.0, 3.0) == near(
        circuit_of(*parts, output="m").z("m", "m"), rel=1e-9
    )


@pytest.mark.parametrize("rule", RULES, ids=lambda rule: rule.name)
def test_a_short_form_is_the_limit_of_its_rule_for_high_r_o(rule: Rule) -> None:
    if rule.short_ohm is None:
        assert not rule.short
        return
    bipolar = rule in (BASE, EMITTER, COLLECTOR)
    cell = Cell("Q1", "p", "s", "o", GM, BETA / GM if bipolar else math.inf, 1e9)
    around = Outside(control=0.0 if rule is COLLECTOR else R_B, common=R_E, output=R_C)
    assert rule.short_ohm(cell, around) == near(rule.ohm(cell, around), rel=1e-4)


@pytest.mark.parametrize("rule", RULES, ids=lambda rule: rule.name)
def test_every_rule_says_where_it_holds_and_who_says_so(rule: Rule) -> None:
    assert rule.formula
    assert rule.valid
    assert rule.source


def test_open_surroundings_give_a_resistance_and_never_a_nan() -> None:
    opened = Outside(math.inf, math.inf, math.inf)
    for cell in (BIPOLAR, replace(BIPOLAR, gm=0.0), replace(BIPOLAR, gm=0.0, r_o=math.inf)):
        for rule in (BASE, EMITTER, COLLECTOR, DIODE_TOP, DIODE_BOTTOM):
            assert not math.isnan(rule.ohm(cell, opened))
    for cell in (FIELD_EFFECT, replace(FIELD_EFFECT, gm=0.0, g_mb=0.0), Cell("G1", "p", "s", "o", 0.0)):
        for rule in (SOURCE, DRAIN, DIODE_TOP, DIODE_BOTTOM):
            assert not math.isnan(rule.ohm(cell, opened))


def test_base_with_an_open_emitter_ends_in_r_o_and_the_collector() -> None:
    value = BASE.ohm(BIPOLAR, Outside(0.0, math.inf, R_C))
    assert value == near(BIPOLAR.r_pi + (BETA + 1) * R_O + R_C)


def test_emitter_of_a_common_emitter_design_example() -> None:
    """Sedra and Smith, Microelectronic Circuits, 5th-7th ed., low-frequency design example, from memory: 72 ohm at C_E.

    R_sig 5 kohm ‖ R_B 100 kohm, gm 40 mA/V, beta 100.
    """
    cell = Cell("Q1", "p", "s", "o", 0.04, 2500.0)
    seen = EMITTER.ohm(cell, Outside(control=5e3 * 100e3 / 105e3))
    assert seen == near(72.0, rel=0.005)


def test_source_of_a_cascode_transistor_with_finite_r_o() -> None:
    """Practice values after Sedra and Smith, 8th ed., ch. 10: gm 2 mA/V, r_o 100 kohm, R_L 50 kohm, printed 746 ohm.

    The network gives (r_o + R_L)/(1 + gm·r_o) = 746.3 ohm; 1/gm alone would be 500 ohm.
    """
    cell = Cell("M2", "0", "x", "out", 2e-3, math.inf, 100e3)
    assert SOURCE.ohm(cell, Outside(output=50e3)) == near(746.0, rel=1e-3)


def test_drain_above_a_degeneration_resistance() -> None:
    """Practice values after Sedra and Smith, 8th ed., ch. 10: printed r_o2·gm·r_o1 = 20 Mohm, in full 20.2."""
    cell = Cell("M2", "0", "x", "out", 2e-3, math.inf, 100e3)
    assert DRAIN.ohm(cell, Outside(common=100e3)) == near(20.2e6, rel=1e-3)


def test_the_body_effect_lowers_the_resistance_into_a_source_by_gm_over_gm_plus_gmb() -> None:
    cell = Cell("M1", "g", "s", "0", 2e-3, math.inf, math.inf, "0", 0.4e-3)
    assert SOURCE.ohm(cell, Outside()) == near(1 / 2.4e-3)


def test_a_body_away_from_ground_is_left_to_the_solved_network() -> None:
    cell = Cell("M1", "g", "s", "d", 2e-3, math.inf, math.inf, "w", 0.4e-3)
    assert SOURCE.ohm(cell, Outside()) == near(1 / 2e-3)


def test_nothing_flows_into_a_gate() -> None:
    assert math.isinf(GATE.ohm(FIELD_EFFECT, OUTSIDE))
