"""The fewest periods that meet a target, for many similar stacks: a bound for every count first, exact checks last.

T at a few energies of a window bounds its minimum from above and its maximum from below, so no count that the bound
rules out can meet the target. Only counts that pass it are worked out, in ascending order, until one meets.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from transport.chain import Chain
from transport.oscillation import Floats
from transport.periods import PeriodCheck, Question, checked, histories
from transport.structure import Stack, Target, Window

_SAMPLES = 24
_MEAN_SLACK = 3.0
"""Room (dB) left to a mean window, whose few samples only estimate it."""


@dataclass(frozen=True, slots=True)
class Asked:
    """A question for the engine: a stack at any number of periods, its target, the beam's resolution (eV FWHM)."""

    stack: Stack
    target: Target | None
    resolution: float


def margin_bounds(question: Question, counts: NDArray[np.int64]) -> Floats:
    """The most (dB) that the margin of each count can be; for a mean window with some room left to the estimate.

    With a beam resolution nothing is ruled out: inf.
    """
    bound = np.full(counts.size, np.inf)
    if question.target is None or question.resolution:
        return bound
    windows = question.target.windows
    share = (1 - np.cos(np.linspace(0, np.pi, _SAMPLES))) / 2
    energy = np.concatenate([w.bottom + (w.top - w.bottom) * share for w in windows])
    chain = Chain(question.stack, energy)
    log10 = chain.log10_transmission(chain.denominator(chain.powers(counts[:, None])))
    for place, window in enumerate(windows):
        values = log10[:, place * _SAMPLES:(place + 1) * _SAMPLES]
        bound = np.minimum(bound, _window_bound(window, values, share))
    return bound


def _window_bound(window: Window, log10: Floats, share: Floats) -> Floats:
    """The bound of one window from log10 T, (counts, samples)."""
    asked = math.log10(window.transmission)
    if window.measure == "mean":
        with np.errstate(divide="ignore"):
            mean = np.log10(np.trapezoid(np.minimum(10.0**log10, 1.0), share, axis=1))
        return np.asarray(10 * (mean - asked if window.kind == "pass" else asked - mean) + _MEAN_SLACK)
    if window.kind == "pass":
        return np.asarray(10 * (log10.min(axis=1) - asked))
    return np.asarray(10 * (asked - log10.max(axis=1)))


def fewest_periods(question: Question, least: int = 1) -> PeriodCheck | None:
    """The check of the fewest periods (`least` or more) that meet the target, exact; None where no count does."""
    counts = np.arange(least, question.target.most_periods + 1) if question.target else np.zeros(0, np.int64)
    hopeful = counts[margin_bounds(question, counts) >= 0]
    size = 2
    while hopeful.size:
        for check in checked(histories(question, hopeful[:size]), hopeful[:size]):
            if check.meets:
                return check
        hopeful, size = hopeful[size:], 2 * size
    return None


def best_check(question: Question, least: int, beyond: float) -> PeriodCheck | None:
    """The check with the largest margin of all counts, if it is larger than `beyond` (dB)."""
    counts = np.arange(least, question.target.most_periods + 1) if question.target else np.zeros(0, np.int64)
    bounds = margin_bounds(question, counts)
    order, best, size = np.argsort(-bounds, kind="stable"), None, 4
    while order.size and bounds[order[0]] > beyond:
        some = np.sort(counts[order[:size]])
        for check in checked(histories(question, some), some):
            if check.margin_dB is not None and check.margin_dB > beyond:
                best, beyond = check, check.margin_dB
        order = order[size:]
    return best
