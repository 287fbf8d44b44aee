"""Layers whose band edge and mass run, resolved into constant layers, so that all else stays exact for them.

For y = (psi, psi'/m), y' = A(x) y with A = [[0, m], [(V - E)/C, 0]]. Over a step of length h three constant layers of
thickness h (5 - sqrt 5)/10, h/sqrt 5, h (5 - sqrt 5)/10 are taken whose A has the moments of the true one: with the
quadratic c0 + c1 s + c2 s^2 through the values at Gauss's three points (s from -1/2 to 1/2) they hold

    c0 - 5/12 c1 + c2/6,     c0 + (1/6 - 5/(12 sqrt 5)) c2,     c0 + 5/12 c1 + c2/6

of V and of m alike: a commutator-free Magnus step (Blanes and Moan, Appl. Numer. Math. 56, 1519 (2006); Alvermann and
Fehske, J. Comput. Phys. 230, 5930 (2011)) that is exact to sixth order in everything linear in c1 and c2. Real steps
that all go forwards cannot be right to sixth order in c1^2 as well. What is missing is D h^3/4 [A1, [A0, A1]], which
for a constant mass is a constant potential, D h^2 m V1^2 / 2C, and is added to V (modified potentials: Bader, Blanes,
Casas, Kopylov and Ponsoda, J. Comput. Appl. Math. 330, 909 (2018), from memory; the weights and D are derived here).
So a step is of sixth order for a constant mass, and of fourth order with a small constant where the mass runs.
"""

from __future__ import annotations

import functools
import itertools
import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

from transport.constants import HBAR2_2M0
from transport.parameters import PARAMETERS
from transport.propagation import Transfer, element_transfer
from transport.structure import Layer

Floats = NDArray[np.float64]

TOLERANCE = 1e-10
"""Relative error of a variation's matrix, against one of twice as many steps."""
THINNEST = 1e-9
"""The thinnest variation, nm."""
MOST_SLICES = int(PARAMETERS["file_slices"].high)
PER_STEP = 3
"""Constant layers of one step."""

_ENERGIES = 13
_FIRST_STEPS = 4
_TRIALS = 3  # of spacings, before one that is better than it need be is taken
_ORDER = 6
_RESOLVED, _ROUNDING = 1e-7, 1e-15  # error of a step that tells how errors are spread; and one that says nothing
_REACH = 2.0  # an interface's error function is cut at erf(2) = 0.995, and scaled so that it ends there

_INNER = math.sqrt(5) / 10
_SHARES = np.array([0.5 - _INNER, 2 * _INNER, 0.5 - _INNER])
_LEAN = np.array([-5 / 12, 0.0, 5 / 12])
_BEND = np.array([1 / 6, 1 / 6 - 1 / (24 * _INNER), 1 / 6])
_GAUSS = math.sqrt(15) / 10
# D: int int |s - s'| c(s) c(s') of c = s is -1/60; that of the three layers is subtracted.
_DEFECT = 2 * (25 / 144) * _SHARES[0] ** 2 * (2 * _SHARES[0] / 3 + _SHARES[1]) - 1 / 60


def _linear(x: Floats, length: float, n: tuple[float, ...]) -> Floats:
    return n[0] + (n[1] - n[0]) * x / length


def _cosine(x: Floats, length: float, n: tuple[float, ...]) -> Floats:
    return np.asarray(n[0] + n[1] * np.cos(2 * np.pi * x / length))


def _gaussian(x: Floats, length: float, n: tuple[float, ...]) -> Floats:
    return np.asarray(n[2] + n[0] * np.exp(-0.5 * ((x - length / 2) / n[1]) ** 2))


def _sech2(x: Floats, length: float, n: tuple[float, ...]) -> Floats:
    decay = np.exp(-2 * abs(x - length / 2) / n[1])
    return np.asarray(n[2] + n[0] * 4 * decay / (1 + decay) ** 2)


def _fermi(x: Floats, length: float, n: tuple[float, ...]) -> Floats:
    return np.asarray(n[0] * (1 + np.tanh((x - length / 2) / (2 * n[1]))) / 2)


def _parabola(x: Floats, length: float, n: tuple[float, ...]) -> Floats:
    return np.asarray(n[0] * (1 - ((x - length / 2) / n[1]) ** 2))


def _samples(x: Floats, length: float, n: tuple[float, ...]) -> Floats:
    return np.asarray(np.interp(x, np.linspace(0.0, length, len(n)), n))


def _flat(x: Floats, length: float, n: tuple[float, ...]) -> Floats:
    return np.full(x.shape, n[0])


def _series(x: Floats, length: float, n: tuple[float, ...]) -> Floats:
    return np.asarray(np.polynomial.chebyshev.chebval(2 * x / length - 1, n))


_SHAPES: Mapping[str, Callable[[Floats, float, tuple[float, ...]], Floats]] = MappingProxyType({
    "flat": _flat, "series": _series, "linear": _linear, "cosine": _cosine, "gaussian": _gaussian, "sech2": _sech2,
    "fermi": _fermi, "parabola": _parabola, "samples": _samples,
})


@dataclass(frozen=True, slots=True)
class Curve:
    """One quantity through a layer: shift + factor * shape(x).

    `numbers` of each shape, in order. flat: value; series: Chebyshev coefficients from face to face; linear: from, to;
    cosine: mean, amplitude; gaussian, sech2: height, width (nm), base; fermi: step, width; parabola: height, width;
    samples: values equally spaced from face to face.
    """

    shape: str
    numbers: tuple[float, ...]
    factor: float = 1.0
    shift: float = 0.0

    def at(self, x: Floats, length: float) -> Floats:
        """Values at x (nm from the left face) in a layer of that length."""
        return self.shift + self.factor * _SHAPES[self.shape](x, length, self.numbers)

    def times(self, factor: float) -> Curve:
        """The curve multiplied by a number."""
        return replace(self, factor=self.factor * factor, shift=self.shift * factor)

    def corners(self, length: float) -> Floats:
        """Where the curve has a corner within (nm)."""
        return np.linspace(0.0, length, len(self.numbers)) if self.shape == "samples" else np.empty(0)

    def net(self, length: float) -> Floats:
        """Places (nm) between which nothing narrow can hide."""
        if self.shape not in ("gaussian", "sech2", "fermi"):
            return np.linspace(0.0, length, 1 + _FIRST_STEPS) if self.shape != "flat" else np.empty(0)
        widths = 2.0 ** np.arange(-1, 7) * self.numbers[1]
        return np.concatenate([[length / 2], length / 2 - widths, length / 2 + widths])


def flat(value: float) -> Curve:
    """A quantity that does not run."""
    return Curve("flat", (value,))


@dataclass(frozen=True, slots=True)
class Face:
    """A graded interface at a face: its full length (nm) and what lies beyond it."""

    length: float
    band_edge: float
    mass: float
    nonparabolicity: float


@dataclass(frozen=True, slots=True)
class Variation:
    """Band edge (eV), mass (m0) and nonparabolicity (1/eV) through one layer of `thickness` nm.

    At a graded face the values go over into those beyond it as (1 - erf(4 s / length) / erf(2)) / 2 of the distance s
    from the face: half of the interface lies in this layer, the other half beyond.
    """

    thickness: float
    band_edge: Curve
    mass: Curve
    nonparabolicity: Curve
    left: Face | None = None
    right: Face | None = None

    def at(self, x: Floats) -> tuple[Floats, Floats, Floats]:
        """Band edge, mass and nonparabolicity at each x (nm from the left face)."""
        edge, mass, alpha = (c.at(x, self.thickness) for c in (self.band_edge, self.mass, self.nonparabolicity))
        for face, distance in ((self.left, x), (self.right, self.thickness - x)):
            if face is not None:
                share = _beyond(distance, face.length)
                edge = edge + share * (face.band_edge - edge)
                mass = mass + share * (face.mass - mass)
                alpha = alpha + share * (face.nonparabolicity - alpha)
        return edge, mass, alpha

    def scaled(self, thickness: float, edge: float, mass: float) -> Variation:
        """Another thickness (widths in nm stay), and band edge and mass times a factor each."""
        return replace(self, thickness=thickness, band_edge=self.band_edge.times(edge), mass=self.mass.times(mass))

    def moved(self, edge: float) -> Variation:
        """The band edge shifted as a whole (eV)."""
        return replace(self, band_edge=replace(self.band_edge, shift=self.band_edge.shift + edge))

    def at_face(self, side: int) -> tuple[float, float, float]:
        """Band edge, mass and nonparabolicity at the left (0) or right (1) face, its grading left out."""
        x = np.array(side * self.thickness)
        edge, mass, alpha = (float(c.at(x, self.thickness))
                             for c in (self.band_edge, self.mass, self.nonparabolicity))
        return edge, mass, alpha

    def corners(self) -> Floats:
        """Where steps have to end (nm), ascending from 0 to the thickness."""
        places = [np.array([0.0, self.thickness])]
        places += [curve.corners(self.thickness) for curve in (self.band_edge, self.mass, self.nonparabolicity)]
        places += [np.array([abs(side - face.length / 2)]) for face, side in self._faces if face is not None]
        return self._ascending(places)

    def net(self) -> Floats:
        """The corners, and places between which nothing narrow can hide."""
        places = [curve.net(self.thickness) for curve in (self.band_edge, self.mass, self.nonparabolicity)]
        places += [abs(side - np.linspace(0, face.length / 2, 1 + _FIRST_STEPS))
                   for face, side in self._faces if face is not None]
        return self._ascending([self.corners(), *places])

    @property
    def _faces(self) -> tuple[tuple[Face | None, float], tuple[Face | None, float]]:
        return (self.left, 0.0), (self.right, self.thickness)

    def _ascending(self, places: list[Floats]) -> Floats:
        found = np.unique(np.concatenate(places))
        found = found[(found >= 0) & (found <= self.thickness)]
        kept: Floats = found[np.diff(found, prepend=-self.thickness) > 1e-12 * self.thickness]
        kept[-1] = self.thickness
        return kept

    def mean(self) -> tuple[float, float, float]:
        """Means over the layer of band edge, mass and nonparabolicity."""
        nodes, weights = np.polynomial.legendre.leggauss(8)
        ends = self.net()
        width = np.diff(ends)[:, None]
        values = self.at(ends[:-1, None] + width * (1 + nodes) / 2)
        edge, mass, alpha = (float(np.sum(v * weights * (width / self.thickness)) / 2) for v in values)
        return edge, mass, alpha

    def reach(self) -> tuple[float, float]:
        """About the lowest and the highest band edge."""
        ends = self.net()
        edge = self.at(ends[:-1, None] + np.diff(ends)[:, None] * np.linspace(0, 1, 9))[0]
        return float(edge.min()), float(edge.max())


def _beyond(distance: Floats, length: float) -> Floats:
    """Share of what lies beyond a graded face: a half at the face, nothing from half the length on."""
    scaled = 2 * _REACH * (np.minimum(distance, length / 2) / length)
    error = np.array([math.erf(value) for value in scaled.ravel()]).reshape(scaled.shape)
    return np.asarray((1 - error / math.erf(_REACH)) / 2)


class VariationError(ValueError):
    """A variation that cannot be resolved; the message says what to do about it."""


@functools.lru_cache(maxsize=512)
def slices(variation: Variation, low: float, high: float) -> tuple[Layer, ...]:
    """The constant layers, left to right, whose matrix is the variation's to 1e-10 at energies from low to high (eV).

    Steps are as long as lets all err alike, and as many as it takes for twice as many to change the matrix by no more
    than TOLERANCE of its largest entry (b and c measured by the wave number of that range). Raises VariationError if
    those are too many, and for a variation thinner than THINNEST.
    """
    if variation.thickness < THINNEST:
        raise VariationError(f"is {variation.thickness:g} nm thick, but a layer that runs needs {THINNEST:g} nm; "
                             "make it thicker")
    energy = np.linspace(low, high, _ENERGIES)
    net, best = _refined(variation, energy), None
    allowed, wanted = TOLERANCE, TOLERANCE / 2  # a half for energies between those looked at
    trials = 0
    while best is None or trials < _TRIALS:
        trials += 1
        net = _spread(net, _wanted_steps(variation, net, energy, allowed), variation.corners())
        finer = _halved(net, ~_is_flat(variation, net))
        coarse, fine = (_product(_matrices(_constants(variation, ends), energy)) for ends in (net, finer))
        error = float(_difference(coarse, fine, _unit(variation, energy)).max())
        if error <= wanted and _sound(_constants(variation, net)).all() and (best is None or net.size < best.size):
            best = net
        if best is not None and (wanted / 10 <= error <= wanted or net.size == variation.corners().size):
            break
        change = (wanted / max(error, wanted * 1e-3)) ** ((_ORDER + 1) / _ORDER)
        allowed *= min(max(0.9 * change, 0.05), 20.0)
    return on_steps(variation, best)


def _wanted_steps(variation: Variation, ends: Floats, energy: Floats, allowed: float) -> Floats:
    """Into how many steps each step would have to go to err by no more than is allowed; neighbours not too unlike."""
    steps = (np.maximum(_errors(variation, ends, energy), _ROUNDING) / allowed) ** (1 / (_ORDER + 1))
    width = np.diff(ends)
    wider = np.clip(width[1:] / width[:-1], 0.25, 4)
    steps[1:], steps[:-1] = np.maximum(steps[1:], steps[:-1] * wider / 2), np.maximum(steps[:-1], steps[1:] / wider / 2)
    least = 1e-6 * width / variation.thickness  # where nothing runs, one step will do
    return np.asarray(np.where(_is_flat(variation, ends), least, np.maximum(steps, least)))


def _spread(net: Floats, steps: Floats, corners: Floats) -> Floats:
    """Ends of new steps: between neighbouring corners as many as the net has `steps` there, spaced like them."""
    count = np.append(0.0, np.cumsum(steps))
    places = np.interp(corners, net, count)
    sizes = np.maximum(np.ceil(np.diff(places)), 1)
    _require_few(float(sizes.sum()))
    parts = [np.linspace(low, high, 1 + int(size))[1:] for (low, high), size in zip(itertools.pairwise(places), sizes,
                                                                                   strict=True)]
    found: Floats = np.interp(np.concatenate([[0.0], *parts]), count, net)
    return found[np.diff(found, prepend=-1.0) > 0]


def _require_few(steps: float) -> None:
    if PER_STEP * steps > MOST_SLICES:
        raise VariationError(f"takes more than {MOST_SLICES:,} constant layers to be right to {TOLERANCE:g}; make it "
                          "thinner, lower or smoother")


def on_steps(variation: Variation, ends: Floats) -> tuple[Layer, ...]:
    """The constant layers of given steps, whose `ends` (nm) ascend from 0 to the variation's thickness.

    Raises ValueError where a layer would come to a mass that is not above 0: its step is too long.
    """
    rows = _constants(variation, ends).reshape(4, -1).T.tolist()
    return tuple(Layer(*row) for row in rows)


def like(variation: Variation, layers: Sequence[Layer]) -> tuple[Layer, ...]:
    """The constant layers of a variation on the steps of one that hardly differs, stretched to its thickness."""
    ends = np.append(0.0, np.cumsum([layer.thickness for layer in layers])[PER_STEP - 1::PER_STEP])
    return on_steps(variation, ends * (variation.thickness / ends[-1]))


def _halved(ends: Floats, where: NDArray[np.bool_] | None = None) -> Floats:
    """Every step, or every one of some, cut into two."""
    return _split(ends, np.full(ends.size - 1, 2) if where is None else 1 + where)


def _is_flat(variation: Variation, ends: Floats) -> NDArray[np.bool_]:
    """Steps through which nothing runs: their layers are exact whatever their length."""
    whole, half = _constants(variation, ends)[1:], _constants(variation, _halved(ends))[1:]
    both = np.concatenate([whole, half.reshape(3, -1, 2 * PER_STEP)], axis=2)
    return np.asarray((both == both[:, :, :1]).all(axis=(0, 2)))


def _refined(variation: Variation, energy: Floats) -> Floats:
    """Steps so short that each errs by little: the net from which the spacing of the final ones is read."""
    ends = variation.net()
    while True:
        _require_few(ends.size - 1)
        error = _errors(variation, ends, energy)
        parts = np.ceil(np.clip((error / _RESOLVED) ** (1 / (_ORDER + 1)), 1, 4)).astype(int)
        if (parts == 1).all():
            return ends
        ends = _split(ends, parts)


def _errors(variation: Variation, ends: Floats, energy: Floats) -> Floats:
    """The error of each step: the most that halving it changes its matrix. Infinite where a mass is not above 0."""
    whole, half = _constants(variation, ends), _constants(variation, _halved(ends))
    coarse, fine = _along(_matrices(whole, energy), PER_STEP), _along(_matrices(half, energy), 2 * PER_STEP)
    error: Floats = _difference(coarse, fine, _unit(variation, energy)).max(axis=1)
    error[_is_flat(variation, ends)] = 0.0
    error[~_sound(whole)] = math.inf
    return error


def _split(ends: Floats, parts: NDArray[np.int64]) -> Floats:
    """Each step cut into so many equal parts."""
    left, width = np.repeat(ends[:-1], parts), np.repeat(np.diff(ends) / parts, parts)
    place = np.arange(parts.sum()) - np.repeat(np.cumsum(parts) - parts, parts)
    return np.append(left + place * width, ends[-1])


def _constants(variation: Variation, ends: Floats) -> Floats:
    """Thickness, band edge, mass and nonparabolicity of the layers of each step, shape (4, steps, 3).

    m(E) = mass (1 + a (E - V)) is the line (mass - mass a V) + mass a E, whose two coefficients are averaged.
    """
    width = np.diff(ends)
    middle = (ends[1:] + ends[:-1]) / 2
    edge, mass, alpha = variation.at(middle[:, None] + width[:, None] * np.array([-_GAUSS, 0.0, _GAUSS]))
    edges, edge_lean = _averaged(edge)
    slopes, slope_lean = _averaged(mass * alpha)
    grounds, ground_lean = _averaged(mass - mass * alpha * edge)
    centre, lean = mass[:, 1], ground_lean + slope_lean * edge[:, 1]
    defect = _DEFECT * width**2 * centre * edge_lean / (2 * HBAR2_2M0)
    edges = edges + (defect * edge_lean)[:, None]
    masses = grounds + slopes * edges - (defect * lean)[:, None]
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.array([width[:, None] * _SHARES, edges, masses, slopes / masses])


def _averaged(values: Floats) -> tuple[Floats, Floats]:
    """What the layers of each step hold of a quantity known at Gauss's points, and its c1."""
    lean = (values[:, 2] - values[:, 0]) / (2 * _GAUSS)
    bend = (values[:, 2] + values[:, 0] - 2 * values[:, 1]) / (2 * _GAUSS**2)
    return values[:, 1, None] + lean[:, None] * _LEAN + bend[:, None] * _BEND, lean


def _sound(constants: Floats) -> NDArray[np.bool_]:
    """Steps whose layers all have a mass above 0 and a nonparabolicity of 0 or more."""
    return np.asarray(((constants[2] > 0) & (constants[3] >= 0)).all(axis=1))


def _matrices(constants: Floats, energy: Floats) -> Transfer:
    """Matrices of all layers, (layers, energies): those of a layer of 1 nm and mass 1 at (E - V) m t^2, scaled."""
    thickness, edge, mass, alpha = constants.reshape(4, -1, 1)
    kinetic = energy - edge
    heavy = mass * (1 + np.nan_to_num(alpha) * kinetic)
    step = element_transfer(Layer(1.0, 0.0, 1.0), kinetic * heavy * thickness**2)
    return Transfer(step.a, step.b * heavy * thickness, step.b * kinetic * thickness / -HBAR2_2M0, step.d,
                    np.broadcast_to(step.log_scale, kinetic.shape))


def _along(steps: Transfer, count: int) -> Transfer:
    """Products of so many neighbours at a time."""
    total = _picked(steps, slice(0, None, count))
    for place in range(1, count):
        total = _picked(steps, slice(place, None, count)) @ total
    return total


def _product(steps: Transfer) -> Transfer:
    """The product of all, pair by pair."""
    while (size := len(steps.a)) > 1:
        pairs = (_picked(steps, slice(1, None, 2)) @ _picked(steps, slice(0, size - 1, 2))).rescaled()
        steps = pairs if size % 2 == 0 else _joined(pairs, _picked(steps, slice(size - 1, size)))
    return steps


def _picked(steps: Transfer, which: slice) -> Transfer:
    return Transfer(*(getattr(steps, name)[which] for name in Transfer.__slots__))


def _joined(first: Transfer, second: Transfer) -> Transfer:
    return Transfer(*(np.concatenate([getattr(first, name), getattr(second, name)]) for name in Transfer.__slots__))


def _unit(variation: Variation, energy: Floats) -> float:
    """m/k (nm m0) of the range: what makes b and c comparable with a and d."""
    mass = variation.mean()[1]
    return mass / math.sqrt(mass * float(np.ptp(energy)) / HBAR2_2M0)


def _difference(found: Transfer, true: Transfer, unit: float) -> Floats:
    """Largest deviation of an entry over the largest entry."""
    scale = np.exp(np.minimum(found.log_scale - true.log_scale, 300.0))
    pairs = ((found.a, true.a, 1.0), (found.b, true.b, 1 / unit), (found.c, true.c, unit), (found.d, true.d, 1.0))
    deviation = np.max([abs(f * scale - t) * weight for f, t, weight in pairs], axis=0)
    return np.asarray(deviation / np.max([abs(t) * weight for _, t, weight in pairs], axis=0))
