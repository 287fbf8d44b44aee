"""What a report is about: everything the engine finds for one scenario, worked out once for all of its sections."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import TypeVar

from transport import (
    PeakComparison,
    Profile,
    Resonances,
    Scenario,
    Verdict,
    VerdictRange,
    compare_peaks,
    period_verdict,
    resonances,
    verdict_range,
)
from transport.periods import no_progress
from webapp.results import (
    Lattice,
    Passage,
    Points,
    Span,
    drawn_profile,
    lattice,
    natural_span,
    passage,
    points,
    question,
)

Result = TypeVar("Result")


@dataclass(frozen=True)
class Findings:
    """Results for a scenario over `span` (eV). None where it asks for nothing of the kind; `range`, `ledger` and
    `peaks` are a sentence where the engine refuses them, which leaves the rest of the report as it is."""

    scenario: Scenario
    span: Span
    profile: Profile
    passage: Passage
    lattice: Lattice
    points: Points
    verdict: Verdict | None
    range: VerdictRange | str | None
    ledger: Resonances | str
    peaks: PeakComparison | str | None


def findings(scenario: Scenario, progress: Callable[[float], None] = no_progress) -> Findings:
    """Work everything out. Raises ValueError where the one-band model ends within the span."""
    stack, asked = scenario.stack, question(scenario)
    span = natural_span(asked)
    infinite = lattice(asked.stack, span)
    decides = bool(scenario.target and scenario.target.windows)
    verdict = period_verdict(scenario, progress=progress) if decides else None
    return Findings(
        scenario, span, drawn_profile(stack), passage(stack, span, scenario.resolution), infinite,
        points(infinite, stack.periods), verdict,
        _or_sentence(lambda: verdict_range(scenario, progress)) if decides else None,
        _or_sentence(lambda: resonances(stack, (max(span[0], _lowest(scenario)), span[1]))),
        _or_sentence(lambda: compare_peaks(scenario)) if scenario.document.measured else None,
    )


def _lowest(scenario: Scenario) -> float:
    """The lower of both leads' edges: below it nothing moves."""
    return min(0.0, scenario.stack.right.band_edge)


def _or_sentence(work: Callable[[], Result]) -> Result | str:
    try:
        return work()
    except ValueError as error:
        return str(error)
