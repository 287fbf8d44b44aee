"""Nothing the user made is lost: closed tabs, lost connections, killed servers, two tabs on one file; looking only."""

from __future__ import annotations

import os
import signal
from pathlib import Path
from urllib.parse import urlsplit

from playwright.sync_api import Browser, Page, expect

from tests.browser.conftest import Served, ready, serving, visiting
from tests.browser.test_bench import field, opened, typed

BARRIER = "stack.cell[0].monolayers"


def test_an_edit_survives_a_closed_tab_and_undo_leads_to_the_file(page: Page, served: Served) -> None:
    opened(page, "Heron gate")
    typed(page, BARRIER, "9")
    typed(page, "stack.cell[1].monolayers", "many")
    expect(page.locator('[data-message="stack.cell[1].monolayers"]')).to_contain_text("must be a number")
    context, address = page.context, page.url
    page.close()

    later = context.new_page()
    later.goto(address)
    ready(later)
    expect(later.locator("#notice")).to_contain_text("Edits that were not saved are back")
    expect(later.locator(field(later, BARRIER))).to_have_value("9")
    expect(later.locator(field(later, "stack.cell[1].monolayers"))).to_have_value("many")
    later.get_by_role("button", name="Undo").click()
    expect(later.locator(field(later, BARRIER))).to_have_value("7")
    expect(later.locator("#changed")).to_be_hidden()


def test_a_file_changed_elsewhere_is_not_overwritten_by_edits_brought_back(page: Page, served: Served) -> None:
    opened(page, "Heron gate")
    typed(page, BARRIER, "9")
    expect(page.locator("#changed")).to_be_visible()
    file = served.folder / "heron-gate.toml"
    file.write_text(file.read_text().replace("Heron gate", "Heron gate, changed by a colleague"))
    page.reload()
    ready(page)
    expect(page.locator("#notice")).to_contain_text("was changed elsewhere in the meantime")
    page.get_by_role("button", name="Save", exact=True).click()
    expect(page.locator("#objections")).to_contain_text("changed elsewhere")
    page.get_by_role("button", name="Leave the file").click()
    assert "colleague" in file.read_text()


def test_edits_survive_a_killed_server_and_the_page_comes_back_by_itself(browser: Browser, folder: Path) -> None:
    with serving(folder) as first:
        port = urlsplit(first.address).port
        assert port is not None
        page = browser.new_context(viewport={"width": 1280, "height": 800}).new_page()
        page.goto(first.address)
        ready(page)
        opened(page, "Heron gate")
        typed(page, BARRIER, "9")
        expect(page.locator("#changed")).to_be_visible()
        os.kill(first.process, signal.SIGKILL)
        expect(page.locator("#lost")).to_be_visible()
        # Said to nobody: kept all the same.
        typed(page, "stack.cell[1].monolayers", "21")
    with serving(folder, port=port):
        expect(page.locator("#lost")).to_be_hidden(timeout=20_000)
        expect(page.locator(field(page, BARRIER))).to_have_value("9")
        expect(page.locator(field(page, "stack.cell[1].monolayers"))).to_have_value("21")
        page.context.close()


def test_the_second_of_two_tabs_that_save_one_file_is_told(page: Page, served: Served) -> None:
    opened(page, "Heron gate")
    other = page.context.new_page()
    other.goto(page.url)
    ready(other)
    typed(page, BARRIER, "9")
    page.get_by_role("button", name="Save", exact=True).click()
    expect(page.locator("#notice")).to_contain_text("Saved as heron-gate.toml")
    typed(other, BARRIER, "11")
    other.get_by_role("button", name="Save", exact=True).click()
    expect(other.locator("#objections")).to_contain_text("has been changed elsewhere since this page read it")
    other.get_by_role("button", name="Leave the file").click()
    assert "monolayers = 9" in (served.folder / "heron-gate.toml").read_text()


def test_with_view_only_sliders_move_and_nothing_is_changed_or_saved(browser: Browser, folder: Path) -> None:
    before = {file.name: file.read_bytes() for file in folder.iterdir()}
    with serving(folder, "--view-only") as served, visiting(browser, served) as page:
        opened(page, "Heron gate")
        page.locator("#period-slider").focus()
        page.keyboard.press("ArrowRight")
        expect(page.locator("#periods-shown")).to_have_text("9 periods")
        expect(page.locator(field(page, BARRIER))).to_be_disabled()
        expect(page.get_by_role("button", name="Save", exact=True)).to_be_hidden()
        page.keyboard.press("Control+s")
        expect(page.locator("#notice")).to_contain_text("This page is for looking")
    assert {file.name: file.read_bytes() for file in folder.iterdir()} == before


def test_the_kept_edits_of_a_saved_file_are_gone(page: Page, served: Served) -> None:
    opened(page, "Heron gate")
    typed(page, BARRIER, "9")
    page.get_by_role("button", name="Save", exact=True).click()
    expect(page.locator("#notice")).to_contain_text("Saved as heron-gate.toml")
    assert page.evaluate("Object.keys(localStorage).filter((key) => key.startsWith('colonnade-kept'))") == []
