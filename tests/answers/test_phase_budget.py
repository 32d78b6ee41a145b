"""The phase budget of a two-stage amplifier: exact degrees add up, paper beside them where it has a formula."""

from __future__ import annotations

import math
from pathlib import Path

import pytest

from cells import near
from compensated import TwoStages, network_of
from tauledger.asked import Asked
from tauledger.circuit import Port
from tauledger.devices.parts import (
    Part,
    capacitance,
    delayed_transconductance,
    resistance,
    transconductance,
    voltage_source,
)
from tauledger.engine.client import Engine
from tauledger.network.assemble import Network
from tauledger.pipeline import review, review_network
from tauledger.record import PhaseBudget, PhaseRow, Review
from tauledger.report.unity import figures

FIXTURES = Path(__file__).parents[2] / "fixtures"


@pytest.fixture(scope="module")
def servo(engine: Engine) -> Review:
    return review(FIXTURES / "servo_gain.cir", engine=engine)


def budget_of(found: Review) -> PhaseBudget:
    assert found.phase_budget is not None
    return found.phase_budget


def row(budget: PhaseBudget, name: str) -> PhaseRow:
    return next(one for one in budget.rows if one.name == name)


def total(budget: PhaseBudget) -> float:
    return sum(one.used_deg for one in budget.rows) + budget.others_deg + budget.rest_deg


def test_rows_others_and_rest_leave_the_margin(servo: Review) -> None:
    budget = budget_of(servo)
    assert servo.f_unity is not None
    assert budget.at_hz == servo.f_unity.exact_hz
    assert total(budget) == pytest.approx(180.0 - budget.margin_deg, abs=1e-9)
    # the servo that holds the operating point makes roots far below the band, which count among the others
    assert budget.rest_deg == 0.0
    assert abs(budget.others_deg) < 2.0


def test_ngspice_has_the_same_margin(servo: Review) -> None:
    assert servo.f_unity is not None
    assert budget_of(servo).margin_deg == pytest.approx(servo.f_unity.phase_margin_deg, abs=1e-3)


def test_paper_knows_the_poles_of_the_compensated_stage_within_five_per_cent(servo: Review) -> None:
    budget = budget_of(servo)
    assert budget.stage == "M6, bridged by CC, M6.c_gd from out to y"
    for name in ("dominant pole", "second pole", "zero, right half plane", "mirror pole"):
        one = row(budget, name)
        assert one.difference is not None
        assert abs(one.difference) < 0.05
        assert one.hand_hz is not None
        assert one.hand_deg is not None
        exact = math.hypot(one.real_hz, one.imag_hz)
        assert abs(one.hand_hz) / exact - 1.0 == pytest.approx(one.difference, abs=1e-12)
        assert abs(one.hand_deg - one.used_deg) < 1.0
        assert one.hand_formula
        assert one.hand_values
    assert row(budget, "zero, right half plane").real_hz > 0.0
    assert row(budget, "dominant pole").used_deg == pytest.approx(90.0, abs=0.02)


def test_where_no_formula_fits_there_is_none(servo: Review) -> None:
    bare = [one for one in budget_of(servo).rows if not one.hand_formula]
    assert bare
    assert all(one.hand_hz is None and one.hand_deg is None and one.difference is None for one in bare)


def test_gm1_over_c_c_is_far_off_and_the_second_pole_is_named(servo: Review) -> None:
    single, refined, margin = budget_of(servo).by_hand
    assert single.hand / single.exact > 1.2
    assert "second pole" in single.why
    assert "sits below it" in single.why
    assert refined.hand == near(refined.exact, rel=0.03)
    assert margin.hand == pytest.approx(margin.exact, abs=2.0)


def test_a_network_alone_has_the_budget_of_its_formulas() -> None:
    one = TwoStages(r_z=700.0, c_1=0.1e-12)
    budget = budget_of(review_network(network_of(one)))
    names = [line.name for line in budget.rows]
    assert names == ["dominant pole", "second pole", "zero of the nulling resistor", "third pole"]
    # 700 ohm is above 1/gm2: the zero lies in the left half plane and gives phase
    assert row(budget, "zero of the nulling resistor").used_deg < 0.0
    assert budget.stage == "K5, bridged by K7 and K8 from out to x"
    assert budget.rest_deg == pytest.approx(0.0, abs=1e-6)


def test_an_amplifier_without_a_compensated_stage_has_two_coefficients() -> None:
    """Two time constants in a row, the longer first: no stage is bridged, and the load does not make that pole."""
    parts = [
        voltage_source("V1", "in", "0", 1.0),
        transconductance("G1", ("0", "a"), ("in", "0"), 10e-3),
        resistance("R1", "a", "0", 10e3),
        capacitance("C1", "a", "0", 30e-12),
        transconductance("G2", ("0", "out"), ("a", "0"), 10e-3),
        resistance("R2", "out", "0", 5e3),
        capacitance("C2", "out", "0", 3e-12),
    ]
    budget = budget_of(review_network(Network.from_parts(parts, output=Port("out"))))
    assert (budget.stage, budget.by_hand) == ("", ())
    assert "1/(2π·b1)" in [one.hand_formula for one in budget.rows]
    assert total(budget) == pytest.approx(180.0 - budget.margin_deg, abs=1e-9)


def test_where_the_load_counts_in_the_dominant_pole_the_formula_has_it(engine: Engine) -> None:
    """R2·(C_c + C_L) makes two fifths of b1 in the preamplifier."""
    budget = budget_of(review(FIXTURES / "echo_preamp.cir", engine=engine, asked=Asked(unity=True)))
    names = [one.name for one in budget.rows]
    assert "dominant pole, load counted" in names
    assert "second pole, load counted" in names
    for name in ("dominant pole, load counted", "second pole, load counted"):
        assert abs(row(budget, name).difference or 1.0) < 0.08
    _, refined, margin = budget.by_hand
    assert refined.hand == near(refined.exact, rel=0.03)
    assert margin.hand == pytest.approx(margin.exact, abs=3.0)


BUFFER = """a bridged stage between two resistors
.model mn nmos level=1 vto=0.6 kp=90u lambda=0.05 tox=15n cgso=0.3n cgdo=0.3n
VDD vdd 0 3.3
VS s 0 dc 0.8 ac 1
RS s g 30k
M1 out g 0 0 mn w=25u l=1u
RD vdd out 45k
CF g out 0.8p
CL out 0 1.2p
.end
"""


def test_gm1_that_is_a_resistor_is_called_so_and_its_unity_gain_is_within_two_per_cent(
    engine: Engine, tmp_path: Path
) -> None:
    budget = budget_of(of_text(BUFFER, engine, tmp_path))
    single = budget.by_hand[0]
    assert single.formula == "gm1·R1·A2/(2π·b1)"
    assert single.values.startswith("gm1 = 1/RS = 33.3 µS")
    assert single.hand == near(single.exact, rel=0.02)


MODELS = """.model mn nmos level=1 vto=0.6 kp=100u lambda=0.05 gamma=0.4 phi=0.7 tox=15n cgso=0.3n cgdo=0.3n
.model mp pmos level=1 vto=-0.7 kp=40u lambda=0.06 gamma=0.4 phi=0.7 tox=15n cgso=0.3n cgdo=0.3n
"""
TWO_STAGES = f"""two stages with a load that hangs at the bias line
{MODELS}VDD vdd 0 2.5
VSS vss 0 -2.5
VIN inp 0 ac 1
LB out inn 1G
CB inn 0 1G
IB bp vss 15u
M9 bp bp vdd vdd mp w=20u l=1u
M5 tail bp vdd vdd mp w=40u l=1u
M1 n1 inn tail vdd mp w=60u l=1u
M2 n2 inp tail vdd mp w=60u l=1u
M3 n1 n1 vss vss mn w=15u l=1u
M4 n2 n1 vss vss mn w=15u l=1u
M6 out n2 vss vss mn w=300u l=1u
M7 out bp vdd vdd mp w=400u l=1u
CC n2 out 3p
CL out 0 8p
.end
"""


def of_text(text: str, engine: Engine, folder: Path, **asked: object) -> Review:
    path = folder / "board.cir"
    path.write_text(text, encoding="utf-8")
    return review(path, engine=engine, asked=Asked(unity=True), **asked)  # type: ignore[arg-type]


def test_a_pole_of_the_bias_line_has_no_formula_of_the_stage_nor_of_a_mirror(engine: Engine, tmp_path: Path) -> None:
    budget = budget_of(of_text(TWO_STAGES, engine, tmp_path))
    aside = [one for one in budget.rows if one.name == "pole off the signal path"]
    assert aside
    assert all(not one.hand_formula for one in aside)
    assert "zero off the signal path" in [one.name for one in budget.rows]
    assert not [one for one in budget.rows if "M9" in one.hand_values]
    assert "M3" in row(budget, "mirror pole").hand_values


def test_a_zero_through_c_gd_is_called_by_its_own_transistor(engine: Engine, tmp_path: Path) -> None:
    budget = budget_of(of_text(TWO_STAGES, engine, tmp_path))
    assert "M6" in row(budget, "zero, right half plane").hand_values
    assert all("gm2" not in one.hand_formula for one in budget.rows if one.name.startswith("zero through"))


def test_gm1_is_that_of_the_input_pair_and_not_of_its_mirror(engine: Engine, tmp_path: Path) -> None:
    """A mirror of the same gm as the pair ends at the same node."""
    budget = budget_of(of_text(TWO_STAGES.replace("w=15u", "w=24u"), engine, tmp_path))
    assert "(M2)" in budget.by_hand[0].values


OTA = f"""a pair with a mirror and a load
{MODELS}VDD vdd 0 2.5
VSS vss 0 -2.5
VIN inp 0 ac 1
LB out inn 1G
CB inn 0 1G
IT tail vss 30u
M1 n1 inp tail vss mn w=30u l=1u
M2 out inn tail vss mn w=30u l=1u
M3 n1 n1 vdd vdd mp w=20u l=1u
M4 out n1 vdd vdd mp w=20u l=1u
CL out 0 3p
.end
"""
FOLDED = f"""a folded cascode with a load
{MODELS}VDD vdd 0 3.3
VIN inp 0 dc 1.4 ac 1
LB out inn 1G
CB inn 0 1G
IT tail 0 80u
M1 f1 inp tail 0 mn w=50u l=1u
M2 f2 inn tail 0 mn w=50u l=1u
IF1 vdd f1 80u
IF2 vdd f2 80u
VC c 0 1.9
M3 g1 c f1 vdd mp w=60u l=1u
M4 out c f2 vdd mp w=60u l=1u
CF1 f1 0 150f
CF2 f2 0 150f
M5 g1 g1 0 0 mn w=15u l=1u
M6 out g1 0 0 mn w=15u l=1u
CL out 0 2p
.end
"""


@pytest.mark.parametrize(("text", "further"), [(OTA, "mirror pole"), (FOLDED, "pole of a cascode's source")])
def test_where_the_load_makes_the_dominant_pole_unity_gain_is_gm1_over_c_l(
    text: str, further: str, engine: Engine, tmp_path: Path
) -> None:
    budget = budget_of(of_text(text, engine, tmp_path))
    assert budget.stage == "no compensated stage, the load at out makes the dominant pole"
    assert abs(row(budget, "pole of the load").difference or 1.0) < 0.02
    assert further in [one.name for one in budget.rows]
    single, refined, margin = budget.by_hand
    assert single.formula == "gm1/(2π·C_L)"
    assert "(M1)" in single.values
    assert single.hand == near(single.exact, rel=0.05)
    assert refined.hand == near(refined.exact, rel=0.05)
    assert margin.hand == pytest.approx(margin.exact, abs=4.0)


BALANCED = f"""both halves of a balanced amplifier are its output
{MODELS}VDD vdd 0 3
VP ip 0 dc 1.5 ac 0.5
VN in 0 dc 1.5 ac -0.5
IT t 0 80u
M1 on ip t 0 mn w=30u l=1u
M2 op in t 0 mn w=30u l=1u
M3 on cm vdd vdd mp w=50u l=1u
M4 op cm vdd vdd mp w=50u l=1u
R1 on cm 150k
R2 op cm 150k
C1 on 0 2p
C2 op 0 2p
.end
"""


def test_half_of_gm1_goes_to_either_side_of_a_balanced_output(engine: Engine, tmp_path: Path) -> None:
    budget = budget_of(of_text(BALANCED, engine, tmp_path, output="v(op,on)"))
    single = budget.by_hand[0]
    assert "half of M2's" in single.values
    assert "times 2 from op to the output" in single.values
    assert single.hand == near(single.exact, rel=0.02)


def test_no_budget_without_a_section_on_unity_gain(engine: Engine) -> None:
    assert review(FIXTURES / "echo_preamp.cir", engine=engine).phase_budget is None
    assert review(FIXTURES / "tia_pair.cir", engine=engine).phase_budget is None


def test_what_a_delay_takes_beside_its_all_pass_is_a_row_of_its_own() -> None:
    """A gm1 that acts 2 ns late turns the phase by ω·τ; the all-pass among the poles and zeros by 2·atan(ω·τ/2)."""
    late = 2e-9
    parts = [
        delayed_transconductance(part.owner, part.nodes[:2], part.nodes[2:], part.value, late)  # type: ignore[arg-type]
        if part.name == "K2"
        else part
        for part in network_of(TwoStages()).parts
    ]
    budget = budget_of(review_network(Network.from_parts(parts, output=Port("out"))))
    plain = budget_of(review_network(network_of(TwoStages())))
    turn = 2.0 * math.pi * budget.at_hz * late
    assert budget.at_hz == near(plain.at_hz, rel=1e-9)
    assert budget.margin_deg == pytest.approx(plain.margin_deg - math.degrees(turn), abs=1e-6)
    assert budget.rest_deg == pytest.approx(math.degrees(turn - 2.0 * math.atan(turn / 2.0)), abs=1e-6)
    assert total(budget) == pytest.approx(180.0 - budget.margin_deg, abs=1e-9)


def test_the_section_on_unity_gain_shows_what_the_formulas_give(engine: Engine, tmp_path: Path) -> None:
    found = of_text(BUFFER, engine, tmp_path)
    budget, facts = budget_of(found), found.f_unity
    assert facts is not None
    assert facts.hand_hz == [step.hand for step in budget.by_hand if step.figure == "f_u"][-1]
    assert facts.hand_formula.startswith("gm1·R1·A2/(2π·b1)")
    assert facts.difference == pytest.approx(facts.hand_hz / (facts.simulated_hz or math.nan) - 1.0)


def test_gain_times_f_high_far_from_unity_gain_is_no_figure() -> None:
    """Three poles far below f_u: the product of one pole alone is many times f_u."""
    parts: list[Part] = [voltage_source("V1", "in", "0", 1.0)]
    before = "in"
    for k, (ohm, farad) in enumerate([(100e3, 16e-9), (10e3, 1.6e-9), (10e3, 1.6e-9)]):
        parts += [
            transconductance(f"G{k}", ("0", f"n{k}"), (before, "0"), 20.0 / ohm),
            resistance(f"R{k}", f"n{k}", "0", ohm),
            capacitance(f"C{k}", f"n{k}", "0", farad),
        ]
        before = f"n{k}"
    found = review_network(Network.from_parts(parts, output=Port("n2")))
    facts = found.f_unity
    assert facts is not None
    assert facts.exact_hz is not None
    assert facts.gain_bandwidth_exact_hz is not None
    assert facts.gain_bandwidth_exact_hz > 3.0 * facts.exact_hz
    assert facts.hand_hz is None
    assert "gain · f_H" not in [cells[0] for cells in figures(facts)]


def test_a_mirror_bridged_by_its_own_c_gd_is_no_compensated_stage_and_a_follower_hides_no_load(
    engine: Engine, tmp_path: Path
) -> None:
    followed = OTA.replace("CL out 0 3p", "CX x 0 3p\nMF vdd x out vss mn w=40u l=1u\nIF out vss 100u\nCL out 0 0.2p")
    followed = followed.replace("M2 out inn", "M2 x inn").replace("M4 out n1", "M4 x n1")
    budget = budget_of(of_text(followed, engine, tmp_path))
    assert budget.stage == "no compensated stage, the load at x makes the dominant pole"
    assert "from x to the output" in budget.by_hand[0].values
    assert budget.by_hand[0].hand == near(budget.by_hand[0].exact, rel=0.1)


def test_unity_gain_with_further_roots_is_told_only_where_a_row_has_them_by_hand(
    engine: Engine, tmp_path: Path
) -> None:
    """A capacitor at the mirror brings its pole below f_u; f_u with further roots is told only where a row has some."""
    weak = OTA.replace("CL out 0 3p", "CL out 0 3p\nCN n1 0 3p")
    budget = budget_of(of_text(weak, engine, tmp_path))
    counted = [one for one in budget.rows if one.hand_hz is not None and one.name != "pole of the load"]
    assert (len(budget.by_hand) > 1) == bool(counted)
