"""The sections on the circuit: lower edge, stages, devices, poles and zeros."""

from __future__ import annotations

from tauledger.record import Review
from tauledger.report.blocks import Block, Folded, Picture, Prose, Section
from tauledger.report.drawing.stage import MOST_STAGES, drawable
from tauledger.report.tables import lower, roots, setting, upper, way


def lower_section(review: Review) -> Section:
    """Give the lower edge: its capacitors, the way from paper to simulation, the methods."""
    blocks: list[Block] = []
    if review.f_low is not None and lower.lower_parts(review):
        blocks.append(lower.lower_edge(review))
        if way.way(review, "f_low"):
            blocks.append(way.way_table(review, "f_low"))
        methods = way.methods_table(review, "f_low")
        if methods.rows:
            blocks.append(Folded(methods.caption, (methods,)))
    if lower.aside(review):
        blocks.append(Prose(lower.aside(review)))
    return Section("lower", "The lower edge", tuple(blocks), ("Edge alone", "Bypass zero"))


def stages_section(review: Review) -> Section:
    """Give the stages with their drawings; where there is no chain, the network of the hand analysis."""
    blocks: list[Block] = [setting.stages(review)] if review.stages else []
    drawn = drawable(review)
    nodes = upper.counting_nodes(review)
    # a drawing without the node that takes most would say the wrong thing
    if drawn and (not nodes or nodes[0].name in {stage.node for stage in drawn}):
        caption = (
            "The small-signal circuit of the hand analysis, stage by stage: at every node its resistance and its "
            "capacitances with their Miller part, R_Th the resistance at the input. Gm·v, with Gm = gain over R, gives "
            "the gain in the table. Where the node is marked inside, R is that behind the series resistance of the "
            "device, and Gm the gain over that R; a capacitance with “at … Ω” faces that one instead, and counts "
            "in the C of the next drawing as R·C over R."
        )
        if len(drawn) == MOST_STAGES < len(review.stages):
            caption += f" Drawn: the first {len(drawn)} nodes of {len(review.stages)}."
        blocks.append(Picture("stages", caption))
    elif nodes:
        blocks.append(upper.equivalent(review))
    return Section("stages", "Stages" if review.stages else "The network of the hand analysis", tuple(blocks))


def devices_section(review: Review) -> Section:
    """Give the operating points."""
    symbols = {figure.symbol for device in review.devices for figure in device.figures}
    terms = (("r_pi", "gm, r_π, r_o, C_π, C_μ, f_T"), ("c_gs", "gm, g_mb, r_o, C_gs, C_gd, C_db, C_sb, f_T"))
    wanted = tuple(term for symbol, term in terms if symbol in symbols)
    return Section("devices", "Devices", setting.devices(review), wanted)


def roots_section(review: Review) -> Section:
    """Give poles and zeros, and where they lie."""
    if not roots.near_roots(review):
        return Section("roots", "", ())
    # Real roots alone are one line, which the frequency response shows better.
    pairs = any(root.imag_hz for root in roots.near_roots(review))
    caption = (
        "Poles × and zeros ○ in the s-plane. Each circle is one decade farther out, so that DC itself lies beyond the "
        "innermost one; the angle is true."
    )
    picture = (Picture("plane", caption),) if pairs else ()
    return Section("roots", "Poles and zeros", (*picture, roots.roots_table(review)))
