"""The page in a browser: quiet, alone, no wider than its view, legible in both schemes and on paper; rows and marks."""

from __future__ import annotations

import shutil
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest
from playwright.sync_api import Browser, Page, sync_playwright

from report.cursors import WITH_FACTORS
from report.literal import ECHO_PREAMP
from report.pdf import printed
from tauledger.report.charts.style import PALETTE
from tauledger.report.html import to_html

# pt per mm
MM = 72.0 / 25.4
QUIET = [
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
]
TOO_WIDE = """() => [...document.querySelectorAll("table")]
  .filter((table) => table.offsetParent && (table.getBoundingClientRect().right > innerWidth + 0.5
    || table.scrollWidth > table.clientWidth + 1)).map((table) => table.caption.textContent)"""
CUT_OFF = """() => [...document.querySelectorAll("svg.chart")].filter((svg) => svg.checkVisibility()).flatMap((svg) => {
  const frame = svg.getBoundingClientRect();
  const words = [...svg.querySelectorAll("text")].filter((text) => {
    const box = text.getBoundingClientRect();
    return box.right > frame.right + 1 || box.left < frame.left - 1;
  });
  const wide = svg.parentElement.scrollWidth > svg.parentElement.clientWidth + 1 ? ["to be scrolled"] : [];
  return [...wide, ...words.map((text) => text.textContent)];
})"""
# What of the drawn circuits has to be scrolled, or is written smaller than 10 px.
HARD_TO_READ = """() => [...document.querySelectorAll("svg.circuit")].flatMap((svg) => {
  if (!svg.checkVisibility()) return [];
  const scale = svg.getBoundingClientRect().width / svg.viewBox.baseVal.width;
  const size = scale * parseFloat(getComputedStyle(svg).fontSize);
  const hidden = svg.parentElement.scrollWidth > svg.parentElement.clientWidth + 1;
  return size < 10 || hidden ? [svg.querySelector("title").textContent] : [];
})"""
# Relative luminance and contrast ratio as WCAG 2.2 has them, of every text against what lies behind it.
FAINT = """() => {
  const channels = (color) => (color.match(/[\\d.]+/g) || []).map(Number);
  const linear = (c) => (c <= 0.04045 * 255 ? c / 255 / 12.92 : ((c / 255 + 0.055) / 1.055) ** 2.4);
  const light = ([r, g, b]) => 0.2126 * linear(r) + 0.7152 * linear(g) + 0.0722 * linear(b);
  const paper = (element) => {
    for (let at = element; at; at = at.parentElement) {
      const behind = channels(getComputedStyle(at).backgroundColor);
      if (behind.length === 3 || behind[3] > 0) return behind;
    }
    return [255, 255, 255];
  };
  const faint = [];
  let looked = 0;
  for (const element of document.querySelectorAll("body *, svg text")) {
    if (![...element.childNodes].some((node) => node.nodeType === 3 && node.data.trim())) continue;
    if (element.closest("script, style, title") || !element.getClientRects().length) continue;
    const style = getComputedStyle(element);
    const ink = channels(element.closest("svg") ? style.fill : style.color);
    const [one, other] = [light(ink), light(paper(element))].sort((a, b) => b - a);
    looked += 1;
    if ((one + 0.05) / (other + 0.05) < 4.5) faint.push(element.textContent.slice(0, 40));
  }
  return { faint, looked };
}"""


@pytest.fixture(scope="module")
def browser() -> Iterator[Browser]:
    """The system's Chromium; `.ci/setup dev` installs it."""
    program = shutil.which("chromium") or shutil.which("chromium-browser")
    assert program, "Chromium is missing: run .ci/setup dev"
    with sync_playwright() as playwright:
        running = playwright.chromium.launch(executable_path=program, args=QUIET)
        yield running
        running.close()


def legible(page: Page) -> None:
    found = page.evaluate(FAINT)
    assert found["looked"] > 200
    assert found["faint"] == []


def test_the_page_in_a_browser(browser: Browser, tmp_path: Path) -> None:
    file = tmp_path / "review.html"
    file.write_bytes(to_html(ECHO_PREAMP))
    page = browser.new_page(viewport={"width": 1440, "height": 900}, color_scheme="light")
    complaints: list[Any] = []
    page.on("console", lambda message: complaints.append(message.text))
    page.on("pageerror", lambda error: complaints.append(str(error)))
    page.on("request", lambda request: None if request.url == file.as_uri() else complaints.append(request.url))
    page.goto(file.as_uri())

    for width in (360, 768, 1440):
        page.set_viewport_size({"width": width, "height": 900})
        assert page.evaluate(TOO_WIDE) == []
        assert page.evaluate(CUT_OFF) == []
        assert page.evaluate(HARD_TO_READ) == []
        assert page.locator("svg.circuit:visible").count() == 2
        assert page.locator("svg.chart:visible").count() == 4
        assert page.evaluate("document.documentElement.scrollWidth") <= width
    for picture in page.locator("svg:visible").all():
        box = picture.bounding_box()
        assert box is not None
        assert box["width"] > 300
        assert box["height"] > 80

    bar = page.locator("#shares g[data-part='CL']").first
    page.locator("#shares tr[data-part='CL']").hover()
    assert "linked" in (bar.get_attribute("class") or "")
    assert page.locator("svg.circuit g.linked:visible").count() == 1
    page.locator("h1").hover()
    assert page.locator(".linked").count() == 0

    page.locator("summary").first.click()
    assert page.locator("details[open] .working").first.is_visible()
    legible(page)
    light = page.evaluate("getComputedStyle(document.documentElement).backgroundColor")
    page.emulate_media(color_scheme="dark")
    assert page.evaluate("getComputedStyle(document.documentElement).backgroundColor") != light
    legible(page)
    page.emulate_media(color_scheme="dark", media="print")
    legible(page)
    ink = "getComputedStyle(document.documentElement).getPropertyValue('--ink').trim()"
    assert page.evaluate(ink) == PALETTE["ink"][0], "paper is light for those who read in the dark too"
    assert complaints == []


def test_the_frequency_cursor_follows_mouse_keys_and_finger(browser: Browser, tmp_path: Path) -> None:
    file = tmp_path / "review.html"
    file.write_bytes(to_html(WITH_FACTORS))
    context = browser.new_context(viewport={"width": 1200, "height": 900}, has_touch=True)
    page = context.new_page()
    complaints: list[Any] = []
    page.on("console", lambda message: complaints.append(message.text))
    page.on("pageerror", lambda error: complaints.append(str(error)))
    page.goto(file.as_uri())
    output, slider = page.locator("output"), page.locator("#cursor-at")
    line = page.locator("#bode svg.wide .cursor-line")
    factor = page.locator(".cursor tr[data-part='Q1.c_mu'] [data-at]")
    chart = page.locator("#bode svg.wide")
    chart.scroll_into_view_if_needed()
    at_edge = output.inner_text()
    assert at_edge == slider.get_attribute("aria-valuetext")
    before = line.get_attribute("x1")

    box = chart.bounding_box()
    assert box is not None
    chart.hover(position={"x": 0.6 * box["width"], "y": 0.3 * box["height"]})
    assert output.inner_text() != at_edge
    assert line.get_attribute("x1") != before
    assert factor.nth(0).inner_text() == "180"

    slider.focus()
    page.keyboard.press("End")
    assert float(slider.input_value()) == float(slider.get_attribute("max") or 0)
    assert slider.get_attribute("aria-valuetext") == output.inner_text()
    page.keyboard.press("Home")
    assert factor.nth(0).inner_text() == "–", "below mid-band there is no factor"

    chart.tap(position={"x": 0.85 * box["width"], "y": 0.3 * box["height"]})
    assert factor.nth(0).inner_text() not in ("–", "180")
    assert complaints == []

    for width in (360, 768):
        page.set_viewport_size({"width": width, "height": 900})
        assert page.evaluate(TOO_WIDE) == []
        assert page.locator(".cursor").is_visible()
    page.emulate_media(media="print")
    assert page.locator(".cursor").is_hidden()
    context.close()


@pytest.mark.parametrize(("paper", "width", "height"), [("A4", 210.0, 297.0), ("Letter", 215.9, 279.4)])
def test_it_is_printed_on_pages_that_are_used_and_not_clipped(
    browser: Browser, tmp_path: Path, paper: str, width: float, height: float
) -> None:
    file = tmp_path / "review.html"
    file.write_bytes(to_html(WITH_FACTORS))
    page = browser.new_page()
    page.goto(file.as_uri())
    pages = printed(page.pdf(format=paper))
    assert 4 <= len(pages) <= 12
    assert all(one.width == pytest.approx(width * MM, abs=1.0) for one in pages)
    assert all(one.height == pytest.approx(height * MM, abs=1.0) for one in pages)
    assert all(one.fill > 1 / 3 for one in pages[:-1]), [one.fill for one in pages]
    margin = 14.0 * MM
    assert all(margin < x < one.width - margin and margin < y for one in pages for x, y in one.texts)
    page.emulate_media(media="print")
    page.set_viewport_size({"width": round((width - 30.0) / 25.4 * 96.0), "height": 900})
    assert page.evaluate(TOO_WIDE) == []
    assert page.evaluate(CUT_OFF) == []
    page.close()


def test_everything_is_read_without_script(browser: Browser, tmp_path: Path) -> None:
    file = tmp_path / "review.html"
    file.write_bytes(to_html(WITH_FACTORS))
    context = browser.new_context(java_script_enabled=False, viewport={"width": 1200, "height": 900})
    page = context.new_page()
    page.goto(file.as_uri())
    assert page.locator("svg.chart").first.is_visible()
    assert page.locator(".cursor").is_hidden()
    page.locator("summary").first.click()
    assert page.locator("details[open] .working").first.is_visible()
    context.close()
