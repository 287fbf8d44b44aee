"""Waves inside a finite stack: psi(x), local density of states, charge, dwell and phase times.

A wave that comes in from one side is carried from the far face, where it only goes out, towards its source: there it
grows, so nothing cancels; its size is held as a logarithm. The state is (psi, psi'/m), as in `propagation.py`. A layer
is its own mirror image: marching leftwards is marching rightwards through the reversed list, the sign of psi'/m turned.

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
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any, Literal, get_args

import numpy as np
from numpy.typing import ArrayLike, NDArray

from transport.cell import Cell
from transport.constants import HBAR, HBAR2_2M0
from transport.oscillation import Floats
from transport.propagation import IDENTITY, Array, Span, Transfer, element_transfer, mass_at, require_model, transfer
from transport.structure import Delta, Element, Layer, Lead, Stack

Complex = NDArray[np.complex128]
Side = Literal["left", "right"]

MOST_VALUES, MOST_PLACES = 10_000_000, 100_000
"""Values (energies times places) that one call computes at most, and places (positions, or layers) at most."""

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
        return _squared(self.psi)


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
    right_going, left_going, join = _joined(_outgoing(stack, energy, "left"), _outgoing(stack, energy, "right"))
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
        open_ = np.flatnonzero(energy > _lead(stack, side).band_edge)
        if open_.size:
            march = _incident(stack, energy[open_], side)
            row, offset = places.seen_from(march)
            psi, slope = march.scaled(row, offset)
            rate = HBAR2_2M0 * march.numbers[3, row, None]
            density[open_] += (_squared(psi) + (rate * _squared(slope) if rate.any() else 0.0)).T
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
    elements, inside = _written_out(stack, energy.size)[::-1], _inside(stack, energy)
    (near, near_growth), (far, far_growth) = (
        (_flux_factor(lead, energy), _flux_factor_growth(lead, energy)) for lead in (stack.left, stack.right))
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


@dataclass(frozen=True, slots=True)
class _March:
    """A solution carried from its far face; rows are layers counted from there, of `kind` in the distinct `layers`.

    `numbers`: thickness (nm), band edge (eV), mass (m0) and dm/dE (m0/eV) of each row, shape (4, rows).
    `psi`, `slope` (d psi/dy / m, y the distance from the far face), both times exp(`log`): shape (rows + 1, n), at
    the far face of every layer, and at the near face of the stack. It is wanted over exp(`reference`), (n,), and times
    `amplitude`, which makes the incident flux 1.
    """

    layers: tuple[Layer, ...]
    kind: NDArray[np.int64]
    numbers: Floats
    inside: Array
    psi: Complex
    slope: Complex
    log: Floats
    reference: Floats
    amplitude: Any
    leftwards: bool

    def at(self, row: NDArray[np.int64], offset: Floats) -> tuple[Complex, Complex, Floats]:
        """psi, slope and log (places, n) at distances `offset` (nm) beyond the far face of layers `row`."""
        psi, slope, log, kinds = self.psi[row], self.slope[row], self.log[row], self.kind[row]
        for kind in np.unique(kinds):
            chosen = np.flatnonzero(kinds == kind)
            offsets, which = np.unique(offset[chosen], return_inverse=True)
            pieces = [self._piece(self.layers[kind], float(s)) for s in offsets]
            a, b, c, more = (
                np.array([np.broadcast_to(getattr(piece, name), self.inside.shape) for piece in pieces])
                for name in ("a", "b", "c", "log_scale")
            )
            one, two = psi[chosen], slope[chosen]
            psi[chosen] = a[which] * one + b[which] * two
            slope[chosen] = c[which] * one + a[which] * two
            if more.any():
                log[chosen] += more[which]
        return psi, slope, log

    def _piece(self, layer: Layer, length: float) -> Transfer:
        return element_transfer(replace(layer, thickness=length), self.inside) if length > 0 else IDENTITY

    def scaled(self, row: NDArray[np.int64], offset: Floats) -> tuple[Complex, Complex]:
        """psi and slope (places, n) of the wave that is wanted."""
        psi, slope, log = self.at(row, offset)
        scale = self.amplitude * np.exp(log - self.reference)
        return psi * scale, slope * scale

    def probability(self, row: NDArray[np.int64] | None = None, offset: Floats | None = None) -> Floats:
        """Probability in layers `row` (default: each) up to `offset` from the far face (default: the whole of it).

        Shape (places, n), without `amplitude`. From the state at the middle of the piece, where
        psi = u cos qy + m w sin(qy)/q has an even and an odd part: the cross term integrates to 0, the rest is
        positive, whether the wave oscillates, decays or both.
        """
        row = np.arange(self.kind.size) if row is None else row
        offset = self.numbers[0, row] if offset is None else offset
        psi, slope, log = self.at(row, offset / 2)
        edge, mass, rate = self.numbers[1:, row, None]
        kinetic = self.inside - edge
        mass = mass + rate * kinetic
        even, odd, growth = _squared_integrals(np.sqrt(kinetic * mass / HBAR2_2M0 + 0j), offset[:, None])
        upper, lower = _squared(psi), _squared(slope)
        total = upper * even + abs(mass) ** 2 * lower * odd
        total += HBAR2_2M0 * rate * (lower * even + abs(kinetic / HBAR2_2M0) ** 2 * upper * odd)
        return np.asarray(total * np.exp(2 * (log - self.reference) + growth))


def _squared_integrals(wave_number: Complex, length: Floats) -> tuple[Floats, Floats, Floats]:
    """Integrals of |cos qy|^2 and |sin(qy)/q|^2 over |y| < length/2, both over exp(growth), and growth.

    length/2 (sinh(z)/z +- sin(r)/r), the second over |q|^2, with z = |Im q| length and r = |Re q| length; for small
    |q| length the second is summed as a series, since there the two parts cancel.
    """
    z, r = abs(wave_number.imag) * length, abs(wave_number.real) * length
    steep, flat = np.where(z > 0, z, 1.0), np.sinc(r / np.pi) * np.exp(-z)
    rise = np.where(z > 0, -np.expm1(-2 * steep) / (2 * steep), 1.0)
    square = z * z + r * r
    near = square < 1
    series, term, power = np.zeros_like(z), np.ones_like(z), np.ones_like(z)
    p, s = np.where(near, z * z, 0.0), np.where(near, -r * r, 0.0)
    for n in range(1, 11):
        series += term / math.factorial(2 * n + 1)
        power = power * s
        term = term * p + power  # p^n + p^(n-1) s + ... + s^n
    ratio = np.where(near, series * np.exp(-z), (rise - flat) / np.where(near, 1.0, square))
    return length / 2 * (rise + flat), length**3 / 2 * ratio, z


def _incident(stack: Stack, energy: Floats, side: Side) -> _March:
    """The wave of unit flux from `side`."""
    march, factor = _outgoing(stack, energy, side), _flux_factor(_lead(stack, side), energy)
    incident = (march.psi[-1] + 1j * march.slope[-1] / factor) / 2
    return replace(march, amplitude=np.sqrt(HBAR / (2 * HBAR2_2M0 * factor.real)) / incident)


def _outgoing(stack: Stack, energy: Array, side: Side) -> _March:
    """The solution that goes out at the face away from `side`, carried towards `side`.

    The cells are passed in closed form (`cell.py`), so that a chain of opaque cells costs no digits.
    """
    _require_size(energy.size, len(stack.entry) + len(stack.cell) * stack.periods + len(stack.exit))
    inside = _inside(stack, energy)
    if side == "left":
        far, first, cell, last = stack.right, stack.exit[::-1], stack.cell[::-1], stack.entry[::-1]
    else:
        far, first, cell, last = stack.left, stack.entry, stack.cell, stack.exit
    steps = {element: element_transfer(element, inside) for element in dict.fromkeys((*first, *cell, *last))}
    one = np.ones((1, energy.size), complex)
    before, start = _carried((one, -1j * _flux_factor(far, energy) * one, np.zeros(one.shape)), first, steps)
    psis, slopes, logs = _at_cells(start, cell, inside, stack.periods + 1)
    within, _ = _carried((psis[:-1], slopes[:-1], logs[:-1]), cell, steps)
    after, end = _carried((psis[-1:], slopes[-1:], logs[-1:]), last, steps)
    psi, slope, log = (np.concatenate([*(_by_cell(part[k], energy.size) for part in (before, within, after)), end[k]])
                       for k in range(3))
    layers = [e for e in (*first, *cell * stack.periods, *last) if isinstance(e, Layer)]
    kinds = {layer: kind for kind, layer in enumerate(dict.fromkeys(layers))}
    kind = np.array([kinds[layer] for layer in layers])
    numbers = np.array([(x.thickness, x.band_edge, x.mass, x.mass * x.nonparabolicity) for x in layers]).T
    return _March(tuple(kinds), kind, numbers, inside, psi, slope, log, log[-1], 1.0, side == "left")


State = tuple[Complex, Complex, Floats]
"""psi and slope over exp(log), and log: shape (cells, n)."""


def _carried(state: State, elements: Sequence[Element], steps: Mapping[Element, Transfer]) -> tuple[list[Any], State]:
    """States at the far faces of a list's layers (three lists, a layer each), and the one behind it."""
    faces: list[Any] = [[], [], []]
    for element in elements:
        if isinstance(element, Layer):
            for face, part in zip(faces, state, strict=True):
                face.append(part)
        psi, slope, log = state
        step = steps[element]
        state = _resized(step.a * psi + step.b * slope, step.c * psi + step.d * slope, log + step.log_scale)
    return faces, state


def _resized(psi: Complex, slope: Complex, log: Floats) -> State:
    size = abs(psi) + abs(slope)
    return psi / size, slope / size, log + np.log(size)


def _at_cells(state: State, elements: tuple[Element, ...], inside: Array, count: int) -> State:
    """The states in front of `count` cells, from the one in front of the first: M^j = T_j + U_(j-1) (M - h)."""
    cell = Cell.of(transfer(elements, inside))
    swing, powers = cell.swing, cell.powers(np.arange(1, count)[:, None])
    psi, slope, log = state
    across, along = swing.a * psi + swing.b * slope, swing.c * psi + swing.d * slope
    growth = np.zeros(powers.first.shape)
    if powers.deep is not None:
        growth[powers.deep] = powers.growth
    later = _resized(psi * powers.first + across * powers.second, slope * powers.first + along * powers.second,
                     log + growth - math.log(2))
    return tuple(np.concatenate(pair) for pair in zip(state, later, strict=True))  # type: ignore[return-value]


def _by_cell(faces: list[Any], energies: int) -> Any:
    """Faces of every layer, cell after cell: from a list over layers of (cells, n) to (cells x layers, n)."""
    if not faces:
        return np.zeros((0, energies))
    return np.stack(faces, axis=1).reshape(len(faces) * faces[0].shape[0], energies)


def _inside(stack: Stack, energy: Array) -> Array:
    """The energies that the layers see, checked against the end of the one-band model."""
    inside = energy + 0.5j * stack.dephasing if stack.dephasing else energy
    require_model(stack.elements, Span.of(inside))
    return inside


def _current(stack: Stack, march: _March, places: _Places) -> Floats:
    """Flux against the march (places, n): what leaves at the far face, and what dephasing takes on the way there."""
    far, scale = stack.right if march.leftwards else stack.left, abs(march.amplitude) ** 2
    leaving = 2 * HBAR2_2M0 / HBAR * _flux_factor(far, march.inside.real).real
    leaving = leaving * abs(march.psi[0]) ** 2 * np.exp(2 * (march.log[0] - march.reference)) * scale
    if not stack.dephasing:
        return np.tile(leaving, (places.position.size, 1))
    (row, offset), held = places.seen_from(march), march.probability()
    held = (np.cumsum(held, axis=0) - held)[row] + march.probability(row, offset)
    return np.asarray(leaving + stack.dephasing / HBAR * scale * held)


def _joined(right_going: _March, left_going: _March) -> tuple[_March, _March, NDArray[np.int64]]:
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
    factor = (other.conj() * psi + bend.conj() * slope) / (_squared(other) + _squared(bend))
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

    def seen_from(self, march: _March) -> tuple[NDArray[np.int64], Floats]:
        """Row of the march and distance from that layer's far face."""
        if march.leftwards:
            row = march.kind.size - 1 - self.layer
            return row, march.numbers[0, row] - self.offset
        return self.layer, self.offset


def _places(stack: Stack, positions: ArrayLike | None, points_per_nm: float, energies: int) -> _Places:
    """The places asked for, after a check that `energies` times their number is not too much."""
    thickness = np.array([e.thickness for e in _written_out(stack, energies) if isinstance(e, Layer)])
    face = np.concatenate([[0.0], np.cumsum(thickness)])
    if positions is not None:
        position = np.atleast_1d(np.asarray(positions, dtype=float)).ravel()
        if not (np.isfinite(position).all() and (position >= 0).all() and (position <= face[-1] * (1 + 1e-12)).all()):
            raise ValueError(f"positions: every one must lie in the stack, from 0 to {face[-1]:.9g} nm")
        _require_size(energies, position.size)
        layer = np.minimum(np.searchsorted(face[1:], position), thickness.size - 1)
        return _Places(position, layer, np.clip(position - face[layer], 0.0, thickness[layer]))
    if not (math.isfinite(points_per_nm) and points_per_nm > 0):
        raise ValueError(f"points_per_nm is {points_per_nm!r}: give a number above 0")
    count = np.maximum(np.ceil(thickness * points_per_nm - 1e-9), 1)
    _require_size(energies, float(count.sum()) + 1)
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


def _squared(amplitude: Complex) -> Floats:
    return np.asarray(amplitude.real**2 + amplitude.imag**2)


def _flux_factor(lead: Lead, energy: Array) -> Complex:
    """k/m (1/nm per m0) of the wave that goes out into a lead; i kappa/m where it is closed, with m(E) continued."""
    kinetic, mass = energy - lead.band_edge, mass_at(lead, energy)
    if (np.asarray(mass).real <= 0).any():
        end = (lead.band_edge - 1 / lead.nonparabolicity) * 1e3
        raise ValueError(f"the one-band model ends at {end:.6g} meV, where a lead's mass falls to 0: ask above it")
    square = kinetic / (HBAR2_2M0 * mass) + 0j
    closed = square.real < 0
    return np.asarray(np.where(closed, 1j, 1.0) * np.sqrt(np.where(closed, -square, square)))


def _flux_factor_growth(lead: Lead, energy: Floats) -> Floats:
    """d ln(k/m)/dE (1/eV) of an open lead."""
    kinetic = energy - lead.band_edge
    return np.asarray(1 / kinetic - lead.nonparabolicity / (1 + lead.nonparabolicity * kinetic)) / 2


def _lead(stack: Stack, side: Side) -> Lead:
    return stack.left if side == "left" else stack.right


def _written_out(stack: Stack, energies: int) -> tuple[Element, ...]:
    _require_size(energies, len(stack.entry) + len(stack.cell) * stack.periods + len(stack.exit))
    return stack.entry + stack.cell * stack.periods + stack.exit


def _finite(energies: Array) -> Array:
    energy = np.atleast_1d(energies).ravel()
    if not np.isfinite(energy).all():
        raise ValueError("energies: every one must be a finite number of eV")
    return energy


def _incident_energies(stack: Stack, energies: ArrayLike, side: Side) -> Floats:
    if side not in ("left", "right"):
        raise ValueError(f"side is {side!r}: give 'left' or 'right', where the wave comes from")
    energy, edge = _finite(np.asarray(energies, dtype=float)), _lead(stack, side).band_edge
    if (energy <= edge).any():
        raise ValueError(f"energies: the {side} lead is closed below {edge:.9g} eV, ask above it")
    return energy


def _require_size(energies: int, places: float) -> None:
    if places > MOST_PLACES or energies * places > MOST_VALUES:
        raise ValueError(f"energies, positions, stack: {energies:,} energies at {places:,.0f} places are more than "
                         f"{MOST_PLACES:,} places or {MOST_VALUES:,} values: ask for fewer")
