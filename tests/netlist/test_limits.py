"""What has no end, or is too large to be meant, is a message within seconds."""

from __future__ import annotations

from pathlib import Path

import pytest

from tauledger.errors import InputError
from tauledger.netlist import elaborate, read
from tauledger.netlist.diagnostics import MOST_DIAGNOSTICS

PAD = "pad\nV1 in 0 AC 1\nR1 in 0 1k\n"
DOUBLING = "".join(f".func f{k}(x) {{f{k + 1}(x)+f{k + 1}(x)}}\n" for k in range(25)) + ".func f25(x) {x}\n"
LONG_WORD = "ab_1" * 50_000


@pytest.mark.parametrize(
    ("cards", "message"),
    [
        (DOUBLING + "R9 in 0 {f0(1)}", "calls functions more than"),
        (DOUBLING + "B9 out 0 v=f0(v(in))", "calls functions more than"),
        (".func f(x) {f(x)}\nR9 in 0 {f(1)}", "f calls itself"),
        ("".join(f".param p{k}={{p{k + 1}+1}}\n" for k in range(3000)) + ".param p3000=1", "nested too deeply"),
        (f"B9 out 0 v={'-(' * 299}v(in){')' * 299}", "the formula is too long"),
        (f"B9 out 0 v={'-(' * 120}v(in){')' * 120}", "the formula is too large"),
        ("B9 out 0 v=v(in" + " " * 3900, "the formula ends"),
        (f"B9 out 0 {LONG_WORD}", "v= or i= is missing"),
        (f"E9 out 0 {LONG_WORD} x", "has four nodes and a gain"),
        (".if (1)\n" * 50 + ".endif\n" * 50, ".if blocks are nested more than"),
        (".subckt a b\n" * 50 + ".ends\n" * 50, "subcircuits are defined more than"),
    ],
)
def test_it_is_a_message(tmp_path: Path, cards: str, message: str) -> None:
    path = tmp_path / "board.cir"
    path.write_text(f"{PAD}{cards}\n")
    with pytest.raises(InputError) as raised:
        elaborate(read(path), purpose="reading")
    assert message in str(raised.value)


def test_no_more_than_twenty_messages_come_at_once_in_the_order_of_the_file(tmp_path: Path) -> None:
    path = tmp_path / "board.cir"
    path.write_text(PAD + "".join(f"R{k} in 0 nothing\n" for k in range(2, 60)))
    with pytest.raises(InputError) as raised:
        elaborate(read(path), purpose="reading")
    heads = [line for line in str(raised.value).splitlines() if line.startswith(str(path))]
    assert [int(head.split(":")[1]) for head in heads] == list(range(4, 4 + MOST_DIAGNOSTICS))
