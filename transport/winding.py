"""Counting poles without finding them: how often the outgoing-wave determinant turns around a region.

The argument principle: an analytic function without poles turns as often around 0, along the edge of a region, as it
has zeros inside (Delves and Lyness, Math. Comp. 21, 543 (1967); Kravanja and Van Barel (2000)). No pole of the
scattering matrix lies above the real axis, so the edge is drawn well above it, where nothing is narrow: it crosses
the axis at its two ends only, and a state of 1e-15 eV is counted like any other.

Nothing of the engine's arithmetic is used, not even the layer matrix: plane waves are matched from layer to layer,
each amplitude exact to its own rounding however deep below the axis, and N cells multiplied out by squaring.
"""

from __future__ import annotations

import cmath
import math
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from transport.constants import HBAR2_2M0
from transport.propagation import mass_at
from transport.structure import Delta, Element, Layer, Lead, Stack

Complexes = NDArray[np.complex128]
Floats = NDArray[np.float64]
Matrix = NDArray[np.complex128]
"""Shape (2, 2, n)."""

_LARGEST_TURN = math.pi / 3
_MOST_POINTS = 400_000


@dataclass(frozen=True, slots=True)
class Box:
    """A rectangle of complex energy (eV): `low` to `high`, from `depth` below the real axis to `height` above it.

    A negative `height` leaves the axis out. `left_open`, `right_open`: which lead carries current on its axis.
    """

    low: float
    high: float
    depth: float
    height: float
    left_open: bool
    right_open: bool


def poles_within(stack: Stack, box: Box) -> int | None:
    """How many poles lie in the box; None where no count can be given: the edge runs through a pole.

    The edge is sampled until f turns by less than a sixth of a turn from point to point, and then once more at half
    the distance: the count must stay.
    """
    edge = np.concatenate([side[:-1] for side in _sides(stack, box)])
    edge = np.append(edge, edge[0])
    direction = _turned(stack, box, edge)
    before = None
    while True:
        if np.isnan(direction).any():
            return None
        step = np.angle(direction[1:] * direction[:-1].conj())
        coarse = ~(abs(step) < _LARGEST_TURN)
        if not coarse.any():
            count = round(float(step.sum()) / (2 * math.pi))
            if count == before:
                return count
            before, coarse = count, np.ones(step.size, dtype=bool)
        where = np.flatnonzero(coarse)
        middle = (edge[where] + edge[where + 1]) / 2
        if edge.size + middle.size > _MOST_POINTS or np.any((middle == edge[where]) | (middle == edge[where + 1])):
            return None
        edge = np.insert(edge, where + 1, middle)
        direction = np.insert(direction, where + 1, _turned(stack, box, middle))


def _sides(stack: Stack, box: Box) -> list[Complexes]:
    """The four sides, each with points enough for the waves that fit into the stack."""
    low, high, bottom, top = box.low, box.high, -1j * box.depth, 1j * box.height
    corners = [low + bottom, high + bottom, high + top, low + top, low + bottom]
    sides = []
    for begin, end in pairwise(corners):
        turn = abs(_optical_phase(stack, begin) - _optical_phase(stack, end))
        share = np.linspace(0, 1, 24 + math.ceil(turn / _LARGEST_TURN))
        if begin.imag != end.imag and box.height > 0:  # crowded where the side crosses the axis
            axis = begin.imag / (begin.imag - end.imag)
            ladder = np.geomspace(1e-12, 1, 40)
            share = np.unique(np.concatenate([share, axis * (1 - ladder), axis + (1 - axis) * ladder]))
        sides.append(np.asarray(begin + (end - begin) * share, dtype=np.complex128))
    return sides


def _optical_phase(stack: Stack, energy: complex) -> complex:
    """The phase that plane waves gather through all layers."""
    def through(elements: Sequence[Element]) -> complex:
        return sum((cmath.sqrt((energy - e.band_edge) * complex(mass_at(e, np.array(energy))) / HBAR2_2M0) * e.thickness
                    for e in elements if isinstance(e, Layer)), 0j)

    return through(stack.entry + stack.exit) + stack.periods * through(stack.cell)


def _turned(stack: Stack, box: Box, energy: Complexes) -> Complexes:
    """f over its size at each point: the wave that comes in on the right of one that only goes out on the left."""
    media = _Media(energy)
    left, right = (media.lead(lead, is_open) for lead, is_open in
                   ((stack.left, box.left_open), (stack.right, box.right_open)))
    core = media.swiftest(stack.cell)
    cells = _power(media.through(core, stack.cell, core), stack.periods)
    total = _product([cells, media.through(left, stack.entry, core)])
    value = right * _product([media.through(core, stack.exit, right), total])[1, 1]
    with np.errstate(invalid="ignore"):  # no direction at a zero: the edge runs through a pole
        return np.asarray(value / abs(value), dtype=np.complex128)


class _Media:
    """Plane waves at given energies: matrices on the amplitudes (onward, back), scaled by any positive number."""

    def __init__(self, energy: Complexes) -> None:
        self.energy = energy
        self.one = np.ones_like(energy)
        self.phases: dict[Layer, Matrix] = {}

    def lead(self, lead: Lead, is_open: bool) -> Complexes:
        """k/m of a lead, going out."""
        square = (self.energy - lead.band_edge) / (HBAR2_2M0 * mass_at(lead, self.energy))
        return np.asarray(np.sqrt(square) if is_open else 1j * np.sqrt(-square))

    def flux(self, layer: Layer) -> Complexes:
        """k/m of a layer; at its band edge, where its two waves are one, that of 1e-12 eV above."""
        kinetic = self.energy - layer.band_edge
        kinetic = np.where(abs(kinetic) < 1e-12, 1e-12, kinetic)
        return np.asarray(np.sqrt(kinetic / (HBAR2_2M0 * mass_at(layer, self.energy))))

    def swiftest(self, elements: Sequence[Element]) -> Complexes:
        """k/m of the layer where it is largest at each energy: far from 0, where its waves would be hard to tell."""
        fluxes = np.array([self.flux(element) for element in elements if isinstance(element, Layer)])
        return np.asarray(fluxes[abs(fluxes).argmax(axis=0), np.arange(self.energy.size)])

    def through(self, begin: Complexes, elements: Sequence[Element], end: Complexes) -> Matrix:
        """A list of layers and deltas between media of k/m `begin` and `end`."""
        total, here = self._step(begin, begin), begin
        for element in elements:
            if isinstance(element, Delta):
                total = _product([self._kick(element, here), total])
                continue
            beyond = self.flux(element)
            phase = self.phases.setdefault(element, self._phase(element, beyond))
            total, here = _product([phase, _product([self._step(here, beyond), total])]), beyond
        return _product([self._step(here, end), total])

    def _step(self, here: Complexes, beyond: Complexes) -> Matrix:
        ratio = here / beyond
        return np.asarray(np.array([[1 + ratio, 1 - ratio], [1 - ratio, 1 + ratio]]) / 2, dtype=np.complex128)

    def _kick(self, delta: Delta, here: Complexes) -> Matrix:
        turn = delta.strength / HBAR2_2M0 / (2j * here)
        return np.array([[1 + turn, turn], [-turn, 1 - turn]], dtype=np.complex128)

    def _phase(self, layer: Layer, flux: Complexes) -> Matrix:
        turn = 1j * flux * mass_at(layer, self.energy) * layer.thickness
        size = abs(turn.real)
        return np.array([[np.exp(turn - size), 0 * turn], [0 * turn, np.exp(-turn - size)]])


def _power(matrix: Matrix, count: int) -> Matrix:
    """The matrix to a whole power, by squaring."""
    result = None
    while True:
        if count & 1:
            result = matrix if result is None else _product([matrix, result])
        count >>= 1
        if not count:
            assert result is not None
            return result
        matrix = _product([matrix, matrix])


def _product(pair: list[Matrix]) -> Matrix:
    """Two matrices multiplied, brought to size 1."""
    ((a, b), (c, d)), ((e, f), (g, h)) = pair
    product = np.array([[a * e + b * g, a * f + b * h], [c * e + d * g, c * f + d * h]])
    return np.asarray(product / np.abs(product).max(axis=(0, 1)))
