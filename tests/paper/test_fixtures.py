"""Every line of an empty page, filled in from the review of the same board, is read and found right."""

from __future__ import annotations

import re
import tomllib
from pathlib import Path

import pytest

from tauledger.engine.client import Engine
from tauledger.paper.page import read_page
from tauledger.pipeline import page_for, review
from tauledger.record import NodeRow, Review

FIXTURES = Path(__file__).parents[2] / "fixtures"
BOARDS = sorted(path.name for path in FIXTURES.glob("*.cir"))
TABLE = re.compile(r'\[(node|device)\.(?:"(.*)"|([\w-]+))\]')


def test_the_key_of_every_line_is_bare(engine: Engine) -> None:
    text = page_for(FIXTURES / "mos_gain.cir", page="p.toml", engine=engine)
    lines = [line for line in text.splitlines() if '= ""' in line]
    assert all(re.match(r'#[A-Za-z0-9_-]+ = ""', line) for line in lines)
    assert '#gm_over_i = ""' in text
    assert {line.partition("# ")[2] for line in lines if line.startswith("#gm_over_i")} == {"1/V"}
    assert {line.partition("# ")[2] for line in lines if line.startswith("#gm =")} == {"S"}


@pytest.mark.parametrize("board", BOARDS)
def test_every_line_filled_in_from_the_review_is_right(board: str, engine: Engine) -> None:
    path = FIXTURES / board
    lines = page_for(path, page="p.toml", engine=engine).splitlines()
    found = review(path, engine=engine)
    filled, table = [], ("", "")
    for line in lines:
        opened = TABLE.match(line)
        table = (opened.group(1), opened.group(2) or opened.group(3)) if opened else table
        key = re.match(r'#(\w+) = ""', line)
        value = right(found, *table, key.group(1)) if key else None
        filled.append(line if key is None or value is None else f"{key.group(1)} = {value!r}")
    text = "\n".join(filled)
    tomllib.loads(text)
    figures = review(path, engine=engine, page=read_page(text, "p.toml")).paper
    assert len(figures) == sum(not line.startswith(("#", "[")) and "=" in line for line in filled)
    assert len(figures) > 4
    assert [(f.where, f.key, f.says) for f in figures if f.slip] == []
    wrong = [f for f in figures if f.says != "agrees within 2 %"]
    assert all(f.key == "miller_gain" and f.says.startswith("no slip: it is the value by hand") for f in wrong)


def bridged(node: NodeRow) -> float:
    """Give K across the inverting bridge that counts most, else that of what is bootstrapped most."""
    assert node.working is not None
    terms = [term for line in node.working.lines for term in line.capacitances]
    near_end = [term for term in terms if term.gain_real and not term.text.startswith("1 + 1/|A|")]
    inverting = [term for term in near_end if term.gain_real < 0.0 and (term.factor, term.gain_real) != (2.0, -1.0)]
    return max(inverting or near_end, key=lambda term: abs(term.farad * term.gain_real)).gain_real


def right(found: Review, kind: str, name: str, key: str) -> float | None:
    """Take the figure from the review; None where this circuit has none, as an edge that is not there."""
    if kind == "device":
        device = next(one for one in found.devices if one.name == name)
        symbol = {"gm_over_i": "gm/I"}.get(key, key)
        return next(figure.value for figure in device.figures if figure.symbol == symbol)
    if kind == "node":
        node = next(one for one in found.nodes if one.name == name)
        if key == "miller_gain":
            return bridged(node)
        tau, ohm = node.time_constant_exact_s, node.resistance_exact_ohm
        assert tau is not None
        assert ohm is not None
        return {"resistance": ohm, "time_constant": tau, "capacitance": tau / ohm}[key]
    if key == "gain":
        return abs(complex(found.midband.gain_real, found.midband.gain_imag))
    edge = found.f_high if key == "f_high" else found.f_low
    return None if edge is None else edge.simulated_hz
