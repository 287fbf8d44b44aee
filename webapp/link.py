"""A bench in an address: the scenario, the page and the axes, compressed; read back with bounds on everything."""

from __future__ import annotations

import base64
import binascii
import zlib
from typing import Literal

import msgspec

from transport import Document, ScenarioError, document_from_data, document_to_data, scenario_from_document
from transport.parameters import PARAMETERS
from transport.refusal import refuse_unless

LONGEST = 2_000
"""Characters a link may have: longer ones are broken by mail programs and chats."""
_VERSION = "1"
_MOST_BYTES = 1_000_000
_FARTHEST = PARAMETERS["energy_eV"].high * 1e3
_NARROWEST = 1e-6
"""meV; what is narrower no figure can tell apart, and the engine would be asked for energies that are one double."""

Page = Literal["periods", "peaks", "compare", "handoff"]


class Shown(msgspec.Struct, frozen=True, forbid_unknown_fields=True):
    """What a link reopens; `energy_meV`: the energies seen, where they are not all."""

    document: Document
    page: Page = "periods"
    scale: Literal["log", "linear"] = "log"
    energy_meV: tuple[float, float] | None = None
    density: bool = False


class _Carried(msgspec.Struct, frozen=True, forbid_unknown_fields=True, omit_defaults=True):
    """The same as it travels: the document as plain data, judged by the engine alone."""

    s: dict[str, object]
    page: Page = "periods"
    scale: Literal["log", "linear"] = "log"
    energy: tuple[float, float] | None = None
    density: bool = False


def encode(shown: Shown) -> str:
    """The text of a link. Raises ScenarioError where it would be longer than LONGEST, or `decode` would refuse it."""
    _require_range(shown.energy_meV)
    carried = _Carried(document_to_data(shown.document), shown.page, shown.scale, shown.energy_meV, shown.density)
    packed = zlib.compress(msgspec.json.encode(carried), level=9)
    text = _VERSION + base64.urlsafe_b64encode(packed).decode().rstrip("=")
    refuse_unless(len(text) <= LONGEST, "link",
                  f"would have {len(text):,} characters, and more than {LONGEST:,} break on their way; "
                  "send the file instead")
    return text


def decode(text: str) -> Shown:
    """What a link holds. Raises ScenarioError for anything that `encode` did not make."""
    refuse_unless(len(text) <= LONGEST, "link", f"has more than {LONGEST:,} characters; ask for the file instead")
    refuse_unless(text[:1] == _VERSION, "link", "is of another version of this program, or cut off; ask for the file")
    try:
        packed = base64.b64decode((text[1:] + "=" * (-(len(text) - 1) % 4)).encode("ascii"), b"-_", validate=True)
        unpacking = zlib.decompressobj()
        plain = unpacking.decompress(packed, _MOST_BYTES)
        refuse_unless(unpacking.eof and not unpacking.unused_data, "link",
                      f"is cut off, or holds more than {_MOST_BYTES:,} bytes; ask for the file instead")
        carried = msgspec.json.decode(plain, type=_Carried)
    except (binascii.Error, zlib.error, msgspec.MsgspecError, RecursionError, UnicodeError):
        raise ScenarioError("link", "was altered or cut off on its way; ask for it again, or for the file") from None
    document = document_from_data(carried.s)
    scenario_from_document(document)
    _require_range(carried.energy)
    return Shown(document, carried.page, carried.scale, carried.energy, carried.density)


def _require_range(energy: tuple[float, float] | None) -> None:
    """Refuse energies (meV) that the engine could never finish with."""
    low, high = energy or (0.0, 1.0)
    refuse_unless(low >= -_FARTHEST and high <= _FARTHEST and high - low >= _NARROWEST, "link",
                  "shows an energy range that is reversed, or that no figure has; ask for it again")
