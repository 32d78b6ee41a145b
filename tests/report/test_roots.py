"""Poles and zeros as a table: whether all of them decay, what makes the edge; their names do not lie on each other."""

from __future__ import annotations

import re

import pytest
from msgspec.structs import replace

from report.literal import ECHO_PREAMP
from tauledger.record import NoteFacts, Owner, PoleFacts, Review, ZeroFacts
from tauledger.report.charts.plane import plane_chart
from tauledger.report.tables.roots import roots_table, stable_as_drawn

STABLE = "All poles lie in the left half-plane"
GROWING = PoleFacts(2e3, 0.0, None, "", None, ())
DELAYED = PoleFacts(-2e9, 0.0, None, "", None, (Owner("Q1.gm.delay", 1.0),))
AIDS = NoteFacts("measuring-aids", "", "measuring aids left out: LFB 1 GH")


def test_that_all_poles_decay_is_said_below_them() -> None:
    assert stable_as_drawn(ECHO_PREAMP)
    assert STABLE in roots_table(ECHO_PREAMP).note


@pytest.mark.parametrize(
    "review",
    [
        replace(ECHO_PREAMP, poles=(*ECHO_PREAMP.poles, GROWING)),
        replace(ECHO_PREAMP, poles=(*ECHO_PREAMP.poles, DELAYED)),
        replace(ECHO_PREAMP, poles=()),
        replace(ECHO_PREAMP, notes=(*ECHO_PREAMP.notes, AIDS)),
    ],
    ids=["one grows", "a delay has more of them", "none is known", "the loop is held open"],
)
def test_it_is_not_said_where_it_is_not_so_or_not_known(review: Review) -> None:
    assert not stable_as_drawn(review)
    assert STABLE not in roots_table(review).note


def test_a_pair_at_the_edge_makes_it_even_where_its_effect_cannot_be_told() -> None:
    assert ECHO_PREAMP.f_high is not None
    hz = ECHO_PREAMP.f_high.exact_hz or 0.0
    near, far = (PoleFacts(-0.6 * at, 0.8 * at, None, "", None, (), f0_hz=at, q=0.83) for at in (hz, 9.0 * hz))
    rows = roots_table(replace(ECHO_PREAMP, poles=(near, far))).rows
    assert "makes f_H" in rows[0].cells
    assert "makes f_H" not in rows[1].cells


def test_names_of_roots_close_to_each_other_stand_at_different_heights() -> None:
    pair = PoleFacts(-2e5, 5e5, None, "", None, (), f0_hz=5.4e5, q=1.3)
    crowd = tuple(PoleFacts(-at, 0.0, None, "", None, ()) for at in (4.0e5, 4.1e5))
    drawn = plane_chart(replace(ECHO_PREAMP, poles=(*crowd, pair), zeros=(ZeroFacts(-4.05e5, 0.0),)))
    heights = {
        name: float(y)
        for y, name in re.findall(r"<text[^>]*?translate\([\d.]+ ([\d.]+)\)[^>]*>([pz]\d)</text>", drawn)
        or [(y, name) for y, name in re.findall(r'<text[^>]* y="([\d.]+)"[^>]*>([pz]\d)</text>', drawn)]
    }
    assert len({heights[name] for name in ("p1", "p2", "z1")}) == 3
