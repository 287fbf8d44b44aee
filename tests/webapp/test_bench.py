"""The state of a session without a browser: drafts, undo, saving, and a folder that nothing leads out of."""

from __future__ import annotations

import asyncio
import shutil
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import msgspec
import pytest

from transport import ScenarioError, load_scenario, matched_ends
from webapp.bench import Bench
from webapp.editor import Rail
from webapp.environment import CHECKOUT
from webapp.files import Folder
from webapp.latest import Latest, Stop
from webapp.messages import Slide, read

BARRIER = "stack.cell[0].monolayers"


@pytest.fixture
def folder(tmp_path: Path) -> Folder:
    shutil.copytree(CHECKOUT / "scenarios", tmp_path / "served")
    return Folder(tmp_path / "served")


@pytest.fixture
def bench(folder: Folder) -> Bench:
    return Bench(folder, "heron-gate.toml")


def test_a_value_that_can_be_used_is_in_force_at_once(bench: Bench) -> None:
    bench.set(BARRIER, "8")
    assert bench.document.stack.cell[0].monolayers == 8
    assert bench.is_changed and not bench.drafts


@pytest.mark.parametrize("text, sentence", [
    ("nonsense", "must be a number"), ("-3", "must be above 0"), ("1e9", "at most 20,000"), ("nan", "must be"),
    ("", "thickness"), ("<b>7</b>", "must be a number"),
])
def test_a_value_that_cannot_is_kept_beside_its_sentence(bench: Bench, text: str, sentence: str) -> None:
    before = bench.document
    bench.set(BARRIER, text)
    assert bench.drafts[BARRIER].text == text
    assert sentence in bench.drafts[BARRIER].message
    assert bench.document == before


def test_a_proposal_is_taken_in_one_step_and_its_drafts_come_back(bench: Bench) -> None:
    bench.set(BARRIER, "x")
    before = bench.document
    proposal = matched_ends(bench.scenario).proposals[0]
    bench.adopt(proposal.scenario, proposal.name)
    assert bench.document == proposal.scenario.document and bench.undo_step == proposal.name
    bench.set("stack.ends.whole_monolayers", "true")
    assert bench.document.stack.ends is not None and bench.document.stack.ends.whole_monolayers
    bench.drop_ends()
    assert bench.document.stack.ends is None
    for _ in range(3):
        bench.undo()
    assert bench.document == before and bench.drafts[BARRIER].text == "x"


def test_growth_figures_are_made_where_the_file_has_none(bench: Bench) -> None:
    assert bench.document.growth is None
    bench.set("growth.offset_percent", "8")
    assert bench.document.growth is not None and bench.document.growth.offset_percent == 8
    bench.set("growth.monolayer_error", "half")
    assert "must be a number" in bench.drafts["growth.monolayer_error"].message


def test_undo_reaches_back_over_edits_drafts_and_files(bench: Bench) -> None:
    first = bench.document
    bench.set(BARRIER, "8")
    bench.set(BARRIER, "x")
    bench.open("mill-race.toml")
    assert bench.place == "mill-race.toml"
    for _ in range(3):
        bench.undo()
    assert bench.document == first and bench.place == "heron-gate.toml" and not bench.drafts
    for _ in range(3):
        bench.redo()
    assert bench.place == "mill-race.toml"


def test_a_drag_of_the_slider_is_one_step(bench: Bench) -> None:
    for periods in range(9, 20):
        bench.slide(periods)
    bench.settle()
    assert bench.scenario.stack.periods == 19
    bench.undo()
    assert bench.scenario.stack.periods == 8


def test_layers_are_added_copied_moved_and_deleted_with_their_drafts(bench: Bench) -> None:
    bench.set(BARRIER, "x")
    bench.add_layer("stack.cell", 0)
    assert bench.drafts["stack.cell[1].monolayers"].text == "x"
    bench.move("stack.cell", 1, 1)
    assert bench.drafts["stack.cell[2].monolayers"].text == "x"
    bench.duplicate("stack.cell", 0)
    assert len(bench.document.stack.cell) == 4
    bench.delete("stack.cell", 3)
    assert not bench.drafts and len(bench.document.stack.cell) == 3


def test_the_last_layer_of_the_cell_cannot_go(bench: Bench) -> None:
    bench.delete("stack.cell", 1)
    bench.delete("stack.cell", 0)
    assert len(bench.document.stack.cell) == 1
    assert bench.notice is not None and "at least one layer" in bench.notice.sentence


def test_a_message_about_a_row_that_is_gone_changes_nothing(bench: Bench) -> None:
    before = bench.document
    bench.set("stack.cell[9].monolayers", "7")
    bench.delete("stack.cell", 9)
    bench.move("stack.cell", 9, -1)
    bench.duplicate("stack.entry", 0)
    assert bench.document == before


def test_changing_the_material_takes_and_gives_the_composition(bench: Bench) -> None:
    bench.set("stack.cell[0].choice", "GaAs")
    assert bench.document.stack.cell[0].x is None
    bench.set("stack.cell[0].choice", "AlGaAs")
    assert bench.document.stack.cell[0].x is not None


def test_saving_writes_what_is_in_force_and_asks_before_it_loses_anything(bench: Bench, folder: Folder) -> None:
    bench.set(BARRIER, "8")
    assert bench.save("heron-gate.toml", agreed=False) == ()
    assert load_scenario(folder.path / "heron-gate.toml") == bench.scenario
    assert not bench.is_changed
    assert "is there already" in bench.save("mill-race.toml", agreed=False)[0]
    written = folder.path / "heron-gate.toml"
    written.write_text(f"# mine\n{written.read_text()}")
    sentences = bench.save("heron-gate.toml", agreed=False)
    assert any("changed elsewhere" in s for s in sentences) and any("comments" in s for s in sentences)
    assert bench.save("heron-gate.toml", agreed=True) == ()
    assert "# mine" not in written.read_text()


@pytest.mark.parametrize("name", ["../out", "/tmp/out", "a/b", "..", "", ".hidden", "x" * 300, "nul\0l", "link"])
def test_no_name_leads_out_of_the_folder(bench: Bench, folder: Folder, name: str) -> None:
    (folder.path / "link.toml").symlink_to(folder.path.parent / "outside.toml")
    bench.save(name, agreed=True)
    assert bench.notice is not None and bench.notice.is_fault
    assert sorted(path.name for path in folder.path.parent.iterdir()) == ["served"]


def test_a_bad_file_stays_in_the_list_with_its_sentence(folder: Folder) -> None:
    (folder.path / "broken.toml").write_text("format = 1\ntitle = ")
    entries = {entry.name: entry for entry in folder.entries()}
    assert entries["broken.toml"].problem and not entries["heron-gate.toml"].problem
    bench = Bench(folder, "broken.toml")
    assert bench.place == "heron-gate.toml"
    assert bench.notice is not None and "broken.toml cannot be opened" in bench.notice.sentence


def test_an_empty_folder_begins_with_a_new_scenario(tmp_path: Path) -> None:
    bench = Bench(Folder(tmp_path))
    assert bench.place is None and bench.scenario.title == "New scenario"
    with pytest.raises(ScenarioError, match="is not a folder; name the folder that holds the scenarios"):
        Folder(tmp_path / "absent")


def test_only_messages_of_the_page_are_read() -> None:
    assert read({"type": "slide", "seq": 3, "periods": 9}) == Slide(seq=3, periods=9)
    lies: list[object] = [{}, {"type": "nothing", "seq": 1}, {"type": "slide", "seq": 1, "periods": "9"}, [], None]
    for junk in lies:
        with pytest.raises(msgspec.ValidationError):
            read(junk)


def test_of_many_requests_the_latest_wins() -> None:
    done: list[int] = []
    started: list[int] = []

    async def visit() -> None:
        gate = asyncio.Event()
        loop = asyncio.get_running_loop()

        def work(request: int, stop: Stop) -> int:
            started.append(request)
            if request == 1:
                asyncio.run_coroutine_threadsafe(gate.wait(), loop).result(timeout=10)
            stop.check()
            return request

        finished = asyncio.Event()

        def show(request: int, result: int) -> None:
            done.append(result)
            if request == 4:
                finished.set()

        def fail(request: int, error: Exception) -> None:
            raise error

        latest: Latest[int, int] = Latest(work, show, fail, interrupts=True)
        for request in (1, 2, 3, 4):
            latest.ask(request)
            await asyncio.sleep(0)
        gate.set()
        await asyncio.wait_for(finished.wait(), timeout=10)

    with ThreadPoolExecutor() as aside:  # a thread of its own: the browser tests keep a loop running in this one
        aside.submit(asyncio.run, visit()).result(timeout=30)
    assert done == [4]
    assert started[-1] == 4 and 3 not in started


def test_a_list_is_turned_round_and_written_twice_with_its_drafts(bench: Bench) -> None:
    before = bench.document.stack.cell
    bench.set(BARRIER, "x")
    bench.mirror("stack.cell")
    assert bench.document.stack.cell == before[::-1]
    assert set(bench.drafts) == {BARRIER.replace("[0]", "[1]")}
    bench.double("stack.cell")
    assert bench.document.stack.cell == 2 * before[::-1]
    bench.undo()
    bench.undo()
    assert bench.document.stack.cell == before and set(bench.drafts) == {BARRIER}


def test_a_layer_is_moved_by_many_places(bench: Bench) -> None:
    bench.double("stack.cell")
    first, second = bench.document.stack.cell[:2]
    bench.move("stack.cell", 0, 3)
    assert bench.document.stack.cell == (second, first, second, first)
    bench.move("stack.cell", 3, 1)
    assert bench.document.stack.cell == (second, first, second, first)


def test_all_barriers_change_at_once_and_too_thin_ones_are_refused(bench: Bench) -> None:
    bench.thicken("barriers", 1)
    assert bench.document.stack.cell[0].monolayers == 8 and bench.document.stack.exit[0].monolayers == 8
    assert bench.undo_step == "change of all barriers"
    before = bench.document
    bench.thicken("barriers", -20)
    assert bench.notice is not None and "must stay above 0" in bench.notice.sentence and bench.document == before


@pytest.mark.parametrize("kind", ["linear", "cosine", "gaussian", "sech2", "fermi", "parabola", "samples"])
def test_a_layer_becomes_a_profile_that_is_accepted_at_once_and_back(bench: Bench, kind: str) -> None:
    bench.set("stack.cell[1].choice", f"profile:{kind}")
    assert bench.document.stack.cell[1].profile == kind and not bench.drafts
    assert any(field["path"] == "stack.cell[1].mass" for field in Rail(bench).view()["parts"][3]["rows"][1]["fields"])
    bench.set("stack.cell[1].choice", "material:GaAs")
    assert bench.document.stack.cell[1].material == "GaAs"


def test_samples_of_a_profile_are_typed_as_a_list(bench: Bench) -> None:
    bench.set("stack.cell[1].choice", "profile:samples")
    bench.set("stack.cell[1].potential_eV", "0, 0.05; -0.01")
    assert bench.document.stack.cell[1].potential_eV == (0.0, 0.05, -0.01)
    bench.set("stack.cell[1].potential_eV", "0, high")
    assert "must be a number" in bench.drafts["stack.cell[1].potential_eV"].message


def test_an_alloy_is_graded_through_its_layer_and_at_its_faces(bench: Bench) -> None:
    bench.set("stack.cell[0].graded", "true")
    bench.set("stack.cell[0].x_to", "0.1")
    assert (bench.document.stack.cell[0].x_from, bench.document.stack.cell[0].x_to) == (0.3, 0.1)
    bench.set("stack.cell[0].graded", "false")
    assert bench.document.stack.cell[0].x == 0.3
    bench.set("stack.exit[0].grading_nm", "0.4")
    bench.set("stack.cell[0].grading_nm", "0.4")
    assert bench.document.stack.cell[0].grading_nm == 0.4
