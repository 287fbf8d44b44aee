"""What a finite stack lets through: transmission, reflection and phase over energy."""

from __future__ import annotations

import math
from collections.abc import Callable
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from transport.cell import Powers
from transport.chain import Amplitude, Chain, Envelope
from transport.narrow import NARROWEST, NarrowPeaks, narrow_peaks
from transport.oscillation import Floats, absolute_phase, zeros
from transport.sampling import resolve
from transport.structure import Stack

MOST_PEAKS = 20_000
"""Peaks that a chosen-energies spectrum resolves; beyond, it gives the envelope."""

_TOLERANCE = 8e-4  # of T at the thirds of an interval; where T is smooth its thirds then miss by an eighth of it
_DECADES = 0.05  # the same for log10 T, so that a logarithmic plot is smooth too, down to this share of the range:
_SMALLEST_SHARE = 1e-5
_LEAST_TOP = 1e-6  # T of a peak below which it is not worth a point at its top


class Spectrum:
    """Transmission and what belongs to it at each energy, computed when first asked for.

    `energy` (eV, counted from the left lead's edge) has the shape the energies were given in, and so has every
    result. `envelope` is set only where there are too many peaks to resolve one by one, `narrow` only where some are
    too narrow for doubles and drawn from their poles; `note` then says so.
    """

    def __init__(
        self, stack: Stack, energy: Floats, envelope: Envelope | None = None, note: str = "",
        narrow: NarrowPeaks | None = None,
    ) -> None:
        self.stack, self.energy, self.envelope, self.note, self.narrow = stack, energy, envelope, note, narrow
        self._chain = Chain(stack, energy.ravel())

    def __repr__(self) -> str:
        return f"Spectrum({self.energy.size} energies, {self.stack.periods} periods)"

    @cached_property
    def _powers(self) -> Powers:
        return self._chain.powers(self.stack.periods)

    @cached_property
    def _denominator(self) -> Amplitude:
        return self._chain.denominator(self._powers)

    def _shaped(self, values: Any) -> Floats:
        result = np.asarray(values).reshape(self.energy.shape)
        result.flags.writeable = False
        return result

    @cached_property
    def from_pole(self) -> NDArray[np.bool_]:
        """Where T comes from the pole of a peak that is too narrow for doubles."""
        covered = np.zeros(self.energy.shape, bool) if self.narrow is None else self.narrow.covers(self.energy)
        covered.flags.writeable = False
        return covered

    def _with_narrow(self, sampled: Floats, drawn: Callable[[Floats], Floats]) -> Floats:
        """Values with those at narrow peaks put in their place; `drawn` makes them of T there."""
        if self.narrow is None:
            return sampled
        return self._shaped(np.where(self.from_pole, drawn(self.narrow.transmission(self.energy)), sampled))

    @cached_property
    def transmission(self) -> Floats:
        """T, from 0 to 1; 0 where a lead is closed. Below 1e-308 it is 0: read log10_transmission."""
        return self._with_narrow(self._sampled_transmission, lambda passed: passed)

    @cached_property
    def _sampled_transmission(self) -> Floats:
        chain, periods = self._chain, self.stack.periods
        alive = chain.cell.passing(periods)
        if alive is None:
            return self._shaped(chain.transmission(self._denominator))
        part, result = chain.at(alive), np.zeros(chain.energy.shape)
        result[alive] = part.transmission(part.denominator(part.powers(periods)))
        return self._shaped(result)

    @cached_property
    def reflection(self) -> Floats:
        """R, from its own amplitude; 1 where a lead is closed (with dephasing, less: what was absorbed is lost)."""
        reflected = self._shaped(self._chain.reflection(self._powers, self._denominator))
        return self._with_narrow(reflected, lambda passed: 1 - passed)

    @cached_property
    def absorption(self) -> Floats:
        """A = 1 - T - R: what dephasing takes from the coherent part; 0 without dephasing."""
        if not self.stack.dephasing:
            return self._shaped(np.zeros(self.energy.shape))
        return self._shaped(np.maximum(1.0 - self.transmission - self.reflection, 0.0))

    @cached_property
    def log10_transmission(self) -> Floats:
        """log10 T, finite however small T is; -inf where a lead is closed."""
        return self._with_narrow(self._shaped(self._chain.log10_transmission(self._denominator)), np.log10)

    @cached_property
    def phase(self) -> Floats:
        """arg t between the outer faces (radians), unwrapped in energy; NaN where a lead is closed.

        Absolute for a lossless stack. With dephasing it is unwrapped along ascending energies.
        """
        argument, chain = self._denominator.argument, self._chain
        if self.stack.dephasing:
            order = np.argsort(chain.energy)
            phase = np.empty_like(chain.energy)
            phase[order] = np.unwrap(-argument[order])
        else:
            phase = absolute_phase(chain, argument, zeros(chain, self.stack.periods, self._powers))
        return self._shaped(np.where(chain.open, phase, np.nan) if chain.some_closed else phase)


def spectrum(
    stack: Stack, energies: ArrayLike | None = None, *, between: tuple[float, float] | None = None
) -> Spectrum:
    """Spectrum of a stack at given energies (eV, any shape), or `between` two energies at energies it chooses.

    Chosen energies miss no peak, however narrow, each peak is sampled at its top, and joining them by straight lines is
    within 1e-3 of T everywhere. Peaks narrower than 1e-11 eV are drawn from their poles (`narrow`, `from_pole`): their
    height is that of the pole, their place that of the nearest double. At energies given, T of such a peak is wrong.
    Above 20,000 peaks the envelope's two sides come with them, and `note` says so. Raises ValueError for energies
    that are not finite, a range that is reversed, and where the one-band model ends.
    """
    if (energies is None) == (between is None):
        raise ValueError("energies, between: give exactly one of the two")
    if energies is not None:
        energy = np.asarray(energies, dtype=float)
        if not np.isfinite(energy).all():
            raise ValueError("energies: every one must be a finite number of eV")
        return Spectrum(stack, energy)
    assert between is not None
    return _chosen(stack, *between)


def transmission_map(stack: Stack, energies: ArrayLike, periods: ArrayLike) -> Floats:
    """log10 T of the stack with each of several numbers of periods: shape (periods, energies), -inf where closed."""
    chain = Chain(stack, np.asarray(energies, dtype=float).ravel())
    counts = np.asarray(periods, dtype=np.int64).reshape(-1, 1)
    return np.asarray(chain.log10_transmission(chain.denominator(chain.powers(counts))))


def _chosen(stack: Stack, low: float, high: float) -> Spectrum:
    if not (math.isfinite(low) and math.isfinite(high) and low < high):
        raise ValueError(f"between is ({low!r}, {high!r}): give two finite energies in eV, the lower one first")
    threshold = max(stack.left.band_edge, stack.right.band_edge)
    if high <= threshold:
        return Spectrum(stack, np.array([low, high]))
    begin, still = max(low, threshold), stack.lossless()
    ends = np.array([begin, high])
    chain = Chain(still, ends)
    peaks = int(np.diff(zeros(chain, stack.periods))[0])
    if peaks > MOST_PEAKS:
        return _enveloped(stack, low, begin, high, peaks)
    samples = resolve(still, np.array([stack.periods]), ends[:1], ends[1:], start=129)
    energy = _topped(stack, _straightened(stack, samples.energy))
    narrow = None if stack.dephasing else narrow_peaks(still, samples.energy)
    if narrow is not None:
        energy = np.unique(np.concatenate([energy[~narrow.covers(energy)], _within(narrow.points(), begin, high)]))
    energy = energy if begin == low else np.concatenate([[low], energy])
    return Spectrum(stack, energy, None, _narrow_note(narrow), narrow)


def _within(energy: Floats, low: float, high: float) -> Floats:
    return energy[(energy >= low) & (energy <= high)]


def _narrow_note(narrow: NarrowPeaks | None) -> str:
    if narrow is None:
        return ""
    many = "1 peak is" if narrow.energy.size == 1 else f"{narrow.energy.size:,} peaks are"
    doubt = "" if narrow.certified else "; that these are all of them is not certified"
    return f"{many} narrower than {NARROWEST:g} eV and drawn from the poles{doubt}"


def _topped(stack: Stack, energy: Floats) -> Floats:
    """The energies with the top of every peak added: near a pole 1/T is a parabola."""
    passed = Spectrum(stack, energy).transmission
    here = passed[1:-1]
    middle = 1 + np.flatnonzero((here >= passed[:-2]) & (here > passed[2:]) & (here > _LEAST_TOP))
    at, value = energy[middle], 1 / passed[middle]
    before, after = energy[middle - 1] - at, energy[middle + 1] - at
    rise, fall = 1 / passed[middle - 1] - value, 1 / passed[middle + 1] - value
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        off = (rise * after**2 - fall * before**2) / (2 * (rise * after - fall * before))
    sound = np.isfinite(off) & (off > before) & (off < after)
    return np.unique(np.concatenate([energy, (at + np.where(sound, off, 0.0))]))


def _straightened(stack: Stack, energy: Floats) -> Floats:
    """More energies, until T at both thirds of every interval lies on the straight line between its ends.

    Two points, because a curve that bends one way and back crosses its chord at the middle.
    """
    value, log = _both(stack, energy)
    pending, smallest = np.arange(energy.size - 1), _SMALLEST_SHARE * (energy[-1] - energy[0])
    while pending.size:
        begin, step = energy[pending], (energy[pending + 1] - energy[pending]) / 3
        third = np.column_stack([begin + step, begin + 2 * step])
        passed, decades = (a.reshape(third.shape) for a in _both(stack, third.ravel()))
        bent = _off_chord(value, pending, passed) > _TOLERANCE
        bent |= (_off_chord(log, pending, decades) > _DECADES) & (step > smallest)
        bent &= (third[:, 0] > begin) & (third[:, 1] > third[:, 0]) & (third[:, 1] < energy[pending + 1])
        places = np.repeat(pending + 1, 2)
        energy, value, log = (
            np.insert(a, places, b.ravel()) for a, b in ((energy, third), (value, passed), (log, decades))
        )
        first = (pending + 2 * np.arange(pending.size))[bent]
        pending = np.concatenate([first, first + 1, first + 2])
        pending.sort()
    keep = np.concatenate([[True], np.diff(energy) > 0])
    return np.asarray(energy[keep])


def _off_chord(values: Floats, where: NDArray[np.int64], at_thirds: Floats) -> Floats:
    """Largest distance from the chord at the two thirds of each interval."""
    left, right = values[where, None], values[where + 1, None]
    return np.asarray(abs(at_thirds - (left + (right - left) * np.array([1 / 3, 2 / 3]))).max(axis=1))


def _both(stack: Stack, energy: Floats) -> tuple[Floats, Floats]:
    """T and log10 T, the latter never below -300 (where a lead closes it falls without end)."""
    found = Spectrum(stack, energy)
    return found.transmission, np.maximum(found.log10_transmission, -300.0)


def _enveloped(stack: Stack, low: float, begin: float, high: float, peaks: int) -> Spectrum:
    """T at evenly spaced energies with the envelope's two sides, for more peaks than can be drawn."""
    energy = np.unique(np.concatenate([[low], np.linspace(begin, high, 20_001)]))
    note = (
        f"{peaks:,} peaks lie in this range, more than the {MOST_PEAKS:,} that are resolved one by one: "
        "the envelope's two sides are given, between which T swings"
    )
    return Spectrum(stack, energy, Chain(stack.lossless(), energy).envelope, note)
