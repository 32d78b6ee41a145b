"""Phase budget and wanted figures in every format: what is exact, what is paper, what was run."""

from __future__ import annotations

import json
import re

import pytest
from msgspec.structs import replace

from tauledger.record import PhaseBudget, PhaseRow, Remedy, UnityStep, WantChange, WantFacts
from tauledger.report.csv import to_csv
from tauledger.report.html import to_html
from tauledger.report.json import to_json
from tauledger.report.layout import SYMBOLS
from tauledger.report.markdown import to_markdown
from tauledger.report.tables.wants import cells, change_text, heads, verdict
from tauledger.report.terminal import render

from .literal import ECHO_PREAMP
from .test_loop import WIRE

BUDGET = PhaseBudget(
    at_hz=21.9e6,
    margin_deg=31.5,
    rows=(
        PhaseRow("dominant pole", "pole", -1180.0, 0.0, 90.0, "1/(2π·R1·C)", "R1 = 611 kΩ at y", 1186.0, 89.99, 0.005),
        PhaseRow("zero", "zero", 85.5e6, 0.0, 14.3),
        PhaseRow("zero", "zero", -55.3e6, 0.0, -21.6),
        PhaseRow("pole pair", "pole", -30e6, 40e6, 65.8),
    ),
    others=1,
    others_deg=0.02,
    rest_deg=-0.02,
    stage="M6, bridged by CC from out to y",
    by_hand=(
        UnityStep("f_u", "Hz", "gm1/(2π·C_c)", "gm1 = 401 µS (M2)", 28.7e6, 21.9e6, "the second pole sits below it"),
        UnityStep("f_u", "Hz", "with roots", "", 22.2e6, 21.9e6, ""),
        UnityStep("phase margin", "°", "180° − Σ", "", 29.4, 31.5, ""),
    ),
)
REACHED = Remedy(
    changes=(
        WantChange("RZ", "Ω", None, 823.6, new=True, beside="CC"),
        WantChange("CC", "F", 2.2e-12, 4.036e-12, 3.96e-12, owner="CC"),
    ),
    reaches=True,
    figure=60.0,
    simulated_figure=60.0002,
    f_unity_hz=13.83e6,
    phase_margin_deg=60.0,
    gain_margin_db=18.0,
    f_high_hz=648.0,
    f_low_hz=None,
    gain_db=87.54,
)
BY_ALGEBRA = replace(
    REACHED,
    changes=(WantChange("M6.gm", "S", 1.214e-3, 3.647e-3, 3.257e-3, owner="M6"),),
    simulated_figure=None,
    moves_bias=True,
    says="by algebra alone, all else held",
)
SHORT = replace(
    REACHED,
    changes=(WantChange("RZ", "Ω", None, 823.6, new=True, beside="CC"),),
    reaches=False,
    figure=44.8,
    simulated_figure=44.8,
)
MARGIN = WantFacts("margin", "°", 60.0, 31.5, False, -28.5, (REACHED, BY_ALGEBRA, SHORT))
EDGE = WantFacts("f_h", "Hz", 1e3, 1.18e3, True, 180.0)
FOUND = replace(ECHO_PREAMP, phase_budget=BUDGET, wants=(MARGIN, EDGE))


def lines(**options: bool) -> list[str]:
    return render(FOUND, color=False, unicode=options.get("unicode", True)).splitlines()


def test_the_terminal_shows_degrees_exact_and_by_hand_and_what_is_left() -> None:
    text = "\n".join(lines())
    assert re.search(r"PHASE USED UP at 21.90 MHz +exact +used +by hand +off +by hand", text)
    assert re.search(r"dominant pole +1.180 kHz +90.0° +1.186 kHz +\+0.50 % +90.0°", text)
    assert re.search(r"zero, right half plane +85.50 MHz +14.3°\n", text)
    assert re.search(r"zero, left half plane +55.30 MHz +-21.6°\n", text)
    assert re.search(r"pole pair +50.00 MHz +65.8°\n", text)
    assert re.search(r"1 other +0.0°\n", text)
    assert re.search(r"left for the margin +31.5°\n", text)
    assert not re.search(r"^  delay ", text, re.MULTILINE)
    assert re.search(r"phase margin +29.4° +31.5° +-2.1°", text)
    assert "the second pole sits below it" in text


def test_what_delays_take_has_a_row_where_there_is_any() -> None:
    delayed = replace(FOUND, phase_budget=replace(BUDGET, rest_deg=3.2))
    assert re.search(r"\n  delay +3.2°\n", render(delayed, color=False, unicode=True))


def test_the_terminal_says_what_a_margin_takes_and_what_is_met() -> None:
    text = "\n".join(lines())
    assert "WANTED  phase margin 60° at least: now 31.5°, missed by 28.5°" in text
    assert "WANTED  f_H 1 kHz at least: now 1.180 kHz, met with 180.0 Hz to spare" in text
    assert "824 Ω (1/gm) in series with CC, and CC" in text
    assert "824 Ω (1/gm) in series with CC: not enough" in text
    assert re.search(r"4.036 pF +3.960 pF +60.0° +60.0° +13.83 MHz +87.54 dB", text)
    assert re.search(r"gm of M6§ +3.647 mS +3.257 mS +60.0° +– +13.83 MHz +87.54 dB", text)
    assert "§ moves the operating point; by algebra alone" in re.sub(r"\s+", " ", text)


@pytest.mark.parametrize("unicode", [True, False])
def test_no_line_is_longer_than_the_page(unicode: bool) -> None:
    found = lines(unicode=unicode)
    assert max(len(line) for line in found) <= 80
    if not unicode:
        assert not set(SYMBOLS) & set("".join(found))


@pytest.mark.parametrize(
    ("quantity", "unit", "columns"),
    [
        ("margin", "°", "margin ngspice f_u gain"),
        ("gain_margin", "dB", "gain margin ngspice f_u gain"),
        ("f_u", "Hz", "f_u ngspice margin gain"),
        ("f_h", "Hz", "f_H ngspice gain"),
        ("f_l", "Hz", "f_L ngspice gain"),
    ],
)
def test_every_wanted_figure_has_its_columns_in_every_table(quantity: str, unit: str, columns: str) -> None:
    found = replace(ECHO_PREAMP, wants=(replace(MARGIN, quantity=quantity, unit=unit),))
    text = re.sub(" +", " ", render(found, color=False, unicode=True))
    assert f"WHAT IT TAKES value by slope {columns}\n" in text
    assert f"| change | value | by slope | {' | '.join(heads(found.wants[0])[2:])} |" in to_markdown(found).decode()


def test_page_and_markdown_have_both_sections() -> None:
    page, text = to_html(FOUND).decode(), to_markdown(FOUND).decode()
    for title in ("Phase used up at unity gain", "What it takes"):
        assert f">{title}</h2>" in page
        assert f"### {title}" in text
    assert "Wanted: phase margin 60° at least: now 31.5°, missed by 28.5°." in text
    assert "left for the margin" in text
    assert "Unity gain by hand" in text
    assert "- **dominant pole** 1/(2π·R1·C), R1 = 611 kΩ at y" in text
    assert "- **f_u** gm1 = 401 µS (M2); the second pole sits below it" in text


def test_csv_and_json_carry_them_field_for_field() -> None:
    table = to_csv(FOUND).decode()
    assert "phase_budget.rows,dominant pole,used_deg,90.0,degree\r\n" in table
    assert "phase_budget,,margin_deg,31.5,degree\r\n" in table
    assert "wants.remedies.changes,1/1/CC,first_order,3.96e-12," in table
    document = json.loads(to_json(FOUND))
    assert document["phase_budget"]["rows"][0]["hand_hz"] == 1186.0
    assert document["wants"][0]["remedies"][1]["simulated_figure"] is None


def test_nothing_of_it_where_nothing_was_found_or_asked() -> None:
    text = render(ECHO_PREAMP, color=False, unicode=True)
    assert "PHASE USED UP" not in text
    assert "WANTED" not in text
    assert "What it takes" not in to_markdown(ECHO_PREAMP).decode()
    assert "phase_budget" not in to_csv(ECHO_PREAMP).decode().replace("phase_budget,,phase_budget,,\r\n", "")


def test_a_figure_without_an_end_is_met_and_what_nothing_reaches_says_so() -> None:
    endless = replace(EDGE, now=None, slack=None)
    assert verdict(endless, FOUND) == "f_H 1 kHz: met, the response has no end there"
    none = replace(MARGIN, remedies=(SHORT,), says="no single change of these reaches it")
    assert verdict(none, FOUND).endswith("missed by 28.5°; no single change of these reaches it")
    assert change_text(SHORT).endswith(": not enough")


def test_what_cannot_be_known_is_said_and_a_card_in_a_subcircuit_keeps_its_name() -> None:
    unknown = replace(MARGIN, now=None, slack=None, says="nothing can be worked out", remedies=())
    assert verdict(unknown, FOUND) == "phase margin 60°: nothing can be worked out"
    inside = replace(REACHED, changes=(WantChange("X1.CC", "F", 2e-12, 4e-12, owner="X1.CC"),))
    assert change_text(inside) == "X1.CC"


def test_what_is_put_in_says_where_and_its_value_stands_in_its_column() -> None:
    change = WantChange("CX", "F", None, 7.07e-12, new=True, beside="out to b", owner="CX")
    one = replace(REACHED, changes=(change,))
    assert cells(MARGIN, one, ECHO_PREAMP)[:3] == ("C put in, out to b", "7.070 pF", "")


def test_the_gain_beside_it_stands_in_its_own_decibel() -> None:
    current_driven = replace(ECHO_PREAMP, midband=replace(ECHO_PREAMP.midband, unit="Ω"))
    for review, level in ((ECHO_PREAMP, "dB"), (current_driven, "dBΩ")):
        assert cells(MARGIN, REACHED, review)[-1] == f"{REACHED.gain_db:.2f} {level}"


def test_a_wanted_margin_of_a_closed_amplifier_says_whose_margin_it_is() -> None:
    closed = replace(FOUND, loops=(WIRE,))
    assert verdict(MARGIN, closed).endswith(
        "(as if the amplifier were closed once more with a gain of 1; its own loop has 62.0°)"
    )
    asked = replace(FOUND, loops=(replace(WIRE, found=False),))
    assert verdict(MARGIN, asked) == verdict(MARGIN, FOUND)
