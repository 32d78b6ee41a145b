"""Any circuit that is written is read back equal: names, nodes, values, formulas, models, options."""

from __future__ import annotations

from pathlib import Path

import numpy as np
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from msgspec.structs import replace

from netlist_boards import BOARDS
from netlist_elements import ELEMENTS
from tauledger.circuit import (
    Apply,
    Circuit,
    Current,
    Drive,
    Element,
    Formula,
    Model,
    Number,
    Passives,
    Port,
    Variable,
    Voltage,
)
from tauledger.netlist import elaborate, read
from tauledger.netlist.writer import flat_netlist

NODES = ("0", "in", "Out", "X1.mid", "a-1", "n[2]", "+5v", "1e3")
NUMBERS = st.floats(1e-15, 1e12, allow_nan=False, width=64)
SIGNED = st.one_of(NUMBERS, NUMBERS.map(lambda x: -x), st.just(0.0))
PLACES = st.integers(0, len(NODES) - 1)
LEAVES: st.SearchStrategy[Formula] = st.one_of(
    st.builds(Number, SIGNED),
    st.builds(Voltage, st.integers(1, len(NODES) - 1), st.just(0)),
    st.builds(Voltage, st.integers(1, len(NODES) - 1), st.integers(1, len(NODES) - 1)),
    st.just(Current("V1")),
    st.builds(Variable, st.sampled_from(["temper", "hertz", "time"])),
)


def applied(inner: st.SearchStrategy[Formula]) -> st.SearchStrategy[Formula]:
    def apply(names: list[str], count: int) -> st.SearchStrategy[Formula]:
        return st.builds(Apply, st.sampled_from(names), st.tuples(*[inner] * count))

    negated = st.builds(Apply, st.just("-"), st.tuples(inner.filter(lambda part: not isinstance(part, Number))))
    return st.one_of(
        apply(["+", "-", "*", "/", "^", "<", ">", "<=", ">=", "==", "!=", "&&", "||", "min", "max", "pow", "pwr"], 2),
        apply(["exp", "ln", "sqrt", "abs", "tanh", "u", "uramp", "!"], 1),
        apply(["?:", "ternary_fcn"], 3),
        apply(["pwl"], 5),
        negated,
    )


FORMULAS = st.recursive(LEAVES, applied, max_leaves=8)


@st.composite
def circuits(draw: st.DrawFn) -> Circuit:
    """A source, passives between any nodes, a controlled source of each kind by formula, and a transistor."""
    count = draw(st.integers(1, 12))
    kinds = "".join(draw(st.sampled_from("RCL")) for _ in range(count))
    passives = Passives(
        kind=kinds,
        name=tuple(f"{kind}{'x.' * draw(st.integers(0, 1))}{k}" for k, kind in enumerate(kinds)),
        a=np.array([draw(PLACES) for _ in kinds], dtype=np.int32),
        b=np.array([draw(PLACES) for _ in kinds], dtype=np.int32),
        value=np.array([draw(NUMBERS) for _ in kinds]),
        card=np.zeros(count, dtype=np.int32),
        path=np.zeros(count, dtype=np.int32),
    )
    pairs = [tuple(draw(PLACES) for _ in range(n)) for n in (2, 4, 2, 2, 2, 3, 2)]
    magnitude, phase = draw(NUMBERS), draw(st.floats(-180.0, 180.0))
    elements: tuple[Element, ...] = (
        Element("V", "V1", (1, 0), "", (("dc", draw(SIGNED)), ("acmag", magnitude), ("acphase", phase)), 0, 0),
        Element("E", "E1", pairs[1], "", (("gain", draw(SIGNED)),), 0, 0),
        Element("F", "F1", pairs[0], "", (("gain", draw(SIGNED)),), 0, 0, references=("V1",)),
        Element("G", "G1", pairs[1], "", (), 0, 0, polynomial=tuple(draw(st.lists(SIGNED, min_size=1, max_size=4)))),
        Element("B", "B1", pairs[2], "", (), 0, 0, formula=draw(FORMULAS), quantity="i"),
        Element("E", "E2", pairs[3], "", (), 0, 0, formula=draw(FORMULAS), quantity="v"),
        Element("R", "R99", pairs[4], "thin", (("l", draw(NUMBERS)), ("w", draw(NUMBERS))), 0, 0),
        Element("Q", "Q1", pairs[5], "nsmall", (("off", 1.0), ("area", draw(NUMBERS))), 0, 0),
        Element("R", "Rb", pairs[6], "", (("tc1", draw(SIGNED)),), 0, 0, formula=None, quantity="")
        if draw(st.booleans())
        else Element("C", "Cb", pairs[6], "", (), 0, 0, formula=draw(FORMULAS.filter(of_the_run)), quantity="c"),
    )
    elements = tuple(
        replace(e, parameters=(("value", draw(NUMBERS)), *e.parameters)) if e.name == "Rb" else e for e in elements
    )
    models = (
        Model("thin", "r", 1, (("rsh", draw(NUMBERS)), ("tc1", draw(SIGNED))), 0, 0),
        Model("nsmall", "npn", 1, (("is", draw(NUMBERS)), ("bf", draw(NUMBERS))), 0, 0),
    )
    return Circuit(
        title="generated",
        nodes=NODES,
        passives=passives,
        elements=elements,
        models=models,
        drive=(Drive("V1", "voltage", 1.0),),
        output=Port("0"),
        temperature_c=draw(st.floats(-200.0, 500.0)),
        tnom_c=27.0,
        options=(("gmin", draw(NUMBERS)),),
    )


def of_the_run(formula: Formula) -> bool:
    """A formula of constants alone is a value, not a formula, where both may stand."""
    if isinstance(formula, Apply):
        return any(of_the_run(part) for part in formula.arguments)
    return not isinstance(formula, Number)


def named(circuit: Circuit) -> object:
    """All that makes a circuit, nodes by name, places left out."""

    def tree(formula: Formula | None) -> object:
        match formula:
            case Voltage(plus=plus, minus=minus):
                return ("v", circuit.nodes[plus], circuit.nodes[minus])
            case Apply(function=function, arguments=arguments):
                return (function, *map(tree, arguments))
        return formula

    passives = circuit.passives
    return (
        [
            (passives.kind[k], passives.name[k], circuit.nodes[passives.a[k]], circuit.nodes[passives.b[k]], value)
            for k, value in enumerate(passives.value.tolist())
        ],
        [
            (
                *(e.letter, e.name, [circuit.nodes[node] for node in e.nodes], e.model, e.parameters),
                *(e.references, e.polynomial, tree(e.formula), e.quantity),
            )
            for e in circuit.elements
        ],
        [(m.name, m.type, m.level, m.parameters) for m in circuit.models],
        (circuit.temperature_c, circuit.tnom_c, circuit.options),
    )


@settings(derandomize=True, max_examples=80, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(circuits())
def test_a_generated_circuit_is_read_back_equal(tmp_path: Path, circuit: Circuit) -> None:
    path = tmp_path / "board.cir"
    path.write_text(flat_netlist(circuit), encoding="utf-8")
    assert named(elaborate(read(path), purpose="reading")) == named(circuit)


def test_names_that_are_not_ascii_are_written_so_that_none_is_merged(tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    path.write_text("Füße\nV1 é 0 1 AC 1\nR1 é è 1k\nR2 è 0 1k\nR3 e_u00e9 _u00e9 1k\n", encoding="utf-8")
    text = flat_netlist(elaborate(read(path), purpose="reading"))
    assert text.splitlines()[1:4] == ["R1 _u00e9 _u00e8 1000.0", "R2 _u00e8 0 1000.0", "R3 e_u00e9 _u00e9_ 1000.0"]


def test_the_deck_holds_nothing_that_ngspice_would_run_or_include(tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    for name, board in {**BOARDS, **ELEMENTS}.items():
        path.write_text(f"*# shell touch ran\n{board.partition(chr(10))[2]}", encoding="utf-8")
        text = flat_netlist(elaborate(read(path), purpose="reading"))
        assert text.startswith("* # shell touch ran\n"), name
        assert not any(word in text.lower() for word in (".control", ".include", ".lib", "*#", "`")), name
