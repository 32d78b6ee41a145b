"""Files: what is read, what is refused, and that every item is found again at its line."""

from __future__ import annotations

import hashlib
import pickle
from pathlib import Path

import pytest

from tauledger.circuit import Place, fold
from tauledger.errors import InputError, NetlistError
from tauledger.netlist import elaborate, instance_context, place, read
from tauledger.netlist.draft import MOST_INSTANCES
from tauledger.netlist.netlist import position
from tauledger.netlist.reader import MOST_BYTES, MOST_NESTED_INCLUDES

PAD = "VIN in 0 AC 1\nR1 in out 600\nC1 out 0 100p\n"


def written(path: Path, text: str | bytes) -> Path:
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_bytes(text.encode() if isinstance(text, str) else text)
    return path


@pytest.mark.parametrize(
    ("first", "title"),
    [
        ("River-level gauge, pad", "River-level gauge, pad"),
        ("* River-level gauge", "River-level gauge"),
        (".title River-level gauge", "River-level gauge"),
        ("", ""),
        ("R9 in 0 1", "R9 in 0 1"),
        ("\tgauge\x1b[31m\rred\u202e", "gauge␛[31m␍red�"),
    ],
)
def test_the_first_line_is_the_title_and_safe_to_print(tmp_path: Path, first: str, title: str) -> None:
    netlist = read(written(tmp_path / "board.cir", f"{first}\n{PAD}"))
    assert netlist.title == title
    assert elaborate(netlist).passives.name == ("R1", "C1")


def test_every_item_is_found_again_at_its_line_through_includes_and_instances(tmp_path: Path) -> None:
    parts = written(tmp_path / "lib" / "parts.inc", ".subckt cell a y\n* pad\nR1 a\n+ y 1k\n.ends\n")
    board = written(
        tmp_path / "board.cir",
        "pads\n.include lib/parts.inc\n" + PAD + "X1 out far pair\n  RL far 0 1k\n"
        ".subckt pair a y\nX1 a m cell\nX2 m y cell\n.ends\n",
    )
    netlist = read(board)
    circuit = elaborate(netlist)
    rows = {name: k for k, name in enumerate(circuit.passives.name)}
    row = rows["X1.X2.R1"]
    found = place(netlist, int(circuit.passives.card[row]), int(circuit.passives.path[row]))
    assert found == Place(str(parts), 3, 1, "R1 a")
    assert instance_context(netlist, circuit, int(circuit.passives.path[row])) == (
        f"in X1.X2 ({board}:10), subcircuit cell ({parts}:1)",
        f"in X1 ({board}:6), subcircuit pair ({board}:8)",
    )
    assert place(netlist, int(circuit.passives.card[rows["RL"]])) == Place(str(board), 7, 3, "  RL far 0 1k")
    assert instance_context(netlist, circuit, 0) == ()


def test_a_character_is_found_through_continuations_tabs_and_comments(tmp_path: Path) -> None:
    netlist = read(
        written(tmp_path / "board.cir", "pad\nVIN in 0 AC 1\n* first\n\tR1\tin ; x\n* between\n  +\tout  600\n")
    )
    card = netlist.cards[1]
    for word, line, column in (("R1", 4, 2), ("in", 4, 5), ("out", 6, 5), ("600", 6, 10)):
        at = position(netlist.files, card, card.text.index(word))
        assert (at.line, at.column) == (line, column)
        assert at.text[at.column - 1 :].startswith(word)


def test_the_digest_covers_all_files_in_the_order_of_reading(tmp_path: Path) -> None:
    first = written(tmp_path / "a.inc", "R2 out 0 1k\n")
    second = written(tmp_path / "b.inc", "R3 out 0 1k\n")
    board = written(tmp_path / "board.cir", "pad\n.include a.inc\n.include b.inc\n" + PAD)
    data = b"".join(path.read_bytes() for path in (board, first, second))
    assert read(board).sha256 == hashlib.sha256(data).hexdigest()


def test_a_netlist_and_its_circuit_can_be_pickled(tmp_path: Path) -> None:
    netlist = read(written(tmp_path / "board.cir", "pad\n.param r={1k*2}\n" + PAD))
    assert pickle.loads(pickle.dumps(netlist)) == netlist
    circuit = elaborate(netlist)
    assert pickle.loads(pickle.dumps(circuit)).nodes == circuit.nodes


@pytest.mark.parametrize(
    ("data", "message"),
    [
        (b"", "is empty"),
        (b" \n\n", "is empty"),
        (b"pad\nR1 in 0 \x001k\n", "is not a text file"),
        ("pad\nR1 in 0 1k\n".encode("utf-16"), "is UTF-16 text\n  save it as UTF-8"),
        (b"\x7fELF\x02\x01\x01\x00\x00", "is not a text file"),
    ],
)
def test_a_file_that_is_no_text_is_refused(tmp_path: Path, data: bytes, message: str) -> None:
    path = written(tmp_path / "board.cir", data)
    with pytest.raises(InputError) as raised:
        read(path)
    assert str(raised.value) == f"{path} {message}" or str(raised.value).startswith(f"{path} {message}\n")


def test_a_huge_file_is_refused_without_being_read_whole(tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    with path.open("wb") as stream:
        stream.truncate(1000 * MOST_BYTES)
    with pytest.raises(InputError, match="is too large"):
        read(path)


@pytest.mark.parametrize(
    ("name", "message"), [("nowhere.cir", "does not exist"), (".", "is not a file"), ("no\0where", "does not exist")]
)
def test_a_file_that_is_not_there_is_refused(tmp_path: Path, name: str, message: str) -> None:
    with pytest.raises(InputError, match=message):
        read(str(tmp_path / name))


def test_a_file_outside_the_netlists_folder_is_not_read(tmp_path: Path) -> None:
    secret = written(tmp_path / "secret.txt", "password\n")
    folder = tmp_path / "board"
    written(folder / "board.cir", "pad\n" + PAD)
    (folder / "link.inc").symlink_to(secret)
    (folder / "up").symlink_to(tmp_path)
    for name in ("../secret.txt", str(secret), "link.inc", "up/secret.txt", "./x/../../secret.txt"):
        board = written(folder / "board.cir", f"pad\n.include '{name}'\n{PAD}")
        with pytest.raises(NetlistError) as raised:
            read(board)
        assert "password" not in str(raised.value)
        assert raised.value.diagnostics[0].line == 2


def test_a_link_that_stays_under_the_folder_is_read(tmp_path: Path) -> None:
    written(tmp_path / "lib" / "load.inc", "RL out 0 1k\n")
    (tmp_path / "load.inc").symlink_to(tmp_path / "lib" / "load.inc")
    board = written(tmp_path / "board.cir", "pad\n.include load.inc\n" + PAD)
    assert "RL" in elaborate(read(board)).passives.name


def test_includes_have_a_depth(tmp_path: Path) -> None:
    for k in range(MOST_NESTED_INCLUDES + 2):
        written(tmp_path / f"p{k}.inc", f".include p{k + 1}.inc\n")
    board = written(tmp_path / "board.cir", "pad\n.include p0.inc\n" + PAD)
    with pytest.raises(NetlistError, match=f"nested more than {MOST_NESTED_INCLUDES} deep") as raised:
        read(board)
    assert len(raised.value.diagnostics[0].context) == MOST_NESTED_INCLUDES


def test_includes_have_a_number(tmp_path: Path) -> None:
    written(tmp_path / "p.inc", "* nothing\n")
    board = written(tmp_path / "board.cir", "pad\n" + ".include p.inc\n" * 300 + PAD)
    with pytest.raises(NetlistError, match="includes more than 200 files"):
        read(board)


def test_a_file_of_that_name_in_the_current_folder_is_noted(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    written(tmp_path / "board" / "load.inc", "RL out 0 1k\n")
    board = written(tmp_path / "board" / "board.cir", "pad\n.include load.inc\n.print ac v(out)\n" + PAD)
    assert elaborate(read(board)).notes == ()
    monkeypatch.chdir(tmp_path)
    written(tmp_path / "load.inc", "RL out 0 2k\n")
    circuit = elaborate(read(board))
    assert circuit.passives.value[0] == 1e3
    assert [note.where for note in circuit.notes] == [f"{board}:2"]


def test_twenty_diagnostics_are_enough_and_they_stand_in_file_order(tmp_path: Path) -> None:
    board = written(tmp_path / "board.cir", "pad\n" + PAD + "".join(f"R{k} in out x{k}\n" for k in range(90, 40, -1)))
    with pytest.raises(NetlistError) as raised:
        elaborate(read(board))
    assert [diagnostic.line for diagnostic in raised.value.diagnostics] == list(range(5, 25))


def test_a_card_that_is_wrong_in_every_instance_is_reported_once(tmp_path: Path) -> None:
    cell = ".subckt cell a y\nC1 a y -1\n.ends\n"
    board = written(tmp_path / "board.cir", "pad\n" + PAD + "".join(f"X{k} in out cell\n" for k in range(9)) + cell)
    with pytest.raises(NetlistError) as raised:
        elaborate(read(board))
    (diagnostic,) = raised.value.diagnostics
    assert diagnostic.context[0].startswith("in X0 ")


def test_subcircuits_that_multiply_without_end_are_stopped(tmp_path: Path) -> None:
    levels = "".join(
        f".subckt s{k} a\n" + "".join(f"X{j} a s{k + 1}\n" for j in range(10)) + ".ends\n" for k in range(12)
    )
    levels += ".subckt s12 a\nR1 a 0 1k\n.ends\n"
    board = written(tmp_path / "board.cir", "bomb\n" + PAD + "X1 in s0\n" + levels)
    with pytest.raises(NetlistError, match=f"more than {MOST_INSTANCES} instances"):
        elaborate(read(board))


def test_one_spelling_is_kept_and_all_spellings_are_one(tmp_path: Path) -> None:
    board = written(tmp_path / "board.cir", "pad\nVin In GND AC 1\nR1 IN Out 1k\nR2 OUT gnd 1k\nc1 out 0 1p\n")
    circuit = elaborate(read(board))
    assert circuit.nodes == ("0", "In", "Out")
    assert circuit.passives.name == ("R1", "R2", "c1")
    assert circuit.passives.kind == "RRC"
    assert circuit.drive[0].source == "Vin"


def test_no_name_of_a_circuit_can_steer_a_terminal(tmp_path: Path) -> None:
    for character in ("\x1b", "\x07", "\x08", "\x85", "\u202e", "\u2028", "\u200b", "\x7f", "\r"):
        board = written(tmp_path / "board.cir", f"pad\n{PAD}R2 a{character}b 0 1k\n")
        with pytest.raises(NetlistError, match="control character") as raised:
            read(board)
        assert character not in str(raised.value)


def test_comments_may_hold_anything(tmp_path: Path) -> None:
    board = written(tmp_path / "board.cir", f"pad\n* \x1b[31m ring \x07\n{PAD}R2 out 0 1k ; \x1b[0m µ\n")
    assert fold("R2") in [fold(name) for name in elaborate(read(board)).passives.name]
