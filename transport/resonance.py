"""Resonances, complete: the poles of the scattering matrix with widths, partial widths and a certificate.

Each pole takes arg t through half a turn on the real axis, so arg t says where to begin; all are then polished at once
on the complex plane (Newton's method with the deflation of Aberth, Math. Comp. 27, 339 (1973)). What was found is
compared with an independent count (`winding.py`), and where the two differ the region is split and searched anew.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from transport.chain import Chain
from transport.constants import HBAR
from transport.determinant import Complexes, Floats, Strip, newton_step, strips
from transport.lattice import default_range, lattice_bands
from transport.leaks import log_widths
from transport.levels import bound_states
from transport.narrow import NARROWEST
from transport.oscillation import rotation
from transport.sampling import transmission_phase
from transport.seeds import seeds
from transport.structure import Stack
from transport.winding import Box, poles_within

MOST_RESONANCES = 5_000
"""Resonances listed at most."""

_MOST_STEPS = 60
_MOST_SPLITS = 10
_SETTLED = 1e-8  # share of the distance to the next pole: the error is of second order in the step
_STALLED = 1e-4  # share of that distance within which a step that no longer halves is rounding
_UNTOLD = 1e-14  # eV: poles nearer to each other may not be told apart
_ABOVE = 1e-13  # eV: no pole lies above the axis by more than rounding
_BLURRED = 1e-6  # eV: a zero that rounding may shift by more is rounding itself
_NEIGHBOURS = 24  # poles on either side that deflate


@dataclass(frozen=True, slots=True)
class PoleCertificate:
    """Whether a ledger is complete: `counted` around the region, `found` in it.

    `open_regions`: ranges of energy (eV) in which the two differ, or nothing could be counted.
    """

    counted: int
    found: int
    open_regions: tuple[tuple[float, float], ...] = ()

    @property
    def complete(self) -> bool:
        """Whether every pole of the region is in the list."""
        return self.counted == self.found and not self.open_regions

    @property
    def sentence(self) -> str:
        """The certificate in words."""
        if self.complete:
            return f"certified: {self.counted} counted, {self.found} found"
        where = ", ".join(f"{low:.9g} to {high:.9g} eV" for low, high in self.open_regions)
        return f"not certified: {self.counted} counted, {self.found} found; open: {where or 'the whole range'}"


@dataclass(frozen=True)
class Resonances:
    """The resonances of a stack in a range, ascending in energy: read-only arrays of shape (n,).

    `energy` and `width` (eV): E_r and -2 Im E; `width_left`, `width_right` (eV): what leaks to either lead;
    `log10_width`: finite also where `width` is held at the smallest double. `peak_transmission`: T at E_r; where
    `from_pole`, too narrow for doubles, 4 G_L G_R / (G_L + G_R)^2 instead. `miniband`: index of the band of the
    infinite lattice it lies in (0: in a gap), `number` within it from 1. `bound`: states bound below both leads (eV).

    Resonances nearer to each other than 1e-14 eV are all listed, but doubles cannot tell how they share their widths.
    """

    stack: Stack
    between: tuple[float, float]
    energy: Floats
    width: Floats
    log10_width: Floats
    width_left: Floats
    width_right: Floats
    peak_transmission: Floats
    from_pole: NDArray[np.bool_]
    miniband: NDArray[np.int64]
    number: NDArray[np.int64]
    bound: Floats
    certificate: PoleCertificate

    @cached_property
    def index(self) -> NDArray[np.int64]:
        """1, 2, 3 ..."""
        return _held(np.arange(1, self.energy.size + 1))

    @cached_property
    def lifetime(self) -> Floats:
        """hbar / width (s)."""
        return _held(np.asarray(HBAR / self.width))


def resonances(stack: Stack, between: tuple[float, float] | None = None) -> Resonances:
    """Every resonance of a stack with its real energy in `between` (eV) and a width up to the range's extent.

    Default range: `lattice.default_range`. Below one lead's edge a resonance leaks to the other lead only; below both
    states are bound and listed as such. With dephasing, the poles of the same stack without it. Raises ValueError for
    a range that is reversed or not finite, for more than 5,000 resonances, and where the one-band model ends.
    """
    still = stack.lossless()
    low, high = between if between is not None else default_range(still)
    if not (math.isfinite(low) and math.isfinite(high) and low < high):
        raise ValueError(f"between is ({low!r}, {high!r}): give two finite energies in eV, the lower one first")
    parts = [(strip, _certified(still, strip, (high - low) / 2)) for strip in strips(still, low, high)]
    poles = np.concatenate([np.zeros(0, complex), *(found.poles for _, found in parts)])
    logs = [log_widths(still, strip, found.poles) for strip, found in parts]
    left, right = (np.concatenate([np.zeros(0), *(pair[side] for pair in logs)]) for side in (0, 1))
    certificate = PoleCertificate(sum(found.counted for _, found in parts), poles.size,
                                  _joined([region for _, found in parts for region in found.open_regions]))
    return _ledger(still, (low, high), poles.real.copy(), left, right, certificate)


def _joined(regions: list[tuple[float, float]]) -> tuple[tuple[float, float], ...]:
    """Regions, those that touch made one."""
    joined: list[tuple[float, float]] = []
    for low, high in sorted(regions):
        if joined and joined[-1][1] >= low:
            low, before = joined.pop()
            high = max(high, before)
        joined.append((low, high))
    return tuple(joined)


def _ledger(
    stack: Stack, between: tuple[float, float], energy: Floats, left: Floats, right: Floats,
    certificate: PoleCertificate,
) -> Resonances:
    """All that is told of resonances, from their energies and the logarithms of their partial widths."""
    log = np.logaddexp(left, right)
    width = np.maximum(np.exp(log), np.finfo(float).tiny)
    heights, from_pole = _heights(stack, energy, width, left - log)
    miniband, number = _numbered(stack, energy, between[0])
    arrays = (energy, width, log / math.log(10), np.exp(left), np.exp(right), heights, from_pole, miniband, number,
              bound_states(stack, *between))
    for values in arrays:
        _held(values)
    return Resonances(stack, between, *arrays, certificate)


def _held(values: NDArray[Any]) -> NDArray[Any]:
    """The same array, from now on read-only."""
    values.flags.writeable = False
    return values


# Finding and certifying.

@dataclass(frozen=True, slots=True)
class _Found:
    poles: Complexes
    counted: int
    open_regions: tuple[tuple[float, float], ...] = ()


def _certified(stack: Stack, strip: Strip, depth: float) -> _Found:
    """The poles of a strip, down to `depth` (eV) below the axis, with what the count around them says."""
    poles = _polished(stack, strip, depth, seeds(stack, strip, MOST_RESONANCES))
    found = _settled(stack, strip, depth, _box(strip, depth, poles), poles, _MOST_SPLITS)
    return replace(found, poles=found.poles[np.argsort(found.poles.real)])


def _settled(stack: Stack, strip: Strip, depth: float, box: Box, known: Complexes, splits: int) -> _Found:
    """The poles in a box of a strip, once finding and counting agree, or what remains open."""
    inside, counted = _inside(known, box), poles_within(stack, box)
    if counted != inside.size and splits:
        if counted is None or counted > inside.size:
            known = _polished(stack, strip, depth, _grid(box), known)
        else:
            known = _without_repeats(known, box, inside.size - counted)
        inside = _inside(known, box)
    if counted == inside.size:
        return _Found(inside, counted)
    if not splits:
        return _Found(inside, counted or 0, ((box.low, box.high),))
    parts = [_settled(stack, strip, depth, half, known, splits - 1) for half in _halves(box, known)]
    return _Found(np.concatenate([part.poles for part in parts]), sum(part.counted for part in parts),
                  tuple(region for part in parts for region in part.open_regions))


def _without_repeats(poles: Complexes, box: Box, excess: int) -> Complexes:
    """The poles without `excess` ones of a box that cannot be told from their neighbour: found from two guesses."""
    inside = _inside(poles, box)
    gap = np.abs(np.diff(inside))
    nearest = np.argsort(gap)[:excess]
    return np.asarray(poles[~np.isin(poles, inside[nearest[gap[nearest] < _UNTOLD]])])


def _inside(poles: Complexes, box: Box) -> Complexes:
    kept = (poles.real >= box.low) & (poles.real < box.high) & (poles.imag > -box.depth)
    return np.asarray(poles[kept & (poles.imag <= box.height)] if box.height < 0 else poles[kept])


def _halves(box: Box, poles: Complexes) -> tuple[Box, Box]:
    """A box cut across its longer side, clear of the known poles in it."""
    inside, top = _inside(poles, box), max(0.0, -box.height)
    wide, deep = box.high - box.low, box.depth - top
    if wide >= deep:
        cut = _clear(inside.real, (box.low + box.high) / 2, wide / 4)
        return replace(box, high=cut), replace(box, low=cut)
    cut = _clear(-inside.imag, (top + box.depth) / 2, deep / 4)
    return replace(box, depth=cut), replace(box, height=-cut)


def _box(strip: Strip, depth: float, poles: Complexes) -> Box:
    """The box of a strip, its sides moved off the poles without changing which of them lie inside."""
    room = strip.high - strip.low
    low = strip.low if strip.low_fixed else _clear(poles.real, strip.low, room)
    high = strip.high if strip.high_fixed else _clear(poles.real, strip.high, room)
    return Box(low, high, _clear(-poles.imag, depth, depth), depth, strip.left_open, strip.right_open)


def _clear(values: Floats, target: float, room: float) -> float:
    """A number near `target` with the same values on either side of it, and well clear of them."""
    below, above = values[values < target], values[values >= target]
    low = float(below.max()) if below.size else target - room
    high = float(above.min()) if above.size else target + room
    margin = min(0.3 * (high - low), 0.01 * room)
    return float(np.clip(target, low + margin, high - margin))


def _grid(box: Box) -> Complexes:
    """Guesses spread over a box, for what the phase does not tell."""
    top = max(0.0, -box.height)
    across, down = np.meshgrid(np.linspace(box.low, box.high, 9)[1:-1],
                               top + (box.depth - top) * np.array([0.05, 0.2, 0.5, 0.8]))
    return np.asarray((across - 1j * down).ravel())


def _polished(
    stack: Stack, strip: Strip, depth: float, start: Complexes, known: Complexes | None = None
) -> Complexes:
    """The poles that guesses lead to, besides those already `known`; ascending in energy, `known` ones among them."""
    poles = np.zeros(0, complex) if known is None else known
    z, (low, high) = start.copy(), strip.around
    settled, reach = np.zeros(z.size, dtype=bool), max(high - low, depth) / 4
    lost, before = settled.copy(), np.full(z.size, np.inf)
    for _ in range(_MOST_STEPS):
        active = np.flatnonzero(~settled)
        if not active.size:
            break
        apart = _apart(np.concatenate([z, poles]), active)
        nearest = np.abs(apart).min(axis=1, initial=reach)
        step = np.clip(1e-6 * nearest, 1e-13, 1e-8)
        newton, noise = newton_step(stack, strip, z[active], step)
        with np.errstate(divide="ignore", invalid="ignore"):
            move = newton / (1 - newton * (1 / apart).sum(axis=1))
        move = np.where(np.isfinite(move), move, nearest / 2)
        size = np.abs(move)
        z[active] -= move * np.minimum(1.0, reach / np.maximum(size, 1e-300))
        settled[active] = size < np.maximum(_SETTLED * nearest, 4e-16 * np.abs(z[active]))
        settled[active] |= (size < _STALLED * nearest) & (size > before[active] / 2)
        settled[active] &= np.abs(newton) < np.maximum(0.1 * nearest, _UNTOLD)  # not merely kept apart by others
        before[active] = size
        lost[active] = (abs(z[active].real - (low + high) / 2) > 4 * reach) | (abs(z[active].imag) > 8 * reach)
        # Deep below the axis of a stack that reflects next to nothing, even the slope is only rounding over the step.
        blurred = (noise > _BLURRED) | ((noise > 0.1 * step) & (abs(z[active].imag) > 0.01 * reach))
        lost[active] |= settled[active] & blurred
        settled |= lost
    good = settled & ~lost & (z.imag < _ABOVE) & (z.real > low) & (z.real < high)
    found = np.concatenate([poles, z[good]])
    return np.asarray(found[np.argsort(found.real)])


def _apart(z: Complexes, active: NDArray[np.int64]) -> Complexes:
    """Differences (active, neighbours) of each active point to those beside it in energy; inf for want of one."""
    order = np.argsort(z.real)
    rank = np.empty(z.size, dtype=np.int64)
    rank[order] = np.arange(z.size)
    offset = np.concatenate([np.arange(-_NEIGHBOURS, 0), np.arange(1, _NEIGHBOURS + 1)])
    beside = rank[active][:, None] + offset
    there = (beside >= 0) & (beside < z.size)
    return np.asarray(np.where(there, z[active][:, None] - z[order[np.where(there, beside, 0)]], np.inf))


# What each is.

def _heights(
    stack: Stack, energy: Floats, width: Floats, log_share: Floats
) -> tuple[Floats, NDArray[np.bool_]]:
    """T at each resonance, and where it had to come from the pole."""
    chain = Chain(stack, energy)
    value = np.asarray(chain.transmission(chain.denominator(chain.powers(stack.periods))), dtype=float)
    from_pole = (width < NARROWEST) & chain.open
    share = np.exp(log_share)
    return np.where(from_pole, 4 * share * abs(np.expm1(log_share)), np.minimum(value, 1.0)), from_pole


def _numbered(stack: Stack, energy: Floats, low: float) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Miniband, and number within it: the rank, and for a band that begins below `low` what arg t says came before."""
    turning = rotation(Chain(stack, energy))
    miniband = np.where(turning.passing, np.floor(turning.turns) + 1, 0).astype(np.int64)
    number = np.zeros(energy.size, np.int64)
    for band in np.unique(miniband[miniband > 0]):
        inside = np.flatnonzero(miniband == band)
        number[inside] = np.arange(1, inside.size + 1) + _before(stack, int(band), low)
    return miniband, number


def _before(stack: Stack, band: int, low: float) -> int:
    """Resonances of a miniband below `low`, by the half turns of arg t."""
    at = rotation(Chain(stack, np.array([low])))
    if not at.passing[0] or math.floor(at.turns[0]) + 1 != band:
        return 0
    (found,) = (b for b in lattice_bands(stack, (low, low + 1e-9)).bands if b.index == band)
    begin = max(found.bottom, stack.left.band_edge, stack.right.band_edge)
    phase = transmission_phase(stack, np.array([min(begin, low), low]), stack.periods)
    return max(0, int(np.rint(abs(phase[1] - phase[0]) / math.pi)))
