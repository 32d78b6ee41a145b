"""Units of the gain by what drives and what is read: V/V, Ω, S, A/A, and decibels of them, in every format."""

from __future__ import annotations

import json
from collections.abc import Mapping

import pytest

from tauledger.engine.client import Engine
from tauledger.pipeline import review
from tauledger.record import Review
from tauledger.report.csv import to_csv
from tauledger.report.document import document
from tauledger.report.html import to_html
from tauledger.report.json import to_json
from tauledger.report.layout import BEFORE_A_UNIT
from tauledger.report.markdown import to_markdown
from tauledger.report.terminal import render

VOLTAGE_IN = ("VIN s 0 DC 0.67 AC 1", "RS s a 1k", "IB vcc a DC 1m")
CURRENT_IN = ("IIN vcc a DC 1m AC 1",)
VOLTAGE_OUT = ("RL vcc out 500",)
CURRENT_OUT = ("VOUT vcc out 0",)

BOARDS: Mapping[str, tuple[tuple[str, ...], tuple[str, ...], str, str]] = {
    "V/V": (VOLTAGE_IN, VOLTAGE_OUT, "out", "dB"),
    "Ω": (CURRENT_IN, VOLTAGE_OUT, "out", "dBΩ"),
    "S": (VOLTAGE_IN, CURRENT_OUT, "i(VOUT)", "dBS"),
    "A/A": (CURRENT_IN, CURRENT_OUT, "i(VOUT)", "dB"),
}
MIRROR = ("VCC vcc 0 5", "CIN a 0 2p", "Q1 a a 0 qn", "Q2 out a 0 qn", ".model qn npn(is=5e-15 bf=150 cje=8p cjc=4p)")


@pytest.fixture(scope="module", params=list(BOARDS))
def board(
    request: pytest.FixtureRequest, engine: Engine, tmp_path_factory: pytest.TempPathFactory
) -> tuple[str, Review]:
    drive, load, output, _ = BOARDS[request.param]
    path = tmp_path_factory.mktemp("units") / "board.cir"
    path.write_text("\n".join(["a mirror", *drive, *load, *MIRROR, ".end", ""]), encoding="utf-8")
    return request.param, review(path, engine=engine, output=output)


def test_the_headline_has_the_unit_and_its_decibels(board: tuple[str, Review]) -> None:
    unit, found = board
    decibels = BOARDS[unit][3]
    line = next(line for line in render(found, color=False, unicode=True).splitlines() if line.startswith("Mid-band"))
    gain = line.split(" at ")[0]
    assert f" {decibels} (" in gain
    assert gain.rstrip(")").endswith(unit)
    plain = next(line for line in render(found, color=False, unicode=False).splitlines() if line.startswith("Mid-band"))
    assert plain.isascii()
    assert f" {decibels.replace('Ω', 'ohm')} (" in plain


def test_documents_say_it_alike(board: tuple[str, Review]) -> None:
    unit, found = board
    decibels = BOARDS[unit][3]
    figure = document(found).figures[0]
    assert figure.value.endswith(f" {decibels}")
    assert unit in figure.beside
    pages = [to_markdown(found).decode()]
    if unit == "Ω":
        pages.append(to_html(found).decode())
    for text in pages:
        assert f"{decibels}" in text
        assert unit in text
    assert json.loads(to_json(found))["midband"]["unit"] == unit
    assert f"midband,,unit,{unit}," in to_csv(found).decode()


def test_the_number_is_what_the_unit_says(board: tuple[str, Review]) -> None:
    """A mirror of one to one: 1 A/A, 500 Ω; from a voltage through 1 kΩ and r_e a thousandth of each."""
    unit, found = board
    size = abs(complex(found.midband.gain_real, found.midband.gain_imag))
    expected = {"V/V": 0.48, "Ω": 493.0, "S": 0.962e-3, "A/A": 0.987}[unit]
    assert size == pytest.approx(expected, rel=0.03)


@pytest.mark.parametrize("text", ["93.1 dBΩ", "93.1 dBohm", "-60 dBS", "3 dB"])
def test_a_number_is_not_parted_from_decibels_of_a_unit(text: str) -> None:
    assert " " not in BEFORE_A_UNIT.sub("\N{NO-BREAK SPACE}", text)
