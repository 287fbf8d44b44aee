"""A link that holds a whole scenario and how it is looked at: text that fits an address, and the way back.

Version, a dot, and JSON compressed by zlib in the URL's own base64. A link may come from anybody: what it holds is
bounded in length, in size, in nesting, and checked like a file.
"""

from __future__ import annotations

import base64
import binascii
import math
import re
import zlib
from typing import Literal

import msgspec

from transport import Document, ScenarioError, document_from_data, document_to_data, scenario_from_document
from transport.refusal import refuse_unless

VERSION = 1
"""The version of links that is written, and the newest that is read."""
LONGEST = 2_000
"""Characters of a link that every browser, mail and chat program keeps whole."""
TOO_LONG = f"needs more than {LONGEST:,} characters for this scenario; save the file and send that instead"
"""The sentence where a scenario does not fit."""

_KEY = "link"
_BROKEN = "is damaged or not complete; copy it once more, or ask for the file"
_LARGEST_RATIO = 60  # text of a scenario comes down to a third or a tenth
_SMALL = 30_000  # bytes that any link may hold: a note of one letter ten thousand times is no bomb
_DEEPEST = 12
_MOST_AXES = 12
_SHAPE = re.compile(r"([0-9]{1,4})\.([A-Za-z0-9_-]+)")
_STRINGS = re.compile(rb'"(?:[^"\\]|\\.)*"', re.DOTALL)
_NAME = re.compile(r"[a-z][a-z0-9-]{0,29}")


class AxisRange(msgspec.Struct, frozen=True, forbid_unknown_fields=True, array_like=True):
    """What an axis shows, in the units of its figure; `energy` is the axis that the figures share, in meV."""

    name: str
    low: float
    high: float


class LinkState(msgspec.Struct, frozen=True, forbid_unknown_fields=True, kw_only=True):
    """What a link holds: the scenario as a document, the page, how transmission is drawn, and ranges of axes."""

    version: int = VERSION
    scenario: Document
    page: str = "bench"
    scale: Literal["log", "linear"] = "log"
    axes: tuple[AxisRange, ...] = ()


class _Sent(msgspec.Struct, forbid_unknown_fields=True, omit_defaults=True):
    scenario: dict[str, object]
    page: str = "bench"
    scale: Literal["log", "linear"] = "log"
    axes: tuple[AxisRange, ...] = ()


def encode(bench: LinkState) -> str:
    """The state as text of letters, digits, `-`, `_` and one `.`; decode gives an equal one back.

    Raises ScenarioError with TOO_LONG where the scenario does not fit, and for a state that decode would refuse.
    """
    refuse_unless(bench.version == VERSION, _KEY, f"is of version {bench.version}; this program writes {VERSION} only")
    _check(bench)
    sent = _Sent(document_to_data(bench.scenario), bench.page, bench.scale, bench.axes)
    content = msgspec.json.encode(sent)
    packed = zlib.compress(content, 9)
    text = f"{VERSION}.{base64.urlsafe_b64encode(packed).decode().rstrip('=')}"
    refuse_unless(len(text) <= LONGEST and len(content) <= _most(packed), _KEY, TOO_LONG)
    return text


def decode(text: str) -> LinkState:
    """The state that a link's text holds. Raises ScenarioError, whatever the text."""
    refuse_unless(len(text) <= LONGEST, _KEY, f"is longer than {LONGEST:,} characters and none of ours; open a file")
    shape = _SHAPE.fullmatch(text)
    if shape is None:
        raise ScenarioError(_KEY, _BROKEN)
    refuse_unless(int(shape[1]) == VERSION, _KEY,
                  f"is of version {int(shape[1])}, but this program reads version {VERSION}; ask for the file")
    content = _unpacked(_bytes(shape[2]))
    _check_depth(content)
    try:
        sent = msgspec.json.decode(content, type=_Sent)
    except (msgspec.DecodeError, UnicodeError):
        raise ScenarioError(_KEY, _BROKEN) from None
    state = LinkState(scenario=document_from_data(sent.scenario), page=sent.page, scale=sent.scale, axes=sent.axes)
    _check(state)
    return state


def _bytes(text: str) -> bytes:
    try:
        content = base64.urlsafe_b64decode(text + "=" * (-len(text) % 4))
    except binascii.Error:
        raise ScenarioError(_KEY, _BROKEN) from None
    # The last character may hold bits that count for nothing; only one spelling is ours.
    refuse_unless(base64.urlsafe_b64encode(content).decode().rstrip("=") == text, _KEY, _BROKEN)
    return content


def _most(packed: bytes) -> int:
    return max(_SMALL, _LARGEST_RATIO * len(packed))


def _unpacked(packed: bytes) -> bytes:
    """The content, unpacked no further than it may be."""
    unpacker = zlib.decompressobj()
    try:
        content = unpacker.decompress(packed, _most(packed) + 1)
    except zlib.error:
        raise ScenarioError(_KEY, _BROKEN) from None
    refuse_unless(len(content) <= _most(packed), _KEY, "unpacks to far more than a scenario; it is none of ours")
    refuse_unless(unpacker.eof and not unpacker.unused_data, _KEY, _BROKEN)
    return content


def _check_depth(content: bytes) -> None:
    """Refuse JSON that is nested more deeply than any scenario, before it is read."""
    depth = deepest = 0
    for mark in re.findall(rb"[\[\]{}]", _STRINGS.sub(b"", content)):
        depth += 1 if mark in b"[{" else -1
        deepest = max(deepest, depth)
    refuse_unless(deepest <= _DEEPEST, _KEY, "is nested more deeply than a scenario; it is none of ours")


def _check(state: LinkState) -> None:
    """Raise ScenarioError unless everything of a state can be used."""
    refuse_unless(_NAME.fullmatch(state.page) is not None, _KEY, "names no page of this program; open a file instead")
    refuse_unless(len(state.axes) <= _MOST_AXES, _KEY, f"sets more than {_MOST_AXES} axes; it is none of ours")
    names = [axis.name for axis in state.axes]
    refuse_unless(len(set(names)) == len(names), _KEY, "sets an axis twice; it is none of ours")
    for axis in state.axes:
        refuse_unless(_NAME.fullmatch(axis.name) is not None, _KEY, "names no axis of this program")
        refuse_unless(math.isfinite(axis.low) and math.isfinite(axis.high) and axis.low < axis.high
                      and max(abs(axis.low), abs(axis.high)) <= 1e9, _KEY, f"gives the axis {axis.name} no range")
    scenario_from_document(state.scenario)
