"""The catalogue: every letter once, parts in the order of the cards, names that do not collide."""

from __future__ import annotations

from msgspec.structs import replace

from circuits import board, preamp
from tauledger.devices.catalogue import FAMILIES, choose, families_of, linearise, observations
from tauledger.devices.family import Refusal
from tauledger.devices.gummel_poon import GUMMEL_POON
from tauledger.devices.passives import passive_part
from tauledger.engine.client import Engine


def test_families_are_found_by_either_case_of_their_letter() -> None:
    assert all(family in families_of(family.letter.lower()) for family in FAMILIES)
    assert families_of("?") == ()


def test_the_family_is_chosen_by_type_and_level_and_the_first_that_takes_it() -> None:
    circuit = preamp()
    transistor = circuit.elements[-1]
    assert choose(transistor, circuit.models[0]) is GUMMEL_POON
    no_such = choose(transistor, replace(circuit.models[0], level=77))
    assert isinstance(no_such, Refusal)
    assert "level 77" in no_such.reason
    other = choose(transistor, replace(circuit.models[0], type="nmos"))
    assert isinstance(other, Refusal)
    assert "nmos" in other.reason
    assert isinstance(choose(transistor, None), Refusal)


def test_only_families_with_a_model_are_observed() -> None:
    assert [observation.element for observation in observations(preamp())] == ["Q1"]


def test_parts_come_in_the_order_of_the_cards(engine: Engine) -> None:
    circuit = preamp()
    parts = linearise(circuit, engine.bias(circuit, observations(circuit))).parts
    owners = list(dict.fromkeys(part.owner for part in parts))
    assert owners == ["VCC", "VIN", "RS", "C1", "R1", "R2", "RC", "RE", "CE", "Q1", "C3", "RL", "CL"]
    names = [part.name for part in parts]
    assert len(set(names)) == len(names)


def test_devices_are_those_with_a_cell_or_a_region(engine: Engine) -> None:
    circuit = board("V1 in 0 1", "R1 in out 1k", "G1 out 0 in 0 1m", "G2 out in 0 x 1m", "R2 x 0 1k", "Q1 out in 0 qn")
    devices = linearise(circuit, engine.bias(circuit, observations(circuit))).devices
    assert [device.name for device in devices] == ["G1", "Q1"]


def test_a_passive_element_and_its_column_are_the_same_part() -> None:
    from tauledger.circuit import Element

    circuit = board("V1 a 0 1", "R1 a out 1k", "C1 out 0 1n", "L1 out 0 1m")
    for letter, value in (("R", 2e3), ("C", 1e-9), ("L", 1e-3)):
        family = families_of(letter)[0]
        element = Element(letter, f"{letter}9", (1, 2), "", (("value", value),), 0, 0)
        made = family.linearise(circuit, element, None)  # type: ignore[arg-type]
        assert made.parts == (passive_part(letter, f"{letter}9", "a", "out", value),)
