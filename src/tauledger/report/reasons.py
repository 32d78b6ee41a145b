"""What the reader must know: do network and sweep agree, why do paper and simulation differ, what to beware of."""

from __future__ import annotations

from collections.abc import Sequence

from tauledger.record import CauseFacts, Review
from tauledger.report.layout import CAUTION, HEADING, WARNING, Block, Prose, Section
from tauledger.report.wording import AGREEMENT_WARNS, EDGE, move, network_rejected, number, retitled, withheld

_CAUSES = 3


def warning(review: Review) -> Section:
    """Warn on the first line where the rebuilt network and the sweep disagree; empty where they agree."""
    facts = review.agreement
    if facts is None or facts.max_relative_error <= AGREEMENT_WARNS:
        return Section(())
    differ = (
        f"the rebuilt network differs from ngspice's sweep by {facts.max_relative_error:.2g}"
        f" at {number(facts.at_hz, 'Hz', 3)}"
    )
    if network_rejected(review):
        return Section((Prose(f"{differ} (limit 1e-3): only the sweep counts.", lead="CHECK FAILED: ", style=WARNING),))
    return Section((Prose(f"{differ} (should be below 1e-6).", lead="WARNING: ", style=WARNING),))


def causes(review: Review, *, verbose: bool = False) -> Section:
    """List the causes, largest first, with their effect and what to do instead."""
    if withheld(review):
        return Section((Prose(withheld(review), style=CAUTION),))
    differ = [cause for cause in review.causes if not cause.on_paper]
    shown = differ if verbose else differ[:_CAUSES]
    largest = f", {len(shown)} first of {len(differ)} causes" if len(shown) < len(differ) else ""
    blocks: list[Block] = [Prose(f"WHY PAPER AND SIMULATION DIFFER{largest}", style=HEADING)]
    blocks.extend(_told(shown, review))
    if not differ:
        blocks.append(Prose("nothing of note above 2 %", lead="  "))
    on_paper = [cause for cause in review.causes if cause.on_paper]
    if verbose and on_paper:
        blocks.append(Prose("WHAT PAPER MUST NOT LEAVE OUT (the hand figures here have it)", style=HEADING))
        blocks.extend(_told(on_paper, review))
    return Section(tuple(blocks), major=True)


def closing(review: Review) -> Section:
    """List the notes; say how well network and engine agree, that this is an estimate, and the cautions."""
    facts = review.agreement
    blocks: list[Block] = [
        Prose(retitled(_placed(note.where, note.says), review.parts), lead="Note  ") for note in review.notes
    ]
    if facts is not None and review.engine is not None:
        engine = f"{review.engine.name} {review.engine.version}"
        size = f"{facts.max_relative_error:.1e} over {facts.points} frequencies"
        word = "agree to" if facts.max_relative_error <= AGREEMENT_WARNS else "differ by up to"
        blocks.append(Prose(f"{engine} and the rebuilt network {word} {size}."))
    else:
        blocks.append(Prose("No simulation: all numbers come from the network as given."))
    blocks.append(Prose("This is an estimate; it does not replace measuring the board."))
    blocks.extend(Prose(caution, lead="CAUTION: ", style=CAUTION) for caution in review.cautions)
    return Section(tuple(blocks))


def _told(causes: Sequence[CauseFacts], review: Review) -> list[Prose]:
    leads = [_effect(cause) for cause in causes]
    size = max(map(len, leads), default=0)
    return [
        Prose(retitled(_cause(cause), review.parts), lead=f"  {lead:<{size}}  ", hang=4)
        for cause, lead in zip(causes, leads, strict=True)
    ]


def _effect(cause: CauseFacts) -> str:
    return f"{EDGE.get(cause.quantity, cause.quantity)} {move(cause.effect)}"


def _cause(cause: CauseFacts) -> str:
    instead = f" {_sentence(cause.instead)}" if cause.instead else ""
    return _sentence(cause.says) + instead


def _placed(where: str, says: str) -> str:
    """Put the place before the sentence unless the sentence names it itself."""
    return f"{where}: {says}" if where and where not in says else says


def _sentence(text: str) -> str:
    """Open with a capital unless the first word is a name or a symbol, close with a full stop."""
    start = text[:1].upper() if text[1:2].islower() or text[1:2].isspace() else text[:1]
    return start + text[1:] + ("" if text.endswith((".", "!", "?")) else ".")
