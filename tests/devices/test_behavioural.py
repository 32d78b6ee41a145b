"""Formulas at the operating point: derivatives against differences and against the engine, and whole circuits."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tauledger.circuit import NO_CHANGE, Apply, Change, Circuit, Formula, Number, Passives, Port, Voltage, terminals_of
from tauledger.devices.derivative import at_bias
from tauledger.engine.client import Engine
from tauledger.errors import InputError, NetlistError
from tauledger.netlist import elaborate, read
from tauledger.numbers import solve
from tauledger.solution import Bias, EngineIdentity, Isolation

V1, V2 = Voltage(1, 0), Voltage(2, 1)
NONE = np.array([], dtype=np.int32)
EMPTY = Circuit(
    title="",
    nodes=("0", "a", "b"),
    passives=Passives("", (), NONE, NONE, np.array([], dtype=float), NONE, NONE),
    elements=(),
    models=(),
    drive=(),
    output=Port("a"),
)
few = settings(max_examples=60, deadline=None, derandomize=True)


def bias(v1: float, v2: float) -> Bias:
    return Bias(np.array([0.0, v1, v1 + v2]), {}, {}, EngineIdentity("none", "0"))


SMOOTH = ("sin", "cos", "tanh", "atan", "exp", "asinh", "cosh")
formulas = st.recursive(
    st.one_of(st.floats(-2.0, 2.0).map(Number), st.sampled_from([V1, V2])),
    lambda inner: st.one_of(
        st.builds(lambda f, a: Apply(f, (a,)), st.sampled_from(SMOOTH), inner),
        st.builds(lambda f, a, b: Apply(f, (a, b)), st.sampled_from(["+", "-", "*"]), inner, inner),
        st.builds(lambda a, b: Apply("/", (a, Apply("+", (Number(3.0), Apply("tanh", (b,)))))), inner, inner),
    ),
    max_leaves=6,
)


@few
@given(formulas, st.floats(-1.0, 1.0), st.floats(-1.0, 1.0))
def test_derivative_is_the_limit_of_differences(formula: Formula, v1: float, v2: float) -> None:
    step = 1e-4

    def value(dv1: float, dv2: float) -> float:
        return at_bias(formula, EMPTY, bias(v1 + dv1, v2 + dv2), "B1").value

    found = at_bias(formula, EMPTY, bias(v1, v2), "B1")
    for control, dv in ((V1, (step, 0.0)), (V2, (0.0, step))):
        once, twice = ((value(k * dv[0], k * dv[1]) - value(-k * dv[0], -k * dv[1])) / (2 * k * step) for k in (1, 2))
        # Richardson: the error of the difference is of the fourth order
        expected = (4.0 * once - twice) / 3.0
        scale = 1.0 + abs(expected) + abs(found.value) + abs(twice - once) * 1e4
        assert found.by.get(control, 0.0) == pytest.approx(expected, abs=1e-7 * scale)


FORMULAS = [
    "tanh(2*v(a))",
    "(v(a)-2)^3",
    "(v(a)-2)^2",
    "pow(v(a)-2,3)",
    "pwr(v(a)-2,3)",
    "2^v(a)",
    "v(a)^v(b)",
    "min(v(a),2*v(a)-0.3)",
    "max(v(a),2*v(a)-0.3)",
    "uramp(v(a)-0.1)+u2(v(a))",
    "u(v(a))*v(a)",
    "atan(v(a))*cosh(v(a))/acosh(v(a)+2)",
    "log10(v(a))+log(v(a))*asinh(v(a))+ln(v(b))",
    "nint(v(a))*v(a)+sgn(v(a))*v(b)+floor(v(a)*3)*v(a)+ceil(v(a))*v(b)",
    "(v(a)>0.2 && v(a)<2)*v(a)",
    "v(a)>1 ? v(a)^2 : v(b)*v(a)",
    "ternary_fcn(v(a)>0.5, exp(v(a)), 0)",
    "v(a)*temper/27",
    "pwl(v(a),0,0,0.5,0.1,0.8,0.4)",
    "pwl(v(a),1,0,2,3)",
    "pwl(v(a),-2,0,-1,3)",
    "sqrt(v(a))*asin(v(a))+acos(v(b)/2)+atanh(v(a)/2)",
    "sin(v(a))*cos(v(b))*tan(v(a)-v(b))+sinh(v(a,b))",
    "abs(v(b)-v(a))*v(a)",
    "!(v(a)>3)*v(a)+(v(a)<=1)*v(b)+(v(a)!=v(b))*v(a)+eq0(v(a))+ge0(v(a))*v(b)",
]


@pytest.fixture(scope="module")
def sources(tmp_path_factory: pytest.TempPathFactory, engine: Engine) -> tuple[Circuit, Bias]:
    cards = "\n".join(f"B{k} 0 n{k} i={formula}\nR{k} n{k} 0 1k" for k, formula in enumerate(FORMULAS, start=1))
    path = tmp_path_factory.mktemp("behaviour") / "board.cir"
    path.write_text(f"Gauge: formulas\nVA a 0 DC 0.7 AC 1\nVB b 0 DC 0.9\n{cards}\n.print ac v(n1)\n.end\n")
    circuit = elaborate(read(path), NO_CHANGE)
    return circuit, engine.operating_point(circuit)


@pytest.mark.parametrize("formula", FORMULAS)
def test_derivative_is_the_engine_s_own(formula: str, sources: tuple[Circuit, Bias], engine: Engine) -> None:
    circuit, at = sources
    element = next(e for e in circuit.elements if e.name == f"B{FORMULAS.index(formula) + 1}")
    assert element.formula is not None
    ends = terminals_of(element)
    volts = tuple(float(at.voltages[node]) for node in ends)
    measured = engine.isolate(circuit, Isolation(element.name, volts, (1e3,))).admittance[0, :, :].real
    found = at_bias(element.formula, circuit, at, element.name)
    # current into the source's first node, which is ground
    row = measured[ends.index(element.nodes[0])]
    expected = np.zeros(len(ends))
    for control, slope in found.by.items():
        assert isinstance(control, Voltage)
        expected[ends.index(control.plus)] += slope
        expected[ends.index(control.minus)] -= slope
    scale = max(1e-6, float(np.abs(expected).max()))
    assert row == pytest.approx(expected, abs=1e-9 * scale)


BOARD = """Gauge: every element that may have a formula
VIN in 0 DC 0.7 AC 1
RS in a 1k
CA a 0 1n
B1 0 b i=1m*tanh(2*v(a))+0.1m*v(a)^2 m=2
RB b 0 10k
CB b 0 100p
E1 c 0 vol='2*v(b)+0.3*v(a)*v(b)+sqrt(abs(v(b)))'
RC c d 1k
C1 d 0 c='1n*(1+0.2*v(d))'
R2 d e r='1k*(1+0.5*v(d)+0.1*v(a))' m=2
C2 e 0 q='1n*v(e)+0.1n*v(e)*v(e)'
C3 e d q='0.2n*v(e)*v(d)'
G1 0 out cur='v(e) > 0 ? 1m*v(e)+10u*v(e)*v(d) : 0' m=3
RO out 0 200
VS out x 0
B2 y 0 v=1k*i(VS)+pwl(v(e),-1,-2,0,0,1,3,8,5) tc1=1m temp=60
RX x 0 3k
RY y z 1k tc1=2m
CY z 0 10p
R3 z w r='1k*(1+0.1*v(y))' tc1=3m tc2=20u temp=50 m=2
L1 w u l='20u*(1+0.3*v(y)+0.1*i(VIN))' tc1=4m m=3
C4 w 0 c='20p*(1+0.1*v(y))' tc1=5m m=2
C5 u 0 q='30p*v(u)+2p*v(u)^2' tc1=6m tc2=10u
B3 u 0 i=0.1m*v(u)+v(y)*ddt(v(u))
.print ac v(u)
.end
"""


@pytest.mark.parametrize("celsius", [-40.0, 27.0, 125.0])
def test_a_board_of_formulas_is_rebuilt_to_rounding(celsius: float, tmp_path: Path, engine: Engine) -> None:
    path = tmp_path / "board.cir"
    path.write_text(BOARD)
    numbers = solve(read(path), Change(temperature_c=celsius), engine)
    assert numbers.agreement is not None
    assert numbers.agreement.max_relative_error <= 1e-9


@pytest.mark.parametrize(
    ("card", "says"),
    [
        ("B1 0 b i=1m*v(a)*hertz", "hertz"),
        ("C1 b 0 q='1n*i(VA)'", "current"),
        ("L1 b 0 l='1m*i(L2)'\nL2 b 0 l='1m*v(a)'", "element with a current"),
    ],
)
def test_what_is_no_conductance_or_capacitance_is_refused_at_its_line(card: str, says: str, tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    path.write_text(f"Gauge\nVA a 0 AC 1\nRB b 0 1k\n{card}\n.print ac v(b)\n.end\n")
    with pytest.raises(NetlistError, match=rf"board\.cir:4:.*{says}"):
        elaborate(read(path), NO_CHANGE)


def test_what_ngspice_reads_past_beside_a_formula_is_told(tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    path.write_text(
        "Gauge\nVA a 0 AC 1\nR1 a b r='1k*(1+v(a))' ac=5k tc1=1m dtemp=3\nB1 b 0 i=ddt(v(b))\n.print ac v(b)\n.end\n"
    )
    told = {note.where.split(":")[-1]: note.says for note in elaborate(read(path), NO_CHANGE).notes}
    assert told["3"].endswith("ngspice reads past its ac, dtemp")
    assert "a derivative by time (ddt) as nothing" in told["4"]


def test_a_formula_without_derivative_names_its_element() -> None:
    formula = Apply("sqrt", (V1,))
    with pytest.raises(InputError, match="formula of B7 has no derivative"):
        at_bias(formula, EMPTY, bias(0.0, 0.0), "B7")
    assert at_bias(formula, EMPTY, bias(4.0, 0.0), "B7").by[V1] == pytest.approx(0.25)
    assert math.isclose(at_bias(formula, EMPTY, bias(4.0, 0.0), "B7").value, 2.0)
