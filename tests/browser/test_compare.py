"""Stacks laid over the bench: the one as it was before an edit, others of the folder, and what differs."""

from __future__ import annotations

import pytest
from playwright.sync_api import Page, expect

from tests.browser.conftest import Served
from tests.browser.test_bench import drawn, opened, typed
from transport import load_scenario, period_verdict, spectrum
from webapp.results import question


def test_other_stacks_are_laid_over_the_bench_and_what_differs_is_marked(page: Page, served: Served) -> None:
    opened(page, "Heron gate")
    page.get_by_role("tab", name="Compare").click()
    page.get_by_role("button", name="Lay this one aside").click()
    expect(page.locator("#compare-names th")).to_have_text(["on the bench", "Heron gate, 8 periods"])
    expect(page.locator("#compare-rows tr.differs")).to_have_count(0)

    typed(page, "stack.cell[0].monolayers", "9")
    cell = page.locator("#compare-rows tr", has_text="cell layers")
    expect(cell).to_have_class("differs")
    heron = load_scenario(served.folder / "heron-gate.toml")
    energy, shown = drawn(page, "laid-0", "energy"), drawn(page, "laid-0", "drawn")
    expected = spectrum(heron.stack, [e / 1e3 for e in energy]).log10_transmission
    seen = [place for place, value in enumerate(expected) if value > -30]
    assert [shown[place] for place in seen] == pytest.approx(expected[seen], abs=1e-6) and len(seen) > 200

    page.get_by_role("button", name="Lay another over it").click()
    page.get_by_role("dialog").get_by_text("Mill race", exact=True).first.click()
    mill = load_scenario(served.folder / "mill-race.toml")
    verdicts = page.locator("#compare-rows tr", has=page.get_by_role("rowheader", name="verdict", exact=True))
    expect(verdicts.locator("td").nth(2)).to_have_text(period_verdict(question(mill)).sentence)

    page.get_by_role("button", name="Take Heron gate").click()
    expect(page.locator("#compare-names th")).to_have_count(2)
    page.get_by_role("button", name="Take Mill race").click()
    expect(page.locator("#compare-scroll")).to_be_hidden()
    page.wait_for_function("() => !Bokeh.documents[0].get_model_by_name('laid-0').data.energy.length")


def test_a_fourth_stack_takes_the_place_of_the_oldest(page: Page) -> None:
    opened(page, "Heron gate")
    page.get_by_role("tab", name="Compare").click()
    for count in ("5", "6", "7", "9"):
        typed(page, "stack.periods", count)
        expect(page.locator("#periods-shown")).to_have_text(f"{count} periods")
        page.get_by_role("button", name="Lay this one aside").click()
        expect(page.locator("#compare-names th").last).to_have_text(f"Heron gate, {count} periods")
    expect(page.locator("#compare-names th")).to_have_text(
        ["on the bench", *(f"Heron gate, {count} periods" for count in (6, 7, 9))])
