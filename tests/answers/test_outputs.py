"""Further outputs of one run: each row is the review that this output would get alone."""

from __future__ import annotations

from pathlib import Path

import pytest

import boards
from tauledger.asked import Asked
from tauledger.engine.client import Engine
from tauledger.errors import InputError
from tauledger.pipeline import review, review_network
from tauledger.record import Review
from tauledger.report.document import document
from tauledger.report.layout import lay_out
from tauledger.report.modes import further_outputs

FIXTURES = Path(__file__).parents[2] / "fixtures"


def reviewed(name: str, engine: Engine, *outputs: str, **more: str) -> Review:
    return review(FIXTURES / name, engine=engine, asked=Asked(outputs=outputs), **more)  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("name", "outputs"),
    [
        ("echo_cascode.cir", ("b1", "c1", "v(out,c1)")),
        ("mos_gain.cir", ("y", "x")),
        ("photo_front.cir", ("d", "i(VDD)")),
    ],
)
def test_a_row_is_what_a_review_of_that_output_alone_gives(name: str, outputs: tuple[str, ...], engine: Engine) -> None:
    rows = reviewed(name, engine, *outputs).outputs
    assert len(rows) == len(outputs)
    for output, row in zip(outputs, rows, strict=True):
        alone = reviewed(name, engine, output=output)
        assert row.unit == alone.midband.unit
        assert row.gain_db == pytest.approx(alone.midband.gain_db, abs=1e-6)
        assert row.simulated_db == pytest.approx(alone.midband.gain_db, abs=1e-6)
        for ours, edge in (
            ((row.f_low_exact_hz, row.f_low_simulated_hz), alone.f_low),
            ((row.f_high_exact_hz, row.f_high_simulated_hz), alone.f_high),
        ):
            if edge is None or edge.exact_hz is None:
                assert ours == (None, None)
            else:
                assert ours == pytest.approx((edge.exact_hz, edge.simulated_hz), rel=1e-6)


def test_simulated_and_exact_edges_agree(engine: Engine) -> None:
    for row in reviewed("gain_pair.cir", engine, "c1", "b1", "out2").outputs:
        assert row.f_high_simulated_hz == pytest.approx(row.f_high_exact_hz, rel=1e-6)
        assert row.f_low_simulated_hz == pytest.approx(row.f_low_exact_hz, rel=1e-6)


def test_the_first_output_stays_the_reviewed_one(engine: Engine) -> None:
    plain, with_more = reviewed("echo_preamp.cir", engine), reviewed("echo_preamp.cir", engine, "b")
    assert plain.f_high == with_more.f_high
    assert plain.outputs == ()
    assert with_more.output.plus == "out"


def test_a_node_inside_what_is_taken_as_one_part_says_how_to_see_it(engine: Engine) -> None:
    with pytest.raises(InputError, match=r"--output XU1\.a: this is inside an instance") as raised:
        reviewed("opamp_filter.cir", engine, "XU1.a")
    assert "--fold none" in str(raised.value)
    opened = review(FIXTURES / "opamp_filter.cir", engine=engine, fold=("none",), asked=Asked(outputs=("XU1.a",)))
    assert opened.outputs[0].name == "v(XU1.a)"


def test_an_output_where_only_rounding_arrives_is_refused(engine: Engine) -> None:
    with pytest.raises(InputError, match=r"the drive does not reach it"):
        reviewed("pair.cir", engine, "tail")


def test_a_network_alone_has_one_output() -> None:
    with pytest.raises(InputError, match="further outputs are read from a netlist"):
        review_network(boards.emitter_follower(), asked=Asked(outputs=("out",)))


def test_an_unknown_output_names_the_nearest(engine: Engine) -> None:
    with pytest.raises(InputError, match="no node is called 'otu'") as raised:
        reviewed("echo_preamp.cir", engine, "otu")
    assert "did you mean 'out'?" in str(raised.value)


def test_all_formats_show_them(engine: Engine) -> None:
    one = reviewed("photo_front.cir", engine, "d", "i(VDD)")
    lines = [line.text for line in lay_out([further_outputs(one)], width=80, unicode=True, page=60)]
    assert all(len(line) <= 80 for line in lines)
    assert any("dBΩ" in line for line in lines)
    assert any("v(d)" in line and "simulated" in line for line in lines)
    section = next(section for section in document(one).sections if section.key == "outputs")
    assert section.title == "Further outputs"
