"""The value of each window of a target, for many numbers of periods at once: minimum, maximum or mean of T.

Extrema are refined between resonances and means see every peak, because both start from samples that no resonance
hides between (`sampling.resolve`). Values are log10, so that deep rejection does not underflow.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from transport.chain import Chain
from transport.measuring import measured_curves
from transport.numerics import RowFunction, Rows, row_integrals, row_minima
from transport.oscillation import Floats
from transport.sampling import PHASE_STEP, Samples, resolve
from transport.structure import Stack, Window

_BATCH = 4_000
"""Periods handled together: bounds the memory, at some 50 samples for each."""


@dataclass(frozen=True, slots=True)
class Values:
    """log10 of a window's measure for each count (-inf: nothing passes), and where an extremum lies (eV; NaN: mean)."""

    log10: Floats
    energy: Floats


def window_values(
    stack: Stack, window: Window, counts: NDArray[np.int64], resolution: float, progress: Callable[[float], None]
) -> Values:
    """The window's minimum, maximum or mean of T (or of what a beam of `resolution`, eV FWHM, would measure)."""
    if window.top <= threshold(stack) and not resolution:
        nothing = np.full(counts.size, -np.inf)
        return Values(nothing, np.full(counts.size, np.nan))
    pieces = []
    for batch in _batches(counts):
        pieces.append(_batch_values(stack, window, batch, resolution))
        progress(float(batch[-1] / counts[-1]) ** 2)
    return Values(np.concatenate([p.log10 for p in pieces]), np.concatenate([p.energy for p in pieces]))


def threshold(stack: Stack) -> float:
    """The energy (eV) above which both leads are open."""
    return max(stack.left.band_edge, stack.right.band_edge)


def _batches(counts: NDArray[np.int64]) -> Iterator[NDArray[np.int64]]:
    group = np.cumsum(counts) // _BATCH
    for number in np.unique(group):
        yield counts[group == number]


def _batch_values(stack: Stack, window: Window, counts: NDArray[np.int64], resolution: float) -> Values:
    if resolution:
        return _measured_values(stack, window, counts, resolution)
    begin = max(window.bottom, threshold(stack))
    low, high = np.full(counts.size, begin), np.full(counts.size, window.top)
    samples = resolve(stack.lossless(), counts, low, high, start=17 if window.measure == "mean" else 65)

    def log10_transmission(row: Rows, energy: Floats) -> Floats:
        chain = Chain(stack, energy)
        log = chain.log10_transmission(chain.denominator(chain.powers(counts[row])))
        return np.asarray(np.minimum(log, 0.0))

    value = log10_transmission(samples.row, samples.energy)
    if window.measure == "mean":
        share = (window.top - begin) / (window.top - window.bottom)
        return Values(_log_means(log10_transmission, samples, value) + math.log10(share), np.full(counts.size, np.nan))
    if window.kind == "pass":
        if window.bottom < begin:
            return Values(np.full(counts.size, -np.inf), np.full(counts.size, begin))
        return Values(*row_minima(log10_transmission, samples.row, samples.energy, value))
    least, where = row_minima(lambda r, e: -log10_transmission(r, e), samples.row, samples.energy, -value)
    return _with_hidden(samples, Values(-least, where))


def _with_hidden(samples: Samples, values: Values) -> Values:
    """Count a resonance between two neighbouring doubles as fully transmitting: its height cannot be sampled."""
    here, after = samples.energy[:-1], samples.energy[1:]
    hidden = samples.joined & (abs(np.diff(samples.phase)) > PHASE_STEP) & (np.nextafter(here, after) >= after)
    rows = samples.row[:-1][hidden]
    log10, energy = values.log10.copy(), values.energy.copy()
    log10[rows], energy[rows] = 0.0, here[hidden]
    return Values(log10, energy)


def _log_means(function: RowFunction, samples: Samples, value: Floats) -> Floats:
    """log10 of the mean of 10^function over each row."""
    rows = int(samples.row[-1]) + 1
    peak = np.full(rows, -np.inf)
    np.maximum.at(peak, samples.row, value)
    peak = np.where(np.isfinite(peak), peak, 0.0)
    joined = np.flatnonzero(samples.joined)
    low, high, row = samples.energy[joined], samples.energy[joined + 1], samples.row[joined]
    integral = row_integrals(lambda r, e: 10.0 ** (function(r, e) - peak[r]), row, low, high, rows)
    extent = np.bincount(row, high - low, rows)
    return np.asarray(peak + np.log10(integral / extent))


def _measured_values(stack: Stack, window: Window, counts: NDArray[np.int64], resolution: float) -> Values:
    log10, energy = np.empty(counts.size), np.full(counts.size, np.nan)
    curves = measured_curves(stack, counts, window.bottom, window.top, resolution)
    for place, measured in enumerate(curves):
        if window.measure == "mean":
            value = measured.mean(window.bottom, window.top)
        else:
            value, energy[place] = measured.extremum(window.bottom, window.top, window.kind == "block")
        log10[place] = math.log10(value) if value > 0 else -math.inf
    return Values(log10, energy)
