"""All device families, and the walk over a circuit that asks them: what to observe, and its parts at the bias."""

from __future__ import annotations

from tauledger.circuit import GROUND, Circuit, Element, Model
from tauledger.devices.behavioural import BEHAVIOURAL
from tauledger.devices.bsim import BSIM3, BSIM4
from tauledger.devices.controlled import CURRENT_GAIN, TRANSCONDUCTANCE, TRANSRESISTANCE, VOLTAGE_GAIN
from tauledger.devices.coupling import COUPLING
from tauledger.devices.diode import DIODE
from tauledger.devices.family import WITH_INNER_NODES, Device, Family, Linearised, Refusal
from tauledger.devices.fitted import FITTED
from tauledger.devices.gummel_poon import GUMMEL_POON
from tauledger.devices.jfet import LEVEL_1 as JFET_1
from tauledger.devices.jfet import LEVEL_2 as JFET_2
from tauledger.devices.lines import LOSSLESS_LINE, LOSSY_LINE
from tauledger.devices.meyer import LEVEL_1 as MOS_1
from tauledger.devices.meyer import LEVEL_2 as MOS_2
from tauledger.devices.meyer import LEVEL_3 as MOS_3
from tauledger.devices.meyer import LEVEL_6 as MOS_6
from tauledger.devices.meyer import LEVEL_9 as MOS_9
from tauledger.devices.parts import Part, conductance
from tauledger.devices.passives import CAPACITOR, INDUCTOR, RESISTOR, passive_part
from tauledger.devices.sources import CURRENT_SOURCE, VOLTAGE_SOURCE
from tauledger.devices.switches import CURRENT_SWITCH, VOLTAGE_SWITCH
from tauledger.devices.vdmos import VDMOS
from tauledger.errors import InputError
from tauledger.solution import Bias, Isolation, Observation

FAMILIES: tuple[Family, ...] = (
    RESISTOR,
    CAPACITOR,
    INDUCTOR,
    VOLTAGE_SOURCE,
    CURRENT_SOURCE,
    VOLTAGE_GAIN,
    CURRENT_GAIN,
    TRANSCONDUCTANCE,
    TRANSRESISTANCE,
    COUPLING,
    VOLTAGE_SWITCH,
    CURRENT_SWITCH,
    LOSSLESS_LINE,
    LOSSY_LINE,
    GUMMEL_POON,
    DIODE,
    MOS_1,
    MOS_2,
    MOS_3,
    MOS_6,
    MOS_9,
    BSIM3,
    BSIM4,
    VDMOS,
    JFET_1,
    JFET_2,
    *FITTED,
    *BEHAVIOURAL,
)
OF_LETTER = {
    letter: tuple(family for family in FAMILIES if family.letter == letter)
    for letter in {family.letter for family in FAMILIES}
}


def families_of(letter: str) -> tuple[Family, ...]:
    """Give the families of an element letter (either case), in the order in which they are asked."""
    return OF_LETTER.get(letter.upper(), ())


def choose(element: Element, model: Model | None) -> Family | Refusal:
    """Give the family that takes this element, or the reason why none does.

    Families are asked in the order of `FAMILIES`: those whose letter, model type and level fit, the first that does not
    refuse. Where all of them refuse, the last one's reason counts: it is the one that could do most.
    """
    families = fitting(element, model)
    if not families:
        return Refusal("level", *_no_family(element, model))
    refusal: Refusal | None = None
    for family in families:
        refusal = family.refuse(element, model)
        if refusal is None:
            return family
    assert refusal is not None
    return refusal


def fitting(element: Element, model: Model | None) -> tuple[Family, ...]:
    """Give the families whose letter, model type and level fit to this element, whether or not they refuse it."""
    return tuple(family for family in families_of(element.letter) if _fits(family, model))


def _fits(family: Family, model: Model | None) -> bool:
    if model is None:
        return not family.model_types or family.model_optional
    return model.type in family.model_types and model.level in family.levels


def _no_family(element: Element, model: Model | None) -> tuple[str, str]:
    families = families_of(element.letter)
    words = families[0].words if families else f"element of letter {element.letter}"
    if model is None:
        return f"a {words} without a model is not supported by this version", ""
    known = sorted({level for family in families if model.type in family.model_types for level in family.levels})
    if not known:
        return f"a {words} with a model of type {model.type} is not supported by this version", ""
    return (
        f"level {model.level} of a {words} is not supported by this version",
        f"supported: {', '.join(map(str, known))}",
    )


def observations(circuit: Circuit) -> tuple[Observation, ...]:
    """List what the engine must read at the operating point, in the order of the circuit's elements."""
    asked = (_family(circuit, element).observe(element) for element in circuit.elements)
    return tuple(observation for observation in asked if observation is not None)


def isolations(circuit: Circuit, bias: Bias) -> tuple[Isolation, ...]:
    """List the instances that must be measured alone, at their operating point, in the order of the elements."""
    asked = (_family(circuit, element).isolate(circuit, element, bias) for element in circuit.elements)
    return tuple(isolation for isolation in asked if isolation is not None)


def linearise(circuit: Circuit, bias: Bias) -> Linearised:
    """Give every part of the small-signal network in netlist order, and the devices that have a cell or a region.

    Parts come in the order of their cards; those of one card in the order of its device file.
    """
    rows: list[tuple[tuple[int, int], tuple[Part, ...]]] = []
    passives = circuit.passives
    for k, name in enumerate(passives.name):
        a, b = circuit.nodes[passives.a[k]], circuit.nodes[passives.b[k]]
        part = passive_part(passives.kind[k], name, a, b, float(passives.value[k]))
        rows.append(((int(passives.path[k]), int(passives.card[k])), (part,)))
    devices: list[Device] = []
    for element in circuit.elements:
        device = _family(circuit, element).linearise(circuit, element, bias)
        rows.append(((element.path, element.card), device.parts))
        if device.cell is not None or device.region:
            devices.append(device)
    rows.sort(key=lambda row: row[0])
    found = tuple(part for _, parts in rows for part in parts)
    return Linearised((*found, *_shunts(circuit, found)), tuple(devices))


def shunt_siemens(circuit: Circuit) -> float:
    """Give what `.options rshunt` puts from every node to ground, S; 0 without."""
    ohm = dict(circuit.options).get("rshunt")
    return 0.0 if ohm is None else 1.0 / ohm


def _shunts(circuit: Circuit, parts: tuple[Part, ...]) -> tuple[Part, ...]:
    """Give what `.options rshunt` puts from every node to ground, those behind series resistances included.

    An instance that was measured alone has those of its own inner nodes in its block.
    """
    siemens = shunt_siemens(circuit)
    if not siemens:
        return ()
    measured = {part.owner for part in parts if part.kind == "block"}
    devices = {element.name for element in circuit.elements if element.letter in WITH_INNER_NODES} - measured
    inside = [node for part in parts if part.owner in devices for node in part.nodes if node not in circuit.nodes]
    nodes = dict.fromkeys((*circuit.nodes[1:], *inside))
    return tuple(conductance(f"Rshunt.{node}", node, GROUND, siemens) for node in nodes)


def _family(circuit: Circuit, element: Element) -> Family:
    found = choose(element, circuit.model(element.model) if element.model else None)
    if isinstance(found, Refusal):
        raise InputError(f"{element.name}: {found.reason}", found.hint)
    return found
