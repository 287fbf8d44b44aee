"""States bound below both leads, counted before they are looked for.

A state that decays on both sides minimises a quadratic form, so the number of them below E is the number of Dirichlet
eigenvalues below E plus the number of negative eigenvalues of

    [[a/b + kappa_L, -1/b], [-1/b, d/b + kappa_R]],        determinant f/b, trace (a + d)/b + kappa_L + kappa_R,

which takes the values of psi at both faces to what the slopes there lack (Morse's index; kappa over the lead's mass).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from transport.chain import Chain
from transport.constants import HBAR2_2M0
from transport.determinant import Floats
from transport.oscillation import first_reaching, rotation, zeros
from transport.propagation import mass_at
from transport.structure import Lead, Stack


def bound_states(stack: Stack, low: float, high: float) -> Floats:
    """Energies (eV) of the states of a lossless stack bound below both leads, from `low` to `high`."""
    top = np.nextafter(min(high, stack.left.band_edge, stack.right.band_edge), -np.inf)
    if not low < top:
        return np.zeros(0)
    before, behind = bound_count(stack, np.array([low, top]))
    levels = np.arange(before + 1, behind + 1)
    return first_reaching(lambda energy: bound_count(stack, energy), levels, low, top) if levels.size else np.zeros(0)


def bound_count(stack: Stack, energy: Floats) -> NDArray[np.int64]:
    """Bound states below each energy (eV, shape (n,), all below both leads)."""
    chain = Chain(stack, energy)
    powers = chain.powers(stack.periods)
    plain, swing = chain.around
    a, b, c, d = (np.asarray(getattr(plain, name) * powers.first + getattr(swing, name) * powers.second)
                  for name in "abcd")
    left, right = closed_lead(stack.left, energy), closed_lead(stack.right, energy)
    sign = np.where(b < 0, -1.0, 1.0)
    determinant = (c + left * d + right * a + left * right * b) * sign
    trace = (a + d + (left + right) * b) * sign
    negative = np.where(determinant < 0, 1, np.where(trace < 0, 2, 0))
    return np.asarray(zeros(chain, stack.periods, powers, rotation(chain)) + negative, dtype=np.int64)


def closed_lead(lead: Lead, energy: Floats) -> Floats:
    """kappa over the mass (1/nm per m0) of a lead at energies below its edge."""
    return np.asarray(np.sqrt((lead.band_edge - energy) / (HBAR2_2M0 * mass_at(lead, energy))))
