"""What leaks out of a resonance, and to which side: partial widths, down to any smallness.

Where the pole's imaginary part is exact, it is the width, and the decaying state says how it is shared. Where it drowns
in rounding, the width is flux over norm at the real energy,

    Gamma_side = hbar j_side / int (|psi|^2 + C (dm/dE) |psi'/m|^2) dx,       C = hbar^2/2m0,

relative error of the order Gamma over the distance to the next pole. psi is carried from both ends, going out at each,
and joined where it is largest: short of it each solution grows, and rounding dies away.

Of one layer with matrix M(E) the integral is the quadratic form -C M^T J dM/dE of the state at its face (J the unit
skew matrix): d/dx (y^T J dy/dE) = -(psi^2/C + (dm/dE) (psi'/m)^2) for y = (psi, psi'/m). In a barrier, where a state
may be large at both faces, it is -C d/dE [[a/b, -1/b], [-1/b, a/b]] of psi at both faces, and nothing cancels.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from transport.cell import Cell
from transport.constants import HBAR2_2M0
from transport.determinant import Complexes, Floats, Strip, determinant, newton_step
from transport.propagation import Transfer, element_transfer, flux_factor, mass_at, transfer
from transport.structure import Element, Lead, Stack

_MOST_VALUES = 500_000  # states held at once
_STEP = 1e-30
"""Imaginary step (eV) for exact derivatives of analytic functions (Squire and Trapp, SIAM Rev. 40, 110 (1998))."""
_BARRIER = 2.0
"""cosh(kappa d) from which psi at both faces tells a layer's share."""
_EPSILON = float(np.finfo(float).eps)
_ROUNDING, _AMPLIFIED = 1e-16, 30.0
"""Energy (eV) to which a pole is known at best, and how much of what its determinant's terms alone would allow."""
_DROWNED = 1e-14
"""Width (eV) below which the imaginary part is never relied upon, however close the next pole."""


def log_widths(stack: Stack, strip: Strip, poles: Complexes) -> tuple[Floats, Floats]:
    """Natural logarithms of both partial widths (eV) of each pole in a strip, ascending; -inf to a closed lead."""
    width, nearest = -2 * poles.imag, _nearest(poles)
    _, noise = newton_step(stack, strip, poles, np.maximum(1e-6 * nearest, 1e-13))
    noise = np.maximum(_ROUNDING, _AMPLIFIED * noise)
    narrow = ~(width > np.maximum(np.sqrt(noise * nearest), _DROWNED))  # there either way has lost as many digits
    left, right = np.zeros(poles.size), np.zeros(poles.size)
    wide = ~narrow
    left[wide], right[wide] = _shared(stack, strip, poles[wide])
    left[narrow], right[narrow] = _flux_over_norm(stack, strip, poles.real[narrow])
    return left, right


def _nearest(poles: Complexes) -> Floats:
    """Distance (eV) of each pole to the next in energy, at most 0.1."""
    gap = np.concatenate([[0.1], np.diff(poles.real), [0.1]])
    return np.asarray(np.minimum(np.minimum(gap[:-1], gap[1:]), 0.1))


def _shared(stack: Stack, strip: Strip, poles: Complexes) -> tuple[Floats, Floats]:
    """-2 Im E, shared as the flux out of the faces."""
    at = determinant(stack, strip, poles)
    with np.errstate(divide="ignore"):
        onward, back = (np.log(abs(part)) + at.log_scale for part in (at.across, at.back))
        ratio = 2 * np.where(onward > back, onward, -back)  # the solution that grows is the exact one
        flux = [np.log(flux_factor(lead, poles, is_open).real) if is_open else np.full(poles.size, -np.inf)
                for lead, is_open in ((stack.left, strip.left_open), (stack.right, strip.right_open))]
    left, right = flux[0], flux[1] + ratio
    whole = np.log(-2 * poles.imag) - np.logaddexp(left, right)
    return left + whole, right + whole


# Narrow ones: states at every face, from both ends.

@dataclass(frozen=True, slots=True)
class _March:
    """An outgoing solution carried through the stack: psi and slope over exp(log) at each face, (faces, n).

    `held`: logarithm of the integral over everything behind each face, the closed lead's tail included.
    """

    psi: Complexes
    slope: Complexes
    log: Floats
    held: Floats

    @property
    def size(self) -> Floats:
        """Logarithm of the state at each face."""
        return np.asarray(self.log + np.log(np.hypot(abs(self.psi), abs(self.slope))))


def _flux_over_norm(stack: Stack, strip: Strip, energy: Floats) -> tuple[Floats, Floats]:
    layers = len(stack.entry) + len(stack.cell) * stack.periods + len(stack.exit)
    batch = max(1, _MOST_VALUES // layers)
    parts = [_batch(stack, strip, energy[begin:begin + batch]) for begin in range(0, energy.size, batch)]
    left, right = zip(*parts, strict=True) if parts else ([np.zeros(0)], [np.zeros(0)])
    return np.concatenate(left), np.concatenate(right)


def _batch(stack: Stack, strip: Strip, energy: Floats) -> tuple[Floats, Floats]:
    onward = _march(stack.left, strip.left_open, stack.entry, stack.cell, stack.exit, stack.periods, energy)
    back = _march(stack.right, strip.right_open, stack.exit[::-1], stack.cell[::-1], stack.entry[::-1], stack.periods,
                  energy)
    size, other = onward.size, back.size[::-1]
    at = np.argmax(size + other, axis=0), np.arange(energy.size)
    shift = (size - other)[at]
    norm = np.logaddexp(onward.held[at], back.held[::-1][at] + 2 * shift)
    with np.errstate(divide="ignore"):
        left, right = (
            np.log(2 * HBAR2_2M0 * flux_factor(lead, energy.astype(complex), is_open).real)
            for lead, is_open in ((stack.left, strip.left_open), (stack.right, strip.right_open))
        )
    return left - norm, right + 2 * shift - norm


def _march(
    lead: Lead, is_open: bool, first: Sequence[Element], cell: Sequence[Element], last: Sequence[Element],
    periods: int, energy: Floats,
) -> _March:
    """The solution that goes out at the near face, carried to the far one; cells in closed form."""
    flux = flux_factor(lead, energy.astype(complex), is_open)
    one = np.ones((1, energy.size), complex)
    steps = {element: (element_transfer(element, energy), _Form.of_element(element, energy))
             for element in dict.fromkeys((*first, *cell, *last))}
    faces = _carried((one, -1j * flux * one, np.zeros(one.shape)), first, steps)
    within = _carried(_at_cells(_last(faces), cell, energy, periods), cell, steps)
    psi, slope, log = _last(within)
    beyond = _carried((psi[-1:], slope[-1:], log[-1:]), last, steps)
    parts = (faces, within, beyond)
    psi, slope, log = (np.concatenate([*(_laid(part[k][:-1], energy.size) for part in parts), beyond[k][-1]])
                       for k in range(3))
    held = np.concatenate([_laid(part[3], energy.size) for part in parts])
    tail = np.full((1, energy.size), -np.inf) if is_open else _tail(lead, flux, energy)[None]
    return _March(psi, slope, log, np.logaddexp.accumulate(np.concatenate([tail, held]), axis=0))


State = tuple[Complexes, Complexes, Floats]
_Faces = tuple[list[Any], list[Any], list[Any], list[Any]]


def _carried(
    state: State, elements: Sequence[Element], steps: dict[Element, tuple[Transfer, _Form]]
) -> _Faces:
    """States in front of each element and behind the last, each (cells, n), and what each element holds."""
    faces: _Faces = ([state[0]], [state[1]], [state[2]], [])
    for element in elements:
        psi, slope, log = state
        step, form = steps[element]
        state = _resized(step.a * psi + step.b * slope, step.c * psi + step.d * slope, log + step.log_scale)
        faces[3].append(form.of((psi, slope, log), state))
        for face, part in zip(faces, state, strict=False):
            face.append(part)
    return faces


def _last(faces: _Faces) -> State:
    return faces[0][-1], faces[1][-1], faces[2][-1]


def _resized(psi: Complexes, slope: Complexes, log: Floats) -> State:
    """A state brought to size 1; where it cancelled to nothing, rounding is what would be left of it."""
    size = abs(psi) + abs(slope)
    gone = size == 0
    size = np.where(gone, 1.0, size)
    return np.where(gone, 1.0, psi / size), slope / size, log + np.log(np.where(gone, _EPSILON, size))


def _laid(parts: Sequence[NDArray[Any]], energies: int) -> NDArray[Any]:
    """Values of every element, cell after cell: from a list over elements of (cells, n) to (cells elements, n)."""
    if not parts:
        return np.zeros((0, energies))
    return np.stack(parts, axis=1).reshape(-1, energies)


def _at_cells(state: State, elements: Sequence[Element], energy: Floats, periods: int) -> State:
    """The states in front of each cell: M^j = T_j + U_(j-1) (M - h)."""
    cell = Cell.of(transfer(elements, energy))
    swing, powers = cell.swing, cell.powers(np.arange(1, max(periods, 2))[:, None])
    psi, slope, log = state
    growth = np.zeros(powers.first.shape)
    if powers.deep is not None:
        growth[powers.deep] = powers.growth
    across, along = swing.a * psi + swing.b * slope, swing.c * psi + swing.d * slope
    later = _resized(psi * powers.first + across * powers.second, slope * powers.first + along * powers.second,
                     log + growth - math.log(2))
    return tuple(np.concatenate(pair)[:periods] for pair in zip(state, later, strict=True))  # type: ignore[return-value]


@dataclass(frozen=True, slots=True)
class _Form:
    """The integral over an element as a quadratic form: of psi and slope at its face, over exp(2 `scale`), or, where
    it is a `barrier`, of psi at both faces (`same` for each, `cross` for their product)."""

    straight: Floats
    mixed: Floats
    bent: Floats
    scale: Any
    barrier: NDArray[np.bool_]
    same: Floats
    cross: Floats

    @classmethod
    def of_element(cls, element: Element, energy: Floats) -> _Form:
        """The form of a layer or delta at real energies."""
        m = element_transfer(element, energy + 1j * _STEP)
        a, b, c, d = (np.broadcast_to(part, energy.shape).astype(complex) for part in (m.a, m.b, m.c, m.d))
        da, db, dc, dd = (-HBAR2_2M0 / _STEP * part.imag for part in (a, b, c, d))
        barrier = (a.real > _BARRIER) | (np.asarray(m.log_scale) > 0)
        across = np.where(barrier, b, 1.0)
        return cls(
            (a.real * dc - c.real * da), (a.real * dd - c.real * db + b.real * dc - d.real * da) / 2,
            (b.real * dd - d.real * db), m.log_scale, barrier,
            -HBAR2_2M0 / _STEP * (a / across).imag, HBAR2_2M0 / _STEP * (np.exp(-m.log_scale) / across).imag,
        )

    def of(self, begin: State, end: State) -> Floats:
        """Logarithm of the integral between two states (cells, n) at the element's faces."""
        (psi, slope, log), (beyond, _, log_beyond) = begin, end
        top = np.maximum(log, log_beyond)
        one, two = psi * np.exp(log - top), beyond * np.exp(log_beyond - top)
        faces = self.same * (abs(one) ** 2 + abs(two) ** 2) + 2 * self.cross * (one * two.conj()).real
        inside = self.straight * abs(psi) ** 2 + 2 * self.mixed * (psi * slope.conj()).real
        inside = inside + self.bent * abs(slope) ** 2
        with np.errstate(divide="ignore"):
            return np.asarray(np.where(self.barrier, np.log(np.maximum(faces, 0.0)) + 2 * top,
                                       np.log(np.maximum(inside, 0.0)) + 2 * (log + self.scale)))


def _tail(lead: Lead, flux: Complexes, energy: Floats) -> Floats:
    """Logarithm of the integral over a closed lead, for psi = 1 at its face."""
    mass = mass_at(lead, energy)
    decay = flux.imag
    return np.asarray(np.log((1 + HBAR2_2M0 * lead.mass * lead.nonparabolicity * decay**2) / (2 * decay * mass)))
