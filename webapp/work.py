"""What is worked out off the event loop for one session: the pictures of a stack, and its verdict."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from transport import Profile, Scenario, Verdict, period_verdict, spectrum
from webapp.latest import Stop
from webapp.results import (
    Emergence,
    Floats,
    Lattice,
    Passage,
    Points,
    Question,
    Span,
    drawn_profile,
    emergence,
    lattice,
    most_periods,
    passage,
    points,
    question,
)


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


def verdict(asked: Question, stop: Stop, progress: Callable[[float], None]) -> Verdict | None:
    """Work out the verdict; None where no window is asked. Raises Stopped, and ValueError where the model ends."""
    if asked.target is None or not asked.target.windows:
        return None

    def checked(share: float) -> None:
        stop.check()
        progress(share)

    return period_verdict(asked, progress=checked)
