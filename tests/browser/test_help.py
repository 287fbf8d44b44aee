"""Help where it is needed: the list of keys, demos for an empty folder, a title on every control."""

from __future__ import annotations

from pathlib import Path

from playwright.sync_api import Browser, Page, expect

from tests.browser.conftest import serving, visiting
from transport import load_scenario


def test_the_keys_are_listed_on_a_question_mark_but_not_while_one_types(page: Page) -> None:
    page.locator("#period-slider").focus()
    page.keyboard.press("?")
    expect(page.get_by_role("dialog", name="Keys")).to_be_visible()
    page.keyboard.press("Escape")
    expect(page.get_by_role("dialog", name="Keys")).to_be_hidden()
    page.locator("#save-as").click()
    page.locator("#save-name").press("?")
    expect(page.get_by_role("dialog", name="Keys")).to_be_hidden()


def test_an_empty_folder_offers_the_demos_and_keeps_them_unharmed(browser: Browser, tmp_path: Path) -> None:
    folder = tmp_path / "empty"
    folder.mkdir()
    with serving(folder) as served, visiting(browser, served) as page:
        expect(page.locator("#notice")).to_contain_text("Open offers demos to begin with")
        page.locator("#open").click()
        page.get_by_role("dialog").get_by_text("Heron gate", exact=True).click()
        expect(page.get_by_role("heading", level=1)).to_have_text("Heron gate")
        expect(page.locator("#place")).to_have_text("not saved yet")
        page.locator("#save").click()
        page.locator("#save-name").fill("mine")
        page.get_by_role("dialog").get_by_role("button", name="Save").click()
        expect(page.locator("#notice")).to_contain_text("Saved as mine.toml")
    assert load_scenario(folder / "mine.toml").title == "Heron gate"


def test_every_control_says_what_it_is(page: Page) -> None:
    nameless = page.evaluate("""() =>
        [...document.querySelectorAll("header, #rail, main")].flatMap((place) =>
            [...place.querySelectorAll("button, input, select, textarea")]).filter((control) =>
            !control.closest(".canvas") && !control.title && !control.ariaLabel && !control.labels?.length
            && !control.getAttribute("aria-labelledby") && !control.textContent.trim() && control.type !== "file")
            .map((control) => control.outerHTML)""")
    assert nameless == []
