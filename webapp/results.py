"""What the engine finds for the figures, each part by itself so that an edit recomputes only what it touches.

Frozen results in the engine's units (eV, nm), cached by value; their arrays are read-only because sessions share them.
"""

from __future__ import annotations

import functools
from dataclasses import dataclass, field
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from transport import (
    Bands,
    Bloch,
    Profile,
    Scenario,
    Stack,
    Target,
    band_profile,
    bloch,
    default_range,
    lattice_bands,
    measured_transmission,
    spectrum,
    transmission_map,
)
from transport.fewest import Asked
from transport.parameters import PARAMETERS, default
from transport.structure import Layer

Floats = NDArray[np.float64]
Counts = NDArray[np.int64]
Span = tuple[float, float]

MOST_DRAWN_PERIODS = 400
"""Periods that the profile draws, and for which the finite stack's own points are told apart."""
_TABLED_PERIODS = 60
MOST_ROWS = 240
"""Counts of periods whose transmission the browser holds."""
_PIXELS = 640
"""Energies of the emergence picture."""
_BINS = 800
"""Energies a curve is thinned to: least and largest value of each bin are kept, so that no peak is lost."""
_PER_BAND, _PER_SPAN = 512, 512
_LOWEST_DECADE = -330.0


def question(scenario: Scenario) -> Asked:
    """The question a scenario asks, whatever its present number of periods."""
    return Asked(scenario.stack.with_periods(1), scenario.target, scenario.resolution)


def most_periods(target: Target | None) -> int:
    """The largest count the target allows; the default where nothing is asked."""
    return target.most_periods if target else int(default("most_periods"))


def natural_span(question: Asked) -> Span:
    """The energies worth seeing (eV): the barriers and the target's windows with some room, never cut short."""
    low, high = default_range(question.stack)
    windows = question.target.windows if question.target else ()
    if windows:
        top = max(window.top for window in windows)
        barrier = max((e.band_edge for e in question.stack.elements if isinstance(e, Layer)), default=low)
        low = min(low, *(window.bottom for window in windows))
        # Deltas have no top: there the windows say how far to look.
        high = max(top + 0.15 * (top - low), min(high, low + 2.5 * (top - low)), barrier + 0.1 * (barrier - low))
    limit = PARAMETERS["energy_eV"].high
    return max(low - 0.03 * (high - low), -limit), min(high, limit)


@dataclass(frozen=True)
class Lattice:
    """The infinite lattice over a span: bands with their certificate, and Bloch phase and decay at many energies."""

    bands: Bands
    bloch: Bloch

    @functools.cached_property
    def table(self) -> tuple[Floats, Floats]:
        """Every j/N that a slider passes, and the bands' energies there: looked for at once, which costs the least."""
        share = np.unique(np.concatenate([np.arange(1, n) / n for n in range(2, _TABLED_PERIODS + 1)]))
        return share, self.bands.energies(share * np.pi)


@functools.lru_cache(maxsize=32)
def lattice(stack: Stack, span: Span) -> Lattice:
    """The infinite lattice of the stack's cell over `span`. Raises ValueError where the one-band model ends."""
    bands = lattice_bands(stack, span)
    found = bloch(stack, _crowded(bands, span))
    for values in (found.energy, found.phase, found.decay):
        values.flags.writeable = False
    return Lattice(bands, found)


def _crowded(bands: Bands, span: Span) -> Floats:
    """Energies of a span, crowded towards every band edge, where dispersion and decay are steep."""
    edges = [edge for band in bands.bands for edge in (band.bottom, band.top)]
    turns = (1 - np.cos(np.linspace(0, np.pi, 97))) / 2
    corners = np.unique(np.clip([*span, *edges], *span))
    return np.unique(np.concatenate([low + (high - low) * turns for low, high in pairwise(corners)]))


@dataclass(frozen=True, slots=True)
class Passage:
    """What the stack passes over a view: T and log10 T, and what of it a beam would measure.

    `from_pole`: peaks (eV) drawn from their poles, too narrow for doubles. `absorbed`: what dephasing takes. `lower`
    and `upper`: the envelope where there are too many peaks to resolve, with `note` saying so. None: no such thing.
    """

    periods: int
    energy: Floats
    transmission: Floats
    log10: Floats
    measured: Floats | None = None
    absorbed: Floats | None = None
    lower: Floats | None = None
    upper: Floats | None = None
    note: str = ""
    from_pole: Floats = field(default_factory=lambda: np.zeros(0))


def passage(stack: Stack, view: Span, resolution: float) -> Passage:
    """The stack's transmission at energies the engine chooses, thinned to what a screen can show."""
    found = spectrum(stack, between=view)
    log10 = np.maximum(found.log10_transmission, _LOWEST_DECADE)
    kept = _thinned(found.energy, log10)
    energy = found.energy[kept]
    measured = measured_transmission(stack, energy, resolution) if resolution else None
    envelope = found.envelope
    return Passage(
        stack.periods, energy, found.transmission[kept], log10[kept], measured,
        found.absorption[kept] if stack.dephasing else None,
        envelope.lower[kept] if envelope else None, envelope.upper[kept] if envelope else None, found.note,
        found.narrow.energy if found.narrow else np.zeros(0),
    )


def _thinned(energy: Floats, values: Floats) -> NDArray[np.intp]:
    """Positions of the first, least, largest and last value in each of many bins of energy."""
    if energy.size <= 4 * _BINS:
        return np.arange(energy.size)
    bins = np.minimum(((energy - energy[0]) * (_BINS / (energy[-1] - energy[0]))).astype(int), _BINS - 1)
    starts = np.flatnonzero(np.diff(bins, prepend=-1))
    ends = np.append(starts[1:], energy.size) - 1
    order = np.lexsort((values, bins))
    return np.unique(np.concatenate([starts, ends, order[starts], order[ends]]))


@dataclass(frozen=True, slots=True)
class Points:
    """The finite stack's own points on the infinite dispersion: K d = j pi/N in every band of a span."""

    phase: Floats
    energy: Floats


def points(infinite: Lattice, periods: int) -> Points:
    """Bloch phases j pi/N, j = 1 to N - 1, and their energies (eV), band after band; none for very many periods."""
    bands = infinite.bands
    if periods > MOST_DRAWN_PERIODS or periods < 2 or not bands.bands:
        return Points(np.zeros(0), np.zeros(0))
    share = np.arange(1, periods) / periods
    energy = _tabled(infinite, share) if periods <= _TABLED_PERIODS else bands.energies(share * np.pi)
    return Points(np.tile(share * np.pi, len(bands.bands)), energy.ravel())


def _tabled(infinite: Lattice, share: Floats) -> Floats:
    """Energies of the bands at phases of the table: equal fractions are equal floats."""
    tabled, energy = infinite.table
    return np.asarray(energy[:, np.searchsorted(tabled, share)])


def drawn_profile(stack: Stack) -> Profile:
    """The band edge along the stack, at most MOST_DRAWN_PERIODS of its periods."""
    return band_profile(stack.with_periods(min(stack.periods, MOST_DRAWN_PERIODS)))


@dataclass(frozen=True, slots=True)
class Band:
    """The range of the margins, count by count (dB; NaN where there is none)."""

    counts: Counts
    low: Floats
    high: Floats


@dataclass(frozen=True, slots=True)
class Emergence:
    """log10 T over (count of periods, energy): `rows` (counts, energies) and `image` (pixels of energy, counts).

    The rows lie at energies crowded into the bands, so that each is a curve worth drawing; a pixel of the image is the
    largest value within it, so that no narrow band is missed.
    """

    counts: NDArray[np.int64]
    energy: Floats
    rows: NDArray[np.float32]
    image: NDArray[np.float32]
    span: Span


@functools.lru_cache(maxsize=6)
def emergence(stack: Stack, most: int, span: Span) -> Emergence:
    """The transmission of every count up to `most` (of MOST_ROWS of them, evenly spread, where there are more)."""
    counts = np.unique(np.linspace(1, most, min(most, MOST_ROWS)).round().astype(np.int64))
    pixels = np.linspace(*span, 2 * _PIXELS + 1)
    bands = lattice(stack, span).bands
    inside = [_within_band(band.bottom, band.top, span) for band in bands.bands]
    energy = np.unique(np.concatenate([pixels[1::2], *inside]))
    rows = np.maximum(transmission_map(stack, energy, counts), _LOWEST_DECADE).astype(np.float32)
    starts = np.searchsorted(energy, pixels[:-1:2])
    image = np.maximum.reduceat(rows, starts, axis=1).T.copy()
    for values in (energy, rows, image):
        values.flags.writeable = False
    return Emergence(counts, energy, rows, image, span)


def _within_band(bottom: float, top: float, span: Span) -> Floats:
    """Energies of a band, even in the phase of a band whose dispersion is a cosine, within the span."""
    energy = bottom + (top - bottom) * (1 - np.cos(np.linspace(0, np.pi, _PER_BAND))) / 2
    return np.asarray(energy[(energy >= span[0]) & (energy <= span[1])])
