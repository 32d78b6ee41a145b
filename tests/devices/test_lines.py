"""Lossless and lossy lines: the rebuilt network against the engine, from DC to a hundred times the band edge."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from agreement import rebuilt, worst_of
from circuits import NPN, board
from tauledger.circuit import NO_CHANGE, Circuit, Model
from tauledger.devices.catalogue import choose
from tauledger.devices.family import Refusal
from tauledger.engine.client import Engine
from tauledger.engine.grid import decades
from tauledger.errors import EngineError
from tauledger.netlist import read
from tauledger.network.solve import response
from tauledger.numbers import Numbers, solve

ENDS = {"matched": "75", "open": "1g", "low": "3", "high": "10k"}
FLAGS = (("nocontrol", 1.0),)


def ltra(name: str, **values: float) -> Model:
    given = {"len": 2.0, **values}
    return Model(name, "ltra", 1, tuple(given.items()), 0, 0)


COAX = ltra("coax", r=0.0, l=375e-9, c=66.7e-12)
LOSSY = ltra("lossy", r=4.0, l=375e-9, c=66.7e-12, len=10.0, rel=0.5)
WORN = Model("worn", "ltra", 1, (*ltra("", r=400.0, l=375e-9, c=66.7e-12).parameters, *FLAGS), 0, 0)
TRACK = ltra("track", r=3e3, c=180e-12)
LEAKY = ltra("leaky", r=30.0, g=2e-3)
MODELS = (NPN, COAX, LOSSY, WORN, TRACK, LEAKY)
CARDS = {
    "75 Ω, 5 ns": "T1 a 0 out 0 z0=75 td=5n",
    "600 Ω, 50 ns": "T1 a 0 out 0 z0=600 td=50n",
    "L and C": "O1 a 0 out 0 coax",
    "R, L and C": "O1 a 0 out 0 lossy",
    "R, L and C, much loss": "O1 a 0 out 0 worn",
    "R and C": "O1 a 0 out 0 track",
    "R and G": "O1 a 0 out 0 leaky",
}
LIFTED = {
    "lossless": "T1 a b out d z0=75 td=5n",
    "R, L and C": "O1 a b out d lossy",
    "R and C": "O1 a b out d track",
    "R and G": "O1 a b out d leaky",
}


def plain(card: str, ohm: str = "10k") -> Circuit:
    cards = ("VIN in 0 0", "RS in a 75", card, f"RL out 0 {ohm}", "CL out 0 4p")
    return board(*cards, models=MODELS, drive={"VIN": 1.0})


def lifted(card: str) -> Circuit:
    cards = ("VIN in 0 0", "RS in a 10", "RB b 0 5", card, "RL out d 1k", "RD d 0 20", "CL out d 4p")
    return board(*cards, models=MODELS, drive={"VIN": 1.0})


def follower(card: str, temperature_c: float = 27.0) -> Circuit:
    """The cable driver: an emitter follower, a resistor that ends the line at the board, the line, a high input.

    Small couplings: 10 µF at some GHz is 10⁵ S, beside which network and engine alike lose the digits of the signal.
    """
    cards = (
        *("VCC vcc 0 12", "VIN s 0 0", "RS s in 470", "C1 in b 10n", "R1 vcc b 39k", "R2 b 0 47k", "Q1 vcc b e qn"),
        *("RE e 0 1.2k", "C2 e lead 100n", "R4 lead a 68", card, "RL out 0 10k", "CL out 0 20p"),
    )
    return board(*cards, models=MODELS, drive={"VIN": 1.0}, temperature_c=temperature_c)


def disagreement(circuit: Circuit, engine: Engine, stop_hz: float = 1e10) -> float:
    network, _ = rebuilt(circuit, engine)
    sweep = engine.sweep(decades(1.0, stop_hz, 40))
    size = np.abs(sweep.response)
    return float(
        np.max(np.abs(response(network, sweep.frequency_hz) - sweep.response) / np.maximum(size, 1e-6 * size.max()))
    )


@pytest.mark.parametrize("end", ENDS)
@pytest.mark.parametrize("card", CARDS)
def test_lines_agree_with_the_engine_whatever_ends_them(card: str, end: str, engine: Engine) -> None:
    assert disagreement(plain(CARDS[card], ENDS[end]), engine) < 1e-10


@pytest.mark.parametrize("card", LIFTED)
def test_lines_without_common_return_agree(card: str, engine: Engine) -> None:
    assert disagreement(lifted(LIFTED[card]), engine) < 1e-10


def test_a_shorted_line_agrees_but_for_the_engines_own_rounding_near_dc(engine: Engine) -> None:
    """ngspice takes 1 − e^(−jωτ) as it stands: of a short of 10⁻⁷ Ω at 1 Hz eight digits are left."""
    circuit = board(
        *("VIN in 0 0", "RS in out 50", "T1 out 0 0 0 z0=75 td=5n", "RL out 0 1k"), models=MODELS, drive={"VIN": 1.0}
    )
    network, _ = rebuilt(circuit, engine)
    for start, stop, tolerance in ((1e5, 9e7, 1e-10), (10.0, 1e5, 1e-6)):
        sweep = engine.sweep(decades(start, stop, 20))
        assert np.allclose(response(network, sweep.frequency_hz), sweep.response, rtol=tolerance, atol=0.0)


@pytest.mark.parametrize("temperature_c", [-40.0, 27.0, 125.0])
@pytest.mark.parametrize("card", ["75 Ω, 5 ns", "R, L and C", "R and C"])
def test_a_line_behind_a_follower_agrees_up_to_a_hundred_times_its_edge(
    card: str, temperature_c: float, engine: Engine
) -> None:
    assert disagreement(follower(CARDS[card], temperature_c), engine, 3e9) < 1e-9


FORMS: dict[str, dict[str, float]] = {
    "nothing": {},
    "R alone": {"r": 1.0},
    "L alone": {"l": 1e-6},
    "C alone": {"c": 1e-9},
    "G alone": {"g": 1e-3},
    "R and L": {"r": 1.0, "l": 1e-6},
    "G and C": {"g": 1e-3, "c": 1e-9},
    "R, L, G and C": {"r": 1.0, "l": 1e-6, "g": 1e-3, "c": 1e-9},
    "no length": {"r": 1.0, "c": 1e-9, "len": 0.0},
}


@pytest.mark.parametrize("form", FORMS)
def test_what_is_refused_ngspice_does_not_solve_either(form: str, engine: Engine) -> None:
    model = ltra("form", **FORMS[form])
    circuit = board(
        *("VIN in 0 0", "RS in a 50", "O1 a 0 out 0 form", "RL out 0 75"), models=(model,), drive={"VIN": 1.0}
    )
    refusal = choose(circuit.elements[1], model)
    assert isinstance(refusal, Refusal)
    if form != "no length":
        # a length of 0 makes ngspice give numbers that are none
        with pytest.raises(EngineError):
            engine.bias(circuit, ())


DECKS = {
    "mismatched, ripple long before f_H": "R1 in a 50\nC1 a 0 2p\nT1 a 0 out 0 z0=75 td=50n\nR2 out 0 120\nC2 out 0 1p",
    "mismatched, shorter": "R1 in a 30\nC1 a 0 1p\nT1 a 0 out 0 z0=75 td=8n\nR2 out 0 140\nC2 out 0 2p",
    "open at the far end": "R1 in a 200\nT1 a 0 out 0 z0=50 td=5n\nR2 out 0 1meg\nC2 out 0 3p",
    "open stub beside the path": "R1 in out 50\nT1 out 0 x 0 z0=50 f=50meg\nRX x 0 1meg\nR2 out 0 1k",
    "no capacitor at all": "R1 in a 300\nT1 a 0 out 0 z0=50 td=5n\nR2 out 0 500",
    "a capacitor, that is, to its source": "R1 in a 1meg\nT1 a 0 out 0 z0=50 td=5n\nR2 out 0 1g",
    "lossy": "R1 in a 10\nO1 a 0 out 0 coax\nR2 out 0 1k\nC2 out 0 5p\n.model coax ltra r=0.5 l=250n c=100p len=8",
    "R and C": "R1 in a 1k\nO1 a 0 out 0 track\nC2 out 0 10f\n.model track ltra r=20k c=200p len=1e-2",
    "two lines of different lengths": (
        "R1 in a 40\nT1 a 0 m 0 z0=50 td=3n\nC1 m 0 2p\nT2 m 0 out 0 z0=75 td=11n\nR2 out 0 90\nC2 out 0 1p"
    ),
    "in subcircuits": (
        "R1 in a 30\nX1 a m lead\nX2 m out lead\nR2 out 0 140\nC2 out 0 2p\n"
        ".subckt lead p q\nT1 p 0 q 0 z0=60 f=25meg nl=0.1\n.ends"
    ),
    "no plateau: a shorted stub": "R1 in out 500\nT1 out 0 0 0 z0=50 td=5n\nR2 out 0 1k",
    "coupled in": "C0 in x 100n\nR1 x a 60\nT1 a 0 out 0 z0=50 td=20n\nR2 out 0 70\nC2 out 0 8p",
}


def numbers_of(deck: str, folder: Path, engine: Engine) -> Numbers:
    path = folder / "line.cir"
    path.write_text(f"Lead\nV1 in 0 dc 0 ac 1\n{deck}\n.ac dec 10 1k 1g\n.print ac v(out)\n.end\n")
    return solve(read(path), NO_CHANGE, engine)


@pytest.mark.parametrize("deck", DECKS)
def test_band_edges_are_ngspices_own(deck: str, engine: Engine, tmp_path: Path) -> None:
    numbers = numbers_of(DECKS[deck], tmp_path, engine)
    assert numbers.simulated is not None
    assert numbers.agreement is not None
    assert numbers.agreement.max_relative_error < 1e-9
    assert numbers.edges.f_high is not None
    assert numbers.simulated.f_high_hz == pytest.approx(numbers.edges.f_high.hz, rel=1e-6)
    low = numbers.edges.f_low.hz if numbers.edges.f_low is not None else None
    assert numbers.simulated.f_low_hz == (None if low is None else pytest.approx(low, rel=1e-6))
    # no point of ngspice's between mid-band and the edge lies below it
    hz = numbers.edges.f_high.hz
    assert hz is not None
    swept = numbers.simulated.all_of_it
    inside = (swept.frequency_hz > numbers.midband.frequency_hz) & (swept.frequency_hz < hz * (1.0 - 1e-6))
    assert np.all(np.abs(swept.response[inside]) > np.abs(numbers.simulated.midband.gain) / np.sqrt(2.0))


FAMILIES = {
    "lossless lines": [
        *(plain(CARDS[card], ohm) for card in list(CARDS)[:2] for ohm in ENDS.values()),
        *(follower(CARDS["75 Ω, 5 ns"], t) for t in (-40.0, 27.0, 125.0)),
        lifted(LIFTED["lossless"]),
    ],
    "lossy lines": [
        *(plain(CARDS[card], ohm) for card in list(CARDS)[2:] for ohm in ENDS.values()),
        *(follower(CARDS["R, L and C"], t) for t in (-40.0, 27.0, 125.0)),
        *(lifted(LIFTED[card]) for card in list(LIFTED)[1:]),
    ],
}


def test_worst_agreement_is_what_the_developers_page_keeps(
    engine: Engine, pytestconfig: pytest.Config, capsys: pytest.CaptureFixture[str]
) -> None:
    assert worst_of(FAMILIES, engine, pytestconfig, capsys) < 1e-9
