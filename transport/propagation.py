"""How one layer, and a list of layers, carries the wave: real transfer matrices on (psi, psi'/m).

psi and psi'/m are continuous across every interface (BenDaniel and Duke, Phys. Rev. 152, 683 (1966)), so matrices
multiply with nothing in between:

    ( psi, psi'/m ) right face  =  [[a, b], [c, d]] ( psi, psi'/m ) left face,     determinant 1

With x = (E - V) m t^2 / C, C = hbar^2/2m0 and thickness t, a layer of constant band edge V has

    a = d = cos sqrt(x),     b = m t S(x),     c = -(E - V) t S(x) / C,     S(x) = sin sqrt(x) / sqrt(x).

cos sqrt(x) and S are entire functions of x: there is nothing special at E = V, below it, or at complex E. They are
summed as one short polynomial near 0 and carried outwards by angle doubling, which costs a few products instead of a
sine, a cosine and a square root per energy, and is the same code for real and for complex energies.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.polynomial import chebyshev
from numpy.typing import NDArray

from transport.constants import HBAR2_2M0
from transport.structure import Delta, Element, Layer, Lead

Array = NDArray[Any]
"""Over energy, shape (n,): float64 for real energies, complex128 with dephasing or on the complex plane."""

OPAQUE = 200.0
"""Beyond this exponent a matrix is held scaled, exp(log_scale) times its entries, so that nothing overflows."""

# Freed once, a block of 8 MB makes glibc keep freed memory instead of handing it back page by page between two
# products (the dynamic threshold of mallopt(3)); without it a spectrum takes twice as long. Elsewhere it does nothing.
np.empty(1 << 20)


@dataclass(frozen=True, slots=True)
class Transfer:
    """Transfer matrix exp(log_scale) [[a, b], [c, d]] at each energy; units 1, nm, 1/nm, 1 (masses in m0)."""

    a: Any
    b: Any
    c: Any
    d: Any
    log_scale: Any = 0.0

    def __matmul__(self, first: Transfer) -> Transfer:
        """This matrix after `first` (the one nearer to the left lead)."""
        return Transfer(
            self.a * first.a + self.b * first.c,
            self.a * first.b + self.b * first.d,
            self.c * first.a + self.d * first.c,
            self.c * first.b + self.d * first.d,
            self.log_scale + first.log_scale,
        )

    def rescaled(self) -> Transfer:
        """The same matrix with its largest entry brought to 1."""
        size = np.maximum(np.maximum(abs(self.a), abs(self.b)), np.maximum(abs(self.c), abs(self.d)))
        return Transfer(self.a / size, self.b / size, self.c / size, self.d / size, self.log_scale + np.log(size))


IDENTITY = Transfer(1.0, 0.0, 0.0, 1.0)


def transfer(elements: Sequence[Element], energy: Array) -> Transfer:
    """Transfer matrix of a list of layers and deltas, left to right, at each energy (eV, shape (n,)).

    Raises ValueError where a non-parabolic layer's mass would not be above 0.
    """
    if not elements:
        return IDENTITY
    known = {element: element_transfer(element, energy) for element in dict.fromkeys(elements)}
    scaled = _growth_bound(elements, energy) > OPAQUE
    total = known[elements[0]]
    for element in elements[1:]:
        total = known[element] @ total
        if scaled:
            total = total.rescaled()
    return total


def element_transfer(element: Element, energy: Array) -> Transfer:
    """Transfer matrix of one layer or delta at each energy (eV)."""
    if isinstance(element, Delta):
        return Transfer(1.0, 0.0, element.strength / HBAR2_2M0, 1.0)
    kinetic = energy - element.band_edge
    mass = mass_at(element, energy)
    cosine, sine, log_scale = cosine_and_sine(kinetic * (mass * (element.thickness**2 / HBAR2_2M0)))
    return Transfer(
        cosine, sine * (mass * element.thickness), kinetic * sine * (-element.thickness / HBAR2_2M0), cosine, log_scale
    )


def mass_at(medium: Layer | Lead, energy: Array) -> Any:
    """Effective mass m (1 + alpha (E - V)) at each energy, or the plain number m where alpha is 0.

    Raises ValueError where it would not be above 0: there the one-band model ends and bands found would be false.
    """
    if not medium.nonparabolicity:
        return medium.mass
    factor = 1 + medium.nonparabolicity * (energy - medium.band_edge)
    if factor.size and factor.real.min() <= 0:
        end = medium.band_edge - 1 / medium.nonparabolicity
        raise ValueError(
            f"the one-band model ends at {end * 1e3:.6g} meV, where the mass of a layer with band edge "
            f"{medium.band_edge * 1e3:.6g} meV falls to 0: ask for energies above it"
        )
    return medium.mass * factor


# S(x) on |x| <= 1: its Taylor series with the tail economised away (Chebyshev coefficients beyond degree 7 are below
# 3e-17). Lanczos, Applied Analysis (1956), chapter VII.
_SINE = chebyshev.cheb2poly(
    chebyshev.poly2cheb([(-1) ** n / math.factorial(2 * n + 1) for n in range(14)])[:8]
).tolist()

_REAL_REACH, _COMPLEX_REACH = 1.0, 0.25  # the dropped Chebyshev terms grow off the real axis, so stay closer to 0


def cosine_and_sine(x: Array) -> tuple[Array, Array, Any]:
    """cos sqrt(x), sin sqrt(x)/sqrt(x) and the logarithm of the scale taken out of both (0 unless opaque)."""
    if not x.size:
        return x, x, 0.0
    reach = _COMPLEX_REACH if np.iscomplexobj(x) else _REAL_REACH
    largest = float(abs(x).max()) if np.iscomplexobj(x) else max(float(x.max()), -float(x.min()))
    if largest > OPAQUE**2 and float(x.real.min()) < -(OPAQUE**2):
        return _opaque(x)
    doublings = max(0, math.ceil(math.log(largest / reach, 4))) if largest > reach else 0
    return *_doubled(x * 0.25**doublings, doublings), 0.0


def _doubled(x: Array, doublings: int) -> tuple[Array, Array]:
    """cos and sin/x of 2^doublings sqrt(x), for small x: S(4x) = S(x) cos, cos 2t = 1 - 2 sin^2 t."""
    sine = x * _SINE[-1]
    for coefficient in _SINE[-2:0:-1]:
        sine += coefficient
        sine *= x
    sine += _SINE[0]
    square = sine * sine
    square *= x
    cosine = np.sqrt(1 - square)
    for step in range(doublings):
        if step:
            square = sine * sine
            square *= x
        sine *= cosine
        square *= -2 * 4.0**step
        square += 1
        cosine = square
    return cosine, sine


def _opaque(x: Array) -> tuple[Array, Array, Array]:
    """As cosine_and_sine, where some layers are so thick that exp(sqrt(-x)) would overflow."""
    thick = x.real < -(OPAQUE**2)
    cosine, sine, _ = cosine_and_sine(np.where(thick, 0, x))
    decay = np.sqrt(-x[thick] + 0j)
    turn = np.exp(1j * decay.imag) / 2
    log_scale = np.zeros(x.shape)
    log_scale[thick] = decay.real
    cosine[thick], sine[thick] = (part if np.iscomplexobj(x) else part.real for part in (turn, turn / decay))
    return cosine, sine, log_scale


def _growth_bound(elements: Sequence[Element], energy: Array) -> float:
    """A rough upper bound of log |M|: decay in barriers, and something for every mismatch between neighbours."""
    lowest = float(energy.real.min()) if energy.size else 0.0
    growth = 0.0
    for element in elements:
        if isinstance(element, Delta):
            growth += math.log1p(abs(element.strength) / HBAR2_2M0)
        else:
            depth = max(0.0, element.band_edge - lowest) * element.mass / HBAR2_2M0
            growth += 1.0 + math.sqrt(depth) * element.thickness
    return growth
