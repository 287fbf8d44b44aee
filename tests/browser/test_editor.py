"""Editing many layers at once, and layers dragged to another place."""

from __future__ import annotations

from playwright.sync_api import Page, expect

from tests.browser.test_bench import field, opened


def test_barriers_change_together_lists_turn_round_and_everything_is_undone(page: Page) -> None:
    opened(page, "Heron gate")
    page.get_by_role("button", name="barriers +1 ML").click()
    expect(page.locator(field(page, "stack.cell[0].monolayers"))).to_have_value("8")
    expect(page.locator(field(page, "stack.exit[0].monolayers"))).to_have_value("8")
    page.locator('[data-key="stack.cell#Turn round"]').click()
    expect(page.locator(field(page, "stack.cell[1].monolayers"))).to_have_value("8")
    page.locator('[data-key="stack.cell#Write twice"]').click()
    expect(page.locator('[data-row^="stack.cell["]')).to_have_count(4)
    for _ in range(3):
        page.get_by_role("button", name="Undo").click()
    expect(page.locator(field(page, "stack.cell[0].monolayers"))).to_have_value("7")
    expect(page.locator('[data-row^="stack.cell["]')).to_have_count(2)


def test_a_layer_is_dragged_to_another_place_of_its_list(page: Page) -> None:
    opened(page, "Heron gate")
    page.locator('[data-row="stack.cell[1]"]').scroll_into_view_if_needed()
    handle = page.locator('[data-row="stack.cell[0]"] .swatch').bounding_box()
    place = page.locator('[data-row="stack.cell[1]"]').bounding_box()
    assert handle is not None and place is not None
    page.mouse.move(handle["x"] + 2, handle["y"] + 5)
    page.mouse.down()
    page.mouse.move(place["x"] + 30, place["y"] + place["height"] - 6, steps=6)
    page.mouse.up()
    expect(page.locator(field(page, "stack.cell[1].monolayers"))).to_have_value("7")
    expect(page.locator(field(page, "stack.cell[0].monolayers"))).to_have_value("20")


def test_a_change_that_leaves_nothing_of_a_layer_is_refused_beside_its_button(page: Page) -> None:
    opened(page, "Heron gate")
    for left in range(6, 0, -1):
        page.get_by_role("button", name="barriers \u22121 ML").click()
        expect(page.locator(field(page, "stack.cell[0].monolayers"))).to_have_value(str(left))
    page.get_by_role("button", name="barriers \u22121 ML").click()
    expect(page.locator('[data-list="layers"]')).to_contain_text("must stay above 0")
