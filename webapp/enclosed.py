"""The scenario within a report: put in so that no text can break out of it, and read again with bounds."""

from __future__ import annotations

import base64
import binascii
import re

from transport import Scenario, ScenarioError, parse_scenario
from transport.refusal import refuse_unless
from transport.scenario import format_scenario

_MOST_BYTES = 8_000_000
_BLOCK = re.compile(r'<script type="text/plain" id="scenario-toml">([A-Za-z0-9+/=\s]*)</script>')


def enclosed(scenario: Scenario) -> str:
    """The scenario as a block of HTML that shows nothing."""
    packed = base64.b64encode(format_scenario(scenario).encode()).decode()
    return f'<script type="text/plain" id="scenario-toml">{packed}</script>'


def scenario_from_report(text: str) -> Scenario:
    """The scenario within a report. Raises ScenarioError."""
    refuse_unless(len(text) <= _MOST_BYTES, "report",
                  f"is larger than {_MOST_BYTES:,} bytes; it is none of this program")
    found = _BLOCK.search(text)
    refuse_unless(found is not None, "report", "holds no scenario; open one that this program has written")
    assert found is not None
    try:
        plain = base64.b64decode(found[1], validate=True).decode("utf-8")
    except (binascii.Error, UnicodeDecodeError):
        raise ScenarioError("report", "holds a scenario that was altered; ask for it again") from None
    return parse_scenario(plain)
