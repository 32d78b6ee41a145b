"""The linear voltage-controlled current source, a transistor's hand model where its control shares an output node."""

from __future__ import annotations

from tauledger.circuit import Circuit, Element
from tauledger.devices.family import Device, Family, Transconductor, never_refused, observe_nothing
from tauledger.devices.parts import Part, transconductance
from tauledger.solution import Bias

WORDS = "voltage-controlled current source"


def cell_of(part: Part) -> Transconductor | None:
    """Give a transconductance as a cell where one control node is one of its output nodes, else None.

    The shared node is the common one; the sign of gm follows from which ends are shared. A part that senses its own
    two ends is a conductance and no cell.
    """
    if part.kind != "transconductance":
        return None
    out_plus, out_minus, control_plus, control_minus = part.nodes
    if {out_plus, out_minus} == {control_plus, control_minus}:
        return None
    for output, common, out_sign in ((out_plus, out_minus, 1.0), (out_minus, out_plus, -1.0)):
        for control, reference, control_sign in (
            (control_plus, control_minus, 1.0),
            (control_minus, control_plus, -1.0),
        ):
            if reference == common and control != output:
                return Transconductor(part.owner, control, common, output, out_sign * control_sign * part.value)
    return None


def _linearise(circuit: Circuit, element: Element, _bias: Bias) -> Device:
    out_plus, out_minus, control_plus, control_minus = (circuit.nodes[node] for node in element.nodes)
    gain = element.parameter("gain", 0.0) * element.parameter("m", 1.0)
    part = transconductance(element.name, (out_plus, out_minus), (control_plus, control_minus), gain)
    return Device(element.name, WORDS, "", (), (), cell_of(part), (part,))


TRANSCONDUCTANCE = Family(
    letter="G",
    words=WORDS,
    terminals=("plus", "minus", "control plus", "control minus"),
    linearise=_linearise,
    observe=observe_nothing,
    refuse=never_refused,
    instance_parameters=frozenset({"gain", "m"}),
)
