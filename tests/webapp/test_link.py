"""Links reopen exactly what was shown, stay short, and anything odd is one sentence."""

from __future__ import annotations

import base64
import random
import zlib
from pathlib import Path

import msgspec
import pytest
from hypothesis import given
from hypothesis import strategies as st

from transport import ScenarioError, document_to_data, load_scenario
from webapp.link import LONGEST, Shown, decode, encode

HERON = load_scenario("scenarios/heron-gate.toml").document


def packed(plain: bytes) -> str:
    return "1" + base64.urlsafe_b64encode(zlib.compress(plain, 9)).decode().rstrip("=")


@pytest.mark.parametrize("file", sorted(Path("scenarios").glob("*.toml")), ids=lambda file: file.stem)
def test_a_demo_fits_into_a_link_and_comes_back_the_same(file: Path) -> None:
    shown = Shown(load_scenario(file).document, "peaks", "linear", (-3.5, 120.25), True)
    text = encode(shown)
    assert len(text) < LONGEST and text.replace("-", "").replace("_", "").isalnum()
    assert decode(text) == shown


def test_a_long_scenario_says_so_and_offers_the_file() -> None:
    note = "".join(random.Random(1).choices("abcdefghijklmnopqrstuvwxyz ", k=4000))
    with pytest.raises(ScenarioError, match=r"link: would have [\d,]+ characters.*send the file instead"):
        encode(Shown(msgspec.structs.replace(HERON, note=note)))


@given(st.integers(0, 300), st.characters())
def test_an_altered_link_is_refused_or_still_a_sound_bench(place: int, character: str) -> None:
    text = encode(Shown(HERON))
    place %= len(text)
    try:
        decode(text[:place] + character + text[place + 1:])
    except ScenarioError as error:
        assert "\n" not in str(error)


@given(st.text(max_size=200))
def test_garbage_is_refused_in_one_sentence(text: str) -> None:
    with pytest.raises(ScenarioError, match="link: "):
        decode(text)


@pytest.mark.parametrize(("text", "sentence"), [
    ("", "is of another version"),
    ("2" + "a" * 40, "is of another version"),
    ("1" + "a" * LONGEST, "has more than 2,000 characters"),
    (packed(b"[" * 1500), "was altered or cut off"),
    (packed(b'{"s":' + b'{"a":' * 900 + b"1" + b"}" * 901), "format: is missing"),
    (packed(b" " * 1_200_000), "holds more than 1,000,000 bytes"),
    (packed(b'{"s": {}, "extra": 1}'), "was altered or cut off"),
    (packed(b'{"s": {"format": 1}}'), "leads: is missing"),
    (encode(Shown(HERON))[:-9], "is cut off"),
])
def test_what_is_odd_about_a_link_is_said(text: str, sentence: str) -> None:
    with pytest.raises(ScenarioError, match=sentence):
        decode(text)


@pytest.mark.parametrize("seen", [
    (-1e300, 1e300), (0.0, 1e9), (5.0, 5.0), (6.0, 5.0), (0.0, 1e-300), (50.0, 50.000000000000007)])
def test_a_link_asks_the_engine_for_no_range_that_it_could_never_finish(seen: tuple[float, float]) -> None:
    plain = msgspec.json.encode({"s": document_to_data(HERON), "energy": seen})
    with pytest.raises(ScenarioError, match="energy range that is reversed, or that no figure has"):
        decode(packed(plain))
    with pytest.raises(ScenarioError, match="energy range that is reversed, or that no figure has"):
        encode(Shown(HERON, energy_meV=seen))
