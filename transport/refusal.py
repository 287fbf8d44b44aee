"""How a wrong scenario is refused: one sentence that names the key, the value and the remedy."""

from __future__ import annotations

import difflib
from collections.abc import Iterable

from transport.parameters import PARAMETERS

_LONGEST_SHOWN = 40
_LONGEST_KEY = 200


class ScenarioError(ValueError):
    """What a user wrote cannot be used. `str()` is one line, `key: message`; `key` is as `stack.cell[0].x`."""

    def __init__(self, key: str, message: str) -> None:
        self.key = _one_line(key)[:_LONGEST_KEY]
        self.message = _one_line(message)
        super().__init__(self.key, self.message)

    def __str__(self) -> str:
        return f"{self.key}: {self.message}"


def refuse_unless(condition: bool, key: str, message: str) -> None:
    """Raise ScenarioError unless `condition` holds."""
    if not condition:
        raise ScenarioError(key, message)


def check_limits(key: str, name: str, value: float) -> None:
    """Raise ScenarioError unless the parameter called `name` admits `value`."""
    parameter = PARAMETERS[name]
    if not parameter.admits(value):
        raise ScenarioError(key, f"{parameter.requirement}, but is {shown(value)}")


def shown(value: object) -> str:
    """A value as the file would write it, shortened so that the sentence stays a sentence."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, int) and abs(value) >= 10**_LONGEST_SHOWN:
        # Not str(): Python refuses to write integers of more than 4,300 digits.
        return "a whole number of more than 40 digits"
    text = f'"{_one_line(value)}"' if isinstance(value, str) else str(value)
    return text if len(text) <= _LONGEST_SHOWN else text[:_LONGEST_SHOWN] + "..."


def _one_line(text: str) -> str:
    """Line breaks, control characters and lone surrogates, which a key may hold, written as escapes."""
    return "".join(c if c.isprintable() else c.encode("unicode_escape").decode() for c in text)


def nearest(word: str, known: Iterable[str]) -> str:
    """A remedy for an unknown word: the nearest spelling, or else every known one."""
    known = list(known)
    close = difflib.get_close_matches(word[:100], known, n=1, cutoff=0.6)
    return f"did you mean {close[0]}?" if close else f"known here: {', '.join(known)}"
