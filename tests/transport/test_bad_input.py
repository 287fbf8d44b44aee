"""Every wrong scenario is refused in one sentence that names the key, the value and the remedy."""

from __future__ import annotations

import pickle
import tomllib
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.transport.wrong_files import SOUND, WRONG_FILES
from tests.transport.wrong_layers import WRONG_LAYERS
from transport import ScenarioError, document_from_data, load_scenario, parse_scenario, scenario_from_document

CASES = {**WRONG_FILES, **WRONG_LAYERS}


def refusal(text: str) -> str:
    with pytest.raises(ScenarioError) as caught:
        parse_scenario(text)
    return str(caught.value)


def test_the_scenario_they_all_start_from_is_sound() -> None:
    assert parse_scenario(SOUND).title == "sound"


@pytest.mark.parametrize(("said", "instead", "sentence"), CASES.values(), ids=CASES)
def test_a_wrong_scenario_is_one_sentence(said: str, instead: str, sentence: str) -> None:
    assert SOUND.count(said) == 1
    assert refusal(SOUND.replace(said, instead)) == sentence


JUNK: list[Any] = [
    None, True, -1, 0, 10**400, 1e308, float("nan"), float("inf"), -0.0, "", "GaAs", "\ud800", "\n",
    [], {}, [[]], [{}], [{"layers": [{"layers": []}]}],
    {"repeat": 1}, {"material": "GaAs"}, {"name": 1}, {"": {"": ""}},
]


@settings(deadline=None, max_examples=400)
@given(st.data())
def test_no_junk_in_any_place_gives_anything_but_a_sentence(data: st.DataObject) -> None:
    """Plain data, as a link or an editor may send it, with one place overwritten or one key added."""
    tree = tomllib.loads(SOUND)
    place: Any = tree
    while True:
        key = data.draw(st.sampled_from([*place, "new"] if isinstance(place, dict) else range(len(place))))
        deeper = place[key] if key != "new" else None
        if not isinstance(deeper, dict | list) or not deeper or data.draw(st.booleans()):
            break
        place = deeper
    place[key] = data.draw(st.sampled_from(JUNK))
    try:
        scenario_from_document(document_from_data(tree))
    except ScenarioError as error:
        assert str(error).isprintable()
        assert len(str(error)) < 600


@settings(deadline=None, max_examples=400)
@given(st.integers(0, len(SOUND)), st.integers(0, 30), st.text(max_size=8) | st.sampled_from(list("[]{}=\"'#,.\n-")))
def test_no_slip_of_the_keyboard_gives_anything_but_a_sentence(at: int, gone: int, new: str) -> None:
    try:
        parse_scenario(SOUND[:at] + new + SOUND[at + gone :])
    except ScenarioError as error:
        assert str(error).isprintable()
        assert len(str(error)) < 600


@pytest.mark.parametrize("text", ["", " \n\n", "\t"])
def test_an_empty_text_is_told_how_to_begin(text: str) -> None:
    assert refusal(text) == "scenario: is empty; begin it with format = 1"


def test_a_text_of_a_megabyte_and_more_is_not_parsed() -> None:
    assert refusal("#" * 1_000_001) == "scenario: is larger than 1,000,000 bytes; a scenario file must stay below that"


@pytest.mark.parametrize("limit", ["file_windows", "file_materials"])
def test_long_lists_are_refused(limit: str) -> None:
    window = '{ kind = "pass", from_meV = 45, to_meV = 60, transmission = 0.3 }'
    material = "[materials.m{}]\nband_edge_eV = 0.2\nmass = 0.1\n"
    if limit == "file_windows":
        sentence = refusal(SOUND.replace(window, ", ".join([window] * 101)))
        assert sentence == "target.windows: lists 101 windows; at most 100 are read, so take some out"
    else:
        sentence = refusal(SOUND + "".join(material.format(i) for i in range(100)))
        assert sentence == "materials: defines 101 materials; at most 100 are read, so take some out"


def test_two_thousand_layers_are_read_and_one_more_is_not() -> None:
    layers = ", ".join(["{ delta_eV_nm = 0.1 }"] * 1994)  # with two in the cell and four in the exit: 2,000
    longest = SOUND.replace("{ delta_eV_nm = 0.1 }", layers)
    assert len(parse_scenario(longest).stack.entry) == 1994
    one_more = longest.replace("entry = [", "entry = [ { delta_eV_nm = 0.1 },")
    assert refusal(one_more) == (
        "stack: holds 2,001 layers, repeat groups written out; at most 2,000 are read, so take some out"
    )


@pytest.mark.parametrize("data", [None, 3, "format = 1", [], [1]])
def test_data_that_is_no_table_is_refused(data: object) -> None:
    with pytest.raises(ScenarioError, match=r"^scenario: must be a table of keys and values$"):
        document_from_data(data)


@pytest.mark.parametrize("materials", [3, [], "GaAs"])
def test_materials_that_are_no_tables_are_refused(materials: object) -> None:
    with pytest.raises(ScenarioError, match=r"^materials: must be tables \[materials.NAME\]$"):
        document_from_data({"format": 1, "materials": materials})


def test_a_bottomless_document_is_refused() -> None:
    layer: dict[str, Any] = {"repeat": 1}
    for _ in range(100_000):
        layer = {"repeat": 1, "layers": [layer]}
    data = {"format": 1, "leads": {"left": {}, "right": {}}, "stack": {"periods": 1, "cell": [layer]}}
    with pytest.raises(ScenarioError, match=r"^scenario: is nested too deeply; a list of layers holds plain layers$"):
        document_from_data(data)


def test_a_lone_surrogate_cannot_hide_in_a_title() -> None:
    """JSON can carry one, and no file could be written from it."""
    data = {"format": 1, "title": "\ud800", "leads": {"left": {}, "right": {}}, "stack": {"periods": 1, "cell": []}}
    document = document_from_data(data)
    with pytest.raises(ScenarioError, match=r"^title: holds the control character U\+D800; take it out$"):
        scenario_from_document(document)


def test_a_refusal_survives_the_way_to_another_process() -> None:
    error = pickle.loads(pickle.dumps(ScenarioError("stack.cell[0].x", "is missing")))
    assert (error.key, error.message, str(error)) == ("stack.cell[0].x", "is missing", "stack.cell[0].x: is missing")


def test_a_missing_file_is_named(tmp_path: Path) -> None:
    with pytest.raises(ScenarioError, match=r"none.toml: cannot be read \(No such file or directory\)"):
        load_scenario(tmp_path / "none.toml")


def test_a_folder_or_a_device_is_no_scenario(tmp_path: Path) -> None:
    for path in (tmp_path, Path("/dev/zero")):
        with pytest.raises(ScenarioError, match="is not a file; choose another name"):
            load_scenario(path)


def test_a_file_that_may_not_be_read_is_named(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(path: Path, mode: str) -> None:
        raise PermissionError(13, "Permission denied")

    path = tmp_path / "locked.toml"
    path.write_text(SOUND)
    monkeypatch.setattr(Path, "open", refuse)  # permissions do not bind the superuser, under whom tests may run
    with pytest.raises(ScenarioError, match=r"locked.toml: cannot be read \(Permission denied\); name a scenario file"):
        load_scenario(path)


def test_bytes_that_are_no_text_are_counted(tmp_path: Path) -> None:
    path = tmp_path / "binary.toml"
    path.write_bytes(b"format = 1\n\xff\xfe")
    with pytest.raises(ScenarioError, match=r"binary.toml: is not UTF-8 text \(byte 12\); save it as UTF-8"):
        load_scenario(path)


def test_a_file_of_more_than_a_megabyte_is_not_read(tmp_path: Path) -> None:
    path = tmp_path / "big.toml"
    path.write_bytes(b"#" * 1_000_001)
    with pytest.raises(ScenarioError, match=r"big.toml: is larger than 1,000,000 bytes"):
        load_scenario(path)


@pytest.mark.parametrize("name", ["a\0b", "a" * 300])
def test_a_name_no_file_can_have_is_refused(name: str, tmp_path: Path) -> None:
    with pytest.raises(ScenarioError, match=r"choose another name|cannot be read"):
        load_scenario(tmp_path / name)
