"""Peaks too narrow for doubles: their height and shape come from the pole.

Two neighbouring doubles near 0.1 eV lie 1.4e-17 eV apart, and the rounding of a stack's matrix shifts its peaks by some
ten times that: at a peak narrower than 1e-11 eV sampled T is wrong in its height, above 1 even. Near an isolated pole
E_r - i G/2 the exact T is that of Breit and Wigner, T_r / (1 + (2 (E - E_r) / G)^2), to a share of order G over the
distance to the next pole (Breit and Wigner, Phys. Rev. 49, 519 (1936)).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from transport.oscillation import Floats
from transport.structure import Stack

NARROWEST = 1e-11
"""Width (eV) below which a peak is drawn from its pole."""

_FINE = 5e-12  # eV: samples nearer to each other stand on such a peak
_TOGETHER, _MARGIN = 1e-6, 1e-9  # eV: samples of one region, and the room around it
_REACH = 20.0  # widths either side that are drawn from the pole; T is 6e-4 there
_POINTS = 161  # for each peak, evenly in the angle of the resonance: within 1e-3 of T when joined by straight lines


@dataclass(frozen=True, slots=True)
class NarrowPeaks:
    """Peaks drawn from their poles: `energy` and `width` (eV), `height` (T at the peak), shape (n,), ascending.

    `certified`: whether the poles of every region they were looked for in are known to be complete.
    """

    energy: Floats
    width: Floats
    height: Floats
    certified: bool

    def points(self) -> Floats:
        """Energies (eV) at which the peaks are drawn: each at its top, down both sides, and at the nearest doubles."""
        angle = np.linspace(-1, 1, _POINTS) * np.arctan(2 * _REACH)
        sides = self.energy[:, None] + self.width[:, None] / 2 * np.tan(angle)
        doubles = self.energy + np.spacing(self.energy) * np.array([[-1], [1]])
        return np.unique(np.concatenate([sides.ravel(), doubles.ravel()]))

    def covers(self, energy: Floats) -> NDArray[np.bool_]:
        """Whether T at each energy (eV, ascending) comes from a pole."""
        nearest = self._nearest(energy)
        # The last point down a side may be rounded outwards.
        reach = _REACH * self.width[nearest] + 2 * np.spacing(self.energy[nearest])
        return np.asarray(abs(energy - self.energy[nearest]) <= reach)

    def transmission(self, energy: Floats) -> Floats:
        """T (Breit and Wigner) of the nearest peak at each energy (eV)."""
        nearest = self._nearest(energy)
        off = 2 * (energy - self.energy[nearest]) / self.width[nearest]
        return np.asarray(self.height[nearest] / (1 + off**2))

    def _nearest(self, energy: Floats) -> NDArray[np.int64]:
        after = np.clip(np.searchsorted(self.energy, energy), 1, max(1, self.energy.size - 1))
        if self.energy.size == 1:
            return np.zeros(energy.size, np.int64)
        left_is_nearer = energy - self.energy[after - 1] < self.energy[after] - energy
        return np.asarray(after - left_is_nearer)


def narrow_peaks(still: Stack, sampled: Floats) -> NarrowPeaks | None:
    """The peaks narrower than NARROWEST of a lossless stack; None where there is none.

    `sampled`: ascending energies (eV) as `sampling.resolve` chooses them, crowded wherever the phase of t turns fast.
    """
    from transport.resonance import resonances  # its ledger is needed for such peaks only

    steep = sampled[1:][np.diff(sampled) < _FINE]
    if not steep.size:
        return None
    first = np.concatenate([[True], np.diff(steep) > _TOGETHER])
    starts, ends = steep[first], steep[np.append(np.flatnonzero(first)[1:] - 1, steep.size - 1)]
    ledgers = [resonances(still, (low - _MARGIN, high + _MARGIN)) for low, high in zip(starts, ends, strict=True)]
    energy, width, height = (np.concatenate([getattr(found, name) for found in ledgers])
                             for name in ("energy", "width", "peak_transmission"))
    narrow = (width < NARROWEST) & (height > 0)
    if not narrow.any():
        return None
    return NarrowPeaks(energy[narrow], width[narrow], height[narrow], all(f.certificate.complete for f in ledgers))
