"""Handing a bench to others: links, reports, data, figures, sheets out and in."""

from __future__ import annotations

import json
import random
from pathlib import Path

import pytest
from playwright.sync_api import Page, expect

from tests.browser.conftest import Served, ready
from tests.browser.test_bench import field, opened, typed
from transport import load_scenario, resonances
from transport.handoff import scenario_hash
from webapp.enclosed import scenario_from_report
from webapp.results import natural_span, question


@pytest.fixture
def handoff(page: Page) -> Page:
    opened(page, "Heron gate")
    page.get_by_role("tab", name="Hand-off").click()
    return page


def downloaded(page: Page, button: str) -> tuple[str, bytes]:
    """Name and content of what a button of the page writes."""
    with page.expect_download() as waiting:
        page.locator("#handoff").get_by_role("button", name=button, exact=True).click()
    return waiting.value.suggested_filename, Path(waiting.value.path()).read_bytes()


def test_a_link_reopens_the_same_bench_in_another_browser(handoff: Page, served: Served) -> None:
    typed(handoff, "stack.cell[0].monolayers", "9")
    handoff.get_by_text("linear", exact=True).click()
    handoff.evaluate("Bokeh.documents[0].get_model_by_name('energy-range').setv({start: 20, end: 120})")
    handoff.get_by_role("button", name="Copy a link").click()
    expect(handoff.locator("#link-text")).to_be_visible()
    address = handoff.locator("#link-text").input_value()
    assert address.startswith(served.address) and len(address) < 2_000

    other = handoff.context.browser.new_context().new_page()  # type: ignore[union-attr]
    other.goto(address)
    ready(other)
    expect(other.get_by_role("heading", level=1)).to_have_text("Heron gate")
    expect(other.locator(field(other, "stack.cell[0].monolayers"))).to_have_value("9")
    expect(other.get_by_role("tab", name="Hand-off")).to_have_attribute("aria-selected", "true")
    expect(other.locator("input[name=scale][value=linear]")).to_be_checked()
    other.wait_for_function("() => Bokeh.documents[0].get_model_by_name('energy-range').start === 20")
    other.context.close()


@pytest.mark.parametrize("text", ["1abc", "<img src=x onerror=alert(1)>"])
def test_an_odd_link_opens_the_start_page_with_a_sentence(page: Page, served: Served, text: str) -> None:
    page.goto(f"{served.address}?bench={text}")
    ready(page)
    expect(page.locator("#notice")).to_contain_text("The link cannot be opened: link: ")
    expect(page.locator("#place")).to_contain_text(".toml")


def test_a_scenario_too_long_for_a_link_offers_the_file(handoff: Page) -> None:
    handoff.evaluate("document.querySelector('#rail details:last-of-type').open = true")
    note = "".join(random.Random(1).choices("abcdefghijklmnopqrstuvwxyz", k=4000))
    typed(handoff, "note", note)
    handoff.get_by_role("button", name="Copy a link").click()
    expect(handoff.locator("#link-sentence")).to_contain_text("send the file instead")
    name, content = downloaded(handoff, "Scenario file")
    assert name == "heron-gate.toml" and note in content.decode()


def test_a_report_is_written_and_opens_again_on_the_bench(handoff: Page, tmp_path: Path) -> None:
    typed(handoff, "stack.cell[0].monolayers", "9")
    name, content = downloaded(handoff, "Write the report")
    assert name == "heron-gate.html"
    assert scenario_from_report(content.decode()).document.stack.cell[0].monolayers == 9
    report = tmp_path / name
    report.write_bytes(content)
    opened(handoff, "Mill race")
    handoff.locator("#open").click()
    handoff.locator("#own-file").set_input_files(report)
    expect(handoff.get_by_role("heading", level=1)).to_have_text("Heron gate")
    expect(handoff.locator(field(handoff, "stack.cell[0].monolayers"))).to_have_value("9")
    report.write_text("<html>nothing</html>")
    handoff.locator("#open").click()
    handoff.locator("#own-file").set_input_files(report)
    expect(handoff.locator("#notice")).to_contain_text("holds no scenario")


def test_data_carry_the_hash_and_the_engines_numbers(handoff: Page, served: Served) -> None:
    heron = load_scenario(served.folder / "heron-gate.toml")
    name, content = downloaded(handoff, "All as JSON")
    found = json.loads(content)
    assert name == "heron-gate.json" and found["scenario_sha256"] == scenario_hash(heron)
    known = resonances(heron.stack, natural_span(question(heron)))
    assert [row["energy_meV"] for row in found["resonances"]["rows"]] == pytest.approx(known.energy * 1e3)
    name, content = downloaded(handoff, "Transmission")
    assert name == "heron-gate-spectrum.csv" and b"energy_meV,transmission" in content
    name, content = downloaded(handoff, "As Python")
    assert name == "heron-gate.py" and b"import transport" in content


def test_figures_leave_as_pictures(handoff: Page) -> None:
    for kind, begin in (("SVG", b"<svg"), ("PNG", b"\x89PNG")):
        name, content = downloaded(handoff, kind)
        assert name == f"colonnade-profile.{kind.lower()}" and content.startswith(begin)


def test_the_growers_sheet_leaves_with_times_and_a_wrong_rate_is_said(handoff: Page) -> None:
    handoff.locator("#rates").fill("fast")
    handoff.locator('[data-export="grower"]').click()
    expect(handoff.locator("#handoff-sentence")).to_contain_text('rate: "fast" is none')
    handoff.locator("#rates").fill("GaAs=0.8,AlGaAs=1.1")
    name, content = downloaded(handoff, "Write the sheet")
    assert name == "heron-gate-to-grow.csv" and b"toxic" in content and b"growth_s" in content


def test_a_sheet_is_looked_at_mended_taken_and_undone(handoff: Page) -> None:
    handoff.locator("#sheet-text").fill("d [\u00c5];Material;Al\n28;AlGaAs;0.25\n70;GaA;\n")
    handoff.get_by_role("button", name="Look at it").click()
    expect(handoff.locator("#sheet-faults")).to_contain_text("line 3, material")
    expect(handoff.locator("#sheet-take")).to_be_hidden()
    handoff.locator("#sheet-text").fill("d [\u00c5];Material;Al\n28;AlGaAs;0.25\n70;GaAs;\n")
    handoff.get_by_role("button", name="Look at it").click()
    expect(handoff.locator("#sheet-rows tr")).to_have_count(2)
    handoff.locator("#sheet-take").click()
    expect(handoff.locator(field(handoff, "stack.cell[0].x"))).to_have_value("0.25")
    expect(handoff.locator(field(handoff, "stack.cell[0].thickness_nm"))).to_have_value("2.8")
    handoff.get_by_role("button", name="Undo").click()
    expect(handoff.locator(field(handoff, "stack.cell[0].x"))).to_have_value("0.3")
