"""Reads a page as a strict HTML parser does, for the tests of the report."""

from __future__ import annotations

import re
from xml.etree.ElementTree import Element

import html5lib
from msgspec.structs import replace

from report.literal import ECHO_PREAMP
from tauledger.record import AgreementFacts, Budget, MidbandFacts, Review

HTML = "{http://www.w3.org/1999/xhtml}"
SVG = "{http://www.w3.org/2000/svg}"


def parse(page: bytes) -> Element:
    """Parse a page; html5lib in its strict mode raises at the first fault."""
    found = html5lib.HTMLParser(strict=True).parse(page.decode())
    assert isinstance(found, Element)
    return found


def words(element: Element) -> str:
    """Give all text of an element, white space made single and soft signs taken away."""
    return re.sub(r"\s+", " ", "".join(element.itertext()).replace("\u200b", "")).strip()


def hostile() -> Review:
    """The literal review with names and texts that try to become markup."""
    attack = "<script>alert(1)</script>\"'&amp;$x$"
    netlist = replace(ECHO_PREAMP.netlist, title=attack, path=f"{attack}.cir")
    base, *others = ECHO_PREAMP.nodes
    part = replace(ECHO_PREAMP.parts[-2], name='C<b>&"1', owner='C<b>&"1')
    return replace(
        ECHO_PREAMP,
        netlist=netlist,
        nodes=(replace(base, name=attack, title=attack), *others),
        parts=(*ECHO_PREAMP.parts[:-2], part, ECHO_PREAMP.parts[-1]),
        causes=(replace(ECHO_PREAMP.causes[0], says=attack, instead=attack),),
        lines=(replace(ECHO_PREAMP.lines[0], text=attack),),
        cautions=(attack,),
    )


def rejected() -> Review:
    """The literal review as it is when the network is not trusted: all that rests on it is gone."""
    return replace(
        ECHO_PREAMP,
        agreement=AgreementFacts(0.02, 1.5e6, 261),
        nodes=(),
        parts=(),
        poles=(),
        zeros=(),
        steps=(),
        estimates=(),
        causes=(),
        stages=(),
        budget=Budget(None, None),
    )


def without_plateau() -> Review:
    """The literal review of a circuit without plateau and without simulation."""
    return replace(
        ECHO_PREAMP,
        midband=MidbandFacts(8415.15, None, None, -119.2, 40.0, 41.5, "V/V"),
        agreement=None,
        engine=None,
        f_low=None,
        nodes=(),
        stages=(),
        steps=(),
        estimates=(),
        causes=(),
        budget=Budget(None, None),
        curves=None,
    )
