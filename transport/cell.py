"""One cell, and N of it in closed form, at a cost that hardly depends on N.

With the cell matrix M = [[a, b], [c, d]], half trace h = (a + d)/2 = cos phi and swing = M - h:

    M^N = T_N(h) + U_{N-1}(h) swing        (Chebyshev polynomials; cos N phi and sin N phi / sin phi).
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from transport.propagation import OPAQUE, Array, Transfer

_GROWTH = 340.0
"""Exponent of lambda^N up to which powers are computed as they are; their squares may still overflow, to T = 0."""

_LOST = 450.0
"""Exponent of lambda^N from which T < 1e-308 whatever the end layers do."""

_SURELY_OPAQUE = 30.0
"""log |h| beyond which 1/lambda is lost beside lambda = 2h in double precision."""

_ONE_HALF, _ONE, _TWO, _FOUR = (np.array(number) for number in (0.5, 1.0, 2.0, 4.0))


@dataclass(frozen=True, slots=True)
class Powers:
    """2 T_N and 2 U_{N-1} of the half trace at each energy; at the places `deep` (an index), both over exp(growth)."""

    first: Any
    second: Any
    deep: tuple[Any, ...] | None = None
    growth: Any = 0.0


@dataclass(frozen=True)
class Cell:
    """The cell at each energy, shape (n,): its matrix, half trace and sin^2 phi.

    `log_scale` (None: nowhere) is the logarithm still taken out of matrix and half trace, above 0 only where the cell
    is so opaque that its entries would overflow.
    """

    matrix: Transfer
    half_trace: Array
    sine_squared: Array
    log_scale: NDArray[np.float64] | None

    @classmethod
    def of(cls, matrix: Transfer) -> Cell:
        """The cell of a transfer matrix."""
        matrix, log_scale = _unscaled(matrix)
        half = (matrix.a + matrix.d) * _ONE_HALF
        squared = sine_squared(half, matrix)
        if log_scale is not None:  # deep in a gap, where sin^2 = -sinh^2 = -h^2
            squared = np.where(log_scale > 0, -(half**2), squared)
        return cls(matrix, half, squared, log_scale)

    def at(self, index: NDArray[np.int64]) -> Cell:
        """The cell at some of its energies only."""
        m = self.matrix
        entries = (part if isinstance(part, float) else part[index] for part in (m.a, m.b, m.c, m.d))
        held = None if self.log_scale is None else self.log_scale[index]
        return Cell(Transfer(*entries), self.half_trace[index], self.sine_squared[index], held)

    @cached_property
    def swing(self) -> Transfer:
        """M - h."""
        lean = (self.matrix.a - self.matrix.d) * _ONE_HALF
        return Transfer(lean, self.matrix.b, self.matrix.c, -lean)

    @cached_property
    def size(self) -> tuple[Array, float]:
        """cosh of the decay per cell (in a gap |h|; in a band 1, or |h| if real) at each energy, and its largest value.

        Complex h with foci +-1 lies on the ellipse |h + 1| + |h - 1| = 2 cosh(Im phi): absorption may outgrow |h|.
        """
        half = self.half_trace
        size = (abs(half + 1) + abs(half - 1)) / 2 if half.dtype.kind == "c" else abs(half)
        return size, float(size.max()) if size.size else 0.0

    def powers(self, periods: Any) -> Powers:
        """2 T_N(h) and 2 U_{N-1}(h) for a whole number, or an array that broadcasts against the energies."""
        with np.errstate(over="ignore", invalid="ignore"):
            first, second = chebyshev(self.half_trace, self.sine_squared, periods)
        deep = self._deep(periods)
        if deep is None:
            return Powers(first, second)
        far = np.nonzero(deep)
        first[far], second[far], growth = self._asymptotic(far, periods)
        return Powers(first, second, far, growth)

    def passing(self, periods: int) -> NDArray[np.int64] | None:
        """Indices of the energies where T of N periods is above the smallest double (None: perhaps all)."""
        (size, largest), limit = self.size, math.cosh(_LOST / periods)
        if self.log_scale is None:
            return None if largest <= limit else np.flatnonzero(size <= limit)
        with np.errstate(divide="ignore"):
            seen = np.where(self.log_scale > 0, periods * (np.log(size) + self.log_scale) < _LOST, size <= limit)
        return np.flatnonzero(seen)

    def _deep(self, periods: Any) -> NDArray[np.bool_] | None:
        """Where lambda^N would overflow (None: nowhere): the growth is then kept as a logarithm."""
        size, largest = self.size
        limit = math.cosh(_GROWTH / periods) if isinstance(periods, int) else np.cosh(_GROWTH / periods)
        if self.log_scale is None and largest <= np.min(limit, initial=math.inf):
            return None
        deep: NDArray[np.bool_] = size > limit
        return deep if self.log_scale is None else deep | (self.log_scale > 0)

    def _places(self, where: tuple[Any, ...], periods: Any) -> tuple[Array, Array, Any]:
        """Half trace, sin^2 and periods at the chosen places of the broadcast shape."""
        count = np.asarray(periods)
        if count.ndim:
            count = np.broadcast_to(count, np.broadcast_shapes(count.shape, self.half_trace.shape))[where]
        return self.half_trace[where[-1]], self.sine_squared[where[-1]], count

    def _asymptotic(self, where: tuple[Any, ...], periods: Any) -> tuple[Any, Any, Any]:
        """2 T_N, 2 U_{N-1} and their logarithm where 1/lambda^N is nothing beside lambda^N."""
        half, squared, count = self._places(where, periods)
        root = np.sqrt(-squared)
        if half.dtype.kind == "c":
            root = np.where((half.conj() * root).real < 0, -root, root)
        else:
            root = np.copysign(root, half)
        larger, sine, growth = half + root, root, 0.0
        if self.log_scale is not None:
            growth = self.log_scale[where[-1]]
            larger, sine = np.where(growth > 0, 2 * half, larger), np.where(growth > 0, half, sine)
        size = abs(larger)
        turn = _unit_power(larger, size, count)
        return turn, turn / sine, count * (np.log(size) + growth)


def _unscaled(matrix: Transfer) -> tuple[Transfer, NDArray[np.float64] | None]:
    """The matrix with its scale multiplied in wherever that is safe, and the logarithm left elsewhere."""
    if isinstance(matrix.log_scale, float):
        return matrix, None
    log_scale = np.asarray(matrix.log_scale, dtype=float)
    with np.errstate(divide="ignore"):
        held = (np.log(abs(matrix.a + matrix.d) / 2) + log_scale > _SURELY_OPAQUE) | (log_scale > OPAQUE)
    scale = np.exp(np.where(held, 0.0, log_scale))
    entries = (part * scale for part in (matrix.a, matrix.b, matrix.c, matrix.d))
    return Transfer(*entries), np.where(held, log_scale, 0.0)


def sine_squared(half_trace: Array, matrix: Transfer) -> Array:
    """sin^2 phi: 1 - h^2, and near |h| = 1 the form -(bc + ((a - d)/2)^2) where that one loses fewer digits.

    At a closed gap the matrix is +-1 and the second form is exact; in an opaque cell its products are large and the
    first is the better.
    """
    result: Array = _ONE - half_trace * half_trace
    near = np.flatnonzero(abs(result) < 1e-2)
    if near.size:
        lean, product = (matrix.a[near] - matrix.d[near]) / 2, matrix.b[near] * matrix.c[near]
        exact = np.flatnonzero(abs(product) + abs(lean) ** 2 < 1)
        result[near[exact]] = -(product + lean * lean)[exact]
    return result


def _unit_power(value: Array, size: Array, count: Any) -> Any:
    """(value / |value|)^count."""
    if value.dtype.kind == "c":
        return (value / size) ** count
    return np.where(count % 2, np.copysign(1.0, value), 1.0)


def chebyshev(half_trace: Array, sine_squared: Array, periods: Any) -> tuple[Any, Any]:
    """2 T_N(h) and 2 U_{N-1}(h) by binary powering of cos phi + i sin phi.

    Only h and sin^2 phi enter, so it serves on both sides of a band edge and at complex energies alike.
    """
    count = np.asarray(periods)
    bits = int(count.max(initial=1)).bit_length()
    if count.ndim:
        return _chebyshev_each(half_trace, sine_squared, count, bits)
    if bits == 1:
        return half_trace + half_trace, np.full_like(half_trace, 2.0)
    first, second = _TWO - _FOUR * sine_squared, _FOUR * half_trace
    for bit in reversed(range(bits - 1)):
        if bit < bits - 2:
            first, second = _twofold(sine_squared, first, second)
        if (int(count) >> bit) & 1:
            first, second = _one_more(half_trace, sine_squared, first, second)
    return first, second


def _chebyshev_each(half_trace: Array, sine_squared: Array, count: NDArray[np.int64], bits: int) -> tuple[Any, Any]:
    """As chebyshev, with a number of periods for each element."""
    first, second = np.full_like(half_trace, 2.0), np.zeros_like(half_trace)
    for bit in reversed(range(bits)):
        first, second = _twofold(sine_squared, first, second)
        odd = (count >> bit) & 1 == 1
        stepped = _one_more(half_trace, sine_squared, first, second)
        first, second = np.where(odd, stepped[0], first), np.where(odd, stepped[1], second)
    return first, second


def _twofold(sine_squared: Array, first: Any, second: Any) -> tuple[Any, Any]:
    """2 T and 2 U of twice as many periods: T_2n = 1 - 2 sin^2 U_n^2, U_2n = 2 T_n U_n."""
    square = second * second
    square *= sine_squared
    np.subtract(_TWO, square, out=square)
    return square, first * second


def _one_more(half_trace: Array, sine_squared: Array, first: Any, second: Any) -> tuple[Any, Any]:
    """2 T and 2 U of one more period."""
    return half_trace * first - sine_squared * second, first + half_trace * second
