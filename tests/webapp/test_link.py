"""Links that hold a scenario: they come back as they went, fit an address, and whatever else comes is refused."""

from __future__ import annotations

import base64
import json
import zlib
from pathlib import Path
from urllib.parse import quote

import msgspec
import pytest
from hypothesis import given
from hypothesis import strategies as st

from transport import ScenarioError, document_from_data, document_to_data, load_scenario, parse_scenario
from webapp.bench import NEW_SCENARIO
from webapp.environment import CHECKOUT
from webapp.link import LONGEST, TOO_LONG, AxisRange, LinkState, decode, encode

DEMOS = sorted((CHECKOUT / "scenarios").glob("*.toml"))
NEW = parse_scenario(NEW_SCENARIO).document
PLAIN = {"scenario": document_to_data(NEW)}

edges = st.floats(-2, 2, allow_subnormal=False)
layers = st.builds(
    lambda edge, mass, thickness: {"band_edge_eV": edge, "mass": mass, "thickness_nm": thickness},
    edges, st.floats(0.01, 2), st.floats(0.1, 50))
texts = st.text(st.characters(codec="utf-8", exclude_categories=("Cc", "Cs", "Zl", "Zp")), min_size=1, max_size=60)


@st.composite
def states(draw: st.DrawFn) -> LinkState:
    """A small scenario with any numbers and text, looked at in any way."""
    lead = {"band_edge_eV": 0.0, "mass": draw(st.floats(0.01, 2))}
    data = {
        "format": 1, "title": draw(texts), "note": draw(texts), "leads": {"left": lead, "right": lead},
        "stack": {"periods": draw(st.integers(1, 1_000_000)), "cell": draw(st.lists(layers, min_size=1, max_size=4))},
    }
    low = draw(st.floats(-1e6, 1e6))
    axes = draw(st.sampled_from([(), (AxisRange("energy", low, low + 1.5),),
                                 (AxisRange("energy", low, low + 1.5), AxisRange("position", 0.0, 3.0))]))
    return LinkState(scenario=document_from_data(data), page=draw(st.sampled_from(["bench", "periods", "page-2"])),
                     scale=draw(st.sampled_from(["log", "linear"])), axes=axes)


def packed(content: bytes, version: str = "1") -> str:
    """A link around any content."""
    return f"{version}.{base64.urlsafe_b64encode(zlib.compress(content, 9)).decode().rstrip('=')}"


@given(states())
def test_a_state_comes_back_as_it_went(state: LinkState) -> None:
    assert decode(encode(state)) == state


@pytest.mark.parametrize("path", DEMOS, ids=lambda path: path.stem)
def test_every_demo_fits_an_address(path: Path) -> None:
    state = LinkState(scenario=load_scenario(path).document, page="periods", scale="linear",
                      axes=(AxisRange("energy", 12.25, 310.5),))
    text = encode(state)
    assert len(text) < 2_000
    assert quote(text, safe="") == text  # nothing an address would have to escape
    assert decode(text) == state


def test_a_scenario_that_does_not_fit_is_offered_as_a_file() -> None:
    data = document_to_data(NEW)
    data["stack"]["entry"] = [{"band_edge_eV": (i * i) % 97 / 91, "mass": 0.067 + i / 7e3, "thickness_nm": 1 + i / 3}
                              for i in range(300)]
    with pytest.raises(ScenarioError, match="save the file") as refusal:
        encode(LinkState(scenario=document_from_data(data)))
    assert refusal.value.message == TOO_LONG


def test_what_would_unpack_to_too_much_is_not_written_either() -> None:
    data = document_to_data(NEW)
    data["stack"]["entry"] = [data["stack"]["cell"][0]] * 1900
    with pytest.raises(ScenarioError, match="save the file"):
        encode(LinkState(scenario=document_from_data(data)))


def test_a_long_note_of_one_letter_is_no_bomb() -> None:
    state = LinkState(scenario=msgspec.structs.replace(NEW, note="m" * 10_000))
    assert decode(encode(state)) == state


@given(st.text(max_size=300))
def test_any_text_is_a_state_or_one_sentence(text: str) -> None:
    for candidate in (text, f"1.{text}"):
        with pytest.raises(ScenarioError) as refusal:
            decode(candidate)
        assert "\n" not in str(refusal.value)


@given(st.binary(max_size=300))
def test_any_content_is_a_state_or_one_sentence(content: bytes) -> None:
    with pytest.raises(ScenarioError, match="link"):
        decode(packed(content))


@given(st.integers(0, 10_000), st.characters(codec="ascii"))
def test_an_altered_link_is_refused(place: int, other: str) -> None:
    text = encode(LinkState(scenario=NEW))
    place %= len(text)
    if text[place] == other:
        return
    with pytest.raises(ScenarioError, match="link"):
        decode(text[:place] + other + text[place + 1:])


@given(st.integers(0, 10_000))
def test_a_truncated_link_is_refused(length: int) -> None:
    text = encode(LinkState(scenario=NEW))
    with pytest.raises(ScenarioError, match="damaged"):
        decode(text[: length % len(text)])


def test_text_behind_a_link_is_refused() -> None:
    text = encode(LinkState(scenario=NEW))
    content = base64.urlsafe_b64decode(text[2:] + "=" * (-len(text[2:]) % 4)) + b"more"
    with pytest.raises(ScenarioError, match="damaged"):
        decode(f"1.{base64.urlsafe_b64encode(content).decode().rstrip('=')}")


@pytest.mark.parametrize("size", [40_000, 10**6, 10**8 // 80])
def test_a_bomb_is_not_unpacked(size: int) -> None:
    note = b'{"scenario":{"note":"' + b"a" * size
    with pytest.raises(ScenarioError, match=r"far more than a scenario|longer than"):
        decode(packed(note))


@pytest.mark.parametrize("content", [
    b"[" * 20_000, b'{"scenario":' + b'{"a":' * 4_000, b'{"scenario":{"x":' + b"[" * 4_000 + b"]" * 4_000 + b"}}",
    b'{"scenario":{"stack":{"entry":[' + b'{"layers":[' * 2_000,
])
def test_deep_nesting_is_refused_before_it_is_read(content: bytes) -> None:
    with pytest.raises(ScenarioError, match="nested more deeply"):
        decode(packed(content))


def test_brackets_within_text_are_no_nesting() -> None:
    state = LinkState(scenario=msgspec.structs.replace(NEW, note='[[[[[[[[[[[[[[[[ \\" {{{{{{{{{{{{{{{{'))
    assert decode(encode(state)) == state


@pytest.mark.parametrize("change, words", [
    ({"page": "../x"}, "names no page"), ({"page": "<b>"}, "names no page"), ({"scale": "cubic"}, "damaged"),
    ({"axes": [["energy", 2, 1]]}, "no range"), ({"axes": [["energy", 1e300, 1e301]]}, "no range"),
    ({"axes": [["<i>", 1, 2]]}, "names no axis"), ({"axes": [["e", 1, 2], ["e", 1, 3]]}, "twice"),
    ({"axes": [[f"a{i}", 1, 2] for i in range(13)]}, "more than 12 axes"),
    ({"extra": 1}, "damaged"), ({"scenario": 3}, "damaged"), ({"scenario": {}}, "format: is missing"),
    ({"scenario": {**document_to_data(NEW), "title": "a\x00b"}}, "control character"),
    ({"scenario": {**document_to_data(NEW), "title": "x" * 201}}, "characters"),
    ({"scenario": {**document_to_data(NEW), "format": 2}}, "reads format = 1 only"),
    ({"scenario": {**document_to_data(NEW), "colour": 2}}, "is not a key"),
])
def test_what_cannot_be_used_is_one_sentence(change: dict[str, object], words: str) -> None:
    with pytest.raises(ScenarioError, match=words):
        decode(packed(json.dumps(PLAIN | change).encode()))


@pytest.mark.parametrize("content", [b"", b"{}", b"null", b'{"scenario":NaN}', b'{"scenario":{"format":1e999}}',
                                     b'{"scenario":{"title":"\\ud800"}}', b"\xff\xfe", b'{"scenario":{"a":1}} {}'])
def test_content_that_is_no_json_of_ours_is_one_sentence(content: bytes) -> None:
    with pytest.raises(ScenarioError):
        decode(packed(content))


def test_a_newer_version_says_what_to_do() -> None:
    with pytest.raises(ScenarioError, match=r"version 2, but this program reads version 1; ask for the file"):
        decode(packed(json.dumps(PLAIN).encode(), "2"))


def test_a_link_is_not_longer_than_is_read() -> None:
    with pytest.raises(ScenarioError, match="longer than"):
        decode("1." + "A" * LONGEST)


def test_the_least_link_is_the_bench_as_it_opens() -> None:
    assert decode(packed(json.dumps(PLAIN).encode())) == LinkState(scenario=NEW)
