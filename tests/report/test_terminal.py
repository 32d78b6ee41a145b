"""The page of text: one snapshot of a literal review, and what changes on it when the review is another."""

from __future__ import annotations

import ast
import math
import re
from pathlib import Path

import pytest
from msgspec.structs import replace

import tauledger
from report.literal import ECHO_PREAMP
from tauledger.record import (
    AgreementFacts,
    Budget,
    CauseFacts,
    DriveFacts,
    EdgePair,
    MidbandFacts,
    NoteFacts,
    Owner,
    Review,
    Working,
)
from tauledger.report.layout import SYMBOLS
from tauledger.report.terminal import render
from tauledger.report.wording import owners_text

PAGE = Path(__file__).with_name("terminal.txt")


def plain(review: Review, *, unicode: bool = True, verbose: bool = False) -> str:
    return render(review, color=False, unicode=unicode, verbose=verbose)


def test_the_page_reads_as_agreed() -> None:
    """After a change that is meant, write it anew: print(plain(ECHO_PREAMP)) > terminal.txt."""
    assert plain(ECHO_PREAMP) == PAGE.read_text(encoding="utf-8")


@pytest.mark.parametrize("unicode", [True, False])
def test_the_page_has_at_most_60_lines_of_80_columns(unicode: bool) -> None:
    lines = plain(ECHO_PREAMP, unicode=unicode).splitlines()
    assert len(lines) <= 60
    assert max(map(len, lines)) <= 80


def test_ascii_loses_nothing_but_symbols() -> None:
    text = plain(ECHO_PREAMP, unicode=False)
    assert text.isascii()
    assert "RL 10 kohm || CL 50 pF" in text
    assert "CE, e to ground 100 uF" in text
    assert re.findall(r"\d+\.\d+", text) == re.findall(r"\d+\.\d+", plain(ECHO_PREAMP))


def test_colour_changes_no_character() -> None:
    colored = render(ECHO_PREAMP, color=True, unicode=True)
    assert "\x1b[" in colored
    assert re.sub(r"\x1b\[[0-9;]*m", "", colored) == plain(ECHO_PREAMP)


def test_same_review_same_text() -> None:
    assert plain(ECHO_PREAMP, verbose=True) == plain(ECHO_PREAMP, verbose=True)


def test_a_title_cannot_steer_the_terminal() -> None:
    netlist = replace(ECHO_PREAMP.netlist, title="\x1b]0;owned\x07 gauge\r\u202e")
    text = plain(replace(ECHO_PREAMP, netlist=netlist))
    assert text.startswith("\\x1b]0;owned\\x07 gauge")
    assert not {"\x1b", "\x07", "\r", "\u202e"} & set(text)


def test_agreement_above_1e_6_warns_on_the_first_line() -> None:
    text = plain(replace(ECHO_PREAMP, agreement=AgreementFacts(3.2e-5, 1.5e6, 261)))
    assert text.splitlines()[0].startswith("WARNING: the rebuilt network differs from ngspice's sweep by 3.2e-05")
    assert "WHOSE CAPACITANCE" in text


def rejected(error: float) -> Review:
    """The review as it is when the network is not trusted: all that rests on it is gone."""
    return replace(
        ECHO_PREAMP,
        agreement=AgreementFacts(error, 1.5e6, 261),
        nodes=(),
        parts=(),
        poles=(),
        zeros=(),
        steps=(),
        estimates=(),
        causes=(),
        stages=(),
        budget=Budget(None, None),
    )


@pytest.mark.parametrize("error", [0.02, math.inf, math.nan])
def test_agreement_above_1e_3_says_what_is_left_out_and_why(error: float) -> None:
    text = plain(rejected(error))
    assert text.startswith("CHECK FAILED: ")
    assert "Left out, for the rebuilt network is not ngspice's: budget, steps" in text
    assert "WHY PAPER" not in text
    assert "nothing of note" not in text


def no_plateau() -> Review:
    midband = MidbandFacts(2.1e3, None, None, -30.0, 12.0, 30.19, "V/V")
    working = {"nodes": (), "steps": (), "estimates": (), "causes": (), "budget": Budget(None, None)}
    return replace(ECHO_PREAMP, midband=midband, **working)


def test_without_a_plateau_the_hand_tables_are_said_to_be_left_out() -> None:
    text = plain(no_plateau())
    assert "the highest gain: there is no plateau" in " ".join(text.split())
    assert "Hand tables are left out: without a plateau" in text
    assert "UPPER EDGE" not in text
    assert "WHOSE CAPACITANCE SETS f_H" in text, "shares do not need a plateau"


def test_where_hand_analysis_is_withheld_no_cause_is_denied() -> None:
    note = NoteFacts(
        "hand-withheld", "", "taking every capacitor as a short or an open misses the gain by more than 2 %"
    )
    text = plain(replace(no_plateau(), midband=ECHO_PREAMP.midband, notes=(note,)))
    assert "Hand tables are left out: the notes below say why." in text
    assert "Note  taking every capacitor as a short" in text
    assert "nothing of note" not in text
    assert "not in the signal path" not in text, "which is only known from the budget"


def test_a_gain_that_is_not_real_is_given_with_its_angle() -> None:
    assert "(32.31 V/V at 158°)" in plain(no_plateau())


def test_a_plateau_down_to_dc_has_no_lower_edge() -> None:
    midband = replace(ECHO_PREAMP.midband, frequency_hz=0.0, from_hz=0.0)
    text = plain(replace(ECHO_PREAMP, f_low=None, midband=midband))
    assert "at DC, plateau from DC to 194 kHz" in text
    assert "f_L: none, the plateau reaches down to DC." in text
    assert "10 % less: f_L" not in text


def test_a_note_about_a_missing_edge_is_not_said_twice() -> None:
    says = "|H| levels off towards DC at -1.2 dB of mid-band and never falls 3 dB"
    text = plain(replace(ECHO_PREAMP, f_low=None, notes=(NoteFacts("levels-off", "f_L", says),)))
    assert "f_L: none" not in text
    assert "Note  f_L: |H| levels off" in text


def test_the_share_of_a_capacitor_that_raises_f_high_is_negative() -> None:
    parts = tuple(
        replace(part, share=EdgePair(-0.12, 0.0)) if part.name == "CL" else part for part in ECHO_PREAMP.parts
    )
    line = next(line for line in plain(replace(ECHO_PREAMP, parts=parts)).splitlines() if line.startswith("  CL   "))
    assert " -12 % " in line


def test_shares_of_the_page_add_to_all_of_them() -> None:
    """Whatever is not worth a row stands in the last one, so that nobody misses a part."""
    text = plain(ECHO_PREAMP)
    table = text[text.index("WHOSE CAPACITANCE") :].split("LOWER EDGE")[0]
    shown = [float(found) for found in re.findall(r"([\d.]+) %(?!,)(?=\s)", table.split("\n", 1)[1])]
    whole = 100.0 * math.fsum(part.share.f_high or 0.0 for part in ECHO_PREAMP.parts)
    assert math.fsum(shown) == pytest.approx(whole, abs=1.0)


def test_a_solved_resistance_is_marked_and_the_mark_explained() -> None:
    assert "†" not in plain(ECHO_PREAMP)
    first = ECHO_PREAMP.nodes[0]
    working = replace(first.working or Working("", "", (), (), None, "solved"), source="solved")
    text = plain(replace(ECHO_PREAMP, nodes=(replace(first, working=working), *ECHO_PREAMP.nodes[1:])))
    assert "428.0 Ω†" in text
    assert "† solved exactly: none of the rules fits this node" in text


def test_only_moves_above_half_a_per_cent_are_steps_and_the_rest_is_not_lost() -> None:
    text = plain(ECHO_PREAMP)
    way = text[text.index("FROM PAPER") : text.index("WHOSE")]
    assert "the time constants by hand are the exact ones" not in way
    assert way.count("kHz  ") >= 4
    slow = tuple(
        replace(step, factor=1.004) if step.step in ("exact-constants", "all-poles", "full") else step
        for step in ECHO_PREAMP.steps
    )
    assert "+1.2 % smaller steps, simulated" in plain(replace(ECHO_PREAMP, steps=slow))


def test_the_capacitances_of_a_node_add_to_its_time_constant() -> None:
    """What is not worth a row of its own is in the last one; 2 % of the whole budget is not."""
    base, collector, _ = ECHO_PREAMP.nodes
    table = plain(ECHO_PREAMP).split("UPPER EDGE")[1]
    for node, rows in ((base, ("C_μ of Q1 2.16 pF × 180.1", "C_π of Q1")), (collector, ("CL", "2 smaller ones"))):
        lines = table.split(node.title)[1].splitlines()[1:3]
        assert [line.strip().startswith(name) for line, name in zip(lines, rows, strict=True)] == [True, True]
        told = [float(found) for line in lines for found in re.findall(r"([\d.]+) ns", line)]
        assert math.fsum(told) * 1e-9 == pytest.approx(node.time_constant_s, rel=2e-3)


def test_parts_inside_a_device_are_named_as_the_trade_does_also_in_sentences() -> None:
    text = plain(ECHO_PREAMP)
    assert "C_μ of Q1 ties both nodes together" in text
    assert "c_mu" not in text


def test_causes_beyond_the_third_are_counted_and_told_by_verbose() -> None:
    fourth = CauseFacts("no-dominant-pole", "f_L", 0.03, "", "no pole dominates", "take both", ())
    review = replace(ECHO_PREAMP, causes=(*ECHO_PREAMP.causes, *ECHO_PREAMP.causes[:1], fourth))
    assert "3 first of 4 causes" in plain(review)
    assert "No pole dominates. Take both." not in plain(review)
    assert "No pole dominates. Take both." in plain(review, verbose=True)


def test_without_causes_the_page_says_so() -> None:
    assert "nothing of note above 2 %" in plain(replace(ECHO_PREAMP, causes=()))


def test_cautions_close_the_page() -> None:
    text = plain(replace(ECHO_PREAMP, cautions=("75 V between nodes: a supply that can injure",)))
    assert text.splitlines()[-1] == "CAUTION: 75 V between nodes: a supply that can injure"
    assert "This is an estimate; it does not replace measuring the board." in text


def test_a_network_without_netlist_says_that_nothing_was_simulated() -> None:
    text = plain(replace(ECHO_PREAMP, engine=None, agreement=None))
    assert "No simulation: all numbers come from the network as given." in text


def test_a_pair_driven_from_both_sides_names_both_sources() -> None:
    drive = (DriveFacts("VP", "voltage", 0.5, 0.0, 300.0), DriveFacts("VN", "voltage", -0.5, 0.0))
    assert "Drive VP 500 mV through 300 Ω, VN -500 mV without series resistor" in plain(
        replace(ECHO_PREAMP, drive=drive)
    )


def test_verbose_shows_every_node_part_pole_and_the_working() -> None:
    text = plain(ECHO_PREAMP, verbose=True)
    for node in ECHO_PREAMP.nodes:
        assert node.title in text
    for name in ("CB1", "CB2", "dQ_be/dV_bc of Q1", "C_sub of Q1"):
        assert name in text
    assert text.count("\n  pole ") == len(ECHO_PREAMP.poles)
    assert "RC ‖ RL ‖ r_o(Q1) = 2.2k ‖ 10k ‖ 31.0k = 1.704k" in text
    assert "Stages  b 0.6659 → out -179.1" in text


def written(module: Path) -> set[str]:
    """The characters outside of ASCII in the texts of a module, its docstrings apart."""
    tree = ast.parse(module.read_text(encoding="utf-8"))
    docstrings = {
        id(node.body[0].value)
        for node in ast.walk(tree)
        if isinstance(node, ast.Module | ast.FunctionDef | ast.ClassDef) and ast.get_docstring(node) is not None
        if isinstance(node.body[0], ast.Expr)
    }
    texts = [node for node in ast.walk(tree) if isinstance(node, ast.Constant) and isinstance(node.value, str)]
    return {c for node in texts if id(node) not in docstrings for c in str(node.value) if not c.isascii()}


# Set by the page alone, shown in messages only, or white space.
ELSEWHERE = {"\u00a0", "\u200b", "\ufeff", "␡", "�", "○"}


def test_every_symbol_that_the_program_writes_has_a_spelling_in_ascii() -> None:
    found = {c for module in (Path(tauledger.__file__).parent).rglob("*.py") for c in written(module)}
    assert found - ELSEWHERE <= set(SYMBOLS), sorted(found - ELSEWHERE - set(SYMBOLS))


def test_the_owner_of_a_delay_s_pole_is_named_as_one_would_say_it() -> None:
    owners = (Owner("X1.Q1.gm.delay", 0.9), Owner("Q1.c_mu", 0.2))
    assert owners_text(owners, {"Q1.c_mu": "C_μ of Q1"}) == "delay of X1.Q1 90 %, C_μ of Q1 20 %"
