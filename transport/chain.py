"""How a finite stack scatters: N periods in closed form, between any end layers and leads.

With the cell matrix M, half trace h = cos phi and swing = M - h, the powers are (Chebyshev)

    M^N = T_N(h) + U_{N-1}(h) swing,

so every amplitude of entry . cell^N . exit is  (its value for exit.entry) T_N + (its value for exit.swing.entry) U.
Both values are free of N: a `Chain` holds them, and any number of periods costs the same handful of products.
Unit maxima, envelopes and the bare-stack form of Sprung, Wu and Martorell, Am. J. Phys. 61, 1118 (1993), follow.

Amplitudes refer to the outer faces, convention exp(ikx - i omega t). With lead flux factors g = k/m and total matrix
[[a, b], [c, d]]:

    F = g_R a + g_L d + i (c - g_L g_R b),    t = 2 sqrt(g_L g_R) / F,    T = |t|^2,
    r = (g_L d - g_R a - i (c + g_L g_R b)) / F,    r' = (g_R a - g_L d - i (c + g_L g_R b)) / F.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from transport.constants import HBAR2_2M0
from transport.propagation import IDENTITY, OPAQUE, Array, Transfer, mass_at, transfer
from transport.structure import Lead, Stack

LN2 = math.log(2.0)
_SURELY_OPAQUE = 30.0
"""log |h| beyond which 1/lambda is lost beside lambda = 2h in double precision."""


@dataclass(frozen=True, slots=True)
class Powers:
    """T_N and U_{N-1} of the half trace at each energy; at the places `deep` (an index), both over exp(growth)."""

    first: Any
    second: Any
    deep: tuple[Any, ...] | None = None
    growth: Any = 0.0


@dataclass(frozen=True, slots=True)
class Amplitude:
    """(even + i odd) exp(log_scale): real parts for a lossless stack, complex ones with dephasing.

    `powers`, once applied, holds the growth that is still to be multiplied in.
    """

    even: Any
    odd: Any
    log_scale: Any = 0.0
    powers: Powers | None = None

    @property
    def value(self) -> NDArray[np.complex128]:
        """even + i odd, without the scales."""
        return np.asarray(self.even + 1j * self.odd)

    @property
    def squared(self) -> Any:
        """|even + i odd|^2, without the scales."""
        if np.iscomplexobj(self.even) or np.iscomplexobj(self.odd):
            value = self.value
            return value.real**2 + value.imag**2
        return self.even * self.even + self.odd * self.odd

    @property
    def logarithm(self) -> tuple[Any, tuple[Any, ...] | None, Any]:
        """What was taken out: everywhere, and besides at some places."""
        powers = self.powers
        return (self.log_scale, None, 0.0) if powers is None else (self.log_scale, powers.deep, powers.growth)

    def at(self, powers: Powers, swing: Amplitude) -> Amplitude:
        """This amplitude (of exit.entry) with `swing` (of exit.swing.entry), for N periods."""
        return Amplitude(
            _sum(self.even, powers.first, swing.even, powers.second),
            _sum(self.odd, powers.first, swing.odd, powers.second),
            self.log_scale,
            powers,
        )


def _sum(x: Any, first: Any, y: Any, second: Any) -> Any:
    """x first + y second, where a plain 0.0 stands for a term that is absent (a bare stack, equal leads)."""
    if isinstance(y, float):
        return x * first
    if isinstance(x, float):
        return y * second
    return x * first + y * second


class Chain:
    """A stack at given energies (real, eV, shape (n,)), with all that does not depend on its number of periods.

    Methods take `periods` as a whole number, or an integer array that broadcasts against the energies.
    """

    def __init__(self, stack: Stack, energy: NDArray[np.float64]) -> None:
        self.stack, self.energy = stack, energy
        self.inside: Array = energy + 0.5j * stack.dephasing if stack.dephasing else energy
        self.left = flux_factor(stack.left, energy, bool(stack.dephasing))
        same = stack.left == stack.right
        self.right = self.left if same else flux_factor(stack.right, energy, bool(stack.dephasing))
        self.cell = transfer(stack.cell, self.inside)
        self.half_trace, self.swing, self.log_cell = _split(self.cell)
        self.sine_squared = sine_squared(self.half_trace, self.swing)
        if self.log_cell is not None:  # held back by a scale: deep in a gap, where sin^2 = -sinh^2 = -h^2
            self.sine_squared = np.where(self.log_cell > 0, -self.half_trace**2, self.sine_squared)

    @cached_property
    def entry(self) -> Transfer:
        """Transfer matrix of the entry layers."""
        return transfer(self.stack.entry, self.inside)

    @cached_property
    def exit(self) -> Transfer:
        """Transfer matrix of the exit layers."""
        return transfer(self.stack.exit, self.inside)

    @cached_property
    def around(self) -> tuple[Transfer, Transfer]:
        """exit.entry and exit.swing.entry."""
        swing = self.swing if self.entry is IDENTITY else self.swing @ self.entry
        if self.exit is IDENTITY:
            return self.entry, swing
        return self.exit if self.entry is IDENTITY else self.exit @ self.entry, self.exit @ swing

    @cached_property
    def outgoing(self) -> tuple[Amplitude, Amplitude]:
        """F for exit.entry and for exit.swing.entry."""
        plain, swing = self.around
        if swing is self.swing and self.right is self.left:
            forward = Amplitude(0.0, swing.c - (self.left * self.right) * swing.b)  # g_R lean - g_L lean = 0
        else:
            forward = _outgoing(swing, self.left, self.right)
        return _outgoing(plain, self.left, self.right), forward

    @cached_property
    def reflected(self) -> tuple[Amplitude, Amplitude]:
        """r F for exit.entry and for exit.swing.entry."""
        plain, swing = self.around
        return _reflected(plain, self.left, self.right), _reflected(swing, self.left, self.right)

    @cached_property
    def open(self) -> NDArray[np.bool_]:
        """True where both leads carry current."""
        return (self.energy > self.stack.left.band_edge) & (self.energy > self.stack.right.band_edge)

    @cached_property
    def flux(self) -> NDArray[np.float64]:
        """4 g_L g_R, 0 where a lead is closed."""
        product = 4 * (self.left * self.right)
        return np.where(self.open, product.real, 0.0) if np.iscomplexobj(product) else product

    def powers(self, periods: Any) -> Powers:
        """T_N(h) and U_{N-1}(h), without overflow however many periods stand in a gap."""
        deep = self._deep(periods)
        if deep is None:
            return Powers(*chebyshev(self.half_trace, self.sine_squared, periods))
        near, far = np.nonzero(~deep), np.nonzero(deep)
        first, second = (np.empty(deep.shape, self.half_trace.dtype) for _ in range(2))
        first[near], second[near] = chebyshev(*self._at(near, periods))
        first[far], second[far], growth = self._asymptotic(far, periods)
        return Powers(first, second, far, growth)

    def _deep(self, periods: Any) -> NDArray[np.bool_] | None:
        """Where lambda^N would overflow (None: nowhere): the growth is then kept as a logarithm."""
        size = abs(self.half_trace)
        limit = np.cosh(np.minimum(OPAQUE / np.asarray(periods), 300.0))
        if self.log_cell is None and (not size.size or size.max() <= limit.min()):
            return None
        deep: NDArray[np.bool_] = size > limit
        return deep if self.log_cell is None else deep | (self.log_cell > 0)

    def _at(self, where: tuple[Any, ...], periods: Any) -> tuple[Array, Array, Any]:
        """Half trace, sin^2 and periods at the chosen places of the broadcast shape."""
        count = np.asarray(periods)
        if count.ndim:
            count = np.broadcast_to(count, np.broadcast_shapes(count.shape, self.energy.shape))[where]
        return self.half_trace[where[-1]], self.sine_squared[where[-1]], count

    def _asymptotic(self, where: tuple[Any, ...], periods: Any) -> tuple[Any, Any, Any]:
        """T_N, U_{N-1} and their logarithm where 1/lambda^N is nothing beside lambda^N = exp(N mu) (+-1)^N."""
        half, squared, count = self._at(where, periods)
        root = np.sqrt(-squared)
        if half.dtype.kind == "c":
            root = np.where((half.conj() * root).real < 0, -root, root)
        else:
            root = np.copysign(root, half)
        larger, sine, growth = half + root, root, 0.0
        if self.log_cell is not None:
            growth = self.log_cell[where[-1]]
            larger, sine = np.where(growth > 0, 2 * half, larger), np.where(growth > 0, half, sine)
        size = abs(larger)
        turn = _unit_power(larger, size, count)
        return turn, turn / sine, count * (np.log(size) + growth) - LN2

    def denominator(self, powers: Powers) -> Amplitude:
        """F for N periods: every amplitude is something over F."""
        plain, swing = self.outgoing
        return plain.at(powers, swing)

    def transmission(self, denominator: Amplitude) -> Any:
        """T = 4 g_L g_R / |F|^2; 0 where a lead is closed."""
        result = self.flux / denominator.squared
        everywhere, places, growth = denominator.logarithm
        with np.errstate(under="ignore"):
            if isinstance(everywhere, np.ndarray):
                result = result * np.exp(-2 * everywhere)
            if places is not None:
                result[places] *= np.exp2((-2 / LN2) * growth)
        return result

    def log10_transmission(self, denominator: Amplitude) -> Any:
        """log10 T, finite however small T is; -inf where a lead is closed."""
        everywhere, places, growth = denominator.logarithm
        with np.errstate(divide="ignore"):
            result = np.log(self.flux / denominator.squared)
            if (lost := np.nonzero(np.isneginf(result) & self.open))[0].size:  # T itself underflows beside an edge
                result[lost] = np.log(self.flux[lost[-1]]) - np.log(denominator.squared[lost])
            result = result - 2 * everywhere
        if places is not None:
            result[places] -= 2 * growth
        return result * (1 / math.log(10))

    def reflection(self, powers: Powers, denominator: Amplitude) -> Any:
        """R = |r|^2, from its own amplitude and not as 1 - T; 1 where the left lead is closed."""
        plain, swing = self.reflected
        numerator = plain.at(powers, swing)
        ratio = numerator.squared / denominator.squared
        return np.where(self.energy > self.stack.left.band_edge, ratio, 1.0)

    @cached_property
    def envelope(self) -> Envelope:
        """The two curves between which T swings inside the bands as periods are added.

        With u = F(exit.entry), w = F(exit.swing.entry): |u cos N phi + w sin N phi / sin phi|^2 lies between the
        eigenvalues A -+ B of its quadratic form; their product is (Im u w*)^2, free of cancellation.
        """
        plain, swing = self.outgoing
        squared = np.maximum(self.sine_squared, 0.0)
        first, second = squared * plain.squared, swing.squared
        cross = plain.even * swing.even + plain.odd * swing.odd
        sum_ = (first + second) / 2 + np.sqrt(((first - second) / 2) ** 2 + squared * cross**2)
        area = plain.odd * swing.even - plain.even * swing.odd
        scale = np.exp(-2 * np.asarray(plain.log_scale))
        with np.errstate(divide="ignore", invalid="ignore"):
            lower, upper = self.flux * squared / sum_ * scale, self.flux * sum_ / area**2 * scale
        passing = squared > 0
        return Envelope(passing, np.where(passing, lower, 0.0), np.where(passing, upper, 0.0))


@dataclass(frozen=True, slots=True)
class Envelope:
    """Lower and upper envelope of T over the periods; `passing` is False, and both 0, in the gaps."""

    passing: NDArray[np.bool_]
    lower: NDArray[np.float64]
    upper: NDArray[np.float64]


def flux_factor(lead: Lead, energy: NDArray[np.float64], evanescent: bool = False) -> Any:
    """g = k/m (1/nm per m0) of a lead; below its edge 0, or i kappa/m where `evanescent` is set."""
    kinetic = (energy - lead.band_edge) / (HBAR2_2M0 * _lead_mass(lead, energy))
    if evanescent:
        return np.sqrt(kinetic + 0j)
    if kinetic.size and kinetic.min() < 0:
        kinetic = np.maximum(kinetic, 0.0)
    return np.sqrt(kinetic)


def _lead_mass(lead: Lead, energy: NDArray[np.float64]) -> Any:
    """The lead's mass; below its edge, where it carries nothing, the mass at the edge."""
    return mass_at(lead, np.maximum(energy, lead.band_edge)) if lead.nonparabolicity else lead.mass


def _outgoing(m: Transfer, left: Any, right: Any) -> Amplitude:
    """F as a function of a matrix."""
    if m is IDENTITY:
        return Amplitude(left + right, 0.0)
    return Amplitude(right * m.a + left * m.d, m.c - (left * right) * m.b, m.log_scale)


def _reflected(m: Transfer, left: Any, right: Any) -> Amplitude:
    """r F as a function of a matrix."""
    if m is IDENTITY:
        return Amplitude(left - right, 0.0)
    return Amplitude(left * m.d - right * m.a, -(m.c + (left * right) * m.b), m.log_scale)


def _split(cell: Transfer) -> tuple[Array, Transfer, NDArray[np.float64] | None]:
    """Half trace, swing, and the logarithm still taken out of both (None: nothing)."""
    log_cell = None
    if not isinstance(cell.log_scale, float):
        log_cell = np.asarray(cell.log_scale, dtype=float)
        with np.errstate(divide="ignore"):
            held = (np.log(abs(cell.a + cell.d) / 2) + log_cell > _SURELY_OPAQUE) | (log_cell > OPAQUE)
        scale = np.exp(np.where(held, 0.0, log_cell))
        cell = Transfer(cell.a * scale, cell.b * scale, cell.c * scale, cell.d * scale)
        log_cell = np.where(held, log_cell, 0.0)
    half, lean = (cell.a + cell.d) * _ONE_HALF, (cell.a - cell.d) * _ONE_HALF
    return half, Transfer(lean, cell.b, cell.c, -lean), log_cell


def sine_squared(half_trace: Array, swing: Transfer) -> Array:
    """sin^2 phi: 1 - h^2, and near |h| = 1 the form -(bc + lean^2) where that one loses fewer digits.

    At a closed gap the matrix is +-1 and the second form is exact; in an opaque cell its products are large and the
    first is the better.
    """
    result = 1 - half_trace * half_trace
    near = np.flatnonzero(abs(result) < 1e-2)
    if near.size:
        lean, b, c = swing.a[near], np.broadcast_to(swing.b, result.shape)[near], swing.c[near]
        product = b * c
        exact = np.flatnonzero(abs(product) + abs(lean) ** 2 < 1)
        result[near[exact]] = -(product + lean * lean)[exact]
    return result


def _unit_power(value: Array, size: Array, count: Any) -> Any:
    """(value / |value|)^count."""
    if value.dtype.kind == "c":
        return (value / size) ** count
    if np.ndim(count):
        return np.where(count % 2, np.copysign(1.0, value), 1.0)
    return np.copysign(1.0, value) if count % 2 else np.ones_like(value)


def chebyshev(half_trace: Array, sine_squared: Array, periods: Any) -> tuple[Any, Any]:
    """T_N(h) and U_{N-1}(h) by binary powering of cos phi + i sin phi: both sides of a band edge, real or complex."""
    count = np.asarray(periods)
    bits = int(count.max(initial=1)).bit_length()
    if count.ndim:
        return _chebyshev_each(half_trace, sine_squared, count, bits)
    twice, second, down = half_trace + half_trace, 1.0, sine_squared * _MINUS_FOUR
    for bit in reversed(range(bits - 1)):
        twice, second = _twofold(down, twice, second)
        if (int(count) >> bit) & 1:
            twice, second = _one_more(half_trace, sine_squared, twice, second)
    return twice * _ONE_HALF, second


def _chebyshev_each(half_trace: Array, sine_squared: Array, count: NDArray[np.int64], bits: int) -> tuple[Any, Any]:
    """As chebyshev, with a number of periods for each element."""
    twice, second, down = np.full_like(half_trace, 2.0), np.zeros_like(half_trace), sine_squared * _MINUS_FOUR
    for bit in reversed(range(bits)):
        twice, second = _twofold(down, twice, second)
        odd = (count >> bit) & 1 == 1
        stepped = _one_more(half_trace, sine_squared, twice, second)
        twice, second = np.where(odd, stepped[0], twice), np.where(odd, stepped[1], second)
    return twice * _ONE_HALF, second


_ONE_HALF, _TWO, _MINUS_FOUR = np.array(0.5), np.array(2.0), np.array(-4.0)


def _twofold(down: Array, twice: Any, second: Any) -> tuple[Any, Any]:
    """2 T and U of twice as many periods; `down` is -4 sin^2."""
    if isinstance(second, float):
        return down + _TWO, twice
    square = second * second
    square *= down
    square += _TWO
    return square, twice * second


def _one_more(half_trace: Array, sine_squared: Array, twice: Any, second: Any) -> tuple[Any, Any]:
    """2 T and U of one more period."""
    return half_trace * twice - (sine_squared * _TWO) * second, twice * _ONE_HALF + half_trace * second
