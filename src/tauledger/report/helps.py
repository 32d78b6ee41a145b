"""What would help: what 10 % less of one element does to f_H, f_L and gain, and the proof of the largest three."""

from __future__ import annotations

from tauledger.record import Review
from tauledger.report.layout import Block, Prose, Row, Section, Table
from tauledger.report.marks import in_short, mark
from tauledger.report.wording import change, move, part_title, value_of


def what_would_help(review: Review) -> Section:
    """Give first-order effects of 10 % less per element, free cards first, and the exact ones where recomputed."""
    if not review.helps:
        return Section(())
    rows: list[Row] = []
    for one in review.helps:
        title = part_title(one.name, one.owner) + mark(one)
        value = value_of(one.name, one.owner, one.value, one.unit)
        rows.append(Row((title, value, move(one.f_high), move(one.f_low), move(one.gain))))
        if one.gain_rerun is not None:
            rows.append(
                Row(
                    (
                        "  recomputed",
                        "",
                        move(change(one.f_high_rerun_hz, review.f_high.exact_hz if review.f_high else None)),
                        move(change(one.f_low_rerun_hz, review.f_low.exact_hz if review.f_low else None)),
                        move(one.gain_rerun),
                    )
                )
            )
    head = ("WHAT WOULD HELP: 10 % less of", "value", "f_H", "f_L", "gain")
    blocks: list[Block] = [Table("lrrrr", head, tuple(rows))]
    told = ("to first order, operating point held", *in_short(review.helps))
    blocks.append(Prose("; ".join(told), lead="  "))
    return Section(tuple(blocks), major=True)
