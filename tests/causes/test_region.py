"""Transistors that do not amplify where signal passes are named; those that signal does not reach are not."""

from __future__ import annotations

from pathlib import Path

import pytest

from tauledger.causes.region import in_words, not_amplifying
from tauledger.circuit import NO_CHANGE
from tauledger.engine.client import Engine
from tauledger.netlist import read
from tauledger.numbers import solve

MODEL = ".model n npn(is=1e-15 bf=200 vaf=80 cje=5p cjc=2p tf=300p)"
STAGE = f"""River-level gauge, a stage and a switch
VCC vcc 0 12
VIN in 0 DC {{bias}} AC 1
RS in b 1k
RC vcc c {{load}}
RE e 0 470
Q1 c b e n
RL c 0 100k
CL c 0 10p
Q2 c k 0 n
VK k 0 {{key}}
{MODEL}
.print ac v(c)
.end
"""


def found(bias: float, load: str, key: float, tmp_path: Path, engine: Engine) -> list[tuple[str, str]]:
    path = tmp_path / "board.cir"
    path.write_text(STAGE.format(bias=bias, load=load, key=key))
    numbers = solve(read(path), NO_CHANGE, engine)
    return [(d.name, d.region) for d in not_amplifying(numbers.network, numbers.midband, numbers.devices)]


def test_an_active_stage_beside_an_open_switch_calls_for_no_note(tmp_path: Path, engine: Engine) -> None:
    assert found(1.3, "3.9k", 0.0, tmp_path, engine) == []


def test_a_saturated_stage_is_named(tmp_path: Path, engine: Engine) -> None:
    assert found(2.5, "10k", 0.0, tmp_path, engine) == [("Q1", "saturated")]


def test_a_stage_without_bias_is_named_though_it_hardly_moves_the_output(tmp_path: Path, engine: Engine) -> None:
    assert found(0.2, "3.9k", 0.0, tmp_path, engine) == [("Q1", "off")]


def test_a_switch_that_mutes_the_output_is_not_where_signal_enters(tmp_path: Path, engine: Engine) -> None:
    assert ("Q2", "saturated") not in found(1.3, "3.9k", 0.8, tmp_path, engine)


@pytest.mark.parametrize(
    ("region", "words"),
    [("triode", "in triode"), ("triode, reversed", "in triode, reversed"), ("saturated", "saturated"), ("off", "off")],
)
def test_regions_stand_behind_is(region: str, words: str) -> None:
    assert in_words(region) == words
