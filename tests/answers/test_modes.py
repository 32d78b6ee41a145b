"""Differential and common mode: linear combinations of single drives, in algebra and in ngspice."""

from __future__ import annotations

import math
from pathlib import Path

import pytest

from tauledger.engine.client import Engine
from tauledger.errors import InputError
from tauledger.pipeline import review
from tauledger.record import Review
from tauledger.report.document import document
from tauledger.report.layout import lay_out
from tauledger.report.modes import modes

FIXTURES = Path(__file__).parents[2] / "fixtures"
PAIR = (FIXTURES / "pair.cir").read_text(encoding="utf-8")


def written(folder: Path, *edits: tuple[str, str]) -> Path:
    text = PAIR
    for old, new in edits:
        assert old in text
        text = text.replace(old, new)
    path = folder / "pair.cir"
    path.write_text(text, encoding="utf-8")
    return path


def gain(one: Review) -> complex:
    return complex(one.midband.gain_real, one.midband.gain_imag)


def lines(one: Review) -> list[str]:
    return [line.text for line in lay_out([modes(one)], width=80, unicode=True, page=60)]


def test_the_gains_are_half_the_difference_and_the_sum_of_single_drives(engine: Engine) -> None:
    one = review(FIXTURES / "pair.cir", engine=engine, output="outp")
    assert one.modes is not None
    assert (one.modes.plus, one.modes.minus, one.modes.unit) == ("VINP", "VINN", "V/V")
    by_p, by_n = (
        gain(review(FIXTURES / "pair.cir", engine=engine, output="outp", drive=name, midband_hz=0.0))
        for name in ("VINP", "VINN")
    )
    row = one.modes.rows[0]
    assert row.at == "mid-band"
    differential, common = 20 * math.log10(abs(by_p - by_n) / 2), 20 * math.log10(abs(by_p + by_n))
    assert row.differential_db == pytest.approx(differential)
    assert row.common_db == pytest.approx(common)
    assert row.cmrr_db == pytest.approx(differential - common)


def test_the_differential_gain_is_that_of_the_review(engine: Engine) -> None:
    one = review(FIXTURES / "pair.cir", engine=engine, output="outp")
    assert one.modes is not None
    assert one.f_high is not None
    middle, edge = one.modes.rows
    assert middle.differential_db == pytest.approx(one.midband.gain_db)
    assert edge.hz == one.f_high.exact_hz
    assert edge.differential_db == pytest.approx(one.midband.gain_db - 20 * math.log10(math.sqrt(2)), abs=1e-6)


def test_common_mode_gain_is_the_collector_resistor_over_twice_the_tail(engine: Engine) -> None:
    """−R_C‖R_L,half/(2·R_T + R_E + r_e): 5.6 kΩ ‖ (20 kΩ to the other half, which moves alike) over 2·5.6 kΩ + 47 Ω."""
    one = review(FIXTURES / "pair.cir", engine=engine, output="outp")
    assert one.modes is not None
    common = one.modes.rows[0].common_db
    assert common is not None
    assert 10 ** (common / 20) == pytest.approx(5.6e3 / (2 * 5.6e3 + 47 + 26), rel=0.03)


def test_ngspice_gives_the_same_gains(engine: Engine, tmp_path: Path) -> None:
    """One collector resistor 2 % off: the common mode comes through between the collectors, too."""
    one = review(written(tmp_path, ("RCP vcc outp 5.6k", "RCP vcc outp 5.71k")), engine=engine)
    assert one.modes is not None
    for row in one.modes.rows:
        assert row.differential_simulated_db == pytest.approx(row.differential_db, abs=1e-6)
        assert row.common_db is not None
        assert row.common_simulated_db == pytest.approx(row.common_db, abs=1e-6)
        assert row.cmrr_simulated_db == pytest.approx(row.cmrr_db, abs=1e-6)


def test_equal_halves_have_no_common_mode_gain_between_their_outputs(engine: Engine) -> None:
    one = review(FIXTURES / "pair.cir", engine=engine)
    assert one.modes is not None
    assert all(row.common_db is None and row.common_simulated_db is None for row in one.modes.rows)
    assert any("both halves are equal in the netlist" in line for line in lines(one))


def test_two_sources_in_phase_have_both_modes_as_well(engine: Engine, tmp_path: Path) -> None:
    in_phase = review(written(tmp_path, ("AC 0.5 180", "AC 0.5 0")), engine=engine, output="outp")
    opposite = review(FIXTURES / "pair.cir", engine=engine, output="outp")
    assert in_phase.modes is not None
    assert opposite.modes is not None
    assert in_phase.modes.rows[0].cmrr_db == pytest.approx(opposite.modes.rows[0].cmrr_db)


@pytest.mark.parametrize("edit", [("AC 0.5 180", "AC 0.4 180"), ("AC 0.5 180", "AC 0.5 90"), ("AC 0.5 180", "AC 0")])
def test_other_drives_have_no_modes(edit: tuple[str, str], engine: Engine, tmp_path: Path) -> None:
    assert review(written(tmp_path, edit), engine=engine, output="outp").modes is None


def test_a_pair_of_inputs_is_driven_with_a_half_each(engine: Engine, tmp_path: Path) -> None:
    """--input VINN,VINP turns the sign; amplitudes on the cards do not count."""
    plain = review(FIXTURES / "pair.cir", engine=engine, output="outp")
    path = written(tmp_path, ("AC 0.5 180", ""), ("AC 0.5 0", ""))
    turned = review(path, engine=engine, output="outp", drive="VINN,VINP")
    assert turned.modes is not None
    assert (turned.modes.plus, turned.modes.minus) == ("VINN", "VINP")
    assert gain(turned) == pytest.approx(-gain(plain))


@pytest.mark.parametrize(
    ("wanted", "says"),
    [
        ("VINP,VINX", "no voltage or current source is called 'VINX'\n  did you mean 'VINN'?"),
        ("VINP,VINN,VCC", "--input VINP,VINN,VCC: 3 sources"),
        ("VINP,vinp", "twice the same source"),
        ("VINP,", "no voltage or current source is called ''"),
    ],
)
def test_a_pair_that_is_none_gets_one_clear_message(wanted: str, says: str, engine: Engine) -> None:
    with pytest.raises(InputError) as raised:
        review(FIXTURES / "pair.cir", engine=engine, drive=wanted)
    assert says in str(raised.value)


def test_a_voltage_and_a_current_are_no_pair(engine: Engine, tmp_path: Path) -> None:
    path = written(tmp_path, ("RLD outp outn 20k", "RLD outp outn 20k\nITEST outp 0 0"))
    with pytest.raises(InputError, match="a voltage and a current"):
        review(path, engine=engine, drive="VINP,ITEST")


def test_after_the_answer_the_engine_holds_the_deck_of_the_review_again(engine: Engine) -> None:
    one = review(FIXTURES / "pair.cir", engine=engine, output="outp")
    assert abs(complex(engine.sweep([100.0]).response[0])) == pytest.approx(abs(gain(one)), rel=1e-5)


def test_all_formats_show_them(engine: Engine) -> None:
    one = review(FIXTURES / "pair.cir", engine=engine, output="outp")
    assert lines(one)[0].split() == ["MODES", "of", "VINP", "and", "VINN", "differential", "common", "CMRR"]
    section = next(section for section in document(one).sections if section.key == "modes")
    assert section.title == "Differential and common mode"


def test_currents_that_drive_have_their_gains_in_decibels_of_ohms(engine: Engine, tmp_path: Path) -> None:
    edits = (("VINP legp 0 DC 0", "IINP 0 legp DC 0"), ("VINN legn 0 DC 0", "IINN 0 legn DC 0"))
    one = review(written(tmp_path, *edits), engine=engine, output="outp")
    assert one.modes is not None
    assert one.modes.unit == "Ω"
    assert any("dBΩ" in line for line in lines(one))
    for row in one.modes.rows:
        assert row.common_simulated_db == pytest.approx(row.common_db, abs=1e-6)
