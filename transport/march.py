"""A solution carried through a whole stack from the face where it only goes out, its size held as a logarithm.

A wave grows towards its source, so carried from its far face nothing cancels. The state is (psi, psi'/m), as in
`propagation.py`. A layer is its own mirror image: marching leftwards is marching rightwards through the reversed list,
the sign of psi'/m turned. The cells are passed in closed form (`cell.py`), so that opaque cells cost no digits.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from transport.cell import Cell
from transport.constants import HBAR2_2M0
from transport.oscillation import Floats
from transport.propagation import (
    IDENTITY,
    Array,
    Span,
    Transfer,
    element_transfer,
    flux_factor,
    require_model,
    transfer,
)
from transport.structure import Element, Layer, Lead, Stack

Complex = NDArray[np.complex128]
Side = Literal["left", "right"]

MOST_VALUES, MOST_PLACES = 10_000_000, 100_000
"""Values (energies times places) that one call computes at most, and places (positions, or layers) at most."""


@dataclass(frozen=True, slots=True)
class March:
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
        upper, lower = squared(psi), squared(slope)
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


def outgoing(stack: Stack, energy: Array, side: Side) -> March:
    """The solution that goes out at the face away from `side`, carried towards `side`.

    Raises ValueError for more values than MOST_VALUES, and where the one-band model ends.
    """
    require_size(energy.size, len(stack.entry) + len(stack.cell) * stack.periods + len(stack.exit))
    inside = inside_energy(stack, energy)
    if side == "left":
        far, first, cell, last = stack.right, stack.exit[::-1], stack.cell[::-1], stack.entry[::-1]
    else:
        far, first, cell, last = stack.left, stack.entry, stack.cell, stack.exit
    steps = {element: element_transfer(element, inside) for element in dict.fromkeys((*first, *cell, *last))}
    one = np.ones((1, energy.size), complex)
    before, start = _carried((one, -1j * open_flux_factor(far, energy) * one, np.zeros(one.shape)), first, steps)
    psis, slopes, logs = _at_cells(start, cell, inside, stack.periods + 1)
    within, _ = _carried((psis[:-1], slopes[:-1], logs[:-1]), cell, steps)
    after, end = _carried((psis[-1:], slopes[-1:], logs[-1:]), last, steps)
    psi, slope, log = (np.concatenate([*(_by_cell(part[k], energy.size) for part in (before, within, after)), end[k]])
                       for k in range(3))
    layers = [e for e in (*first, *cell * stack.periods, *last) if isinstance(e, Layer)]
    kinds = {layer: kind for kind, layer in enumerate(dict.fromkeys(layers))}
    kind = np.array([kinds[layer] for layer in layers])
    numbers = np.array([(x.thickness, x.band_edge, x.mass, x.mass * x.nonparabolicity) for x in layers]).T
    return March(tuple(kinds), kind, numbers, inside, psi, slope, log, log[-1], 1.0, side == "left")


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


def inside_energy(stack: Stack, energy: Array) -> Array:
    """The energies that the layers see, checked against the end of the one-band model."""
    inside = energy + 0.5j * stack.dephasing if stack.dephasing else energy
    require_model(stack.elements, Span.of(inside))
    return inside


def squared(amplitude: Complex) -> Floats:
    return np.asarray(amplitude.real**2 + amplitude.imag**2)


def open_flux_factor(lead: Lead, energy: Array) -> Complex:
    """k/m of the wave that goes out into a lead. Raises ValueError where the lead's mass falls to 0."""
    if lead.nonparabolicity and (lead.band_edge - 1 / lead.nonparabolicity >= np.asarray(energy).real).any():
        end = (lead.band_edge - 1 / lead.nonparabolicity) * 1e3
        raise ValueError(f"the one-band model ends at {end:.6g} meV, where a lead's mass falls to 0: ask above it")
    return flux_factor(lead, energy)


def lead_at(stack: Stack, side: Side) -> Lead:
    return stack.left if side == "left" else stack.right


def written_out(stack: Stack, energies: int) -> tuple[Element, ...]:
    require_size(energies, len(stack.entry) + len(stack.cell) * stack.periods + len(stack.exit))
    return stack.entry + stack.cell * stack.periods + stack.exit


def require_size(energies: int, places: float) -> None:
    if places > MOST_PLACES or energies * places > MOST_VALUES:
        raise ValueError(f"energies, positions, stack: {energies:,} energies at {places:,.0f} places are more than "
                         f"{MOST_PLACES:,} places or {MOST_VALUES:,} values: ask for fewer")
