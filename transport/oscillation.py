"""Counting zeros of the wave: the Pruefer angle, which knows how many states lie below an energy.

For real energy the solution that starts with psi = 0 turns its phase point (psi, psi'/m) ever further as the energy
grows (the mass must not fall with energy). The number of zeros behind it is therefore the number of Dirichlet
eigenvalues below that energy, whatever their spacing: nothing can hide between two samples. Sturm's oscillation
theorem; Pruefer, Math. Ann. 95, 499 (1926); Eastham, The Spectral Theory of Periodic Differential Equations (1973).

Zeros are counted layer by layer in closed form. Rounding could only move a zero across an interface, and is caught by
parity: the sign of psi says whether the number is odd or even.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from transport.cell import Powers
from transport.chain import Chain, argument
from transport.constants import HBAR2_2M0
from transport.propagation import element_transfer, mass_at
from transport.structure import Delta, Element

Floats = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class PhasePoint:
    """psi and slope = psi'/m (any common scale) after `zeros` zeros of psi, at each energy."""

    zeros: Any
    psi: Any
    slope: Any

    @property
    def upward(self) -> Any:
        """Whether psi is positive just to the right of this point."""
        return (np.asarray(self.psi) > 0) | ((np.asarray(self.psi) == 0) & (np.asarray(self.slope) > 0))


WALL = PhasePoint(0, 0.0, 1.0)
"""psi = 0: the start of the Dirichlet solution."""


def through(elements: Sequence[Element], energy: Floats, start: PhasePoint = WALL) -> PhasePoint:
    """The phase point behind a list of layers, with the zeros met on the way added.

    `energy` (eV) broadcasts against the fields of `start`.
    """
    point = start
    for element in elements:
        point = _through_one(element, energy, point)
    return point


def _through_one(element: Element, energy: Floats, start: PhasePoint) -> PhasePoint:
    if isinstance(element, Delta):
        slope = start.slope + element.strength / HBAR2_2M0 * start.psi
        return PhasePoint(start.zeros, start.psi, slope)
    step = element_transfer(element, energy)
    psi, slope = step.a * start.psi + step.b * start.slope, step.c * start.psi + step.d * start.slope
    size = np.hypot(psi, slope)
    size = np.where(size > 0, size, 1.0)  # both parts may cancel behind a very opaque layer
    end = PhasePoint(start.zeros, psi / size, slope / size)
    mass = mass_at(element, energy)
    wave = np.sqrt(np.maximum((energy - element.band_edge) * mass / HBAR2_2M0, 0.0))
    begun = np.arctan2(start.psi * wave, mass * start.slope) % np.pi
    turns = np.where(wave > 0, (begun + wave * element.thickness) / np.pi, 0.5)
    return PhasePoint(start.zeros + _of_parity(turns, start.upward != end.upward), end.psi, end.slope)


def _of_parity(turns: Any, odd: Any) -> Any:
    """floor(turns), corrected to the parity known from the signs."""
    return np.maximum(odd + 2 * np.rint((turns - 0.5 - odd) / 2), odd).astype(np.int64)


def zeros_at(elements: Sequence[Element], energy: float) -> int:
    """The zeros of `through` at one energy (eV): in plain numbers, for arrays of two cost ten times that."""
    zeros, psi, slope = 0, 0.0, 1.0
    for element in elements:
        if isinstance(element, Delta):
            slope += element.strength / HBAR2_2M0 * psi
            continue
        mass, kinetic = float(mass_at(element, np.asarray(energy))), energy - element.band_edge
        upward = _points_up(psi, slope)
        wave = math.sqrt(abs(kinetic) * mass / HBAR2_2M0)
        angle, turns = wave * element.thickness, 0.5
        cosine, sine = 1.0, element.thickness
        if kinetic > 0 and wave:
            turns = (math.atan2(psi * wave, mass * slope) % math.pi + angle) / math.pi
            cosine, sine = math.cos(angle), math.sin(angle) / wave
        elif wave:  # over cosh, which may overflow
            sine = math.tanh(angle) / wave
        psi, slope = cosine * psi + mass * sine * slope, cosine * slope - kinetic / HBAR2_2M0 * sine * psi
        odd = upward != _points_up(psi, slope)
        zeros += max(odd + 2 * round((turns - 0.5 - odd) / 2), odd)
        size = math.hypot(psi, slope) or 1.0  # both parts may cancel behind a very opaque layer
        psi, slope = psi / size, slope / size
    return zeros


def _points_up(psi: float, slope: float) -> bool:
    return psi > 0 or (psi == 0 and slope > 0)


@dataclass(frozen=True, slots=True)
class Rotation:
    """How far one cell turns the phase point, at each energy.

    `passing`: inside a band (|D| < 2). `turns`: the Bloch phase over pi, lifted so that it grows with energy: between
    j - 1 and j in band j, exactly j in the gap above it. `offset`: what N cells add to N turns before rounding down
    when they begin at psi = 0.
    """

    passing: NDArray[np.bool_]
    turns: Floats
    offset: Floats


def dirichlet_count(elements: Sequence[Element], energy: Floats, upward: NDArray[np.bool_]) -> NDArray[np.int64]:
    """Dirichlet eigenvalues of a list of layers below each energy; `upward` says where psi ends above 0.

    The count never falls with energy, and each eigenvalue turns the sign of psi. So if the sign turns as often as the
    count grows from the first energy to the last, every energy in between has one more for each turn before it.
    Otherwise two eigenvalues share an interval, and all energies are followed through the layers.
    """
    if energy.size < _FEW:
        return np.broadcast_to(np.asarray(through(elements, energy).zeros, dtype=np.int64), energy.shape)
    if not (energy[1:] >= energy[:-1]).all():
        order, result = np.argsort(energy), np.empty(energy.size, dtype=np.int64)
        result[order] = dirichlet_count(elements, energy[order], upward[order])
        return result
    first, last = (zeros_at(elements, float(energy[place])) for place in (0, -1))
    turned = upward[1:] != upward[:-1]
    if np.count_nonzero(turned) != last - first:
        return np.asarray(through(elements, energy).zeros, dtype=np.int64)
    counts = np.empty(energy.size, dtype=np.int64)
    counts[0] = first
    np.cumsum(turned, out=counts[1:])
    counts[1:] += first
    return counts


_FEW = 512


def rotation(chain: Chain) -> Rotation:
    """Lifted Bloch phase of the chain's cell (real energies)."""
    cell = chain.cell
    passing = cell.sine_squared > 0
    upward = PhasePoint(0, cell.matrix.b, cell.matrix.d).upward
    counted = dirichlet_count(chain.stack.cell, chain.energy, upward)
    facing = np.where(upward, cell.half_trace, -cell.half_trace)  # cos of the Bloch phase beyond the half turns counted
    behind = np.signbit(facing)  # in a gap: the first cell turns psi = 0 back, and is one zero short
    turns, offset = (counted + behind).astype(float), 0.5 - behind
    inside = np.flatnonzero(passing)
    turns[inside] = counted[inside] + argument(facing[inside], np.sqrt(cell.sine_squared[inside])) / np.pi
    offset[inside] = 0.0
    return Rotation(passing, turns, offset)


def zeros(chain: Chain, periods: Any, powers: Powers | None = None, turning: Rotation | None = None) -> Any:
    """Dirichlet eigenvalues of the whole stack below each energy: an integer array, of periods broadcast with energy.

    The cells are passed in one step: in suitable coordinates a cell turns the phase point by its Bloch phase inside a
    band, and in a gap moves it towards a fixed direction without passing it, so each half turn is known.
    """
    turning = turning or rotation(chain)
    if not (chain.stack.entry or chain.stack.exit):
        return np.floor(periods * turning.turns + turning.offset).astype(np.int64)
    powers = powers or chain.powers(periods)
    start = WALL
    if chain.stack.entry:
        start = PhasePoint(0, *(np.broadcast_to(x, chain.energy.shape) for x in (chain.entry.b, chain.entry.d)))
        start = replace(start, zeros=dirichlet_count(chain.stack.entry, chain.energy, start.upward))
    return through(chain.stack.exit, chain.energy, _through_cells(chain, periods, powers, turning, start)).zeros


def _through_cells(
    chain: Chain, periods: Any, powers: Powers, turning: Rotation, start: PhasePoint
) -> PhasePoint:
    swing, half = chain.cell.swing, chain.cell.half_trace
    if start is WALL:
        across, along = swing.b, swing.d
        psi, slope = across * powers.second, powers.first + along * powers.second
    else:
        across, along = swing.a * start.psi + swing.b * start.slope, swing.c * start.psi + swing.d * start.slope
        psi = start.psi * powers.first + across * powers.second
        slope = start.slope * powers.first + along * powers.second
    end = PhasePoint(0, psi, slope)
    passing, begun_up, ended_up = turning.passing, start.upward, end.upward

    begun = 0.0
    if start is not WALL:
        sine = np.copysign(np.sqrt(np.where(passing, chain.cell.sine_squared, 1.0)), swing.b)
        sign = np.where(begun_up, 1.0, -1.0)
        begun = np.arctan2(sign * start.psi, sign * across / sine) / np.pi
    in_band = _of_parity(begun + periods * turning.turns, begun_up != ended_up)

    whole = periods * np.rint(turning.turns).astype(np.int64)
    crossed = (begun_up != ended_up) ^ (whole & 1 == 1)
    forward = (across if start is WALL else start.slope * across - start.psi * along) * half > 0
    in_gap = whole + np.where(forward, crossed, -crossed.astype(np.int64))
    return PhasePoint(start.zeros + np.where(passing, in_band, in_gap), psi, slope)


def absolute_phase(chain: Chain, argument: Any, count: Any) -> Any:
    """arg t, unwrapped without neighbours.

    The transmitted wave followed backwards is psi_R = psi_N - i g_L psi_D, whose imaginary part vanishes exactly at
    the Dirichlet eigenvalues, and F = g_R psi_R + i slope_R stays within a quarter turn of psi_R because the flux has
    one sign. So arg t lies in pi count + (-pi/2, 3 pi/2): a range of exactly one turn. `argument` is arg F modulo a
    turn, `count` the number of Dirichlet eigenvalues below the energy.
    """
    turned = count + 0.5
    turned = turned + argument * (1 / np.pi)
    turned *= 0.5
    turned = np.rint(turned)
    turned *= 2 * np.pi
    return turned - argument


def first_reaching(function: Callable[[Floats], Any], levels: Any, low: Any, high: Any) -> Floats:
    """The energies at which a non-decreasing `function` first reaches each level, to the last bit (or 1e-17 eV).

    `function` maps energies (n,) to values (n,); at `low` it lies below, at `high` it has reached the level. All
    levels are narrowed together, each bracket cut into as many parts per evaluation as cost little more than one.
    Returns the upper end.
    """
    levels = np.asarray(levels, dtype=float)
    low, high = np.broadcast_to(low, levels.shape).astype(float), np.broadcast_to(high, levels.shape).astype(float)
    sections = int(np.clip(480 // max(levels.size, 1), 8, 128))
    parts = np.arange(1, sections) / sections
    rows = np.arange(levels.size)
    while np.any((np.nextafter(low, high) < high) & (high - low > 1e-17)):
        inside = low[:, None] + (high - low)[:, None] * parts
        reached = np.asarray(function(inside.ravel())).reshape(inside.shape) >= levels[:, None]
        first = np.where(reached.any(axis=1), reached.argmax(axis=1), sections - 1)
        edges = np.column_stack([low, inside, high])
        new_low, new_high = edges[rows, first], edges[rows, first + 1]
        if np.array_equal(new_low, low) and np.array_equal(new_high, high):
            break
        low, high = new_low, new_high
    return np.asarray(high)
