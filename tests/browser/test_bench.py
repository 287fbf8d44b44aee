"""The designer's way through the page: open, drag, read, edit to nonsense and back, save, reload."""

from __future__ import annotations

from pathlib import Path

import pytest
from playwright.sync_api import Page, expect

from tests.browser.conftest import Served, ready
from transport import load_scenario, nearest_stacks, period_verdict, spectrum, verdict_range

PICTURE = Path(__file__).with_name("bench.png")


def opened(page: Page, title: str) -> None:
    """Open a scenario from the list."""
    page.get_by_role("button", name="Open", exact=True).click()
    page.get_by_role("dialog").get_by_text(title, exact=True).first.click()
    expect(page.get_by_role("heading", level=1)).to_have_text(title)


def field(page: Page, key: str) -> str:
    """The selector of a field of the rail."""
    return f'[data-key="{key}"]'


def typed(page: Page, key: str, text: str) -> None:
    """Type a value into a field and leave it."""
    page.locator(field(page, key)).fill(text)
    page.locator(field(page, key)).press("Tab")


def drawn(page: Page, name: str, column: str) -> list[float]:
    """A column of what a figure draws."""
    found = page.evaluate(
        "([name, column]) => Array.from(Bokeh.documents[0].get_model_by_name(name).data[column])", [name, column]
    )
    return [float(value) for value in found]


def test_a_scenario_is_opened_dragged_edited_saved_and_found_again(page: Page, served: Served) -> None:
    opened(page, "Heron gate")
    verdict = period_verdict(load_scenario(served.folder / "heron-gate.toml"))
    expect(page.locator("#sentence")).to_have_text(verdict.sentence)

    page.locator("#period-slider").focus()
    for _ in range(4):
        page.keyboard.press("ArrowRight")
    expect(page.locator("#periods-shown")).to_have_text("12 periods")
    expect(page.locator("#present")).to_contain_text("12 periods meet the target")

    thickness = "stack.cell[0].monolayers"
    typed(page, thickness, "nonsense")
    expect(page.locator(f'[data-message="{thickness}"]')).to_contain_text("must be a number")
    expect(page.locator(field(page, thickness))).to_have_value("nonsense")
    expect(page.locator("#sentence")).to_have_text(verdict.sentence)
    typed(page, thickness, "8")
    expect(page.locator(f'[data-message="{thickness}"]')).to_be_hidden()
    expect(page.locator("#sentence")).not_to_have_text(verdict.sentence)

    page.get_by_role("button", name="Save", exact=True).click()
    expect(page.locator("#notice")).to_contain_text("heron-gate.toml")
    saved = load_scenario(served.folder / "heron-gate.toml")
    assert saved.stack.periods == 12
    assert saved.document.stack.cell[0].monolayers == 8

    page.reload()
    ready(page)
    expect(page.get_by_role("heading", level=1)).to_have_text("Heron gate")
    expect(page.locator(field(page, thickness))).to_have_value("8")
    expect(page.locator("#periods-shown")).to_have_text("12 periods")


def test_the_curve_on_screen_is_the_engines(page: Page, served: Served) -> None:
    opened(page, "Heron gate")
    expect(page.locator("#periods-shown")).to_have_text("8 periods")
    page.wait_for_function("() => Bokeh.documents[0].get_model_by_name('curve-line').tags[0] === 8")
    energy, shown = drawn(page, "curve", "energy"), drawn(page, "curve", "log10")
    stack = load_scenario(served.folder / "heron-gate.toml").stack
    expected = spectrum(stack, [e / 1e3 for e in energy]).log10_transmission
    seen = [i for i, value in enumerate(expected) if value > -30]
    assert len(seen) > 200
    assert [shown[i] for i in seen] == pytest.approx([expected[i] for i in seen], abs=1e-6)


def test_undo_and_redo_reach_every_edit(page: Page) -> None:
    opened(page, "Pebble comb")
    typed(page, "stack.exit[0].delta_eV_nm", "0.12")
    page.get_by_role("button", name="Undo").click()
    expect(page.locator(field(page, "stack.exit[0].delta_eV_nm"))).to_have_value("0.08")
    page.get_by_role("button", name="Redo").click()
    expect(page.locator(field(page, "stack.exit[0].delta_eV_nm"))).to_have_value("0.12")
    page.get_by_role("button", name="Undo").click()
    page.get_by_role("button", name="Undo").click()
    expect(page.get_by_role("heading", level=1)).not_to_have_text("Pebble comb")


def test_layers_are_added_moved_duplicated_and_deleted(page: Page) -> None:
    opened(page, "Heron gate")
    rows = page.locator('[data-row^="stack.cell["]')
    expect(rows).to_have_count(2)
    page.locator('[data-key^="stack.cell+"]').first.click()
    expect(rows).to_have_count(3)
    page.locator('[data-key^="stack.cell[2]#duplicate"]').click()
    expect(rows).to_have_count(4)
    page.locator('[data-key="stack.cell[3]#delete"]').click()
    expect(rows).to_have_count(3)
    page.locator('[data-key="stack.cell[0]#move1"]').click()
    expect(page.locator(field(page, "stack.cell[1].x"))).to_have_value("0.3")


def test_a_verdict_that_is_impossible_says_why(page: Page) -> None:
    opened(page, "Mill race")
    expect(page.locator("#sentence")).to_contain_text("overlaps miniband 1")
    opened(page, "Reed sill, bare ends")
    expect(page.locator("#sentence")).to_contain_text("ripple floor")


def test_a_refusal_is_mended_by_a_remedy_and_undone_with_one_key(page: Page, served: Served) -> None:
    opened(page, "Reed sill, bare ends")
    refusal = period_verdict(load_scenario(served.folder / "reed-sill-bare.toml")).sentence
    expect(page.locator("#sentence")).to_have_text(refusal)
    page.get_by_role("button", name="Find a remedy").click()
    remedy = nearest_stacks(load_scenario(served.folder / "reed-sill-bare.toml"))
    expect(page.locator("#remedies-sentence")).to_have_text(remedy.sentence)
    expect(page.locator(".proposal")).to_have_count(len(remedy.proposals))

    page.locator(".proposal").first.get_by_role("button").click()
    taken = remedy.proposals[0]
    expect(page.locator("#sentence")).to_have_text(period_verdict(taken.scenario).sentence)
    expect(page.locator("#periods-shown")).to_have_text(f"{taken.check.periods} periods")
    expect(page.locator("#earlier")).to_be_visible()
    assert len(drawn(page, "before", "energy")) > 100
    page.keyboard.press("Control+z")
    expect(page.locator("#sentence")).to_have_text(refusal)
    expect(page.locator("#earlier")).to_be_hidden()

    page.get_by_role("button", name="Match the ends").click()
    expect(page.locator("#remedies-sentence")).to_contain_text("Matched ends raise the ripple floor")
    page.locator(".proposal").first.get_by_role("button").click()
    expect(page.get_by_role("button", name="Take the ends away")).to_be_visible()
    page.get_by_role("button", name="Take the ends away").click()
    expect(page.get_by_role("button", name="Take the ends away")).to_have_count(0)


def test_the_verdict_comes_with_its_range_and_follows_the_growers_figures(page: Page, served: Served) -> None:
    opened(page, "Heron gate")
    expect(page.locator("#range-words")).to_have_text(
        verdict_range(load_scenario(served.folder / "heron-gate.toml")).sentence)
    expect(page.locator("#range-drawn")).to_be_visible()
    typed(page, "growth.monolayer_error", "0")
    expect(page.locator("#range-assumed")).to_have_text("For band offset ±5 %, mass ±5 %, each alone and all at once.")
    typed(page, "growth.offset_percent", "0")
    typed(page, "growth.mass_percent", "0")
    expect(page.locator('[data-message="growth.mass_percent"]')).to_contain_text("leaves no range")


def test_ends_without_a_pass_window_have_nothing_to_raise(page: Page) -> None:
    opened(page, "Mill race")
    page.get_by_role("button", name="Match the ends").click()
    expect(page.locator("#remedies-sentence[data-fault=true]")).to_contain_text("holds no pass window")


def test_saving_under_a_bad_name_or_outside_the_folder_is_refused(page: Page, served: Served) -> None:
    outside = served.folder.parent / "outside.toml"
    for name in ("../outside", "/tmp/outside", "a/b", ".."):
        page.get_by_role("button", name="Save as").click()
        page.get_by_role("dialog").get_by_role("textbox").fill(name)
        page.get_by_role("dialog").get_by_role("button", name="Save", exact=True).click()
        expect(page.locator("#notice[data-fault=true]")).to_contain_text("file name")
    assert not outside.exists()
    assert sorted(path.suffix for path in served.folder.iterdir()) == [".toml"] * 6


def test_text_of_a_file_is_never_markup(page: Page, served: Served) -> None:
    hostile = "<img src=x onerror=window.hostile=1><script>window.hostile=1</script>"
    text = (served.folder / "heron-gate.toml").read_text()
    text = text.replace('title = "Heron gate"', f'title = "{hostile}"').replace("A hot-electron filter", hostile)
    (served.folder / "hostile.toml").write_text(text)
    opened(page, hostile)
    expect(page.locator("#sentence")).to_contain_text("Fewest periods")
    assert page.evaluate("() => window.hostile") is None


def test_every_page_fits_its_width(page: Page) -> None:
    for name in ("Periods", "Peaks", "Compare", "Hand-off"):
        page.get_by_role("tab", name=name).click()
        for width in (390, 1280, 1920, 2560):
            page.set_viewport_size({"width": width, "height": 900})
            page.wait_for_function(f"() => document.documentElement.scrollWidth <= {width}")
            expect(page.locator("#trio canvas").first).to_be_visible()


def test_the_three_figures_share_their_energy_axis(page: Page) -> None:
    frames = page.evaluate("""() => ["profile", "passes", "lattice"].map((name) => {
        const figure = Bokeh.documents[0].get_model_by_name(name)
        const view = Bokeh.index.find_one(figure)
        const box = view.frame.bbox
        const top = view.el.getBoundingClientRect().top
        return [Math.round(top + box.top), Math.round(top + box.bottom), figure.y_range.id]
    })""")
    assert frames[0] == frames[1] == frames[2]


def test_the_bench_can_be_used_by_keyboard_alone(page: Page) -> None:
    page.keyboard.press("Tab")
    expect(page.get_by_text("Skip to the bench")).to_be_focused()
    page.locator("#energy").focus()
    page.keyboard.type("70")
    expect(page.locator("#values")).to_contain_text("T =")
    expect(page.locator("#values")).to_contain_text("miniband 1")


def test_the_dark_theme_reaches_the_figures(page: Page) -> None:
    before = page.evaluate("() => Bokeh.documents[0].get_model_by_name('passes').background_fill_color.value")
    page.get_by_role("button", name="Dark theme").click()
    page.wait_for_function(
        "(old) => Bokeh.documents[0].get_model_by_name('passes').background_fill_color.value !== old", arg=before
    )
    assert page.evaluate("() => document.documentElement.dataset.theme") == "dark"


def test_the_readmes_picture_can_be_taken(page: Page, tmp_path: Path, request: pytest.FixtureRequest) -> None:
    """With --picture the committed picture is taken anew."""
    opened(page, "Heron gate")
    expect(page.locator("#sentence")).to_contain_text("Fewest periods")
    page.set_viewport_size({"width": 1440, "height": 900})
    page.mouse.move(0, 0)
    ready(page)
    place = PICTURE if request.config.getoption("--picture") else tmp_path / "bench.png"
    page.screenshot(path=place)
    assert place.stat().st_size > 40_000
