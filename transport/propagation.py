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

OPAQUE = 100.0
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
        inner = self.a * first.a
        outer = inner if self.a is self.d and first.a is first.d else self.d * first.d
        return Transfer(
            inner + self.b * first.c,
            self.a * first.b + self.b * first.d,
            self.c * first.a + self.d * first.c,
            self.c * first.b + outer,
            self.log_scale + first.log_scale,
        )

    def rescaled(self) -> Transfer:
        """The same matrix with its largest entry brought to 1."""
        size = np.maximum(np.maximum(abs(self.a), abs(self.b)), np.maximum(abs(self.c), abs(self.d)))
        return Transfer(self.a / size, self.b / size, self.c / size, self.d / size, self.log_scale + np.log(size))


IDENTITY = Transfer(1.0, 0.0, 0.0, 1.0)


@dataclass(frozen=True, slots=True)
class Span:
    """The box in which energies lie (eV): real parts from `low` to `high`, imaginary parts up to `imaginary`."""

    low: float
    high: float
    imaginary: float

    @classmethod
    def of(cls, energy: Array) -> Span:
        """The box of an array of energies."""
        if not energy.size:
            return cls(math.inf, math.inf, 0.0)
        if energy.dtype.kind == "c":
            return cls(float(energy.real.min()), float(energy.real.max()), float(abs(energy.imag).max()))
        return cls(float(energy.min()), float(energy.max()), 0.0)


def transfer(elements: Sequence[Element], energy: Array, span: Span | None = None) -> Transfer:
    """Transfer matrix of a list of layers and deltas, left to right, at each energy (eV, shape (n,)).

    `span`, if known, is the energies' box.
    """
    if not elements:
        return IDENTITY
    span = span or Span.of(energy)
    scaled = _growth_bound(elements, span) > OPAQUE
    last = {element: place for place, element in enumerate(elements)}
    held: dict[Element, Transfer] = {}  # of elements that come again, and no others: a profile has hundreds of layers
    total = IDENTITY
    for place, element in enumerate(elements):
        step = held.pop(element) if element in held else element_transfer(element, energy, span)
        if last[element] > place:
            held[element] = step
        total = step @ total if place else step
        if scaled and place:
            total = total.rescaled()
    return total


def element_transfer(element: Element, energy: Array, span: Span | None = None) -> Transfer:
    """Transfer matrix of one layer or delta at each energy (eV); `span`, if known, is the energies' box."""
    if isinstance(element, Delta):
        return Transfer(1.0, 0.0, element.strength / HBAR2_2M0, 1.0)
    span = span or Span.of(energy)
    kinetic = energy - np.array(element.band_edge) if element.band_edge else energy
    mass = mass_at(element, energy)
    length = element.thickness / HBAR2_2M0
    reach = max(abs(span.low - element.band_edge), abs(span.high - element.band_edge)) + span.imaginary
    heaviest = mass if isinstance(mass, float) else float(np.max(abs(mass), initial=0.0))
    largest = reach * heaviest * element.thickness * length if energy.size else 0.0
    if largest > OPAQUE**2 and (span.low < element.band_edge or span.imaginary):
        cosine, sine, log_scale = _opaque(kinetic * (mass * element.thickness * length))
        return Transfer(cosine, sine * (mass * element.thickness), kinetic * sine * -length, cosine, log_scale)
    near = _COMPLEX_REACH if energy.dtype.kind == "c" else _REAL_REACH
    doublings = max(0, math.ceil(math.log(largest / near, 4))) if largest > near else 0
    share = 0.5**doublings * element.thickness
    cosine, sine = _doubled(kinetic * np.array(mass * (-4 * share * share / HBAR2_2M0)), doublings)
    lower = kinetic * sine
    lower *= np.array(-share / HBAR2_2M0)
    sine *= np.array(mass * share)
    return Transfer(cosine, sine, lower, cosine)


def mass_at(medium: Layer | Lead, energy: Array) -> Any:
    """Effective mass m (1 + alpha (E - V)) at each energy, or the plain number m where alpha is 0."""
    if not medium.nonparabolicity:
        return medium.mass
    return medium.mass * (1 + medium.nonparabolicity * (energy - medium.band_edge))


def flux_factor(lead: Lead, energy: Array, is_open: bool | None = None) -> NDArray[np.complex128]:
    """g = k/m (1/nm per m0) of the wave that goes out into a lead, its mass continued too.

    An open lead has k = sqrt, a closed one k = i sqrt(-), principal roots; `is_open` says which of the two is continued
    to complex energies (default: as the real part of each energy lies above or below the lead's edge).
    """
    square = (energy - lead.band_edge) / (HBAR2_2M0 * mass_at(lead, energy)) + 0j
    if is_open is not None:
        return np.asarray(np.sqrt(square) if is_open else 1j * np.sqrt(-square))
    opened = np.asarray(energy).real >= lead.band_edge
    return np.asarray(np.where(opened, 1.0, 1j) * np.sqrt(np.where(opened, square, -square)))


def model_end(elements: Sequence[Element]) -> float:
    """The energy (eV) at and below which some layer's mass would not be above 0; -inf where masses are constant."""
    return max((e.band_edge - 1 / e.nonparabolicity for e in elements if isinstance(e, Layer) and e.nonparabolicity),
               default=-math.inf)


def require_model(elements: Sequence[Element], span: Span) -> None:
    """Raise ValueError if some layer's mass would not be above 0: there the model ends, and bands found were false."""
    ends = {e.band_edge - 1 / e.nonparabolicity: e for e in elements if isinstance(e, Layer) and e.nonparabolicity}
    if ends and span.low <= max(ends):
        layer = ends[max(ends)]
        raise ValueError(
            f"the one-band model ends at {max(ends) * 1e3:.6g} meV, where the mass of a layer with band edge "
            f"{layer.band_edge * 1e3:.6g} meV falls to 0: ask for energies above it"
        )


def _economised() -> tuple[NDArray[np.float64], ...]:
    """S as a polynomial in z = -4x on |x| <= 1, highest power first.

    Its Taylor series with the tail economised away: Chebyshev coefficients beyond degree 7 are below 3e-17 (Lanczos,
    Applied Analysis (1956), chapter VII). Kept as arrays of no dimension, which NumPy adds faster than floats.
    """
    taylor = [(-1) ** n / math.factorial(2 * n + 1) for n in range(14)]
    powers = chebyshev.cheb2poly(chebyshev.poly2cheb(taylor)[:8])
    return tuple(np.array(c * (-0.25) ** n) for n, c in reversed(list(enumerate(powers))))


_SINE = _economised()
_ONE_HALF, _TWO, _FOUR = np.array(0.5), np.array(2.0), np.array(4.0)
_REAL_REACH, _COMPLEX_REACH = 1.0, 0.25  # the dropped Chebyshev terms grow off the real axis, so stay closer to 0


def _doubled(z: Array, doublings: int) -> tuple[Array, Array]:
    """cos(2^n t) and sin(2^n t)/t for z = -4 t^2, |z| small, n doublings.

    With s = sin t / t0 and w = 2 cos t: doubling the angle takes s to s w, and w to 2 + z s^2 (the s before it).
    """
    sine = z * _SINE[0]
    for coefficient in _SINE[1:-1]:
        sine += coefficient
        sine *= z
    sine += _SINE[-1]
    square = sine * sine
    square *= z
    twice = np.sqrt(square + _FOUR)
    for step in range(doublings):
        if step:
            square = sine * sine
            square *= z
        sine *= twice
        square += _TWO
        twice = square
    twice *= _ONE_HALF
    return twice, sine


def _opaque(x: Array) -> tuple[Array, Array, NDArray[np.float64]]:
    """cos sqrt(x), sin sqrt(x)/sqrt(x) over exp(log_scale), and log_scale, where exp(sqrt(-x)) may overflow."""
    decay = np.sqrt(-x + 0j)
    thick = decay.real > OPAQUE
    thin = np.where(thick, 0, x)
    doublings = max(0, math.ceil(math.log(max(float(abs(thin).max()), 1e-9) / _COMPLEX_REACH, 4)))
    cosine, sine = _doubled(thin * (-4 * 0.25**doublings), doublings)
    sine *= 0.5**doublings
    decay = decay[thick]
    turn = np.exp(1j * decay.imag) / 2
    log_scale = np.zeros(x.shape)
    log_scale[thick] = decay.real
    parts = (turn, turn / decay)
    cosine[thick], sine[thick] = parts if x.dtype.kind == "c" else (part.real for part in parts)
    return cosine, sine, log_scale


def _growth_bound(elements: Sequence[Element], span: Span) -> float:
    """A rough upper bound of log |M|: decay in barriers, and something for every mismatch between neighbours.

    A thin layer t does no more than t (m/u + |q| u)/2, q = (E - V)/C, whatever its neighbours: in units where psi'/m
    counts u times, that is the norm of the part of its generator that makes a solution grow.
    """
    layers = [element for element in elements if isinstance(element, Layer)]
    reach = [max(abs(span.low - e.band_edge), abs(span.high - e.band_edge)) + span.imaginary for e in layers]
    heavy = math.fsum(e.mass * e.thickness for e in layers)
    steep = math.fsum(q * e.thickness for q, e in zip(reach, layers, strict=True)) / HBAR2_2M0
    unit = math.sqrt(heavy / steep) if heavy and 0 < steep < math.inf else 1.0
    growth = math.fsum(math.log1p(abs(e.strength) / HBAR2_2M0) for e in elements if isinstance(e, Delta))
    for q, layer in zip(reach, layers, strict=True):
        share = layer.mass / HBAR2_2M0
        decay = math.sqrt(max(0.0, layer.band_edge - span.low) * share) + math.sqrt(span.imaginary * share / 2)
        growth += min(1.0 + decay * layer.thickness, layer.thickness * (layer.mass / unit + q / HBAR2_2M0 * unit) / 2)
    return growth
