"""What extra periods cannot change: the ripple floor of a pass window and the limit of its mean.

Inside a miniband T swings between two envelopes that do not depend on the number of periods (`chain.Envelope`).
As periods are added the minimum over a window tends to the least of the lower one, and any average over energy to the
average of the geometric mean of the two (the phase N phi then takes every value equally often).
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from transport.chain import Chain
from transport.lattice import Band, lattice_bands
from transport.measuring import FWHM_PER_SIGMA, Measured
from transport.numerics import gauss_nodes, row_integrals, row_minima
from transport.oscillation import Floats
from transport.sampling import resolve
from transport.structure import Stack, Window

_CLOSED = 1e-12  # eV: a gap narrower than this is closed for a window
_FINE = 12  # periods of the stack whose samples show every feature of the envelope


@dataclass(frozen=True, slots=True)
class Floor:
    """A limiting value of T, and the energy (eV; NaN for a mean) where it is taken."""

    value: float
    energy: float


@dataclass(frozen=True, slots=True)
class Miniband:
    """A stretch of allowed energies: one band, or several whose gaps are closed. `first`, `last`: their indices."""

    bottom: float
    top: float
    first: int
    last: int

    @property
    def name(self) -> str:
        """How the miniband is called in a sentence."""
        return f"miniband {self.first}" if self.first == self.last else f"minibands {self.first}-{self.last}"


@lru_cache(maxsize=256)
def minibands(stack: Stack, low: float, high: float) -> tuple[Miniband, ...]:
    """The minibands reaching into a range (eV), those that touch joined."""
    joined: list[Miniband] = []
    for band in lattice_bands(stack, (low, high)).bands:
        joined = _join(joined, band)
    return tuple(joined)


def _join(joined: list[Miniband], band: Band) -> list[Miniband]:
    if joined and band.bottom - joined[-1].top <= _CLOSED:
        before = joined[-1]
        return [*joined[:-1], Miniband(before.bottom, band.top, before.first, band.index)]
    return [*joined, Miniband(band.bottom, band.top, band.index, band.index)]


def ripple_floor(stack: Stack, window: Window) -> Floor | None:
    """The least value that T touches over the window as periods are added (lossless stack, end layers included).

    0, at the edge, where the window crosses a miniband's or a lead's edge; None where it lies in no miniband.
    """
    inside = _inside(stack, window)
    if not inside:
        return None
    threshold = max(stack.left.band_edge, stack.right.band_edge)
    band = inside[0]
    if window.bottom < threshold:
        return Floor(0.0, max(threshold, window.bottom))
    if window.bottom < band.bottom:
        return Floor(0.0, band.bottom)
    if window.top > band.top:
        return Floor(0.0, band.top)
    row, energy = _envelope_samples(stack, window.bottom, window.top)
    least, where = row_minima(lambda _, e: _side(stack, e, "lower"), row, energy, _side(stack, energy, "lower"))
    return Floor(float(least[0]), float(where[0]))


def mean_limit(stack: Stack, window: Window) -> float:
    """What the window's mean of T tends to as periods are added: the mean of sqrt(lower upper), 0 in the gaps."""
    total = 0.0
    for low, high in _open_pieces(stack, window.bottom, window.top):
        _, energy = _envelope_samples(stack, low, high)
        integral = row_integrals(
            lambda _, e: _side(stack, e, "middle"), np.zeros(energy.size - 1, np.int64), energy[:-1], energy[1:], 1
        )
        total += float(integral[0])
    return total / (window.top - window.bottom)


def measured_limit(stack: Stack, low: float, high: float, resolution: float) -> Measured:
    """What a beam (resolution in eV FWHM) measures of a stack of ever more periods, between two energies (eV)."""
    sigma = resolution / FWHM_PER_SIGMA
    nodes, weights = [np.zeros(1)], [np.zeros(1)]
    for begin, end in _open_pieces(stack, low - 9 * sigma, high + 9 * sigma):
        # E = middle - half cos(pi s): the square-root edges of the band become smooth
        share = np.linspace(0, 1, 17 + math.ceil((end - begin) / sigma * 4))
        step, weight = (part.ravel() for part in gauss_nodes(share[:-1], share[1:]))
        node = begin + (end - begin) * np.sin(np.pi * step / 2) ** 2
        rate = (end - begin) * np.pi / 2 * np.sin(np.pi * step)
        nodes.append(node)
        weights.append(weight * rate * _side(stack, node, "middle"))
    return Measured(np.concatenate(nodes), np.concatenate(weights), sigma)


def touches_miniband(stack: Stack, window: Window) -> bool:
    """Whether any part of the window lies in a miniband."""
    return bool(_inside(stack, window))


def _inside(stack: Stack, window: Window) -> tuple[Miniband, ...]:
    found = minibands(stack, window.bottom, window.top)
    return tuple(b for b in found if min(b.top, window.top) > max(b.bottom, window.bottom))


def _open_pieces(stack: Stack, low: float, high: float) -> list[tuple[float, float]]:
    """The parts of a range that lie in minibands, both leads open."""
    low = max(low, stack.left.band_edge, stack.right.band_edge)
    if low >= high:
        return []
    ends = [(max(b.bottom, low), min(b.top, high)) for b in minibands(stack, low, high)]
    return [(begin, end) for begin, end in ends if begin < end]


def _envelope_samples(stack: Stack, low: float, high: float) -> tuple[NDArray[np.int64], Floats]:
    """Energies that show every feature of the envelope, whose narrowest are those of the end layers."""
    samples = resolve(stack, np.array([_FINE]), np.array([low]), np.array([high]), start=65)
    return np.zeros(samples.energy.size, dtype=np.int64), samples.energy


def _side(stack: Stack, energy: Floats, which: str) -> Floats:
    envelope = Chain(stack, energy).envelope
    if which == "lower":
        return envelope.lower
    return np.sqrt(envelope.lower * envelope.upper)
