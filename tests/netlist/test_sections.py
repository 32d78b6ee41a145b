"""Libraries by section, where included files are looked for, and which folders they may come from."""

from __future__ import annotations

from pathlib import Path

import pytest

from netlist_judge import judged
from tauledger.errors import InputError, NetlistError
from tauledger.netlist import elaborate, read

SAME = 1e-6

CORNERS = """* corners of the clamp
.lib Typical
.param rser=100
.lib 'corners.lib' models
.endl Typical
.lib slow
.include "slow.inc"
.lib corners.lib MODELS
.endl
.lib models
.model clamp d is=1e-14
.subckt pad a y
R1 a y {rser}
.ends
.endl
"""

BOARD = """pads
V1 in 0 1 AC 1
X1 in out pad
D1 out 0 clamp
R2 out 0 1k
"""


def board(folder: Path, *cards: str) -> Path:
    (folder / "corners.lib").write_text(CORNERS)
    (folder / "slow.inc").write_text(".param rser=300\n")
    path = folder / "board.cir"
    path.write_text(BOARD + "".join(f"{card}\n" for card in cards))
    return path


@pytest.mark.parametrize(("card", "ohm"), [(".lib corners.lib typical", 100.0), (".lib 'corners.lib' SLOW", 300.0)])
def test_one_section_is_taken_with_all_that_it_calls(tmp_path: Path, card: str, ohm: float) -> None:
    path = board(tmp_path, card)
    circuit = elaborate(read(path), purpose="reading")
    assert circuit.passives.value[circuit.passives.name.index("X1.R1")] == ohm
    assert judged(path, circuit) <= SAME


def test_sections_of_the_netlist_itself_are_taken_only_when_they_are_called(tmp_path: Path) -> None:
    path = board(tmp_path, ".lib extra", "R9 out 0 1", ".endl", ".lib corners.lib typical")
    assert "R9" not in elaborate(read(path), purpose="reading").passives.name
    path = board(tmp_path, ".lib extra", "R9 out 0 1", ".endl", ".lib corners.lib typical", ".lib board.cir extra")
    assert "R9" in elaborate(read(path), purpose="reading").passives.name


def test_two_sections_that_call_each_other_are_a_message_and_no_hang(tmp_path: Path) -> None:
    (tmp_path / "round.lib").write_text(".lib a\n.lib round.lib b\n.endl\n.lib b\n.lib round.lib a\n.endl\n")
    with pytest.raises(NetlistError, match="this file includes itself"):
        read(board(tmp_path, ".lib round.lib a"))


def test_a_nested_include_is_looked_for_beside_its_file_then_beside_the_netlist(tmp_path: Path) -> None:
    (tmp_path / "parts").mkdir()
    (tmp_path / "parts" / "all.inc").write_text(".include corners.lib\n.lib corners.lib typical\n.include own.inc\n")
    (tmp_path / "parts" / "own.inc").write_text("R7 out 0 7k\n")
    netlist = read(board(tmp_path, ".include parts/all.inc"))
    assert [Path(file.path).name for file in netlist.files[:4]] == [
        "board.cir",
        "all.inc",
        "corners.lib",
        "corners.lib",
    ]
    assert not netlist.notes
    (tmp_path / "own.inc").write_text("R7 out 0 8k\n")
    netlist = read(board(tmp_path, ".include parts/all.inc"))
    circuit = elaborate(netlist, purpose="reading")
    assert circuit.passives.value[circuit.passives.name.index("R7")] == 7e3
    assert [note.says.partition(";")[0] for note in netlist.notes] == [
        "own.inc is read from the folder of the file that includes it"
    ]


def test_files_are_included_only_from_the_own_folder_and_those_that_are_allowed(tmp_path: Path) -> None:
    own, shared = tmp_path / "own", tmp_path / "common"
    own.mkdir()
    shared.mkdir()
    (shared / "parts.inc").write_text(".include more.inc\n")
    (shared / "more.inc").write_text("R7 out 0 7k\n")
    path = board(own, ".lib corners.lib typical", ".include ../common/parts.inc")
    with pytest.raises(NetlistError, match="outside the netlist's own folder"):
        read(path)
    assert "R7" in elaborate(read(path, allow=[shared]), purpose="reading").passives.name
    absolute = board(own, ".lib corners.lib typical", f".include {shared / 'parts.inc'}")
    assert "R7" in elaborate(read(absolute, allow=[shared]), purpose="reading").passives.name
    (own / "link.inc").symlink_to(tmp_path / "secret")
    (tmp_path / "secret").write_text("R8 out 0 1\n")
    with pytest.raises(NetlistError, match="outside the netlist's own folder"):
        read(board(own, ".include link.inc"), allow=[shared])


def test_an_allowed_folder_must_exist(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="is not a folder"):
        read(board(tmp_path), allow=[tmp_path / "none"])
