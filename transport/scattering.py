"""Scattering matrices: what a piece of a stack does to waves that arrive from either side.

Every piece refers to one fixed real flux factor g0 on both sides, so it is defined inside barriers and at closed
leads alike; the last steps go over to the leads' own factors. Redheffer's star product (J. Math. Phys. 41, 1 (1962))
joins pieces: nothing grows, and a lossless matrix stays unitary, which is a check for free.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from transport.chain import Chain
from transport.propagation import IDENTITY, Transfer
from transport.structure import Stack

Complex = NDArray[np.complex128]


@dataclass(frozen=True, slots=True)
class Scattering:
    """Flux-normalised amplitudes at each energy, shape (n,), convention exp(ikx - i omega t), between outer faces.

    `reflection` for a wave from the left, `reflection_back` for one from the right; `transmission`, the same from
    both sides, is to be multiplied by exp(log_transmission), which stays finite when the product underflows.
    """

    reflection: Complex
    transmission: Complex
    reflection_back: Complex
    log_transmission: Any = 0.0

    def __matmul__(self, right: Scattering) -> Scattering:
        """Redheffer star product: this piece with another on its right."""
        loop = 1 / (1 - self.reflection_back * right.reflection)
        with np.errstate(under="ignore"):
            there = self.transmission**2 * np.exp(2 * np.asarray(self.log_transmission))
            back = right.transmission**2 * np.exp(2 * np.asarray(right.log_transmission))
        return Scattering(
            self.reflection + there * right.reflection * loop,
            self.transmission * right.transmission * loop,
            right.reflection_back + back * self.reflection_back * loop,
            self.log_transmission + right.log_transmission,
        )

    @property
    def unitarity_defect(self) -> NDArray[np.float64]:
        """Largest deviation of |r|^2 + |t|^2 from 1, from either side, at each energy."""
        with np.errstate(under="ignore"):
            through = abs(self.transmission) ** 2 * np.exp(2 * np.asarray(self.log_transmission))
        sides = abs(self.reflection) ** 2, abs(self.reflection_back) ** 2
        return np.asarray(np.maximum(*(abs(side + through - 1) for side in sides)))


def of_transfer(m: Transfer, reference: float) -> Scattering:
    """Scattering matrix of a transfer matrix between media of the same real flux factor (1/nm per m0)."""
    across, along = reference * m.b, m.c / reference
    denominator = m.a + m.d + 1j * (along - across)
    lean, both = m.d - m.a, -1j * (along + across)
    return Scattering((lean + both) / denominator, 2 / denominator, (both - lean) / denominator, -m.log_scale)


def step(left: Any, right: Any) -> Scattering:
    """The interface between media of flux factors `left` and `right`, one of which may be imaginary (closed)."""
    reflection = (left - right) / (left + right)
    return Scattering(reflection, 2 * np.sqrt(left * right + 0j) / (left + right), -reflection)


def scattering_matrix(stack: Stack, energies: ArrayLike) -> Scattering:
    """Scattering matrix of a whole stack between its leads, at energies (eV) where both leads are open.

    Composed by star products of the entry layers, the N cells (in closed form) and the exit layers. Raises
    ValueError for an energy at or below a lead's edge, where no wave arrives.
    """
    chain = Chain(stack, np.atleast_1d(np.asarray(energies, dtype=float)).ravel())
    if not chain.open.all():
        edge = max(stack.left.band_edge, stack.right.band_edge)
        raise ValueError(f"energies: both leads carry waves only above {edge * 1e3:.6g} meV, ask above it")
    reference = float(np.median(chain.left.real)) if chain.energy.size else 1.0
    pieces = [chain.entry, _cells(chain), chain.exit]
    total = step(chain.left, reference)
    for piece in pieces:
        if piece is not IDENTITY:
            total = total @ of_transfer(piece, reference)
    return total @ step(reference, chain.right)


def _cells(chain: Chain) -> Transfer:
    """Transfer matrix of all N cells."""
    powers, swing = chain.powers(chain.stack.periods), chain.cell.swing
    growth = np.zeros(chain.energy.shape)
    if powers.deep is not None:
        growth[powers.deep] = powers.growth
    first, second = powers.first / 2, powers.second / 2
    return Transfer(first + swing.a * second, swing.b * second, swing.c * second, first - swing.a * second, growth)
