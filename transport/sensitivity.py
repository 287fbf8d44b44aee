"""What moves a resonance: exact derivatives of its energy and width, from the wave at the pole itself.

A pole makes the functional

    F = int [ C (2 u psi' - m u^2) + (V - E) psi^2 ] dx - i C (g_L psi(0)^2 + g_R psi(L)^2),     u = psi'/m,

stationary, and F = 0 there; so dE/dp = -(dF/dp) / (dF/dE) with psi held, to first order and without any difference
quotient (Hellmann and Feynman's theorem for outgoing waves; the norm is that of Zel'dovich, Sov. Phys. JETP 12, 542
(1961), both from memory, the formulas derived here). psi^2 is not |psi|^2: energy and width move together,
d(width) = -2 Im dE. Within a layer Q = (V - E) psi^2 - C m u^2 is the same everywhere, and is dF/d(thickness).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from transport.constants import HBAR2_2M0
from transport.oscillation import Floats
from transport.propagation import Transfer, element_transfer, flux_factor, mass_at
from transport.structure import Delta, Element, Layer, Lead, Stack

Complexes = NDArray[np.complex128]

_FLAT = 1.0  # (V - E) m d^2 / C below which Gauss's rule is the better
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(12)


@dataclass(frozen=True, slots=True)
class Slopes:
    """dE/dp (complex eV per unit) of each pole, shape (poles, elements of the stack: entry, cell, exit).

    A layer of the cell stands for that layer in every period. `thickness` per nm, `band_edge` per eV, `mass` per m0
    of the mass at the band edge, `nonparabolicity` per 1/eV, `strength` per eV nm; 0 where an element has none.
    """

    thickness: Complexes
    band_edge: Complexes
    mass: Complexes
    nonparabolicity: Complexes
    strength: Complexes


def pole_slopes(stack: Stack, poles: ArrayLike) -> Slopes:
    """The derivatives of poles (complex eV, lossless stack, shape (n,)) with respect to every layer.

    Raises ValueError for energies that are not finite. Source: see the module.
    """
    energy = np.atleast_1d(np.asarray(poles, dtype=complex))
    if not np.isfinite(energy).all():
        raise ValueError("poles: every one must be a finite complex energy in eV")
    elements = stack.entry + stack.cell * stack.periods + stack.exit
    psi, flux = _faces(stack, elements, energy)
    norm = 1j * HBAR2_2M0 * (_flux_slope(stack.left, energy) * psi[0] ** 2
                             + _flux_slope(stack.right, energy) * psi[-1] ** 2)
    size = len(stack.elements)
    slopes = Slopes(*(np.zeros((size, energy.size), dtype=complex) for _ in range(5)))
    for place, element in enumerate(elements):
        row = _row(stack, place)
        if isinstance(element, Delta):
            slopes.strength[row] += psi[place] ** 2
            continue
        start = (psi[place], flux[place])
        end = (psi[place + 1], flux[place + 1])
        density, kinetic = _integrals(element, energy, start, end)
        rate = element.mass * element.nonparabolicity
        mass = mass_at(element, energy)
        slopes.thickness[row] += (element.band_edge - energy) * start[0] ** 2 - HBAR2_2M0 * mass * start[1] ** 2
        slopes.band_edge[row] += density + rate * kinetic
        slopes.mass[row] -= mass / element.mass * kinetic
        slopes.nonparabolicity[row] -= element.mass * (energy - element.band_edge) * kinetic
        norm += density + rate * kinetic
    parts = (slopes.thickness, slopes.band_edge, slopes.mass, slopes.nonparabolicity, slopes.strength)
    return Slopes(*((part / norm).T for part in parts))


def _row(stack: Stack, place: int) -> int:
    """Which of `stack.elements` stands at a place of the unrolled stack."""
    before, cell = len(stack.entry), len(stack.cell)
    if place < before:
        return place
    behind = place - before - cell * stack.periods
    return before + cell + behind if behind >= 0 else before + (place - before) % cell


def _flux_slope(lead: Lead, energy: Complexes) -> Complexes:
    """dg/dE of a lead."""
    mass = mass_at(lead, energy)
    rate = lead.mass * lead.nonparabolicity
    factor = flux_factor(lead, energy)
    return np.asarray((1 / mass - (energy - lead.band_edge) * rate / mass**2) / (2 * HBAR2_2M0 * factor))


def _faces(stack: Stack, elements: Sequence[Element], energy: Complexes) -> tuple[Complexes, Complexes]:
    """psi and u at every face of the unrolled stack, (faces, n), outgoing at both ends.

    Carried inwards from both ends, where the true solution is the one that grows, and joined where the product of
    both is largest. Any common factor.
    """
    steps = {element: element_transfer(element, energy) for element in dict.fromkeys(elements)}
    left = _carried([steps[e] for e in elements], -1j * flux_factor(stack.left, energy))
    back = [_inverse(steps[e]) for e in reversed(elements)]
    right = tuple(part[::-1] for part in _carried(back, 1j * flux_factor(stack.right, energy)))
    weight = [np.log(abs(psi) ** 2 + abs(u) ** 2 + 1e-300) / 2 + log for psi, u, log in (left, right)]
    join = np.argmax(weight[0] + weight[1], axis=0)
    rows, here = np.arange(len(elements) + 1)[:, None], (join, np.arange(energy.size))
    inner = left[0][here].conj() * right[0][here] + left[1][here].conj() * right[1][here]
    turn = (inner / (abs(right[0][here]) ** 2 + abs(right[1][here]) ** 2)).conj()
    ahead = rows <= join
    scale = np.exp(np.where(ahead, left[2] - left[2][here], right[2] - right[2][here]))
    psi = np.where(ahead, left[0], right[0] * turn) * scale
    flux = np.where(ahead, left[1], right[1] * turn) * scale
    return psi, flux


def _inverse(step: Transfer) -> Transfer:
    """The matrix that carries the other way; its scale stays that of growth."""
    return Transfer(step.d, -step.b, -step.c, step.a, step.log_scale)


def _carried(steps: Sequence[Transfer], flux: Complexes) -> tuple[Complexes, Complexes, Floats]:
    """psi and u from psi = 1 and a given u through all steps, each over exp(logarithm): three arrays (faces, n)."""
    psi, log = np.ones_like(flux), np.zeros(flux.size)
    rows = [(psi, flux, log)]
    for step in steps:
        psi, flux = step.a * psi + step.b * flux, step.c * psi + step.d * flux
        size = np.hypot(abs(psi), abs(flux))
        psi, flux, log = psi / size, flux / size, log + step.log_scale + np.log(size)
        rows.append((psi, flux, log))
    return tuple(np.array(part) for part in zip(*rows, strict=True))  # type: ignore[return-value]


def _integrals(
    layer: Layer, energy: Complexes, start: tuple[Complexes, Complexes], end: tuple[Complexes, Complexes]
) -> tuple[Complexes, Complexes]:
    """int psi^2 and C int u^2 over a layer, from psi and u at its faces.

    d(psi u)/dx = m u^2 + (V - E) psi^2 / C together with the constant Q gives both; near E = V, where that loses
    digits, Gauss's rule on the wave within.
    """
    mass, depth = mass_at(layer, energy), layer.band_edge - energy
    constant = depth * start[0] ** 2 - HBAR2_2M0 * mass * start[1] ** 2
    change = HBAR2_2M0 * (end[0] * end[1] - start[0] * start[1])
    flat = abs(depth * mass) * layer.thickness**2 < _FLAT * HBAR2_2M0
    density = (constant * layer.thickness + change) / (2 * np.where(flat, 1.0, depth))
    kinetic = (change - constant * layer.thickness) / (2 * mass)
    if flat.any():
        density[flat], kinetic[flat] = _by_gauss(layer, energy[flat], start[0][flat], start[1][flat])
    return density, kinetic


def _by_gauss(layer: Layer, energy: Complexes, psi: Complexes, flux: Complexes) -> tuple[Complexes, Complexes]:
    density, kinetic = np.zeros_like(psi), np.zeros_like(psi)
    for node, weight in zip((_NODES + 1) / 2, _WEIGHTS / 2, strict=True):
        part = element_transfer(replace(layer, thickness=layer.thickness * float(node)), energy)
        density += weight * layer.thickness * (part.a * psi + part.b * flux) ** 2
        kinetic += weight * layer.thickness * HBAR2_2M0 * (part.c * psi + part.d * flux) ** 2
    return density, kinetic
