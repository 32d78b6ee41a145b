"""`tauledger devices`: one row per transistor, in textbook symbols, as text and as JSON."""

from __future__ import annotations

import json
import math
from pathlib import Path

import pytest

from tauledger.cli import main
from tauledger.engine.client import Engine
from tauledger.errors import InputError
from tauledger.pipeline import devices, review
from tauledger.report.devices import render, to_json
from tauledger.report.terminal import render as review_page

FIXTURES = Path(__file__).parent.parent / "fixtures"
PREAMP = FIXTURES / "echo_preamp.cir"

SATURATED = """River-level gauge, a stage with too large a collector resistor
VCC vcc 0 12
VIN in 0 DC 2.5 AC 1
RS in b 1k
RC vcc c 10k
RE e 0 470
Q1 c b e n
CL c 0 10p
.model n npn(is=1e-15 bf=200 vaf=80 cje=5p cjc=2p tf=300p)
.print ac v(c)
.end
"""


def test_figures_of_a_bipolar_transistor_obey_the_textbook(engine: Engine) -> None:
    found = devices(PREAMP, engine=engine)
    row = found.devices[0]
    value = {figure.symbol: figure.value for figure in row.figures}
    assert (row.name, row.kind, row.region) == ("Q1", "npn", "active")
    # gm = I_C/V_T less some per cent (nf = 1, high injection), r_pi = beta/gm with beta near 220
    assert value["gm/I"] == pytest.approx(1.0 / 0.02587, rel=0.03)
    assert value["gm"] == pytest.approx(value["gm/I"] * value["i_c"], rel=1e-12)
    assert 150 < value["gm"] * value["r_pi"] < 250
    assert value["f_t"] == pytest.approx(value["gm"] / (2 * math.pi * (value["c_pi"] + value["c_mu"])), rel=1e-9)
    assert found.notes == ()


def test_page_has_a_row_per_device_and_a_note_where_one_does_not_amplify(
    tmp_path: Path, engine: Engine, monkeypatch: pytest.MonkeyPatch
) -> None:
    # a path is printed as typed, however long
    monkeypatch.chdir(tmp_path)
    Path("stage.cir").write_text(SATURATED)
    text = render(devices("stage.cir", engine=engine), unicode=True)
    assert "Q1 npn  saturated" in text
    assert "NOTE  Q1 is saturated, where signal passes" in " ".join(text.split()).replace("NOTE ", "NOTE  ")
    assert max(len(line) for line in text.splitlines()) <= 80
    for symbol in ("I_C", "V_CE", "gm", "gm/I", "r_π", "r_o", "C_π", "C_μ", "f_T"):
        assert symbol in text


def test_a_capacitance_that_the_model_splits_is_headed_as_in_the_review(engine: Engine) -> None:
    """C_mu of the operating point is all of base-collector; the card of the preamplifier gives XCJC."""
    text = render(devices(PREAMP, engine=engine), unicode=True)
    assert "C_μ+bx" in text
    assert "C_μ+bx" in review_page(review(PREAMP, engine=engine), color=False, unicode=True)


def test_json_holds_plain_si_numbers_and_names_its_schema(engine: Engine) -> None:
    document = json.loads(to_json(devices(PREAMP, engine=engine)))
    assert document["schema"] == "tauledger.devices/1"
    figures = {figure["symbol"]: figure for figure in document["devices"][0]["figures"]}
    assert figures["i_c"]["unit"] == "A"
    assert figures["i_c"]["value"] == pytest.approx(1.1e-3, rel=0.1)


def test_command_prints_json_alone_on_standard_output(capfdbinary: pytest.CaptureFixture[bytes]) -> None:
    with pytest.raises(SystemExit) as end:
        main(["devices", str(PREAMP), "--json", "-"])
    assert end.value.code == 0
    assert json.loads(capfdbinary.readouterr().out)["devices"][0]["name"] == "Q1"


def test_a_netlist_without_drive_and_output_has_its_devices_and_says_what_is_not_judged(
    tmp_path: Path, engine: Engine
) -> None:
    path = tmp_path / "bias.cir"
    path.write_text(
        "Gauge: bias only\nVCC vcc 0 5\nVB b 0 0.7\nRC vcc c 1k\nQ1 c b 0 n\n.model n npn(is=1e-15)\n.end\n"
    )
    found = devices(path, engine=engine)
    assert [device.name for device in found.devices] == ["Q1"]
    assert [note.note for note in found.notes] == ["no-signal"]
    with pytest.raises(InputError, match="no voltage or current source is called"):
        devices(path, engine=engine, drive="VX")
