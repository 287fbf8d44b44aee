"""A scenario: what its file says, and what that comes to. Reading, writing, saving."""

from __future__ import annotations

import errno
import os
import re
import secrets
import stat
import tomllib
from dataclasses import dataclass, field
from pathlib import Path

import tomli_w

from transport.checks import check_document
from transport.document import Document, document_from_data, document_to_data
from transport.parameters import PARAMETERS
from transport.refusal import ScenarioError, refuse_unless
from transport.resolve import SheetRow, resolve
from transport.structure import Stack, Target

_MOST_BYTES = int(PARAMETERS["file_bytes"].high)
_TOO_BIG = f"is larger than {_MOST_BYTES:,} bytes; a scenario file must stay below that"
# A string that is not closed ends with its line or the text: then no text takes more than linear time.
_STRING_OR_COMMENT = re.compile(
    r'''"""(?:\\.|[^\\])*?(?:"{3,5}|\Z)|'{3}.*?(?:'{3,5}|\Z)|"(?:\\.|[^"\\\n])*"?|'[^'\n]*'?|(#)''', re.DOTALL)
# tomllib needs time that grows with the square of a dotted key's length; no key here has more than three parts.
_LONG_KEY = re.compile(r"(?<![^\s.=\[\]{},])(?:[^\s.=\[\]{},]+[ \t]*\.[ \t]*){32}")


@dataclass(frozen=True)
class Scenario:
    """A scenario; two are equal if their documents are.

    `stack` is resolved (materials at temperature, strain, dephasing; energies eV from the left lead's edge),
    `target` is None where none is asked, `resolution` the beam's full width at half maximum in eV, `warnings`
    sentences for the user, `sheet` the grower's sheet from the left lead's side.
    """

    document: Document
    stack: Stack = field(compare=False)
    target: Target | None = field(compare=False)
    resolution: float = field(compare=False)
    warnings: tuple[str, ...] = field(compare=False)
    sheet: tuple[SheetRow, ...] = field(compare=False)

    @property
    def title(self) -> str:
        """The title, plain text."""
        return self.document.title

    @property
    def note(self) -> str:
        """The note, plain text: never markup."""
        return self.document.note


def scenario_from_document(document: Document) -> Scenario:
    """The scenario a document describes. Raises ScenarioError for anything that cannot be used."""
    check_document(document)
    resolved = resolve(document)
    return Scenario(document, resolved.stack, resolved.target, document.conditions.resolution_meV / 1000,
                    resolved.warnings, resolved.sheet)


def parse_scenario(text: str) -> Scenario:
    """The scenario in TOML `text` (format 1). Raises ScenarioError."""
    refuse_unless(len(text.encode("utf-8", "surrogatepass")) <= _MOST_BYTES, "scenario", _TOO_BIG)
    refuse_unless(text.strip() != "", "scenario", "is empty; begin it with format = 1")
    return scenario_from_document(document_from_data(_toml(text)))


def load_scenario(path: str | os.PathLike[str]) -> Scenario:
    """The scenario in the file `path`. Raises ScenarioError; its key is the path where the file as such is at fault."""
    return parse_scenario(read_text(path))


def format_scenario(scenario: Scenario) -> str:
    """The scenario as TOML; parse_scenario gives an equal one back."""
    return tomli_w.dumps(document_to_data(scenario.document), multiline_strings=True)


def save_scenario(scenario: Scenario, path: str | os.PathLike[str]) -> None:
    """Write the scenario to `path`, whole or not at all; comments in a file that was there go.

    The text goes to a new file in the same folder, which then takes the place (and the mode) of the old one. A
    symbolic link is followed, so that the link stays. Raises ScenarioError with the path as its key.
    """
    save_text(path, format_scenario(scenario))


def save_text(path: str | os.PathLike[str], text: str) -> None:
    """Write any text to `path` in the same way. Raises ScenarioError with the path as its key."""
    try:
        _replace(Path(os.path.realpath(_plain_file(path))), text.encode())
    except OSError as error:
        raise ScenarioError(str(path), f"cannot be saved ({error.strerror}); choose another place") from None


def has_comments(text: str) -> bool:
    """Whether TOML `text` holds comments, which saving would lose."""
    return any(match[1] for match in _STRING_OR_COMMENT.finditer(text))


def read_text(path: str | os.PathLike[str]) -> str:
    """The text of a scenario file, unread beyond the largest size. Raises ScenarioError with the path as its key."""
    try:
        with _plain_file(path).open("rb") as file:
            content = file.read(_MOST_BYTES + 1)
    except OSError as error:
        raise ScenarioError(str(path), f"cannot be read ({error.strerror}); name a scenario file") from None
    refuse_unless(len(content) <= _MOST_BYTES, str(path), _TOO_BIG)
    try:
        return content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise ScenarioError(str(path), f"is not UTF-8 text (byte {error.start + 1:,}); save it as UTF-8") from None


def _plain_file(path: str | os.PathLike[str]) -> Path:
    """The path, which may not exist yet; no folder, and no device or pipe, whose reading would never end."""
    place = Path(path)
    refuse_unless("\0" not in str(place), str(place), "holds a null character; choose another name")
    refuse_unless(place.is_file() or not place.exists(), str(place), "is not a file; choose another name")
    return place


def _toml(text: str) -> dict[str, object]:
    refuse_unless(_LONG_KEY.search(text) is None, "scenario", "holds a dotted key of more than 32 parts; write it out")
    try:
        return tomllib.loads(text)
    except RecursionError:
        raise ScenarioError("scenario", "is nested too deeply; a list of layers holds plain layers") from None
    except tomllib.TOMLDecodeError as error:
        raise ScenarioError("scenario", f"is not valid TOML: {error}; mend it there") from None
    except ValueError:
        # Python's own limit on reading integers, 4,300 digits.
        raise ScenarioError("scenario", "holds a whole number of too many digits; write a smaller one") from None


def _replace(target: Path, content: bytes) -> None:
    new = target.with_name(f".{secrets.token_hex(8)}.saving")
    try:
        with open(os.open(new, os.O_WRONLY | os.O_CREAT | os.O_EXCL, 0o666), "wb") as file:
            file.write(content)
            file.flush()
            os.fsync(file.fileno())
        if target.exists():
            if not os.access(target, os.W_OK):
                raise PermissionError(errno.EACCES, os.strerror(errno.EACCES))
            new.chmod(stat.S_IMODE(target.stat().st_mode))
        os.replace(new, target)
    finally:
        new.unlink(missing_ok=True)
