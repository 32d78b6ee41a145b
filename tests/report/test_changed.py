"""What was set, and the headline before and after."""

from __future__ import annotations

from msgspec.structs import replace

from report.literal import ECHO_PREAMP
from tauledger.record import MovedFigure, SetValue
from tauledger.report.terminal import render


def page(*moved: MovedFigure) -> list[str]:
    review = replace(ECHO_PREAMP, settings=(SetValue("R3", 4700.0), SetValue("nsmall.bf", 100.0)), moved=moved)
    return render(review, color=False, unicode=True).splitlines()


def test_without_settings_the_page_says_nothing_of_them() -> None:
    assert not any(line.startswith("SET ") for line in render(ECHO_PREAMP, color=False, unicode=True).splitlines())


def test_figures_that_move_stand_before_and_after_and_those_that_read_the_same_below() -> None:
    lines = page(
        MovedFigure("gain", "dB", 39.63, 40.7),
        MovedFigure("f_H simulated", "Hz", 733.5e3, 631.5e3),
        MovedFigure("f_H phase shift", "deg", -47.3, -47.0),
        MovedFigure("f_L simulated", "Hz", None, 12.0),
        MovedFigure("phase margin exact", "deg", 62.5, 58.0),
        MovedFigure("f_H peak", "dB", 0.0, 0.0),
        MovedFigure("plateau to", "Hz", 243.61e3, 243.62e3),
    )
    at = lines.index("SET R3 = 4700, nsmall.bf = 100")
    assert [" ".join(line.split()) for line in lines[at + 1 : at + 8]] == [
        "figure as in the netlist as set change",
        "gain 39.63 dB 40.70 dB +1.07 dB",
        "f_H simulated 733.5 kHz 631.5 kHz -14 %",
        "f_H phase shift -47.3° -47.0° +0.3°",
        "f_L simulated – 12.00 Hz –",
        "phase margin exact 62.5° 58.0° -4.5°",
        "unchanged: f_H peak, plateau to",
    ]


def test_what_was_read_past_is_listed_on_the_verbose_page_alone() -> None:
    review = replace(ECHO_PREAMP, netlist=replace(ECHO_PREAMP.netlist, passed=("board.cir:12: .ac dec 10 1 1meg",)))
    assert ".ac dec 10" not in render(review, color=False, unicode=True)
    lines = render(review, color=False, unicode=True, verbose=True).splitlines()
    assert "  board.cir:12: .ac dec 10 1 1meg" in lines
