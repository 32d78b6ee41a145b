"""Each broken netlist gives exactly the message that stands beside it."""

from __future__ import annotations

from pathlib import Path

import pytest

from tauledger.errors import InputError, NetlistError
from tauledger.netlist import elaborate, read

BROKEN = Path(__file__).parents[2] / "fixtures" / "broken"
NAMES = sorted(path.stem for path in BROKEN.glob("*.cir"))


@pytest.mark.parametrize("name", NAMES)
def test_a_broken_netlist_gives_its_message(name: str, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(BROKEN)
    with pytest.raises(InputError) as raised:
        elaborate(read(f"{name}.cir"))
    assert f"{raised.value}\n" == Path(f"{name}.txt").read_text(encoding="utf-8")


def test_every_message_has_its_netlist() -> None:
    assert sorted(path.stem for path in BROKEN.glob("*.txt")) == NAMES
    assert len(NAMES) >= 60


@pytest.mark.parametrize("name", NAMES)
def test_the_caret_stands_under_the_thing_that_is_wrong(name: str, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(BROKEN)
    with pytest.raises(InputError) as raised:
        elaborate(read(f"{name}.cir"))
    if not isinstance(raised.value, NetlistError):
        return
    for diagnostic in raised.value.diagnostics:
        line = Path(diagnostic.file).read_text(encoding="latin-1").split("\n")[diagnostic.line - 1]
        assert len(line) == len(diagnostic.text)
        assert 1 <= diagnostic.column <= len(line) + 1
        assert diagnostic.column + diagnostic.width <= len(line) + 2
