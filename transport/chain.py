"""How a finite stack scatters: N periods in closed form, between any end layers and leads.

N cells are M^N = T_N(h) + U_{N-1}(h) swing (`cell.py`), so every amplitude of entry . cell^N . exit is

    (its value for exit.entry) T_N + (its value for exit.swing.entry) U_{N-1}.

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

from transport.cell import Cell, Powers
from transport.constants import HBAR2_2M0
from transport.propagation import IDENTITY, Array, Span, Transfer, mass_at, require_model, transfer
from transport.structure import Lead, Stack

_SIXTEEN = np.array(16.0)


@dataclass(frozen=True)
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
    def argument(self) -> Any:
        """arg(even + i odd), modulo a turn."""
        if np.iscomplexobj(self.even) or np.iscomplexobj(self.odd):
            return np.angle(self.value)
        return argument(self.even, self.odd)

    @cached_property
    def squared(self) -> Any:
        """|even + i odd|^2, without the scales."""
        if np.iscomplexobj(self.even) or np.iscomplexobj(self.odd):
            value = self.value
            return value.real**2 + value.imag**2
        with np.errstate(over="ignore"):
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


def argument(x: Any, y: Any) -> Any:
    """arg(x + iy) modulo a turn, from -pi/2 to 3 pi/2, for real x and y: arctan2 at half its price."""
    with np.errstate(divide="ignore", over="ignore", invalid="ignore"):
        return np.arctan(y / x) + np.pi * np.signbit(x)


def _sum(x: Any, first: Any, y: Any, second: Any) -> Any:
    """x first + y second, where a plain 0.0 stands for a term that is absent (a bare stack, equal leads)."""
    if isinstance(y, float):
        return x * first
    if isinstance(x, float):
        return y * second
    return x * first + y * second


class Chain:
    """A stack at given energies (real, eV, shape (n,)), with all that does not depend on its number of periods.

    Methods take `periods` as a whole number, or an integer array that broadcasts against the energies. Raises
    ValueError where a non-parabolic layer's mass would not be above 0.
    """

    def __init__(self, stack: Stack, energy: NDArray[np.float64]) -> None:
        self.stack, self.energy = stack, energy
        self.inside: Array = energy + 0.5j * stack.dephasing if stack.dephasing else energy
        self.span = Span.of(self.inside)
        require_model(stack.elements, self.span)
        self.left = self._flux_factor(stack.left)
        self.right = self.left if stack.left == stack.right else self._flux_factor(stack.right)
        self.cell = Cell.of(transfer(stack.cell, self.inside, self.span))

    def at(self, index: NDArray[np.int64]) -> Chain:
        """The chain at some of its energies only."""
        part = Chain.__new__(Chain)
        part.stack, part.energy, part.inside = self.stack, self.energy[index], self.inside[index]
        part.left, part.span = self.left[index], self.span
        part.right = part.left if self.right is self.left else self.right[index]
        part.cell = self.cell.at(index)
        return part

    @cached_property
    def entry(self) -> Transfer:
        """Transfer matrix of the entry layers."""
        return transfer(self.stack.entry, self.inside, self.span)

    @cached_property
    def exit(self) -> Transfer:
        """Transfer matrix of the exit layers."""
        return transfer(self.stack.exit, self.inside, self.span)

    @cached_property
    def around(self) -> tuple[Transfer, Transfer]:
        """exit.entry and exit.swing.entry."""
        swing = self.cell.swing if self.entry is IDENTITY else self.cell.swing @ self.entry
        if self.exit is IDENTITY:
            return self.entry, swing
        return self.exit if self.entry is IDENTITY else self.exit @ self.entry, self.exit @ swing

    @property
    def _is_bare(self) -> bool:
        """No end layers between equal leads: half of every amplitude vanishes, and is left out."""
        return self.right is self.left and not (self.stack.entry or self.stack.exit)

    @cached_property
    def outgoing(self) -> tuple[Amplitude, Amplitude]:
        """F for exit.entry and for exit.swing.entry."""
        if self._is_bare:  # g_R lean - g_L lean = 0
            cell = self.cell.matrix
            return self._outgoing(IDENTITY), Amplitude(0.0, cell.c - self.lead_product * cell.b)
        plain, swing = self.around
        return self._outgoing(plain), self._outgoing(swing)

    @cached_property
    def reflected(self) -> tuple[Amplitude, Amplitude]:
        """r F for exit.entry and for exit.swing.entry."""
        if self._is_bare:
            return Amplitude(0.0, 0.0), self._reflected(self.cell.swing)
        plain, swing = self.around
        return self._reflected(plain), self._reflected(swing)

    def _flux_factor(self, lead: Lead) -> Any:
        """g = k/m (1/nm per m0) of a lead; below its edge 0, or i kappa/m with dephasing, where it matters."""
        kinetic = self.energy - lead.band_edge if lead.band_edge else self.energy
        mass: Any = lead.mass
        if lead.nonparabolicity:  # below the edge, where nothing is carried, the mass at the edge
            mass = mass_at(lead, np.maximum(self.energy, lead.band_edge))
        kinetic = kinetic / (HBAR2_2M0 * mass)
        if self.stack.dephasing:
            return np.sqrt(kinetic + 0j)
        return np.sqrt(kinetic if self.span.low >= lead.band_edge else np.maximum(kinetic, 0.0))

    def _outgoing(self, m: Transfer) -> Amplitude:
        """F as a function of a matrix."""
        if m is IDENTITY:
            return Amplitude(self.left + self.right, 0.0)
        return Amplitude(self.right * m.a + self.left * m.d, m.c - self.lead_product * m.b, m.log_scale)

    def _reflected(self, m: Transfer) -> Amplitude:
        """r F as a function of a matrix."""
        if m is IDENTITY:
            return Amplitude(self.left - self.right, 0.0)
        return Amplitude(self.left * m.d - self.right * m.a, -(m.c + self.lead_product * m.b), m.log_scale)

    @cached_property
    def open(self) -> NDArray[np.bool_]:
        """True where both leads carry current."""
        return self.energy > max(self.stack.left.band_edge, self.stack.right.band_edge)

    @cached_property
    def some_closed(self) -> bool:
        """Whether a lead is closed at any of the energies."""
        return self.span.low <= max(self.stack.left.band_edge, self.stack.right.band_edge)

    @cached_property
    def lead_product(self) -> Any:
        """g_L g_R."""
        return self.left * self.right

    @cached_property
    def flux(self) -> NDArray[np.float64]:
        """16 g_L g_R, 0 where a lead is closed: T is this over |2 F|^2."""
        product = self.lead_product * _SIXTEEN
        return np.where(self.open, product.real, 0.0) if np.iscomplexobj(product) else product

    def powers(self, periods: Any) -> Powers:
        """What N cells do, without overflow however many periods stand in a gap."""
        return self.cell.powers(periods)

    def denominator(self, powers: Powers) -> Amplitude:
        """2 F for N periods: every amplitude is something over F."""
        plain, swing = self.outgoing
        return plain.at(powers, swing)

    def transmission(self, denominator: Amplitude) -> Any:
        """T = 4 g_L g_R / |F|^2; 0 where a lead is closed. `denominator` is 2 F."""
        with np.errstate(divide="ignore", invalid="ignore"):  # F itself may vanish where a lead closes
            result = self.flux / denominator.squared
        if self.some_closed:
            result = np.where(self.open, result, 0.0)
        everywhere, places, growth = denominator.logarithm
        with np.errstate(under="ignore"):
            if isinstance(everywhere, np.ndarray):
                result *= np.exp(-2 * everywhere)
            if places is not None:
                result[places] *= np.exp(-2 * growth)
        return result

    def log10_transmission(self, denominator: Amplitude) -> Any:
        """log10 T, finite however small T is; -inf where a lead is closed. `denominator` is 2 F."""
        everywhere, places, growth = denominator.logarithm
        with np.errstate(divide="ignore", invalid="ignore"):
            result = np.log(self.flux / denominator.squared)
        if self.some_closed:
            result = np.where(self.open, result, -np.inf)
        if (lost := np.nonzero(np.isneginf(result) & self.open))[0].size:  # |F|^2 overflowed, or the flux underflowed
            result[lost] = np.log(self.flux[lost[-1]]) - 2 * np.log(abs(denominator.value[lost]))
        result -= 2 * everywhere
        if places is not None:
            result[places] -= 2 * growth
        return result * (1 / math.log(10))

    def reflection(self, powers: Powers, denominator: Amplitude) -> Any:
        """R = |r|^2, from its own amplitude and not as 1 - T; 1 where the left lead is closed (lossless: either)."""
        plain, swing = self.reflected
        numerator = plain.at(powers, swing)
        with np.errstate(divide="ignore", invalid="ignore"):
            ratio = numerator.squared / denominator.squared
        if self.some_closed:
            seen = self.energy > self.stack.left.band_edge if self.stack.dephasing else self.open
            ratio = np.where(seen, ratio, 1.0)
        if (lost := np.nonzero(~np.isfinite(ratio)))[0].size:  # both squares overflowed
            ratio[lost] = (abs(numerator.value[lost]) / abs(denominator.value[lost])) ** 2
        return ratio

    @cached_property
    def envelope(self) -> Envelope:
        """The two curves between which T swings inside the bands as periods are added.

        With u = F(exit.entry), w = F(exit.swing.entry): |u cos N phi + w sin N phi / sin phi|^2 lies between the
        eigenvalues A -+ B of its quadratic form; their product is (Im u w*)^2, free of cancellation.
        """
        plain, swing = self.outgoing
        squared = np.maximum(self.cell.sine_squared, 0.0)
        first, second = squared * plain.squared, swing.squared
        cross = plain.even * swing.even + plain.odd * swing.odd
        sum_ = (first + second) / 2 + np.sqrt(((first - second) / 2) ** 2 + squared * cross**2)
        area = plain.odd * swing.even - plain.even * swing.odd
        scale = np.exp(-2 * np.asarray(plain.log_scale)) / 4
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
