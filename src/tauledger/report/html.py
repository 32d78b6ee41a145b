"""The review as one HTML file: offline, printable, readable without script, in light and dark.

The document says what is on the page, charts and drawing give its pictures, page.html.j2 the markup. All text goes
through the escaper of jinja2; only the SVG of this room is put in as it is.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from importlib.resources import files
from typing import TYPE_CHECKING

from msgspec import Struct

from tauledger.record import Review
from tauledger.report.blocks import Picture
from tauledger.report.charts.style import PALETTE
from tauledger.report.cursor import cursor
from tauledger.report.document import Document, document
from tauledger.report.layout import BEFORE_A_UNIT
from tauledger.report.terms import unexplained

if TYPE_CHECKING:
    from jinja2 import Template
    from markupsafe import Markup

_MINUS = re.compile(r"(?<![\w.⁻-])-(?=\d)")
# The symbols of the trade, not the names of the user: "f_H", "C_μ", "r_π", "R_E", but not "v_in".
_SYMBOL = re.compile(
    r"(?<![\w.])(d?[CIVRrfgQ]|G(?=_m))_(H|L|T|u|C|D|E|B|G|S|CE|DS|GS|Th|o|b|e|c|s|d|m|π|μ|bx|be|bc|ds|gs|gd|sb|db|gb|mb|sub)"
    r"(?!\w)"
)
_COEFFICIENT = re.compile(r"\b([ab])([₁₂])")


class Drawn(Struct, frozen=True):
    """One picture as SVG with a heading of its own, empty where it has none."""

    heading: str
    svg: str


def to_html(review: Review, *, tell: Callable[[str], None] = lambda _: None) -> bytes:
    """Give the review as one HTML file in UTF-8; equal reviews give equal bytes.

    tell: is told what is being drawn, for a line of progress.
    """
    page = document(review)
    pictures: dict[str, tuple[Drawn, ...]] = {}
    for section in page.sections:
        for block in section.blocks:
            if isinstance(block, Picture):
                tell(f"drawing: {section.title.lower()}")
                pictures[block.name] = _pictures(block.name, review)
    moving = cursor(review)
    text = template("page.html.j2").render(
        page=page,
        review=review,
        pictures=pictures,
        terms=_terms(page),
        style=style(),
        cursor=moving,
        script=read("page.js") if moving is None else f"{read('page.js')}{read('cursor.js')}{moving.data});\n",
        kind=lambda block: type(block).__name__,
    )
    # A path may hold bytes that are no text; they are shown as such.
    return text.encode(errors="backslashreplace")


def template(name: str) -> Template:
    """Give a template of this room, every text in it escaped."""
    from jinja2 import Environment, StrictUndefined

    environment = Environment(autoescape=True, undefined=StrictUndefined, trim_blocks=True, lstrip_blocks=True)
    environment.filters["typeset"] = typeset
    return environment.from_string(read(name))


def read(name: str) -> str:
    """Give a file that ships with this room."""
    return files("tauledger.report").joinpath(name).read_text(encoding="utf-8")


def style() -> str:
    """Give the style sheet with the palette as variables, light first, dark where the reader's system asks for it."""
    light = "".join(f"--{name}: {colors[0]}; " for name, colors in PALETTE.items())
    dark = "".join(f"--{name}: {colors[1]}; " for name, colors in PALETTE.items())
    return read("page.css").replace("/* light */", light.strip()).replace("/* dark */", dark.strip())


def typeset(text: str) -> Markup:
    """Escape a text, set a minus as one, a symbol with its subscript, and keep a number with its unit."""
    from markupsafe import Markup, escape

    joined = BEFORE_A_UNIT.sub("\u00a0", _MINUS.sub("−", text))
    symbols = _SYMBOL.sub(r"\1<sub>\2</sub>", str(escape(joined)))
    return Markup(_COEFFICIENT.sub(lambda found: f"<i>{found[1]}</i><sub>{'₁₂'.index(found[2]) + 1}</sub>", symbols))


def subscripted(svg: str) -> str:
    """Set symbols with their subscripts in the texts of a picture."""
    lowered = '\\1<tspan class="sub" dy="0.25em">\\2</tspan><tspan dy="-0.19em">\u200b</tspan>'

    def words(found: re.Match[str]) -> str:
        return f"{found.group(1)}{_SYMBOL.sub(lowered, _MINUS.sub('−', found.group(2)))}</text>"

    return re.sub(r"(<text[^>]*>)([^<]*)</text>", words, svg)


def _terms(page: Document) -> dict[str, tuple[tuple[str, str], ...]]:
    explained: set[str] = set()
    return {section.key: unexplained(section.terms, explained) for section in page.sections}


def _pictures(name: str, review: Review) -> tuple[Drawn, ...]:
    if name == "stages":
        from tauledger.report.drawing.stage import drawn_stages

        return tuple(Drawn(heading, subscripted(svg)) for heading, svg in drawn_stages(review))
    from tauledger.report.charts.bars import share_chart, time_chart
    from tauledger.report.charts.bode import bode_chart
    from tauledger.report.charts.plane import plane_chart
    from tauledger.report.charts.way import way_chart

    if name == "plane":
        both = plane_chart(review)
    else:
        from tauledger.report.charts.impedance import impedance_chart
        from tauledger.report.charts.loop import loop_chart

        charts = {"time": time_chart, "shares": share_chart, "way": way_chart, "bode": bode_chart, "loop": loop_chart}
        charts["impedance"] = impedance_chart
        draw = charts[name]
        both = draw(review).replace('class="chart"', 'class="chart wide"', 1)
        both += draw(review, narrow=True)
    return (Drawn("", subscripted(both)),) if both else ()
