"""The page: valid, self-contained, accessible, legible in both colour schemes, the same bytes for the same review."""

from __future__ import annotations

import re
from collections import Counter
from dataclasses import dataclass

import pytest
from msgspec.structs import replace

from report.cursors import WITH_FACTORS
from report.literal import ECHO_PREAMP
from report.markup import HTML, SVG, hostile, parse, rejected, without_plateau, words
from report.test_curve import CURVE
from tauledger.record import Review
from tauledger.report.charts.style import PALETTE
from tauledger.report.html import to_html, typeset

REVIEWS = {
    "usual": ECHO_PREAMP,
    "hostile": hostile(),
    "rejected": rejected(),
    "without plateau": without_plateau(),
    "measured": replace(WITH_FACTORS, curve=CURVE),
}


@dataclass(frozen=True)
class Page:
    """A page as bytes, as text, and parsed."""

    raw: bytes

    @property
    def text(self) -> str:
        return self.raw.decode()


@pytest.fixture(scope="module")
def pages() -> dict[str, Page]:
    return {name: Page(to_html(review)) for name, review in REVIEWS.items()}


@pytest.mark.parametrize("name", REVIEWS)
def test_a_strict_parser_finds_no_fault(pages: dict[str, Page], name: str) -> None:
    root = parse(pages[name].raw)
    identifiers = Counter(element.get("id") for element in root.iter() if element.get("id"))
    assert {identifier for identifier, count in identifiers.items() if count > 1} == set()
    referred = {word for element in root.iter() for word in (element.get("aria-labelledby") or "").split()} | set(
        re.findall(r'(?:href="|url\()#([^")]+)', pages[name].text)
    )
    assert referred <= set(identifiers)


@pytest.mark.parametrize("name", REVIEWS)
def test_nothing_is_fetched_from_anywhere(pages: dict[str, Page], name: str) -> None:
    root = parse(pages[name].raw)
    assert not [element for element in root.iter() if element.get("src") or element.tag == f"{HTML}link"]
    targets = [element.get("href") or element.get("{http://www.w3.org/1999/xlink}href") for element in root.iter()]
    assert all(target.startswith("#") for target in targets if target)
    assert not re.search(r"@import|url\((?!#)", pages[name].text)


def test_every_table_has_a_caption_and_says_what_its_heads_are_for(pages: dict[str, Page]) -> None:
    tables = list(parse(pages["usual"].raw).iter(f"{HTML}table"))
    assert len(tables) > 8
    for table in tables:
        caption = table.find(f"{HTML}caption")
        assert caption is not None
        assert words(caption)
        assert all(head.get("scope") in ("row", "col") for head in table.iter(f"{HTML}th"))
        widths = {len(list(row)) for row in table.iter(f"{HTML}tr")}
        assert len(widths) == 1


def test_every_picture_says_what_it_shows(pages: dict[str, Page]) -> None:
    pictures = list(parse(pages["usual"].raw).iter(f"{SVG}svg"))
    # four charts and two stages for two widths, one of them for a third; roots that are all real have no picture
    assert len(pictures) == 13
    for picture in pictures:
        title = picture.find(f"{SVG}title")
        assert title is not None
        assert picture.get("aria-labelledby") == title.get("id")
        assert len(words(title)) > 20


def test_nothing_moves_by_itself(pages: dict[str, Page]) -> None:
    """There is nothing to be reduced for those who asked for less motion."""
    assert not re.search(r"transition|animation|@keyframes|scroll-behavior|<animate", pages["measured"].text)


def test_what_the_mouse_does_the_keyboard_does_too(pages: dict[str, Page]) -> None:
    root = parse(pages["measured"].raw)
    (slider,) = [element for element in root.iter(f"{HTML}input") if element.get("type") == "range"]
    labels = [words(label) for label in root.iter(f"{HTML}label") if label.get("for") == slider.get("id")]
    assert labels == ["Frequency"]
    scrolled = [element for element in root.iter(f"{HTML}div") if element.get("class") == "scroll"]
    assert scrolled
    assert all(element.get("tabindex") == "0" and element.get("aria-label") for element in scrolled)


def test_text_in_pictures_is_text(pages: dict[str, Page]) -> None:
    told = " ".join(words(text) for text in parse(pages["usual"].raw).iter(f"{SVG}text"))
    for expected in ("R·C in ns", "f_H 580.7 kHz".replace("_", ""), "slowest node", "phase in degrees", "RTh"):
        assert expected in told


def test_names_and_texts_of_the_user_stay_text(pages: dict[str, Page]) -> None:
    root = parse(pages["hostile"].raw)
    assert len(list(root.iter(f"{HTML}script"))) == 1
    title = root.find(f"{HTML}head/{HTML}title")
    assert title is not None
    assert words(title).startswith("<script>alert(1)</script>\"'&amp;$x$")


def test_equal_reviews_give_equal_bytes(pages: dict[str, Page]) -> None:
    assert to_html(replace(ECHO_PREAMP)) == pages["usual"].raw
    assert not re.search(r"20\d\d-\d\d-\d\d|/tmp/|matplotlib", pages["usual"].text)


def test_the_reader_finds_the_answers_before_the_details(pages: dict[str, Page]) -> None:
    """Node, its R and C, what limits and what would help stand above the first section."""
    head = next(parse(pages["usual"].raw).iter(f"{HTML}header"))
    told = words(head).replace("\u00a0", " ")
    for expected in (
        "the upper edge is set at b, the base of Q1, above all through Cμ of Q1",
        "R 428.0 Ω by hand (428.0 Ω exact), C 442.8 pF, R·C 189.5 ns, which is 67 % of the sum over all nodes",
        "Cμ of Q1, 2.16 pF, which counts 180.1 times there",
        "By hand, the slowest node alone gives 839.8 kHz, +45 % against the simulation",
        "10 % less Cμ of Q1 raises fH by 6.8 % to 620.2 kHz (recomputed)",
        "Of the parts on the board it is CL: +3.0 %",
        "does not replace measuring the board",
    ):
        assert expected in told


def test_a_rejected_network_is_said_so_first(pages: dict[str, Page]) -> None:
    told = words(next(parse(pages["rejected"].raw).iter(f"{HTML}header")))
    assert told.index("only the sweep counts") < told.index("Gain at mid-band")
    assert "Where the time goes" not in pages["rejected"].text


def test_without_a_simulation_nothing_claims_one(pages: dict[str, Page]) -> None:
    text = words(parse(pages["without plateau"].raw))
    assert "No simulation was run" in text
    assert "there is no plateau" in text
    assert "Agreement with ngspice" not in text


def test_no_internal_name_is_left_in_the_page(pages: dict[str, Page]) -> None:
    text = words(parse(pages["usual"].raw))
    assert not re.search(r"[cC]_(mu|pi)|Q1\.c|Q1'|None|nan|f_high|gain-falls|\bTrue\b", text.split("function ()")[0])


def test_each_term_is_explained_once(pages: dict[str, Page]) -> None:
    lists = [part for part in parse(pages["usual"].raw).iter(f"{HTML}dl") if part.get("class") == "terms"]
    terms = Counter(words(term) for part in lists for term in part.iter(f"{HTML}dt"))
    assert len(terms) >= 15
    assert set(terms.values()) == {1}


def luminance(color: str) -> float:
    """Relative luminance, WCAG 2.2."""
    channels = (int(color[k : k + 2], 16) / 255.0 for k in (1, 3, 5))
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in channels]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def contrast(one: str, other: str) -> float:
    """Contrast ratio, WCAG 2.2."""
    high, low = sorted((luminance(one), luminance(other)), reverse=True)
    return (high + 0.05) / (low + 0.05)


def test_the_contrast_of_the_standard_is_computed() -> None:
    """WCAG 2.2: black on white has 21:1, a colour on itself 1:1."""
    assert contrast("#000000", "#ffffff") == pytest.approx(21.0)
    assert contrast("#767676", "#ffffff") == pytest.approx(4.54, abs=0.01)


@pytest.mark.parametrize("scheme", [0, 1], ids=["light", "dark"])
@pytest.mark.parametrize("name", [name for name in PALETTE if name not in ("paper", "panel", "rule")])
@pytest.mark.parametrize("ground", ["paper", "panel"])
def test_every_colour_that_tells_something_has_a_contrast_of_4_5(scheme: int, name: str, ground: str) -> None:
    assert contrast(PALETTE[name][scheme], PALETTE[ground][scheme]) >= 4.5


def test_every_colour_is_redefined_for_dark() -> None:
    assert len({light for light, _ in PALETTE.values()}) == len(PALETTE)
    assert all(light != dark for light, dark in PALETTE.values())


def test_no_colour_stands_outside_the_palette(pages: dict[str, Page]) -> None:
    text = pages["usual"].text
    allowed = {shade for pair in PALETTE.values() for shade in pair}
    assert set(re.findall(r"#[0-9a-fA-F]{3,8}\b(?=[;,) \"])", text)) <= allowed
    body = text[text.index("<main>") :]
    assert not re.search(r"(?<!var\(--paper, )(?<!var\(--\w{3}, )(?:fill|stroke): #", body)


@pytest.mark.parametrize(
    ("plain", "set_as"),
    [
        ("-4.5 %", "−4.5\u00a0%"),
        ("f_H of C_μ", "f<sub>H</sub> of C<sub>μ</sub>"),
        ("v_in and C_in2 stay", "v_in and C_in2 stay"),
        ("common-emitter Q1-2", "common-emitter Q1-2"),
        ("<b>", "&lt;b&gt;"),
        ("dQ_be/dV_bc, G_m, my_be", "dQ<sub>be</sub>/dV<sub>bc</sub>, G<sub>m</sub>, my_be"),
        ("1/b₁ at b1", "1/<i>b</i><sub>1</sub> at b1"),
    ],
)
def test_numbers_and_symbols_are_set_as_the_trade_does(plain: str, set_as: str) -> None:
    assert str(typeset(plain)) == set_as


def large(devices: int) -> Review:
    """A review with the tables of many devices: every node, part, pole and device repeated under another name."""
    nodes, parts, found, poles, stages = [], [], [], [], []
    for k in range(devices):
        nodes += [replace(node, name=f"{node.name}{k}", title=f"{node.title} {k}") for node in ECHO_PREAMP.nodes]
        parts += [replace(part, name=f"{part.name}x{k}", owner=part.name) for part in ECHO_PREAMP.parts]
        found += [replace(device, name=f"Q{k}") for device in ECHO_PREAMP.devices]
        poles += [replace(pole, real_hz=pole.real_hz * 1.01**k) for pole in ECHO_PREAMP.poles]
        stages += [replace(stage, node=f"{stage.node}{k}") for stage in ECHO_PREAMP.stages]
    return replace(
        ECHO_PREAMP,
        nodes=tuple(nodes),
        parts=tuple(parts),
        devices=tuple(found),
        poles=tuple(poles),
        stages=tuple(stages),
    )


def test_fifty_devices_stay_below_a_megabyte() -> None:
    assert len(to_html(large(50))) < 1_000_000
