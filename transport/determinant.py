"""The outgoing-wave determinant on the complex plane: its zeros are the poles of the scattering matrix.

    f(E) = g_R a + g_L d + i (c - g_L g_R b)

for the total transfer matrix [[a, b], [c, d]], N periods in closed form (`cell.py`), with g = k/m continued from the
real axis of a strip: k = sqrt(E - V) in a lead that is open there, i sqrt(V - E) in one that is closed, principal
roots. Masses that depend on energy are continued too.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from transport.cell import Cell
from transport.propagation import Span, flux_factor, transfer
from transport.structure import Stack

Complexes = NDArray[np.complex128]
Floats = NDArray[np.float64]

_ASIDE = 1e-9
"""Share of a strip by which it keeps aside of a lead's edge, where f branches and may vanish."""
_THINNEST = 1e-12  # eV: leads whose edges differ by less open together
_ROUNDING = 1e-16
"""Share of its terms that a determinant is off."""


@dataclass(frozen=True, slots=True)
class Strip:
    """A range of energy (eV) within which no lead opens: `left_open`, `right_open` hold for the whole of it.

    `low_fixed`, `high_fixed`: that end is (a hair beside) a lead's edge, and cannot be moved across it.
    `around`: the strip with a tenth more at ends that can be moved.
    """

    low: float
    high: float
    left_open: bool
    right_open: bool
    low_fixed: bool
    high_fixed: bool
    around: tuple[float, float]


def strips(stack: Stack, low: float, high: float) -> list[Strip]:
    """The range (eV) cut at the leads' edges; what lies below both leads is left out."""
    edges = sorted({stack.left.band_edge, stack.right.band_edge})
    begin = max(low, edges[0])
    cuts = [begin, *(edge for edge in edges if begin < edge < high), high]
    found = []
    for a, b in pairwise(cuts):
        if b - a < _THINNEST:
            continue
        aside = _ASIDE * (b - a)
        below, above = a + aside * (a in edges), b - aside * (b in edges)
        beyond = (max([a - 0.1 * (b - a), *(edge + aside for edge in edges if edge <= a)]),
                  min([b + 0.1 * (b - a), *(edge - aside for edge in edges if edge >= b)]))
        found.append(Strip(below, above, stack.left.band_edge <= a, stack.right.band_edge <= a, a in edges, b in edges,
                           beyond))
    return found


@dataclass(frozen=True, slots=True)
class Determinant:
    """f over exp(`log_scale`) at each energy.

    `terms`: the sum of the sizes of its terms, of which rounding leaves a share of 1e-16. `across` and `back`: psi
    behind the stack for a wave of 1 that goes out on the left, and the reverse. All over the same scale.
    """

    value: Complexes
    terms: Floats
    across: Complexes
    back: Complexes
    log_scale: Floats


def determinant(stack: Stack, strip: Strip, energy: Complexes) -> Determinant:
    """f at complex energies (eV, shape (n,)) of a lossless stack."""
    span = Span.of(energy)
    cell = Cell.of(transfer(stack.cell, energy, span))
    powers = cell.powers(stack.periods)
    entry, exit_ = transfer(stack.entry, energy, span), transfer(stack.exit, energy, span)
    left = flux_factor(stack.left, energy, strip.left_open)
    right = left if stack.right == stack.left else flux_factor(stack.right, energy, strip.right_open)
    plain, swing = exit_ @ entry, exit_ @ cell.swing @ entry
    log = np.zeros(energy.size) + np.asarray(swing.log_scale)
    if powers.deep is not None:
        log[powers.deep] += powers.growth
    a, b, c, d = ((getattr(plain, name) * powers.first + getattr(swing, name) * powers.second) / 2 for name in "abcd")
    parts = (right * a, left * d, 1j * c, -1j * left * right * b)
    value, terms = sum(parts), sum(abs(part) for part in parts)
    return Determinant(np.asarray(value), np.asarray(terms), a - 1j * left * b, d - 1j * right * b, log)


def newton_step(stack: Stack, strip: Strip, z: Complexes, h: Floats) -> tuple[Complexes, Floats]:
    """f/f', and the distance (eV) that rounding may shift a zero.

    f' is a difference over `h`: far less than what separates zeros, it bends the path and not its end.
    """
    found = determinant(stack, strip, np.concatenate([z, z + h]))
    here, there = np.split(found.value, 2)
    at, beside = np.split(found.log_scale, 2)
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        slope = (there * np.exp(beside - at) - here) / h
        return np.asarray(here / slope), np.asarray(_ROUNDING * found.terms[: z.size] / abs(slope))
