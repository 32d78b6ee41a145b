"""How charts look: colours with their dark counterparts, and the way from a figure to SVG for a page.

Colours come from the palette of Okabe and Ito (Color Universal Design, 2008), darkened on paper until they have a
contrast of 4.5; nothing is told by colour alone. In the SVG they are CSS variables with the light colour as fallback.
"""

from __future__ import annotations

import io
import re
from collections.abc import Iterator
from contextlib import contextmanager
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

# name: light, dark. In a chart the light colour stands for the name, so no two may be alike.
PALETTE = {
    "paper": ("#fcfcf9", "#15181b"),
    "panel": ("#f2f3ee", "#1e2327"),
    "ink": ("#1c2126", "#e8e6df"),
    "muted": ("#5a6167", "#a7adb1"),
    "rule": ("#c9ccc4", "#41484d"),
    "hand": ("#0069a6", "#5bb8ec"),
    "exact": ("#a84a00", "#f0a23c"),
    "simulated": ("#20262b", "#e9e7e1"),
    "faster": ("#00735a", "#3fcfa5"),
    "yours": ("#9c3f76", "#e39ac4"),
    "accent": ("#2c4a3e", "#9fcdb8"),
    "warning": ("#9b1c1c", "#ff9d8f"),
}
WIDTH_IN, NARROW_IN = 7.6, 3.7
_FONT = ("DejaVu Sans",)
_SALT = "tauledger"
# What matplotlib writes into a picture of its own; a page has its own style and title.
_STYLE = re.compile(r"<style.*?</style>", re.DOTALL)
_METADATA = re.compile(r"<metadata>.*?</metadata>", re.DOTALL)
_HEAD = re.compile(r"^.*?<svg[^>]*?viewBox=\"([^\"]*)\"[^>]*>", re.DOTALL)
# A name with a double quote in it stands in single ones.
_IDENTIFIER = re.compile(r"""\bid=(?:"([^"]*)"|'([^']*)')""")
_FONT_FAMILY = re.compile(r"(?<=font-family: )[^;\"]+")
_MARK = "mark-"


def light(name: str) -> str:
    """Give the colour by which `name` is meant in a chart."""
    return PALETTE[name][0]


@contextmanager
def styled() -> Iterator[None]:
    """Set matplotlib up for one chart, and nobody else's."""
    import matplotlib as mpl

    with mpl.rc_context(
        {
            "font.family": list(_FONT),
            "font.size": 9.0,
            "svg.fonttype": "none",
            "svg.hashsalt": _SALT,
            "axes.edgecolor": light("muted"),
            "axes.labelcolor": light("ink"),
            "axes.linewidth": 0.8,
            "axes.spines.top": False,
            "axes.spines.right": False,
            "axes.unicode_minus": True,
            "axes.facecolor": "none",
            "figure.facecolor": "none",
            "text.color": light("ink"),
            "xtick.color": light("muted"),
            "ytick.color": light("muted"),
            "xtick.labelcolor": light("ink"),
            "ytick.labelcolor": light("ink"),
            "hatch.linewidth": 0.9,
            "grid.color": light("rule"),
            "grid.linewidth": 0.6,
            "lines.solid_capstyle": "round",
            "lines.dash_capstyle": "butt",
            # A node may be called $out; it is no formula.
            "text.parse_math": False,
        }
    ):
        yield


def blank(height_in: float, *, narrow: bool = False) -> Figure:
    """Give an empty figure of the page's width, or of that of a small screen with letters of the same size."""
    from matplotlib.figure import Figure

    return Figure(figsize=(NARROW_IN if narrow else WIDTH_IN, height_in), layout="constrained")


def marked(part: str) -> str:
    """Give the group name by which a mark is linked with the table's row about the same part."""
    return _MARK + part


def quiet(axes: Axes) -> None:
    """Take away what carries no information from an axis of names."""
    axes.spines["left"].set_visible(False)
    axes.tick_params(axis="y", length=0)


def to_svg(figure: Figure, *, key: str, title: str, narrow: bool = False) -> str:
    """Give a figure as an <svg> element for a page; ids are made its own with `key`.

    title: what a reader who cannot see it is told. narrow: it is the one for a small screen.
    """
    key = f"{key}-narrow" if narrow else key
    kind = "chart narrow" if narrow else "chart"
    page = io.StringIO()
    nothing = {"Date": None, "Creator": None, "Format": None, "Type": None}
    figure.savefig(page, format="svg", metadata=nothing)
    text = _METADATA.sub("", _STYLE.sub("", page.getvalue()))
    text = _HEAD.sub(
        lambda found: (
            f'<svg class="{kind}" viewBox="{found.group(1)}" role="img" aria-labelledby="{key}-title">'
            f'<title id="{key}-title">{escape(title)}</title>'
        ),
        text,
        count=1,
    )
    text = _own_identifiers(text, key)
    text = text.replace("xlink:href", "href").replace("<defs/>", "")
    text = _FONT_FAMILY.sub("inherit", text)
    for name, (shade, _) in PALETTE.items():
        text = re.sub(rf"(?<=: ){shade}\b", f"var(--{name}, {shade})", text)
    return re.sub(r"\s*\n\s*", "\n", text).strip() + "\n"


def escape(text: str) -> str:
    """Write text so that it stays text inside markup."""
    pairs = (("&", "&amp;"), ("<", "&lt;"), (">", "&gt;"), ('"', "&quot;"))
    for plain, safe in pairs:
        text = text.replace(plain, safe)
    return text


def _own_identifiers(text: str, key: str) -> str:
    """Keep the ids that something refers to, with `key` before them; turn marks into data for the page's script."""
    used = set(re.findall(r'(?:href="|url\()#([^")]+)', text))

    def rename(found: re.Match[str]) -> str:
        name = found.group(1) or (found.group(2) or "").replace('"', "&quot;")
        if name.startswith(_MARK):
            return f'data-part="{name.removeprefix(_MARK)}"'
        if name in used:
            return f'id="{key}-{name}"'
        return found.group() if name == f"{key}-title" else ""

    text = _IDENTIFIER.sub(rename, text)
    return re.sub(r'(href="|url\()#', rf"\g<1>#{key}-", text)
