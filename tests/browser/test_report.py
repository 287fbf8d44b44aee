"""A report in a real browser, from a file and without a network: figures drawn, nothing asked for, A4 in print."""

from __future__ import annotations

from pathlib import Path

import msgspec
import pytest
from playwright.sync_api import Browser, expect

from transport import load_scenario, scenario_from_document
from webapp.report import report_html

HOSTILE = "</script><script>window.XSS = 1</script><img src=x onerror='window.XSS = 1'>"
A4_WITHIN_MARGINS = (210 - 2 * 12) * 96 / 25.4 + 1
"""Pixels of CSS, 96 to the inch, and one for rounding."""
# The width of every card over its height, and how far its figure fills it.
_SHAPES = """[...document.querySelectorAll(".canvas")].flatMap((card) => {
  const outer = card.getBoundingClientRect()
  const inner = card.querySelector(".bk-Figure").getBoundingClientRect()
  return [outer.width / outer.height, inner.width / outer.width, inner.height / outer.height]
})"""


@pytest.mark.parametrize("width", [390, 1280])
def test_a_report_is_alive_offline_and_prints(browser: Browser, tmp_path: Path, width: int) -> None:
    heron = load_scenario("scenarios/heron-gate.toml")
    scenario = scenario_from_document(msgspec.structs.replace(heron.document, note=HOSTILE))
    place = tmp_path / "report.html"
    place.write_text(report_html(scenario))
    context = browser.new_context(viewport={"width": width, "height": 900}, offline=True)
    page, faults = context.new_page(), []
    page.on("console", lambda message: faults.append(message.text) if message.type == "error" else None)
    page.on("pageerror", lambda error: faults.append(str(error)))
    own = ("file:", "data:", "blob:")
    page.on("request", lambda request: None if request.url.startswith(own) else faults.append(request.url))
    page.goto(place.as_uri())
    expect(page.get_by_role("heading", level=1)).to_have_text("Heron gate")
    page.wait_for_function("() => document.querySelectorAll('.bk-Figure').length === 5")
    page.wait_for_function("() => Bokeh.documents.length && Bokeh.documents.every((one) => one.is_idle)")
    assert page.evaluate("document.documentElement.scrollWidth") <= width
    assert page.evaluate("window.XSS") is None
    on_screen = page.evaluate(_SHAPES)
    page.emulate_media(media="print")
    assert page.evaluate(_SHAPES) == pytest.approx(on_screen, rel=0.02), "paper shows figures cut or squeezed"
    widths = page.evaluate("[...document.querySelectorAll('.figures')].map((row) => row.getBoundingClientRect().width)")
    assert max(widths) <= A4_WITHIN_MARGINS
    assert page.pdf(prefer_css_page_size=True).startswith(b"%PDF")
    context.close()
    assert not faults
