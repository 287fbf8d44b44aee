"""What the engine finds for the page *Peaks*: ledger and measured peaks, one resonance, local density."""

from __future__ import annotations

import functools
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from transport import (
    Effect,
    PeakComparison,
    PeakFit,
    Resonances,
    Scenario,
    Stack,
    compare_peaks,
    fit_peaks,
    local_density_of_states,
    measured_peaks,
    pole_wave,
    resonances,
    sensitivities,
)
from transport.peaks import peak_range
from webapp.latest import Stop, checked
from webapp.results import MOST_DRAWN_PERIODS, Floats, Span

MOST_LISTED_PERIODS = 500
"""Periods up to which the resonances are listed without being asked for."""
_POINTS = 4_000
_PLACES, _ROWS = 480, 320


@dataclass(frozen=True, slots=True)
class Listing:
    """A ledger to be worked out: of a scenario, over `span` (eV) and wherever peaks were measured."""

    scenario: Scenario
    span: Span


@dataclass(frozen=True, slots=True)
class Ledger:
    """Every resonance of a stack, and the measured peaks beside them (None: none was measured)."""

    found: Resonances
    compared: PeakComparison | None


def ledger(listing: Listing, stop: Stop) -> Ledger:
    """Work out a ledger. Raises ValueError for too many periods, and where the one-band model ends."""
    stack, record = listing.scenario.stack, listing.scenario.document.measured
    if stack.periods > MOST_LISTED_PERIODS:
        raise ValueError(f"The ledger lists the resonances of up to {MOST_LISTED_PERIODS} periods, and this stack has "
                         f"{stack.periods:,}: the command line lists them for a range of energies.")
    low, high = listing.span
    measured = measured_peaks(record) if record is not None and record.peaks else None
    if measured is not None:
        first, last = peak_range(stack, measured)
        low, high = min(low, first), max(high, last)
    found = _resonances(stack, (low, high))
    return Ledger(found, compare_peaks(listing.scenario, measured, among=found) if measured is not None else None)


@functools.lru_cache(maxsize=8)
def _resonances(stack: Stack, span: Span) -> Resonances:
    return resonances(stack, span)


@dataclass(frozen=True, slots=True)
class Trace:
    """One resonance: |psi|^2 (1/nm) over position (nm), and what moves it, the largest effect first."""

    position: Floats
    density: Floats
    effects: tuple[Effect, ...]


@dataclass(frozen=True, slots=True)
class Traced:
    """A resonance to be traced, by its place in a ledger."""

    scenario: Scenario
    found: Resonances
    place: int


def trace(asked: Traced, stop: Stop) -> Trace:
    """Work out a resonance's wave and what moves it."""
    stack = asked.scenario.stack.lossless()
    energy, width = float(asked.found.energy[asked.place]), float(asked.found.width[asked.place])
    seen = pole_wave(stack, [complex(energy, -width / 2)], points_per_nm=min(5.0, _POINTS / stack.length))
    stop.check()
    return Trace(seen.position, seen.density[0], sensitivities(asked.scenario, energy, width))


@dataclass(frozen=True, slots=True)
class Density:
    """Local density of states as a picture: log10 of states/(eV nm), `image` (rows of energy, places)."""

    image: Floats
    length: float
    span: Span


def density(asked: tuple[Stack, Span], stop: Stop) -> Density:
    """Work out the local density of states; a row is the largest value within it, so that no narrow peak is missed."""
    stack, (low, high) = asked
    drawn = min(stack.periods, MOST_DRAWN_PERIODS)
    length = stack.length - (stack.periods - drawn) * stack.period_length
    edges = np.linspace(low, high, _ROWS + 1)
    peaks = _resonances(stack.lossless(), asked[1]).energy if stack.periods <= MOST_LISTED_PERIODS else np.zeros(0)
    energy = np.unique(np.concatenate([(edges[1:] + edges[:-1]) / 2, peaks[(peaks > low) & (peaks < high)]]))
    found = local_density_of_states(stack, energy, np.linspace(0.0, length, _PLACES)).density
    rows = np.maximum.reduceat(found, np.searchsorted(energy, edges[:-1]), axis=0)
    with np.errstate(divide="ignore"):
        return Density(np.log10(rows), length, asked[1])


@dataclass(frozen=True, slots=True)
class Fitting:
    """A fit to be made: of these figures of a scenario to its measured peaks."""

    scenario: Scenario
    figures: tuple[str, ...]


def fit(asked: Fitting, stop: Stop, progress: Callable[[float], None]) -> PeakFit:
    """Fit the figures. Raises Stopped, and ScenarioError where there is nothing to fit."""
    return fit_peaks(asked.scenario, asked.figures, progress=checked(stop, progress))
