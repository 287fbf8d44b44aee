"""Writers of reports, which packages beside the engine offer: found by name in what is installed, never imported here.

A package declares one in its entry points (group colonnade.reports): a function from a scenario to a text.
"""

from __future__ import annotations

from collections.abc import Callable
from importlib import metadata
from typing import cast

from transport.scenario import Scenario

GROUP = "colonnade.reports"
"""The group of entry points."""


def report_writer(name: str) -> Callable[[Scenario], str]:
    """The writer called `name`. Raises ValueError where none is installed, or it lacks what it needs."""
    remedy = "install the project with its page (python3 -m webapp.start)"
    found = tuple(metadata.entry_points(group=GROUP, name=name))
    if not found:
        raise ValueError(f"report: nothing that is installed here writes reports as {name}; {remedy}")
    try:
        return cast(Callable[[Scenario], str], found[0].load())
    except (ImportError, AttributeError) as error:
        raise ValueError(f"report: what writes reports as {name} cannot be started ({error}); {remedy}") from None
