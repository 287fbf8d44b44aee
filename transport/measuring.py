"""What a beam of finite energy resolution measures: transmission convolved with the beam's Gaussian."""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import ArrayLike, NDArray

from transport.chain import Chain
from transport.numerics import gauss_nodes, row_minima
from transport.oscillation import Floats
from transport.sampling import resolve
from transport.structure import Stack

FWHM_PER_SIGMA = 2 * math.sqrt(2 * math.log(2))
_REACH = 9.0  # standard deviations; what lies beyond weighs less than 1e-17
_STEPS_PER_SIGMA = 2
_GRADES = 12


@dataclass(frozen=True, slots=True)
class Measured:
    """A curve known by weighted nodes (eV, weights times T), seen through a Gaussian of standard deviation `sigma`."""

    node: Floats
    weight: Floats
    sigma: float

    def at(self, energy: Floats) -> Floats:
        """The measured curve at energies (n,)."""
        result, reach = np.empty(energy.size), _REACH * self.sigma
        parts = min(energy.size, 1 + int(np.ptp(energy) / (2 * self.sigma))) if energy.size else 0
        for part in np.array_split(np.argsort(energy), parts) if parts else ():
            here = energy[part]
            near = slice(*np.searchsorted(self.node, [here[0] - reach, here[-1] + reach]))
            apart = (here[:, None] - self.node[near]) / self.sigma
            result[part] = np.exp(-0.5 * apart * apart) @ self.weight[near]
        return result / (self.sigma * math.sqrt(2 * math.pi))

    def mean(self, low: float, high: float) -> float:
        """The plain mean of the measured curve over a window."""
        from scipy.special import ndtr

        inside = ndtr((high - self.node) / self.sigma) - ndtr((low - self.node) / self.sigma)
        return float(inside @ self.weight) / (high - low)

    def extremum(self, low: float, high: float, largest: bool) -> tuple[float, float]:
        """Least (or largest) value of the measured curve in a window, and its energy."""
        sign = -1.0 if largest else 1.0
        steps = max(16, math.ceil((high - low) / self.sigma * 4))
        energy = np.linspace(low, high, steps + 1)
        row = np.zeros(energy.size, dtype=np.int64)
        least, place = row_minima(lambda _, e: sign * self.at(e), row, energy, sign * self.at(energy))
        return sign * float(least[0]), float(place[0])


def measured_curves(
    stack: Stack, counts: NDArray[np.int64], low: float, high: float, resolution: float
) -> list[Measured]:
    """The transmission with each number of periods, measurable between two energies (eV) at a resolution (eV FWHM)."""
    sigma = resolution / FWHM_PER_SIGMA
    begin = max(low - _REACH * sigma, stack.left.band_edge, stack.right.band_edge)
    end = high + _REACH * sigma
    if end <= begin:
        return [Measured(np.zeros(1), np.zeros(1), sigma)] * counts.size
    start = math.ceil((end - begin) / sigma * _STEPS_PER_SIGMA) + 2
    samples = resolve(stack.lossless(), counts, np.full(counts.size, begin), np.full(counts.size, end), start)
    joined = np.flatnonzero(samples.joined)
    row, bottom, top = samples.row[joined], samples.energy[joined], samples.energy[joined + 1]
    edge = max(stack.left.band_edge, stack.right.band_edge)
    row, bottom, top = _graded(row, bottom, top, edge)
    node, weight = _edge_nodes(bottom, top, edge)
    row = np.repeat(row, node.shape[1])
    chain = Chain(stack, node.ravel())
    value = np.minimum(chain.transmission(chain.denominator(chain.powers(counts[row]))), 1.0) * weight.ravel()
    ends = np.searchsorted(row, np.arange(counts.size + 1))
    return [Measured(node.ravel()[i:j], value[i:j], sigma) for i, j in pairwise(ends)]


def _graded(
    row: NDArray[np.int64], low: Floats, high: Floats, edge: float
) -> tuple[NDArray[np.int64], Floats, Floats]:
    """Intervals, ascending by row, those that begin at a lead's edge cut ever finer towards it.

    The other lead's edge may lie a hair below: there T bends as closely to this one.
    """
    first = np.flatnonzero(low == edge)
    cut = edge + (high[first, None] - edge) * 4.0 ** np.arange(-_GRADES, 0)
    place, row_there = np.repeat(first + 1, _GRADES), np.repeat(row[first], _GRADES)
    upper = np.column_stack([cut[:, 1:], high[first]])
    high = high.copy()
    high[first] = cut[:, 0]
    return (np.insert(row, place, row_there), np.insert(low, place, cut.ravel()),
            np.insert(high, place, upper.ravel()))


def _edge_nodes(low: Floats, high: Floats, edge: float) -> tuple[Floats, Floats]:
    """Gauss nodes and weights (intervals, nodes) in u with E = edge + u^2: T is smooth in u where a lead opens."""
    begin = np.sqrt(low - edge)[:, None]
    extent = (high - low)[:, None] / (begin + np.sqrt(high - edge)[:, None])  # sqrt(high) - sqrt(low), uncancelled
    share, weight = gauss_nodes(np.zeros(1), np.ones(1))
    step = extent * share
    return low[:, None] + step * (2 * begin + step), weight * extent * 2 * (begin + step)


def measured_transmission(stack: Stack, energies: ArrayLike, resolution: float) -> Floats:
    """T as a beam of Gaussian resolution (eV, full width at half maximum) would measure it, at energies (eV).

    0 gives T itself. Energies below a lead's edge count as T = 0. Raises ValueError for a negative resolution.
    """
    energy = np.asarray(energies, dtype=float)
    if not (math.isfinite(resolution) and resolution >= 0):
        raise ValueError(f"resolution is {resolution!r}: give a width of 0 eV or more")
    if not energy.size:
        return np.zeros(energy.shape)
    if resolution == 0:
        chain = Chain(stack, energy.ravel())
        return np.asarray(chain.transmission(chain.denominator(chain.powers(stack.periods)))).reshape(energy.shape)
    counts = np.array([stack.periods])
    (measured,) = measured_curves(stack, counts, float(energy.min()), float(energy.max()), resolution)
    return measured.at(energy.ravel()).reshape(energy.shape)
