"""Remedies on the page *Periods*: what matched ends and nearby stacks would do, each a click from the bench."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from transport import MatchedEnds, NearestStacks, Remedy, Scenario
from webapp.results import drawn_profile

View = dict[str, Any]

_DRAWN_CORNERS = 600


@dataclass(frozen=True, slots=True)
class Proposal:
    """What is offered: the scenario, what changes in words, and the figures beside it."""

    scenario: Scenario
    words: str
    facts: tuple[str, ...]


def of_ends(found: MatchedEnds) -> tuple[Proposal, ...]:
    """Matched ends as proposals."""
    return tuple(
        Proposal(p.scenario, p.name, tuple(
            f"window {place + 1}: {before:.3g} \N{RIGHTWARDS ARROW} {after:.3g}"
            for place, before, after in zip(found.windows, found.before, p.limits, strict=True)))
        for p in found.proposals
    )


def of_stacks(found: NearestStacks) -> tuple[Proposal, ...]:
    """Nearest stacks as proposals; where none meets the target, the nearest miss."""
    return tuple(Proposal(r.scenario, r.words, _facts(r)) for r in found.proposals or (found.miss,) if r is not None)


def _facts(remedy: Remedy) -> tuple[str, ...]:
    count, margin = remedy.check.periods, remedy.check.margin_dB
    facts = [f"{count} period{'s' if count > 1 else ''}", f"{remedy.length:.4g} nm"]
    if margin is not None:
        facts.append(f"margin {margin:+.1f} dB".replace("-", "\N{MINUS SIGN}"))
    return tuple(facts)


def remedies_view(state: str, sentence: str, proposals: tuple[Proposal, ...], share: float) -> View:
    """The list as the page shows it; `state`: none, working, known or fault."""
    return {"state": state, "sentence": sentence, "share": share, "proposals": [
        {"words": p.words[:1].upper() + p.words[1:], "facts": list(p.facts), "picture": _picture(p.scenario)}
        for p in proposals
    ]}


def _picture(scenario: Scenario) -> View:
    """The band edge as the points of a line, each from 0 to 1; the box is drawn by the page."""
    profile = drawn_profile(scenario.stack)
    position, potential = profile.position[:_DRAWN_CORNERS], profile.potential[:_DRAWN_CORNERS]
    low, high = float(potential.min()), float(potential.max())
    x = (position - position[0]) / (position[-1] - position[0])
    y = (potential - low) / ((high - low) or 1.0)
    return {"x": x.round(4).tolist(), "y": y.round(4).tolist()}
