"""Slips that are read all the same: each has a note at its place, and what is written right has none."""

from __future__ import annotations

from pathlib import Path

import pytest

from tauledger.circuit import Circuit
from tauledger.netlist import elaborate, read
from tauledger.pipeline import review

PAD = "River-level gauge, pad\nVIN in 0 AC 1\nR1 in out 1k\nC1 out 0 100p\n"


def circuit_of(folder: Path, text: str) -> Circuit:
    path = folder / "board.cir"
    path.write_text(text)
    return elaborate(read(path))


def notes_of(folder: Path, text: str) -> list[str]:
    return [f"{note.where.rpartition(':')[2]} {note.says}" for note in circuit_of(folder, text).notes]


@pytest.mark.parametrize("filler", ["", "".join(f"RF{k} in out 1meg\n" for k in range(12))])
@pytest.mark.parametrize("value", ["3.3kk", "3.3KK", "3.3kmeg", "3.3ku"])
def test_a_second_suffix_is_no_factor_and_a_note_says_so(tmp_path: Path, value: str, filler: str) -> None:
    line = f"R2 out 0 {value}\n"
    text = PAD + filler + line
    where = text.count("\n")
    assert notes_of(tmp_path, text) == [
        f"{where} {value} is {value[:4]}, as ngspice reads it: what follows a suffix is a unit"
    ]


@pytest.mark.parametrize("value", ["3.3k", "3.3kohm", "3.3meg", "3.3megohm", "100mm", "1um", "1nF", "1pf"])
def test_a_unit_behind_a_suffix_needs_no_note(tmp_path: Path, value: str) -> None:
    assert notes_of(tmp_path, PAD + f"R2 out 0 {value}\n") == []


def test_a_negative_resistance_is_reviewed_as_written_with_a_note(tmp_path: Path) -> None:
    board = tmp_path / "board.cir"
    board.write_text(PAD + "R2 out 0 -5k\n")
    found = review(board)
    # 1k against -5k: the gain is 5/4, and the output sees 1.25 kΩ.
    assert found.midband.gain_db == pytest.approx(1.9382, abs=1e-3)
    assert found.f_high is not None
    assert found.f_high.simulated_hz == pytest.approx(1.0 / (2 * 3.141592653589793 * 1.25e3 * 100e-12), rel=1e-4)
    assert found.f_high.exact_hz == pytest.approx(found.f_high.simulated_hz, rel=1e-6)
    assert "R2 has -5000 Ω, less than 0: taken as written, as ngspice does" in [note.says for note in found.notes]
