"""What is worked out off the event loop for one session: the pictures of a stack, and its verdict."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

import numpy as np

from transport import (
    Profile,
    Scenario,
    Verdict,
    VerdictRange,
    margin_range,
    matched_ends,
    nearest_stacks,
    period_verdict,
    spectrum,
    verdict_range,
)
from transport.fewest import Asked
from webapp.latest import Stop, checked, remembered
from webapp.pages.remedies import Proposal, of_ends, of_stacks
from webapp.results import (
    Band,
    Emergence,
    Floats,
    Lattice,
    Passage,
    Points,
    Span,
    drawn_profile,
    emergence,
    lattice,
    most_periods,
    passage,
    points,
    question,
)

MOST_RANGED = 240
"""The largest count up to which the range of the margins is worked out."""
_RANGED = 60


@dataclass(frozen=True, slots=True)
class Wanted:
    """A scenario to be pictured: over `span` as a whole, its transmission over `view`; `version` names its stack."""

    scenario: Scenario
    span: Span
    view: Span
    version: int


@dataclass(frozen=True, slots=True)
class Pictures:
    """Everything the figures draw but the verdict."""

    profile: Profile
    lattice: Lattice
    passage: Passage
    points: Points
    at_points: Floats
    emergence: Emergence


def pictures(wanted: Wanted, stop: Stop) -> Pictures:
    """Work out the pictures. Raises ValueError where the one-band model ends within the span."""
    scenario, asked = wanted.scenario, question(wanted.scenario)
    stack = scenario.stack
    infinite = lattice(asked.stack, wanted.span)
    passed = passage(stack, wanted.view, scenario.resolution)
    own = points(infinite, stack.periods)
    return Pictures(
        drawn_profile(stack), infinite, passed, own, spectrum(stack, own.energy).transmission,
        emergence(asked.stack, most_periods(asked.target), wanted.span),
    )


@remembered
def verdict(asked: Asked, stop: Stop, progress: Callable[[float], None]) -> Verdict | None:
    """Work out the verdict; None where no window is asked. Raises Stopped, and ValueError where the model ends."""
    if asked.target is None or not asked.target.windows:
        return None
    return period_verdict(asked, progress=checked(stop, progress))


@remembered
def range_of(scenario: Scenario, stop: Stop) -> VerdictRange | None:
    """The range of a scenario's verdict; None where no window is asked. Raises Stopped."""
    if scenario.target is None or not scenario.target.windows:
        return None
    return verdict_range(scenario, checked(stop))


@remembered
def band_of(asked: tuple[Scenario, VerdictRange], stop: Stop) -> Band | None:
    """The range of the margins; None for more counts than are worth the wait. Raises Stopped."""
    scenario, found = asked
    most = most_periods(scenario.target)
    if most > MOST_RANGED:
        return None
    counts = np.unique(np.linspace(1, most, min(most, _RANGED)).round().astype(np.int64))
    return Band(counts, *margin_range(scenario, found, counts, checked(stop)))


@dataclass(frozen=True, slots=True)
class Search:
    """A remedy to look for; ends in whole monolayers or not."""

    scenario: Scenario
    what: Literal["ends", "nearest"]
    whole: bool


def proposals(search: Search, stop: Stop, progress: Callable[[float], None]) -> tuple[str, tuple[Proposal, ...]]:
    """What is found, in a sentence and as proposals. Raises Stopped, and ScenarioError where there is nothing to do."""
    told = checked(stop, progress)
    if search.what == "ends":
        ends = matched_ends(search.scenario, search.whole, progress=told)
        return ends.sentence, of_ends(ends)
    stacks = nearest_stacks(search.scenario, progress=told)
    return stacks.sentence, of_stacks(stacks)
