"""Where to sample a spectrum so that nothing is missed: steps of the transmission phase, not of the energy.

Every resonance, however narrow, takes arg t through half a turn, and arg t is known absolutely
(`oscillation.absolute_phase`). Cutting each interval until the phase advances by no more than an eighth of a turn
across it therefore finds every peak, and leaves T smooth in between.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from transport.chain import Chain
from transport.oscillation import Floats, absolute_phase, rotation, zeros
from transport.structure import Stack

PHASE_STEP = np.pi / 4
_MOST_PARTS = 16


@dataclass(frozen=True, slots=True)
class Samples:
    """Points of several spectra laid end to end: `row` says which one (ascending), `energy` ascends within a row."""

    row: NDArray[np.int64]
    energy: Floats
    phase: Floats

    @property
    def joined(self) -> NDArray[np.bool_]:
        """True where a point and the next belong to the same row: the intervals."""
        return np.asarray(self.row[1:] == self.row[:-1])


def transmission_phase(stack: Stack, energy: Floats, periods: Any) -> Floats:
    """arg t (radians, unwrapped) of the lossless stack at each energy, for each count of periods."""
    chain = Chain(stack, energy)
    powers = chain.powers(periods)
    argument = chain.denominator(powers).argument
    return np.asarray(absolute_phase(chain, argument, zeros(chain, periods, powers, rotation(chain))))


def resolve(
    stack: Stack, periods: NDArray[np.int64], low: Floats, high: Floats, start: int
) -> Samples:
    """Sample each row (a number of periods and an open range, eV) until no step hides a resonance.

    `stack` must be lossless. An interval of neighbouring doubles is left as it is, however far the phase steps.
    """
    share = np.linspace(0, 1, start)
    row = np.repeat(np.arange(periods.size), start)
    energy = (low[:, None] * (1 - share) + high[:, None] * share).ravel()
    samples = Samples(row, energy, transmission_phase(stack, energy, periods[row]))
    while True:
        advance = abs(np.diff(samples.phase))
        here, after = samples.energy[:-1], samples.energy[1:]
        coarse = samples.joined & (advance > PHASE_STEP) & (np.nextafter(here, after) < after)
        if not coarse.any():
            return samples
        where = np.flatnonzero(coarse)
        parts = np.clip(np.ceil(advance[where] / PHASE_STEP), 2, _MOST_PARTS).astype(np.int64)
        finer = _refined(stack, periods, samples, where, parts)
        if finer.energy.size == samples.energy.size:  # only doubles that are there already lie between
            return samples
        samples = finer


def _refined(
    stack: Stack, periods: NDArray[np.int64], samples: Samples, where: NDArray[np.int64], parts: NDArray[np.int64]
) -> Samples:
    """The samples with the intervals `where` cut into `parts` equal parts."""
    added = np.repeat(where, parts - 1)
    step = np.arange(added.size) - np.repeat(np.cumsum(parts - 1) - (parts - 1), parts - 1) + 1
    share = step / np.repeat(parts, parts - 1)
    energy = samples.energy[added] * (1 - share) + samples.energy[added + 1] * share
    energy = np.clip(energy, samples.energy[added], samples.energy[added + 1])  # rounding may step outside
    row = samples.row[added]
    phase = transmission_phase(stack, energy, periods[row])
    return merged(samples, row, energy, phase)


def merged(samples: Samples, row: NDArray[np.int64], energy: Floats, phase: Floats) -> Samples:
    """The samples with more points put in their places, repeated points dropped."""
    row, energy = np.concatenate([samples.row, row]), np.concatenate([samples.energy, energy])
    order = np.lexsort((energy, row))
    row, energy, phase = row[order], energy[order], np.concatenate([samples.phase, phase])[order]
    fresh = np.ones(row.size, dtype=bool)
    fresh[1:] = (row[1:] != row[:-1]) | (energy[1:] != energy[:-1])
    return Samples(row[fresh], energy[fresh], phase[fresh])
