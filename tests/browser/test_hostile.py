"""Text of scenarios, tables, links and file names is never markup; nothing outside the served folder is reached."""

from __future__ import annotations

import shutil
from pathlib import Path
from urllib.parse import quote

from playwright.sync_api import Browser, Page, expect

from tests.browser.conftest import Served, visiting
from tests.browser.test_bench import opened

HOSTILE = "<img src=x onerror='window.XSS=1'><script>window.XSS=1</script>"


def test_hostile_text_stays_text_everywhere(browser: Browser, served: Served) -> None:
    text = (served.folder / "heron-gate.toml").read_text()
    (served.folder / "evil.toml").write_text(
        text.replace('title = "Heron gate"', f'title = "{HOSTILE}"').replace('note = """', f'note = """{HOSTILE}'))
    (served.folder / "broken.toml").write_text(f'format = "{HOSTILE}"')
    with visiting(browser, served, "?scenario=evil.toml") as page:
        expect(page.get_by_role("heading", level=1)).to_have_text(HOSTILE)
        page.locator("#open").click()
        expect(page.locator("#files")).to_contain_text("broken.toml")
        page.keyboard.press("Escape")
        page.get_by_role("tab", name="Compare").click()
        page.get_by_role("button", name="Lay this one aside").click()
        expect(page.locator("#compare-names")).to_contain_text(HOSTILE)
        page.get_by_role("tab", name="Peaks").click()
        page.locator("#measured-text").fill(f"{HOSTILE}\n1")
        page.get_by_role("button", name="Pair them").click()
        expect(page.locator("#measured-fault")).to_contain_text("is not known here")
        page.get_by_role("tab", name="Hand-off").click()
        page.locator("#sheet-text").fill(f"nm,material\n2,{HOSTILE}")
        page.get_by_role("button", name="Look at it").click()
        expect(page.locator("#sheet-faults")).to_contain_text("is not known here")
        page.locator('[data-key="stack.cell[0].x"]').fill(HOSTILE)
        page.locator('[data-key="stack.cell[0].x"]').press("Tab")
        expect(page.locator('[data-message="stack.cell[0].x"]')).to_contain_text("must be a number")
        assert page.evaluate("window.XSS") is None


def test_no_name_in_an_address_leads_out_of_the_folder(browser: Browser, served: Served) -> None:
    secret = served.folder.parent / "secret.toml"
    shutil.copy(served.folder / "mill-race.toml", secret)
    (served.folder / "link.toml").symlink_to(secret)
    context = browser.new_context()
    page = context.new_page()
    for name in ("../secret.toml", "/etc/passwd", ".hidden.toml", "a/b.toml", "link.toml", HOSTILE):
        page.goto(f"{served.address}?scenario={quote(name)}")
        expect(page.locator("#notice")).to_contain_text("cannot be opened")
        assert page.evaluate("window.XSS") is None
    context.close()


def test_no_file_of_the_program_or_the_folder_is_served(page: Page, served: Served) -> None:
    for path in ("/assets/../app.py", "/assets/%2e%2e/app.py", "/assets/..%2fapp.py", "/scenarios/heron-gate.toml"):
        answer = page.request.get(served.address.rstrip("/") + path)
        assert answer.status in (403, 404) and "def session" not in answer.text(), path


def test_uploads_are_bounded(page: Page, tmp_path: Path) -> None:
    opened(page, "Heron gate")
    large = tmp_path / "large.csv"
    large.write_text("nm,material\n" + "2,GaAs\n" * 200_000)
    page.get_by_role("tab", name="Hand-off").click()
    page.locator("#sheet-file").set_input_files(large)
    expect(page.locator("#sheet-faults")).to_contain_text("is larger than 1,000,000 bytes")
    large.write_text("<html>" + "x" * 9_000_000)
    page.locator("#open").click()
    page.locator("#own-file").set_input_files(large)
    expect(page.locator("#notice")).to_contain_text("cannot be opened: report: is larger than 8,000,000 bytes")
