"""The experimentalist's way through the page *Peaks*: ledger, wave, measured peaks, fit, and back."""

from __future__ import annotations

from pathlib import Path

import pytest
from playwright.sync_api import Page, expect

from tests.browser.conftest import Served
from tests.browser.test_bench import drawn, opened, typed
from transport import load_scenario, resonances
from webapp.results import natural_span, question

MEASURED = "energy_meV,uncertainty_meV\n52.6,0.2\n62.3,0.2\n76.0,0.2\n"


@pytest.fixture
def peaks(page: Page) -> Page:
    opened(page, "Heron gate")
    page.get_by_role("tab", name="Peaks").click()
    expect(page.locator("#ledger tbody tr").first).to_be_visible()
    return page


def energies(page: Page) -> list[float]:
    return [float(text) for text in page.locator("#ledger tbody tr td:nth-child(2)").all_inner_texts()]


def test_the_ledger_is_the_engines_and_follows_the_slider(peaks: Page, served: Served) -> None:
    scenario = load_scenario(served.folder / "heron-gate.toml")
    known = resonances(scenario.stack, natural_span(question(scenario)))
    expect(peaks.locator("#ledger-seal")).to_have_text(known.certificate.sentence)
    assert energies(peaks) == pytest.approx(known.energy * 1e3, abs=5.1e-5)
    assert drawn(peaks, "ticks", "energy")[: known.energy.size] == pytest.approx(known.energy * 1e3)

    typed(peaks, "stack.periods", "3")
    fewer = resonances(scenario.stack.with_periods(3), natural_span(question(scenario)))
    expect(peaks.locator("#ledger tbody tr")).to_have_count(fewer.energy.size)


def test_the_ledger_is_sorted_by_any_column(peaks: Page) -> None:
    by_energy = energies(peaks)
    peaks.get_by_role("button", name="E (meV)").click()
    peaks.get_by_role("button", name="E (meV)").click()
    assert energies(peaks) == by_energy[::-1]
    expect(peaks.locator("#ledger th[aria-sort=descending]")).to_have_text("E (meV)")


def test_a_chosen_resonance_shows_its_wave_and_keeps_its_name_through_an_edit(peaks: Page) -> None:
    peaks.get_by_role("button", name="Resonance 3 at").focus()
    peaks.keyboard.press("Enter")
    expect(peaks.locator("#resonance-title")).to_have_text("Resonance 3: miniband 1, number 3")
    expect(peaks.locator("#effects tr").first).to_contain_text("GaAs, cell 2")
    peaks.wait_for_function("() => Bokeh.documents[0].get_model_by_name('wave').data.position.length > 100")
    assert min(drawn(peaks, "wave", "foot")) == pytest.approx(energies(peaks)[2], abs=1e-4)

    typed(peaks, "stack.cell[0].monolayers", "8")
    expect(peaks.locator("#resonance-title")).to_have_text("Resonance 3: miniband 1, number 3")
    peaks.get_by_role("button", name="Resonance 3 at").click()
    expect(peaks.locator("#resonance-title")).to_have_text("What moves a peak")
    peaks.wait_for_function("() => !Bokeh.documents[0].get_model_by_name('wave').data.position.length")


def test_local_density_is_drawn_and_taken_away(peaks: Page) -> None:
    peaks.get_by_label("local density").check()
    peaks.wait_for_function("() => Bokeh.documents[0].get_model_by_name('density').data.image.length === 1")
    peaks.get_by_label("local density").uncheck()
    peaks.wait_for_function("() => Bokeh.documents[0].get_model_by_name('density').data.image.length === 0")


def test_measured_peaks_are_paired_fitted_taken_and_undone(peaks: Page) -> None:
    peaks.locator("#measured-text").fill("energy\n1")
    peaks.get_by_role("button", name="Pair them").click()
    expect(peaks.locator("#measured-fault")).to_contain_text("did you mean energy_meV?")
    expect(peaks.locator("#measured-text")).to_have_value("energy\n1")

    peaks.locator("#measured-text").fill(MEASURED)
    peaks.get_by_role("button", name="Pair them").click()
    expect(peaks.locator("#measured-sentence")).to_contain_text("3 of 3 measured peaks paired")
    assert sorted(drawn(peaks, "measured-peaks", "energy")) == pytest.approx([52.6, 62.3, 76.0])

    peaks.get_by_role("button", name="Fit", exact=True).click()
    expect(peaks.locator("#fit-rows tr")).to_have_count(1)
    peaks.get_by_role("button", name="Take it").click()
    expect(peaks.locator("#earlier")).to_be_visible()
    expect(peaks.locator('[data-key="stack.cell[1].monolayers"]')).not_to_have_value("20")
    peaks.locator("#tab-peaks").focus()
    peaks.keyboard.press("Control+z")
    expect(peaks.locator('[data-key="stack.cell[1].monolayers"]')).to_have_value("20")
    expect(peaks.locator("#measured-sentence")).to_contain_text("3 of 3")


def test_a_file_of_peaks_is_read_and_too_large_a_one_refused(peaks: Page, tmp_path: Path) -> None:
    table = tmp_path / "peaks.csv"
    table.write_text("bias_V,width_meV\n0.12,2\n")
    peaks.locator("#measured-file").set_input_files(table)
    expect(peaks.locator("#measured-sentence")).to_contain_text("1 of 1 measured peaks paired")
    table.write_text("energy_meV\n" + "1\n" * 600_000)
    peaks.locator("#measured-file").set_input_files(table)
    expect(peaks.locator("#measured-fault")).to_contain_text("is larger than 1,000,000 bytes")
    expect(peaks.locator("#measured-sentence")).to_contain_text("1 of 1")


def test_a_fit_without_measured_peaks_says_what_is_missing(peaks: Page) -> None:
    peaks.get_by_role("button", name="Fit", exact=True).click()
    expect(peaks.locator("#fit-sentence")).to_contain_text("list the measured peaks, or paste a table of them")
