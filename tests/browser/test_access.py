"""No serious obstacle that is ours, by the open rules of axe-core (WCAG 2 A and AA, Deque's axe 4)."""

from __future__ import annotations

import pytest
from axe_playwright_python.sync_playwright import Axe
from playwright.sync_api import Page, expect

from tests.browser.test_bench import opened

TABS = ("Periods", "Peaks", "Compare", "Hand-off")


def obstacles(page: Page) -> list[str]:
    """Serious and critical violations, those inside the figures of the plotting library left out."""
    found = Axe().run(page, context={"exclude": [[".canvas"]]}).response["violations"]
    return [f"{rule['id']}: {node['target']} {node['failureSummary']}" for rule in found
            if rule["impact"] in ("serious", "critical") for node in rule["nodes"]]


@pytest.mark.parametrize("theme", ["light", "dark"])
def test_no_page_has_a_serious_obstacle(page: Page, theme: str) -> None:
    opened(page, "Heron gate")
    if theme == "dark":
        page.get_by_role("button", name="Dark theme").click()
    page.get_by_role("tab", name="Peaks").click()
    page.get_by_role("button", name="Resonance 2 at").click()
    expect(page.locator("#effects tr").first).to_be_visible()
    page.get_by_role("tab", name="Compare").click()
    page.get_by_role("button", name="Lay this one aside").click()
    expect(page.locator("#compare-names th")).to_have_count(2)
    expect(page.locator("#trio[data-pending]")).to_have_count(0)
    page.wait_for_function("() => document.getAnimations().length === 0")
    for tab in TABS:
        page.get_by_role("tab", name=tab).click()
        assert obstacles(page) == [], tab


def test_no_dialog_has_a_serious_obstacle(page: Page) -> None:
    for opener in ("#open", "#save-as", "#help"):
        page.locator(opener).click()
        expect(page.locator("dialog[open]")).to_be_visible()
        assert obstacles(page) == [], opener
        page.keyboard.press("Escape")


def test_pages_are_chosen_with_the_arrow_keys(page: Page) -> None:
    page.get_by_role("tab", name="Periods").focus()
    for name in (*TABS[1:], TABS[0]):
        page.keyboard.press("ArrowRight")
        expect(page.get_by_role("tab", name=name)).to_have_attribute("aria-selected", "true")
        expect(page.get_by_role("tab", name=name)).to_be_focused()
