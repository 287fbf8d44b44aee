"""The infinite lattice of a cell: every band with its edges and a certificate, dispersion, and decay in the gaps.

Bands are |D(E)| <= 2 with D the trace of the cell matrix. They are not looked for on a grid: the lifted Bloch phase
(`oscillation.rotation`) names the band or gap of any energy, grows with energy, and so brackets every edge however
narrow or close (Magnus and Winkler, Hill's Equation (1966); Eastham (1973)).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from transport.chain import Chain
from transport.constants import HBAR, HBAR2_2M0
from transport.oscillation import Floats, first_reaching, rotation
from transport.propagation import model_end, transfer
from transport.structure import Layer, Stack

MOST_BANDS = 20_000
"""Bands listed at most."""

_STEP = 1e-30
"""Imaginary step (eV) for exact derivatives of analytic functions (Squire and Trapp, SIAM Rev. 40, 110 (1998))."""


@dataclass(frozen=True, slots=True)
class Band:
    """One band: `index` from 1, edges in eV; effective masses (m0) at both edges, negative at the top.

    A mass is 0 where the gap beside the edge is closed (the dispersion is a straight line there).
    """

    index: int
    bottom: float
    top: float
    bottom_mass: float
    top_mass: float


@dataclass(frozen=True, slots=True)
class Certificate:
    """Whether a list is complete: `counted` by the Pruefer angle at the ends of the range, `found` and in place."""

    complete: bool
    counted: int
    found: int

    @property
    def sentence(self) -> str:
        """The certificate in words."""
        if self.complete:
            return f"certified: {self.counted} counted, {self.found} found"
        return f"not certified: {self.counted} counted, {self.found} found"


@dataclass(frozen=True)
class Bands:
    """The bands of a stack's cell that reach into a range, from the lowest up, with their certificate."""

    stack: Stack
    between: tuple[float, float]
    bands: tuple[Band, ...]
    certificate: Certificate

    def energies(self, phase: ArrayLike) -> Floats:
        """E (eV) at Bloch phases K d from 0 to pi: shape (bands, phases)."""
        share = np.clip(np.asarray(phase, dtype=float) / np.pi, 0.0, 1.0)
        if not self.bands or not share.size:
            return np.zeros((len(self.bands), share.size))
        turns = np.array([b.index - 1 + share if b.index % 2 else b.index - share for b in self.bands])
        low, high = (np.array([[getattr(b, end)] for b in self.bands]) for end in ("bottom", "top"))
        below = np.nextafter(low, -np.inf)
        found = first_reaching(
            lambda e: rotation(Chain(self.stack, e)).turns,
            turns.ravel(), np.broadcast_to(below, turns.shape).ravel(), np.broadcast_to(high, turns.shape).ravel(),
        ).reshape(turns.shape)
        return np.clip(found, low, high)


def lattice_bands(stack: Stack, between: tuple[float, float] | None = None) -> Bands:
    """Every band of the infinite lattice of the stack's cell that reaches into `between` (eV), certified.

    Without a range, from the lowest band to a tenth above the highest barrier (`default_range`). Bands that touch stay
    two; one that straddles an end is listed whole. Edges are exact to the rounding of the cell matrix, far below
    1e-10 eV. Raises ValueError for a range that is reversed or not finite, and where the one-band model ends.
    """
    still = _cell_alone(stack)
    low, high = between if between is not None else (lowest_energy(still), default_range(stack)[1])
    if not (math.isfinite(low) and math.isfinite(high) and low < high):
        raise ValueError(f"between is ({low!r}, {high!r}): give two finite energies in eV, the lower one first")
    first, last = band_numbers(still, low, high)
    if last - first >= MOST_BANDS:
        raise ValueError(
            f"between holds {last - first + 1:,} bands, more than the {MOST_BANDS:,} that are listed: narrow the range"
        )
    indices = np.arange(first, last + 1)
    bands: tuple[Band, ...] = ()
    if indices.size:
        bottoms, tops = _edges(still, indices, low, high)
        bottom_masses = _edge_masses(still, indices, bottoms, at_top=False)
        top_masses = _edge_masses(still, indices, tops, at_top=True)
        rows = zip(indices, bottoms, tops, bottom_masses, top_masses, strict=True)
        bands = tuple(Band(int(i), *(float(v) for v in row)) for i, *row in rows)
    return Bands(still, (low, high), bands, certify(still, bands, (low, high)))


def certify(stack: Stack, bands: tuple[Band, ...], between: tuple[float, float]) -> Certificate:
    """Compare a list of bands with the Pruefer count at both ends of the range.

    A band counts as found if it stands in its place (ascending, not overlapping) and the Bloch phase at its middle,
    or just outside it where it is too narrow to enter, is that of its index.
    """
    stack = _cell_alone(stack)
    first, last = band_numbers(stack, *between)
    counted = max(0, last - first + 1)
    if not bands:
        return Certificate(counted == 0, counted, 0)
    bottoms, tops = (np.array([getattr(b, end) for b in bands]) for end in ("bottom", "top"))
    index = np.array([b.index for b in bands])
    room = 1e-12 + 1e-12 * abs(tops)
    below, above = (_turns(stack, e) for e in (bottoms - room, tops + room))
    middle = _turns(stack, (bottoms + tops) / 2)
    held = (below <= index) & (above >= index - 1) & (middle >= index - 1) & (middle <= index) & (below < above)
    held &= (index >= first) & (index <= last)
    held[1:] &= (bottoms[1:] >= tops[:-1]) & (index[1:] > index[:-1])
    found = int(held.sum())
    return Certificate(found == counted == len(bands), counted, found)


def band_numbers(stack: Stack, low: float, high: float) -> tuple[int, int]:
    """Index of the first band that ends above `low` and of the last that begins below `high` (first > last: none)."""
    turning = rotation(Chain(_cell_alone(stack), np.array([low, high])))
    below, above = turning.turns
    first = math.floor(below) + 1
    last = math.floor(above) + 1 if turning.passing[1] else round(above)
    return first, last


def lowest_energy(stack: Stack) -> float:
    """An energy (eV) below every band of the cell, and not above any lead's edge.

    Raises ValueError where non-parabolic masses end the model above the lowest band edge.
    """
    edges = [e.band_edge for e in stack.cell if isinstance(e, Layer)]
    start = min(min(edges), stack.left.band_edge, stack.right.band_edge)
    depth = 0.0
    while _turns(_cell_alone(stack), np.array([start - depth]))[0] > 0:
        depth = max(2 * depth, 1e-3)
    return start - depth


def default_range(stack: Stack) -> tuple[float, float]:
    """From the lower lead edge to the top of the highest barrier and a tenth more (eV).

    Where no layer rises above the leads (deltas, wells), to the energy whose half wavelength fits the period four
    times, at the lead's mass.
    """
    low = min(stack.left.band_edge, stack.right.band_edge)
    open_from = max(stack.left.band_edge, stack.right.band_edge)
    top = max([open_from, *(e.band_edge for e in stack.elements if isinstance(e, Layer))])
    if top - open_from > 1e-3:
        return low, top + 0.1 * (top - low)
    return low, top + HBAR2_2M0 / stack.left.mass * (4 * math.pi / stack.period_length) ** 2


def _cell_alone(stack: Stack) -> Stack:
    """One lossless cell between the leads: the lattice knows nothing of end layers, not even where their model ends."""
    return Stack(stack.left, (), stack.cell, 1, (), stack.right)


def _turns(stack: Stack, energy: Floats) -> Floats:
    return rotation(Chain(stack, energy)).turns


def _label(stack: Stack, energy: Floats) -> Floats:
    """2j - 1 in band j, 2j in the gap above it: non-decreasing in energy."""
    turning = rotation(Chain(stack, energy))
    return np.where(turning.passing, 2 * np.floor(turning.turns) + 1, 2 * turning.turns)


def _edges(stack: Stack, indices: NDArray[np.int64], low: float, high: float) -> tuple[Floats, Floats]:
    """Bottom and top of each band: where the label first reaches 2j - 1, and 2j."""
    reach = high - low
    start, end = low, high
    floor = model_end(stack.cell)
    while _label(stack, np.array([start]))[0] >= 2 * indices[0] - 1:
        # Towards the end of the one-band model, if there is one, but never beyond it.
        start = max(start - reach, floor + (start - floor) / 4) if math.isfinite(floor) else start - reach
        reach *= 2
    reach = high - low
    while _label(stack, np.array([end]))[0] < 2 * indices[-1]:
        end += reach
        reach *= 2
    levels = np.concatenate([2 * indices - 1, 2 * indices])
    found = first_reaching(lambda e: _label(stack, e), levels, start, end)
    return found[: indices.size], found[indices.size :]


def discriminant_slope(stack: Stack, energy: Floats) -> Floats:
    """dD/dE (1/eV) of the cell, exact: the imaginary part at an infinitesimal imaginary energy."""
    cell = transfer(stack.cell, energy + 1j * _STEP)
    scale = np.exp(np.asarray(cell.log_scale, dtype=float))
    return np.asarray((cell.a + cell.d).imag / _STEP * scale)


def _edge_masses(stack: Stack, indices: NDArray[np.int64], edges: Floats, at_top: bool) -> Floats:
    """hbar^2 / (d2E/dK2) in m0 at band edges, from D = 2 cos K d: d2E/dK2 = -2 d^2 cos(K d) / D'."""
    zone_edge = (indices % 2 == 1) == at_top
    with np.errstate(over="ignore", divide="ignore"):
        slope = discriminant_slope(stack, edges)
        mass = -HBAR2_2M0 * slope / (stack.period_length**2 * np.where(zone_edge, -1.0, 1.0))
    return np.where(abs(mass) < 1e-12, 0.0, mass)  # a closed gap: D' there is only rounding


@dataclass(frozen=True, slots=True)
class Bloch:
    """The infinite lattice at given energies (eV), shape (n,).

    `phase`: real part of K d, 0 to pi. `decay`: kappa d per period, 0 in bands. `velocity` (nm/s), 0 in gaps.
    `density_of_states`: states per eV, per cell and spin, 0 in gaps.
    """

    energy: Floats
    phase: Floats
    decay: Floats
    velocity: Floats
    density_of_states: Floats

    @property
    def rejection_dB(self) -> Floats:
        """What each period takes from T in the gaps: 20 log10(e) decay, the usual 8.686 kappa d."""
        return np.asarray(20 / math.log(10) * self.decay)


def bloch(stack: Stack, energies: ArrayLike) -> Bloch:
    """Bloch phase, decay per period, group velocity and density of states of the stack's cell at given energies."""
    energy = np.atleast_1d(np.asarray(energies, dtype=float)).ravel()
    chain = Chain(_cell_alone(stack), energy)
    half, squared = chain.cell.half_trace, chain.cell.sine_squared
    passing = squared > 0
    sine = np.sqrt(abs(squared))
    phase = np.where(passing, np.arctan2(sine, half), np.where(half > 0, 0.0, np.pi))
    size = np.where(passing, 1.0, abs(half) + sine)
    decay = np.log(size)
    if (held := chain.cell.log_scale) is not None:
        decay = np.where(held > 0, np.log(2 * abs(half)) + held, decay)
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        slope = np.where(passing, abs(discriminant_slope(chain.stack, energy)) / (2 * sine), np.inf)
    finite = np.isfinite(slope) & (slope > 0)
    rate = np.where(finite, slope, 1.0)
    velocity = np.where(finite, chain.stack.period_length / (rate * HBAR), 0.0)
    density = np.where(finite, rate / np.pi, 0.0)
    return Bloch(energy, phase, decay, velocity, density)
