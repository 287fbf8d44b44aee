"""Where poles are to be expected: a scattering phase on the real axis steps by pi over each, the steeper the narrower.

Between two open leads the phase is arg t. With one lead closed nothing is transmitted, and it is the phase of what the
open lead reflects: that of the solution which decays in the closed one. Either is known absolutely from a count of
zeros (`oscillation.py`), so no resonance can hide between two samples.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from transport.chain import Chain
from transport.determinant import Complexes, Floats, Strip
from transport.levels import closed_lead
from transport.oscillation import rotation, zeros
from transport.sampling import PHASE_STEP, transmission_phase
from transport.structure import Stack

_FIRST, _MOST_PARTS = 33, 16


def seeds(stack: Stack, strip: Strip, most: int) -> Complexes:
    """Guesses (eV) of the poles of a strip. Raises ValueError for more than `most`."""
    energy, phase = _sampled(stack, strip)
    slope = abs(np.diff(phase)) / np.diff(energy)
    lowest = np.flatnonzero((slope[1:-1] <= slope[:-2]) & (slope[1:-1] < slope[2:])) + 1
    ends = np.concatenate([[0], lowest, [energy.size - 1]])
    advance = abs(np.diff(phase[ends]))
    count = np.where(advance > math.pi / 4, np.maximum(1, np.rint(advance / math.pi)), 0).astype(int)
    if (total := int(count.sum())) > most:
        raise ValueError(f"between holds some {total:,} resonances, more than the {most:,} that are listed: "
                         "narrow the range")
    share = np.concatenate([np.zeros(0), *((np.arange(n) + 0.5) / n for n in count if n)])
    segment = np.repeat(np.arange(count.size), count)
    wanted = phase[ends][segment] + share * np.diff(phase[ends])[segment]
    place = np.clip(np.searchsorted(phase, wanted) - 1, 0, slope.size - 1)
    step = np.diff(phase)[place]
    within = (wanted - phase[place]) / np.where(step > 0, step, 1.0)
    centre = energy[place] + np.clip(within, 0.0, 1.0) * np.diff(energy)[place]
    return np.asarray(centre - 1j / np.maximum(slope[place], 1e-3))


def _sampled(stack: Stack, strip: Strip) -> tuple[Floats, Floats]:
    """Energies and phases, cut until no step is above an eighth of a turn or two energies are neighbours."""
    energy = np.linspace(*strip.around, _FIRST)
    phase = _phase(stack, strip, energy)
    while True:
        advance = abs(np.diff(phase))
        where = np.flatnonzero(advance > PHASE_STEP)
        parts = np.clip(np.ceil(advance[where] / PHASE_STEP), 2, _MOST_PARTS).astype(np.int64)
        added = np.repeat(where, parts - 1)
        share = (_ranks(parts - 1) + 1) / np.repeat(parts, parts - 1)
        fresh = np.setdiff1d(energy[added] + share * (energy[added + 1] - energy[added]), energy)
        if not fresh.size:
            return energy, phase
        order = np.argsort(all_ := np.concatenate([energy, fresh]))
        energy, phase = all_[order], np.concatenate([phase, _phase(stack, strip, fresh)])[order]


def _ranks(counts: NDArray[np.int64]) -> NDArray[np.int64]:
    """0, 1 ... n - 1 for each of the counts."""
    return np.arange(counts.sum()) - np.repeat(np.cumsum(counts) - counts, counts)


def _phase(stack: Stack, strip: Strip, energy: Floats) -> Floats:
    """The phase (radians, unwrapped) that tells resonances in a strip."""
    if strip.left_open and strip.right_open:
        return transmission_phase(stack, energy, stack.periods)
    chain = Chain(stack, energy)
    powers = chain.powers(stack.periods)
    plain, swing = chain.around
    a, b, c, d = (plain * powers.first + swing * powers.second for plain, swing in zip(
        (plain.a, plain.b, plain.c, plain.d), (swing.a, swing.b, swing.c, swing.d), strict=True))
    if strip.left_open:  # seen from the right: the same stack entered from the other side
        a, d = d, a
    decay = closed_lead(stack.right if strip.left_open else stack.left, energy)
    psi, slope = a + decay * b, c + decay * d
    count = zeros(chain, stack.periods, powers, rotation(chain)) + ((psi < 0) != (b < 0))
    raw = -np.arctan2(slope, (chain.left if strip.left_open else chain.right) * psi)
    return np.asarray(raw + 2 * np.pi * np.rint((count - raw / np.pi) / 2))
