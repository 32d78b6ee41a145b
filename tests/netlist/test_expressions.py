"""The numeric dialect: ngspice evaluates the same formulas to the same values, and refuses what we refuse."""

from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from netlist_judge import answers
from tauledger.circuit import Circuit
from tauledger.errors import NetlistError
from tauledger.netlist import elaborate, read

PARAMETERS = {"a": 2.0, "b": -3.0, "half": 0.5, "z": 0.0}

FORMULAS = [
    *(
        "-2^2",
        "2*-2^2",
        "2+-2^2",
        "2-2^2",
        "2^-1",
        "2^-2^2",
        "-2*3+1",
        "-a^2",
        "(-a^2)",
        "2--3",
        "2- -3",
        "--3",
        "- -2",
    ),
    *("+3", "1<2<3", "3>2>1", "1=1", "1<>2", "1!=2", "!0", "!a", "!0+1", "!1==0", "-!0", "2*!0", "!a^2", "!!1"),
    *("1&&0||1", "1||0&&0", "0?2:1?4:5", "1+1?2:3", "1>0?2:3+4", "1 ? -2 : -3", "1?2:3?4:5", "a>1&&b<1"),
    *("5%3", "-5%3", "5.5%2", "7\\2", "-7\\2", "-7.5\\2", "5%3*2", "2*5%3", "7\\2*3", "8/2*4", "8/2/2"),
    *("2^3^2", "2**3**2", "(-2)^3", "pow(-2,3)", "pwr(-2,3)", "pow(0,0)", "a**-2", "2^(-a)", "-a**half"),
    *("ln(10)", "log(10)", "log10(10)", "sgn(-3)", "sgn(z)", "int(-3.7)", "nint(2.5)", "nint(3.5)", "floor(-1.5)"),
    *(
        "ceil(1.2)",
        "sqr(3)",
        "arctan(1)",
        "ternary_fcn(1,2,3)",
        "min(1,2)",
        "max(-a, b)",
        "abs(b)",
        "sqrt(4)",
        "exp(1)",
    ),
    *("sin(1)", "cos(1)", "tan(1)", "asin(0.5)", "acos(0.5)", "atan(1)", "sinh(1)", "cosh(1)", "tanh(1)", "asinh(1)"),
    *(
        "acosh(2)",
        "atanh(0.5)",
        "1k",
        "1meg",
        "1mil",
        "1e3k",
        "2u*1meg",
        "1kohm",
        "5.",
        "+.5",
        "1.e3",
        "1e",
        "sqrt (4)",
    ),
    *("-max(a,b)^2", "((a))", "a - b - 1", "-a - b", "a/b*2", "3*-2-1", "5 - -3^2", "-2<1", "2<-1", "A*Half"),
]

REFUSED = [
    *(
        "a*-b",
        "a+-b",
        "2*-(3)",
        "1- -a",
        "--a",
        "0?1:-a",
        "1?-a:b",
        "a<-b",
        "!-1",
        "-+2",
        "2*+3",
        "2 3",
        "a b",
        "(1",
        "1)",
    ),
    *("1k5", "1d3", "1_0", "1.5.2", "pi", "nosuch", "atan2(1,2)", "1|2", "1/0", "0/0", "sqrt(-1)", "ln(0)", "exp(800)"),
    *("abs()", "a =< 2", "not a", "pow(-2,0.5)", "5%z", "a\\z"),
]


def board(formulas: list[str]) -> str:
    """One source for each formula: its value is the voltage of its node."""
    lines = ["formulas", ".param " + " ".join(f"{name}={value!r}" for name, value in PARAMETERS.items())]
    for number, formula in enumerate(formulas):
        lines += [f"V{number} p{number} 0 {{{formula}}}", f"R{number} p{number} 0 1k"]
    return "\n".join([*lines, "Vac in 0 AC 1", "Rin in 0 1k"]) + "\n"


def circuit_of(path: Path) -> Circuit:
    return elaborate(read(path), output="in")


def check(path: Path, formulas: list[str]) -> None:
    path.write_text(board(formulas))
    theirs = answers(path.parent, path)[0]
    for number, element in enumerate(circuit_of(path).elements[:-1]):
        value = theirs[f"p{number}"][0].real
        assert element.parameter("dc", 0.0) == pytest.approx(value, rel=1e-12, abs=1e-30), formulas[number]


def test_formulas_have_the_value_that_ngspice_gives_them(tmp_path: Path) -> None:
    check(tmp_path / "board.cir", FORMULAS)


@pytest.mark.parametrize("formula", REFUSED)
def test_what_ngspice_does_not_evaluate_is_refused_at_its_place(formula: str, tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    path.write_text(board([formula]))
    with pytest.raises(NetlistError) as raised:
        circuit_of(path)
    (diagnostic,) = raised.value.diagnostics
    assert diagnostic.line == 3
    assert 10 <= diagnostic.column <= 11 + len(formula)


@pytest.mark.parametrize("formula", ["gauss(0,1,3)", "limit(1,2)"])
def test_a_random_number_is_refused(formula: str, tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    path.write_text(board([formula]))
    with pytest.raises(NetlistError, match="draws a random number"):
        circuit_of(path)


numbers = st.sampled_from(["2", "3", "0.5", "1.5", "7", "1k", "20m"])
names = st.sampled_from(sorted(PARAMETERS))


def grown(inner: st.SearchStrategy[str]) -> st.SearchStrategy[str]:
    """Formulas in the forms that ngspice reads; a minus stands at the start of a parenthesis or before a number."""
    operators = ["+", "-", "*", " + ", "<", ">=", "==", "&&", "||", "<>"]
    signed = st.builds("-{}".format, st.sampled_from(["2", "3", "0.5"]))
    return st.one_of(
        st.builds("{}{}{}".format, inner, st.sampled_from(operators), inner),
        st.builds("{}{}{}".format, inner, st.sampled_from(["+", "-", "*", "/"]), signed),
        st.builds("({})".format, inner),
        st.builds("(-{})".format, names),
        st.builds("({})^2".format, inner),
        st.builds("max({},{})".format, inner, inner),
        st.builds("abs({})".format, inner),
        st.builds("({} ? {} : {})".format, inner, inner, inner),
    )


formulas = st.recursive(st.one_of(numbers, names), grown, max_leaves=8)


@settings(derandomize=True, max_examples=15, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.lists(formulas, min_size=20, max_size=40))
def test_random_formulas_have_the_value_that_ngspice_gives_them(tmp_path: Path, formulas: list[str]) -> None:
    check(tmp_path / "board.cir", formulas)


def test_a_long_chain_of_parameters_in_reverse_order_gives_a_message_and_no_traceback(tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    chain = "".join(f".param p{k}={{p{k + 1}+1}}\n" for k in range(2000))
    path.write_text(f"chain\n{chain}.param p2000=1\nV1 in 0 {{p0}} AC 1\nR1 in 0 1k\n")
    with pytest.raises(NetlistError, match="nested too deeply"):
        circuit_of(path)


def test_a_long_chain_of_parameters_in_order_is_no_trouble(tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    chain = "".join(f".param p{k}={{p{k - 1}+1}}\n" for k in range(1, 2001))
    path.write_text(f"chain\n.param p0=1\n{chain}V1 in 0 {{p2000}} AC 1\nR1 in 0 1k\n")
    assert circuit_of(path).elements[0].parameter("dc", 0.0) == 2001.0


def test_a_formula_of_many_operators_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    path.write_text(board(["1" + "+1" * 1000]))
    with pytest.raises(NetlistError, match="too long"):
        circuit_of(path)
