"""A server for others in a real browser: log in and out, wait in line, and be told of a limit."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest
from playwright.sync_api import Browser, Page, expect

from tests.browser.conftest import Served, ready, serving
from tests.browser.test_bench import opened, typed
from transport import load_scenario, nearest_stacks
from webapp.passwords import hashed

PASSWORD = "heron over the mill"


@pytest.fixture
def shut(folder: Path) -> Iterator[Served]:
    users = folder.parent / "users"
    users.write_text(f"ada:{hashed(PASSWORD)}\n")
    with serving(folder, "--auth-file", str(users)) as server:
        yield server


@contextmanager
def visitor(browser: Browser, served: Served, **options: str) -> Iterator[Page]:
    """A page of a browser of its own; afterwards no request may have left the server."""
    context = browser.new_context(viewport={"width": 1280, "height": 800}, **options)  # type: ignore[arg-type]
    page, strays = context.new_page(), []
    own = (served.address, served.address.replace("http", "ws"), "data:", "blob:")
    page.on("request", lambda request: None if request.url.startswith(own) else strays.append(request.url))
    page.on("pageerror", lambda error: strays.append(str(error)))
    yield page
    context.close()
    assert not strays


def log_in(page: Page, password: str) -> None:
    """Fill in the login page."""
    page.get_by_label("Name").fill("ada")
    page.get_by_label("Password").fill(password)
    page.get_by_role("button", name="Log in").click()


def test_who_logs_in_reaches_the_page_asked_for_and_leaves_it_by_logging_out(browser: Browser, shut: Served) -> None:
    with visitor(browser, shut) as page:
        page.goto(f"{shut.address}/?scenario=mill-race.toml")
        expect(page.get_by_role("heading", level=1)).to_have_text("Log in")
        log_in(page, "a wrong guess")
        expect(page.get_by_role("alert")).to_have_text("Name and password do not belong together.")
        expect(page.get_by_label("Name")).to_have_value("ada")
        expect(page.get_by_label("Password")).to_have_value("")

        log_in(page, PASSWORD)
        ready(page)
        expect(page.locator("#place")).to_have_text("mill-race.toml")
        assert page.evaluate("document.cookie") == ""

        page.get_by_role("button", name="Log out").click()
        expect(page.get_by_role("heading", level=1)).to_have_text("Log in")
        page.goto(shut.address)
        expect(page.get_by_role("heading", level=1)).to_have_text("Log in")


def test_the_login_page_has_the_pages_theme_and_is_filled_in_by_keys(browser: Browser, shut: Served) -> None:
    with visitor(browser, shut, color_scheme="dark") as page:
        page.goto(shut.address)
        expect(page.locator("html")).to_have_attribute("data-theme", "dark")
        expect(page.locator("body")).to_have_css("background-color", "rgb(17, 21, 26)")
        expect(page.get_by_label("Name")).to_be_focused()
        page.keyboard.type("ada")
        page.keyboard.press("Tab")
        page.keyboard.type(PASSWORD)
        page.keyboard.press("Enter")
        ready(page)


def test_without_a_login_there_is_no_way_out_to_show(page: Page) -> None:
    expect(page.get_by_role("button", name="Save", exact=True)).to_be_visible()
    expect(page.get_by_role("button", name="Log out")).to_have_count(0)


def test_a_visitor_waits_in_line_behind_anothers_long_work_and_may_give_up(browser: Browser, folder: Path) -> None:
    with (serving(folder, "--jobs", "1") as served, visitor(browser, served) as long,
          visitor(browser, served) as short):
        for page in (short, long):
            page.goto(served.address)
            ready(page)
        opened(short, "Reed sill, bare ends")
        opened(long, "Mill race")
        expect(short.locator("#range-drawn")).to_be_visible()
        typed(long, "target.most_periods", "2000")
        expect(long.locator("#working")).to_be_visible()

        waiting = short.locator("label[for=proposing-progress]")
        short.get_by_role("button", name="Find the nearest stacks").click()
        expect(waiting).to_have_text("waiting, next in line")
        short.locator("#stop-proposing").click()
        expect(short.locator("#remedies-sentence")).to_have_text("No remedy was looked for to the end.")

        short.get_by_role("button", name="Find the nearest stacks").click()
        expect(waiting).to_have_text("waiting, next in line")
        long.locator("#cancel").click()
        remedy = nearest_stacks(load_scenario(served.folder / "reed-sill-bare.toml"))
        expect(short.locator("#remedies-sentence")).to_have_text(remedy.sentence, timeout=20_000)


def test_a_target_beyond_the_servers_limit_is_told_so_and_the_rest_goes_on(browser: Browser, folder: Path) -> None:
    with serving(folder, "--most-periods", "50") as served, visitor(browser, served) as page:
        page.goto(served.address)
        ready(page)
        opened(page, "Heron gate")
        expect(page.locator("#sentence")).to_have_text(
            "This server works out at most 50 periods, and the target asks for 60: lower its most periods, or use the "
            "command line.")
        typed(page, "target.most_periods", "50")
        expect(page.locator("#sentence")).to_contain_text("Fewest periods: 10")


def test_what_is_saved_stands_in_the_log_with_the_session(page: Page, served: Served) -> None:
    opened(page, "Heron gate")
    typed(page, "stack.periods", "9")
    before = served.events()
    page.get_by_role("button", name="Save", exact=True).click()
    expect(page.locator("#notice")).to_contain_text("heron-gate.toml")
    mine = max(int(str(line["session"])) for line in before if line["event"] == "session opened")
    saved = [line for line in served.events()[len(before):] if line["event"] == "saved"]
    assert [(line["what"], line["session"]) for line in saved] == [("heron-gate.toml", mine)]
