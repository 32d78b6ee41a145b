"""Drive and output: from the options, else from the netlist, else a message that lists candidates."""

from __future__ import annotations

from pathlib import Path

import pytest

from tauledger.circuit import Port
from tauledger.errors import InputError
from tauledger.netlist import elaborate, read

PAIR = """River-level gauge, floating transducer
VINP legp 0 AC 0.5 0
VINN legn 0 AC 0.5 180
IREF 0 mid DC 1m AC 2m 90
VCC vcc 0 12
RP legp out 300
RN legn outn 300
RM mid vcc 1k
L1 out mid 1u
VLOAD mid far 0
RL outn far 10k
"""


@pytest.fixture
def path(tmp_path: Path) -> Path:
    board = tmp_path / "board.cir"
    board.write_text(PAIR)
    return board


def test_every_source_with_an_ac_value_is_driven_with_its_phase(path: Path) -> None:
    drive = elaborate(read(path)).drive
    assert [(d.source, d.kind, d.amplitude) for d in drive] == [
        ("VINP", "voltage", 0.5),
        ("VINN", "voltage", -0.5),
        ("IREF", "current", 2e-3j),
    ]


def test_the_source_that_is_named_is_driven_with_one_and_all_others_with_zero(path: Path) -> None:
    circuit = elaborate(read(path), drive="vcc")
    assert [(d.source, d.amplitude) for d in circuit.drive] == [("VCC", 1.0)]
    magnitudes = {e.name: e.parameter("acmag", -1.0) for e in circuit.elements}
    assert magnitudes == {"VINP": 0.0, "VINN": 0.0, "IREF": 0.0, "VCC": 1.0, "VLOAD": 0.0}


@pytest.mark.parametrize(("drive", "hint"), [("VINX", "did you mean 'VIN"), ("RP", "there are: VINP, VINN, IREF")])
def test_an_unknown_source_is_an_error_with_a_suggestion(path: Path, drive: str, hint: str) -> None:
    with pytest.raises(InputError, match=f"no voltage or current source is called '{drive}'") as raised:
        elaborate(read(path), drive=drive)
    assert hint in str(raised.value)


@pytest.mark.parametrize(
    ("output", "port"),
    [
        ("out", Port("out")),
        ("OUTN", Port("outn")),
        ("V(out)", Port("out")),
        (" v( out , outn ) ", Port("out", "outn")),
        ("v(gnd,out)", Port("0", "out")),
        ("i(vload)", Port("mid", "far", "current", "VLOAD")),
        ("I(L1)", Port("out", "mid", "current", "L1")),
    ],
)
def test_an_output_is_a_node_a_difference_or_a_current(path: Path, output: str, port: Port) -> None:
    assert elaborate(read(path), output=output).output == port


@pytest.mark.parametrize(
    ("output", "message"),
    [
        ("v(outt)", "no node is called 'outt'\n  did you mean 'out'?"),
        ("i(vloat)", "no voltage source or inductor is called 'vloat'\n  did you mean 'VLOAD'?"),
        ("i(RL)", "no voltage source or inductor is called 'RL'"),
        ("v(out,out)", "the output v(out,out) is always 0"),
        ("0", "the output 0 is always 0"),
        ("vdb(out)", "'vdb(out)' is not an output\n  write a node, 'v(node)'"),
        ("v(out", "'v(out' is not an output"),
        ("", "'' is not an output"),
        ("v(a\x1b[2J)", "no node is called 'a␛[2J'"),
    ],
)
def test_an_output_that_cannot_be_is_an_error_with_a_suggestion(path: Path, output: str, message: str) -> None:
    with pytest.raises(InputError) as raised:
        elaborate(read(path), output=output)
    assert message in str(raised.value)


@pytest.mark.parametrize(
    ("card", "output"),
    [
        ("", "v(out)"),
        (".print ac v(outn)", "v(outn)"),
        (".print ac vdb(outn) vp(outn)", "v(outn)"),
        (".plot ac v(out,outn)", "v(out,outn)"),
        (".print ac i(vload)", "i(VLOAD)"),
        (".meas ac peak max vm(OUTN)", "v(outn)"),
        (".save v(outn)", "v(outn)"),
        (".probe v(mid)", "v(mid)"),
        (".print tran v(mid)\n.print ac v(outn)", "v(outn)"),
        (".print ac v(legp) v(outn)", "v(outn)"),
        (".print ac v(mid) v(out)", "v(out)"),
        (".print ac v(nowhere)", "v(out)"),
        (".control\nac dec 5 1 1g\nplot db(v(outn)) xlog\n.endc", "v(outn)"),
        (".control\nmeas ac bw when vdb(outn)=-3\n.endc", "v(outn)"),
        (".control\necho v(outn)\n.endc", "v(out)"),
    ],
)
def test_the_output_comes_from_the_hints_of_the_netlist(path: Path, card: str, output: str) -> None:
    path.write_text(PAIR + card + "\n")
    assert str(elaborate(read(path)).output) == output


def test_two_nodes_that_could_be_the_output_are_an_error(path: Path) -> None:
    path.write_text(PAIR + "RX vout 0 1k\nRY vout out 1k\n")
    with pytest.raises(InputError, match="the netlist does not say where the output is"):
        elaborate(read(path))
