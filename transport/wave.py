"""Waves inside a finite stack: psi(x), local density of states, charge, dwell and phase times.

A wave that comes in from one side is carried from the far face towards its source (`march.py`).

Probability. With C = hbar^2/2m0, chi = psi'/m and a dot for d/dE, psi' = m chi and chi' = -(E - V) psi/C give

    d/dx (psi* chi. - chi* psi.) = -(|psi|^2 + C m. |chi|^2) / C          (lossless)
    d/dx Im(psi* chi) = -(dephasing/2C) (|psi|^2 + C m. |chi|^2)          (dephasing)

so what is counted, stored and absorbed is |psi|^2 + C m. |chi|^2, here called probability: |psi|^2, and where the mass
depends on energy what the two-band model puts into the valence band. Dwell and phase times: Hauge and Stoevneng,
Rev. Mod. Phys. 61, 917 (1989); Winful, Phys. Rev. Lett. 91, 260401 (2003). Local density of states from waves of unit
flux: Gasparian, Christen and Buettiker, Phys. Rev. A 54, 4022 (1996).
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import get_args

import numpy as np
from numpy.typing import ArrayLike, NDArray

from transport.constants import HBAR, HBAR2_2M0
from transport.march import (
    Complex,
    March,
    Side,
    inside_energy,
    lead_at,
    open_flux_factor,
    outgoing,
    require_size,
    squared,
    written_out,
)
from transport.oscillation import Floats
from transport.propagation import Array, Transfer, element_transfer, mass_at
from transport.structure import Delta, Element, Layer, Lead, Stack

_REACHED = 0.05  # difference, over the size of the wave, between the closed form and a step across one layer
_NO_POLE = 1e-3  # kink, as an angle, at which two outgoing waves are no longer one


@dataclass(frozen=True, slots=True)
class Wave:
    """A wave in a stack: `position` (x,) in nm from the left face, `energy` (n,) in eV; the rest is (n, x).

    `psi`: in (s/nm)^1/2 for one electron a second from a lead; in nm^-1/2 for a pole. `slope`: psi'/m (1/nm of
    psi's unit, m in m0); at a delta, that on its left. `current`: electrons a second, positive to the right.
    """

    position: Floats
    energy: Array
    psi: Complex
    slope: Complex
    current: Floats

    @property
    def density(self) -> Floats:
        """|psi|^2."""
        return squared(self.psi)


@dataclass(frozen=True, slots=True)
class LocalDensity:
    """Local density of states in states/(eV nm) for each spin: `density` (n, x) at `energy` (n,), `position` (x,)."""

    position: Floats
    energy: Floats
    density: Floats


def wave(
    stack: Stack, energies: ArrayLike, side: Side = "left",
    positions: ArrayLike | None = None, points_per_nm: float = 5.0,
) -> Wave:
    """The wave that one electron a second, coming from `side`, makes at real energies (eV, shape (n,)).

    At `positions` (nm from the left face), or else at both faces of every layer and evenly between them, at least
    `points_per_nm` of them. The incident wave has phase 0 at the face it meets. `current` follows from the continuity
    equation, what leaves plus what is absorbed on the way, since psi* psi'/m of an almost standing wave has lost it.
    Raises ValueError for energies that are not finite or at which that lead is closed, positions outside the stack,
    more values than MOST_VALUES, and where the one-band model ends.
    """
    energy = _incident_energies(stack, energies, side)
    places = _places(stack, positions, points_per_nm, energy.size)
    march = _incident(stack, energy, side)
    psi, slope = march.scaled(*places.seen_from(march))
    towards = -1.0 if side == "left" else 1.0  # the march runs against the wave's own direction
    return Wave(places.position, energy, psi.T, towards * slope.T, -towards * _current(stack, march, places).T)


def pole_wave(
    stack: Stack, energies: ArrayLike, positions: ArrayLike | None = None, points_per_nm: float = 5.0
) -> Wave:
    """The decaying state of a resonance at complex energies (eV, shape (n,)): waves go out of the stack only.

    Carried from both ends and joined where it is largest, so that a long-lived state dies away on both sides. Its
    probability within the stack is 1, each layer's taken from the end that gives the less of it, for rounding only
    ever adds a wave that grows; `psi` is in nm^-1/2 and real where it is joined. Raises ValueError as `wave` does, and
    where the two ends do not join: the energy is no pole.
    """
    energy = _finite(np.asarray(energies, dtype=complex))
    places = _places(stack, positions, points_per_nm, energy.size)
    right_going, left_going, join = _joined(outgoing(stack, energy, "left"), outgoing(stack, energy, "right"))
    count = right_going.kind.size
    psi = slope = np.zeros((places.position.size, energy.size), dtype=np.complex128)
    held = np.full((count, energy.size), np.inf)
    for march, last, towards in ((right_going, count - join, -1.0), (left_going, join, 1.0)):
        row, offset = places.seen_from(march)
        with np.errstate(over="ignore", invalid="ignore"):  # far beyond the join, where it is left out
            seen = march.probability() * abs(march.amplitude) ** 2
            one, two = march.scaled(row, offset)
        held = np.fmin(held, seen[::-1] if march.leftwards else seen)
        mine = row[:, None] < last
        psi = np.where(mine, one, psi)
        slope = np.where(mine, towards * two, slope)
    norm = np.sqrt(held.sum(axis=0))
    psi, slope = (psi / norm).T, (slope / norm).T
    return Wave(places.position, energy, psi, slope, 2 * HBAR2_2M0 / HBAR * (psi.conj() * slope).imag)


def local_density_of_states(
    stack: Stack, energies: ArrayLike, positions: ArrayLike | None = None, points_per_nm: float = 5.0
) -> LocalDensity:
    """Local density of states: probability of the waves of unit flux from both sides, over 2 pi hbar.

    It is what the leads feed: a closed lead sends nothing, and states bound below both, or what dephasing broadens,
    are not in it. `positions` and errors as for `wave`, but any finite energy is taken.
    """
    energy = _finite(np.asarray(energies, dtype=float))
    places = _places(stack, positions, points_per_nm, energy.size)
    density = np.zeros((energy.size, places.position.size))
    for side in get_args(Side):
        open_ = np.flatnonzero(energy > lead_at(stack, side).band_edge)
        if open_.size:
            march = _incident(stack, energy[open_], side)
            row, offset = places.seen_from(march)
            psi, slope = march.scaled(row, offset)
            rate = HBAR2_2M0 * march.numbers[3, row, None]
            density[open_] += (squared(psi) + (rate * squared(slope) if rate.any() else 0.0)).T
    return LocalDensity(places.position, energy, density / (2 * math.pi * HBAR))


def charge(stack: Stack, energies: ArrayLike, side: Side = "left") -> Floats:
    """Share of the probability in each layer, all periods written out: shape (n, layers), each row adding up to 1.

    For the wave from `side` at energies (eV); layers from the left, deltas left out. Raises as `wave` does.
    """
    march = _incident(stack, _incident_energies(stack, energies, side), side)
    held = march.probability().T[:, :: -1 if march.leftwards else 1]
    return np.asarray(held / held.sum(axis=1, keepdims=True))


def dwell_time(stack: Stack, energies: ArrayLike, side: Side = "left") -> Floats:
    """Probability within the stack over the incident flux (s), at energies (eV, shape (n,)).

    With dephasing, dephasing/hbar times this is the share absorbed, 1 - T - R. Raises as `wave` does.
    """
    march = _incident(stack, _incident_energies(stack, energies, side), side)
    return np.asarray(march.probability().sum(axis=0) * abs(march.amplitude) ** 2)


def phase_time(stack: Stack, energies: ArrayLike) -> Floats:
    """hbar d(arg t)/dE (s) at energies (eV, shape (n,)): Wigner, Phys. Rev. 98, 145 (1955). Exact derivative.

    t is the amplitude between the outer faces, the same from either side. Raises ValueError as `wave` does, and
    where the other lead is closed: nothing comes through that had a phase.
    """
    energy = _incident_energies(stack, _incident_energies(stack, energies, "left"), "right")
    elements, inside = written_out(stack, energy.size)[::-1], inside_energy(stack, energy)
    (near, near_growth), (far, far_growth) = (
        (open_flux_factor(lead, energy), _flux_factor_growth(lead, energy)) for lead in (stack.left, stack.right))
    one = np.ones(energy.size, complex)
    psi, slope = np.array([one, 0 * one]), -1j * far * np.array([one, far_growth])  # values, and below their rates
    steps = {e: (step := element_transfer(e, inside), _rate(e, step, inside)) for e in dict.fromkeys(elements)}
    for element in elements:
        step, rate = steps[element]
        more, steeper = rate.a * psi[0] + rate.b * slope[0], rate.c * psi[0] + rate.d * slope[0]
        psi, slope = step.a * psi + step.b * slope, step.c * psi + step.d * slope
        psi[1], slope[1] = psi[1] + more, slope[1] + steeper
        size = abs(psi[0]) + abs(slope[0])
        psi, slope = psi / size, slope / size
    rate_in = psi[1] + 1j * (slope[1] - slope[0] * near_growth) / near
    return np.asarray(-HBAR * (rate_in / (psi[0] + 1j * slope[0] / near)).imag)


def _incident(stack: Stack, energy: Floats, side: Side) -> March:
    """The wave of unit flux from `side`."""
    march, factor = outgoing(stack, energy, side), open_flux_factor(lead_at(stack, side), energy)
    incident = (march.psi[-1] + 1j * march.slope[-1] / factor) / 2
    return replace(march, amplitude=np.sqrt(HBAR / (2 * HBAR2_2M0 * factor.real)) / incident)


def _current(stack: Stack, march: March, places: _Places) -> Floats:
    """Flux against the march (places, n): what leaves at the far face, and what dephasing takes on the way there."""
    far, scale = stack.right if march.leftwards else stack.left, abs(march.amplitude) ** 2
    leaving = 2 * HBAR2_2M0 / HBAR * open_flux_factor(far, march.inside.real).real
    leaving = leaving * abs(march.psi[0]) ** 2 * np.exp(2 * (march.log[0] - march.reference)) * scale
    if not stack.dephasing:
        return np.tile(leaving, (places.position.size, 1))
    (row, offset), held = places.seen_from(march), march.probability()
    held = (np.cumsum(held, axis=0) - held)[row] + march.probability(row, offset)
    return np.asarray(leaving + stack.dephasing / HBAR * scale * held)


def _joined(right_going: March, left_going: March) -> tuple[March, March, NDArray[np.int64]]:
    """Both outgoing solutions brought to one scale, and the layer (from the left) at whose left face they join.

    That is where their product is largest and so the state is: short of it each grows away from its end and is exact,
    beyond it rounding grows instead. Not at a face that a very opaque layer keeps from being reached layer by layer.
    """
    rows = np.arange(right_going.kind.size)
    from_right = [part[::-1] for part in right_going.at(rows, right_going.numbers[0])]
    from_left = [left_going.psi[:-1], left_going.slope[:-1], left_going.log[:-1]]
    stored = right_going.psi[:0:-1] * np.exp(np.minimum(right_going.log[:0:-1] - from_right[2], 50.0))
    size = abs(from_right[0]) + abs(from_right[1])
    weight = sum(np.log(abs(psi) + abs(slope)) + log for psi, slope, log in (from_right, from_left))
    join = np.argmax(np.where(abs(stored - from_right[0]) < _REACHED * size, weight, -np.inf), axis=0)
    at = join, np.arange(join.size)
    psi, slope, log = from_right[0][at], -from_right[1][at], from_right[2][at]
    other, bend, reference = (part[at] for part in from_left)
    factor = (other.conj() * psi + bend.conj() * slope) / (squared(other) + squared(bend))
    kink = np.hypot(abs(psi - factor * other), abs(slope - factor * bend)) / np.hypot(abs(psi), abs(slope))
    if (kink > _NO_POLE).any():
        lost = right_going.inside[np.argmax(kink)]
        raise ValueError(f"energies: at {lost:.9g} eV no wave goes out on both sides, give poles of the transmission")
    turn = np.exp(-1j * np.angle(psi))
    return (replace(right_going, amplitude=turn, reference=log),
            replace(left_going, amplitude=turn * factor, reference=reference), join)


@dataclass(frozen=True, slots=True)
class _Places:
    """Positions (nm from the left face), each with its layer, counted from the left, and the offset inside it."""

    position: Floats
    layer: NDArray[np.int64]
    offset: Floats

    def seen_from(self, march: March) -> tuple[NDArray[np.int64], Floats]:
        """Row of the march and distance from that layer's far face."""
        if march.leftwards:
            row = march.kind.size - 1 - self.layer
            return row, march.numbers[0, row] - self.offset
        return self.layer, self.offset


def _places(stack: Stack, positions: ArrayLike | None, points_per_nm: float, energies: int) -> _Places:
    """The places asked for, after a check that `energies` times their number is not too much."""
    thickness = np.array([e.thickness for e in written_out(stack, energies) if isinstance(e, Layer)])
    face = np.concatenate([[0.0], np.cumsum(thickness)])
    if positions is not None:
        position = np.atleast_1d(np.asarray(positions, dtype=float)).ravel()
        if not (np.isfinite(position).all() and (position >= 0).all() and (position <= face[-1] * (1 + 1e-12)).all()):
            raise ValueError(f"positions: every one must lie in the stack, from 0 to {face[-1]:.9g} nm")
        require_size(energies, position.size)
        layer = np.minimum(np.searchsorted(face[1:], position), thickness.size - 1)
        return _Places(position, layer, np.clip(position - face[layer], 0.0, thickness[layer]))
    if not (math.isfinite(points_per_nm) and points_per_nm > 0):
        raise ValueError(f"points_per_nm is {points_per_nm!r}: give a number above 0")
    count = np.maximum(np.ceil(thickness * points_per_nm - 1e-9), 1)
    require_size(energies, float(count.sum()) + 1)
    count = count.astype(np.int64)
    layer = np.concatenate([[0], np.repeat(np.arange(thickness.size), count)])
    step = np.arange(1, layer.size) - np.repeat(np.cumsum(count) - count, count)
    offset = np.concatenate([[0.0], thickness[layer[1:]] * (step / count[layer[1:]])])
    return _Places(face[layer] + offset, layer, offset)


def _rate(element: Element, step: Transfer, inside: Array) -> Transfer:
    """d/dE of a layer's matrix, to the scale of `step`.

    With x as in `propagation.py`: d cos sqrt(x)/dx = -S/2 and dS/dx = (cos sqrt(x) - S)/2x, near 0 by its series.
    """
    if isinstance(element, Delta):
        return Transfer(0.0, 0.0, 0.0, 0.0)
    kinetic, mass, length = inside - element.band_edge, mass_at(element, inside), element.thickness
    rate = element.mass * element.nonparabolicity
    x = kinetic * mass * (length * length / HBAR2_2M0)
    growth = (mass + kinetic * rate) * (length * length / HBAR2_2M0)
    sine = step.b / (mass * length)
    near = abs(x) < 1
    series, small = np.zeros_like(x), np.where(near, x, 0.0)
    for n in range(10, 0, -1):
        series = series * small + (-1) ** n * n / math.factorial(2 * n + 1)
    bend = np.where(near, series, (step.a - sine) / (2 * np.where(near, 1.0, x))) * growth
    even = -sine / 2 * growth
    return Transfer(even, length * (rate * sine + mass * bend), -length / HBAR2_2M0 * (sine + kinetic * bend), even)


def _flux_factor_growth(lead: Lead, energy: Floats) -> Floats:
    """d ln(k/m)/dE (1/eV) of an open lead."""
    kinetic = energy - lead.band_edge
    return np.asarray(1 / kinetic - lead.nonparabolicity / (1 + lead.nonparabolicity * kinetic)) / 2


def _finite(energies: Array) -> Array:
    energy = np.atleast_1d(energies).ravel()
    if not np.isfinite(energy).all():
        raise ValueError("energies: every one must be a finite number of eV")
    return energy


def _incident_energies(stack: Stack, energies: ArrayLike, side: Side) -> Floats:
    if side not in ("left", "right"):
        raise ValueError(f"side is {side!r}: give 'left' or 'right', where the wave comes from")
    energy, edge = _finite(np.asarray(energies, dtype=float)), lead_at(stack, side).band_edge
    if (energy <= edge).any():
        raise ValueError(f"energies: the {side} lead is closed below {edge:.9g} eV, ask above it")
    return energy
