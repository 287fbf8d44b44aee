"""What a stack is: layers, leads, the finite periodic stack, and the target it is asked to meet.

Frozen values only. Energies are in eV and count from the left lead's band edge, lengths in nm, masses in
units of the free-electron mass. The electron comes from the left:

    left lead | entry layers | cell | cell | ... (periods times) | exit layers | right lead
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from typing import Literal, TypeVar

import numpy as np
from numpy.typing import NDArray


def _require(condition: bool, name: str, value: object, remedy: str) -> None:
    if not condition:
        raise ValueError(f"{name} is {value!r}: {remedy}")


@dataclass(frozen=True, slots=True)
class Layer:
    """A layer of constant band edge.

    `thickness` in nm, `band_edge` in eV, `mass` in m0; with `nonparabolicity` (1/eV) the mass depends on energy as
    mass (1 + nonparabolicity (E - band_edge)). Raises ValueError for values that are not finite or not above 0.
    """

    thickness: float
    band_edge: float
    mass: float
    nonparabolicity: float = 0.0

    def __post_init__(self) -> None:
        _require(math.isfinite(self.thickness) and self.thickness > 0, "thickness", self.thickness,
                 "give a length above 0 nm")
        _require_medium(self)


@dataclass(frozen=True, slots=True)
class Delta:
    """A barrier (or, if negative, a well) of zero thickness and `strength` in eV nm."""

    strength: float

    def __post_init__(self) -> None:
        _require(math.isfinite(self.strength), "strength", self.strength, "give a finite strength in eV nm")


@dataclass(frozen=True, slots=True)
class Lead:
    """A uniform half space: `band_edge` in eV, `mass` in m0, `nonparabolicity` in 1/eV as for a layer."""

    band_edge: float
    mass: float
    nonparabolicity: float = 0.0

    def __post_init__(self) -> None:
        _require_medium(self)


def _require_medium(medium: Layer | Lead) -> None:
    _require(math.isfinite(medium.band_edge), "band_edge", medium.band_edge, "give a finite energy in eV")
    _require(math.isfinite(medium.mass) and medium.mass > 0, "mass", medium.mass, "give a mass above 0 (m0)")
    _require(math.isfinite(medium.nonparabolicity) and medium.nonparabolicity >= 0, "nonparabolicity",
             medium.nonparabolicity, "give 0 or more (1/eV)")


Element = Layer | Delta
Part = TypeVar("Part", Layer, Delta, Lead, Element)


@dataclass(frozen=True, slots=True)
class Stack:
    """A finite periodic barrier stack between two leads.

    `dephasing` (eV) is the width 2 Im V of the optical potential in every layer; 0 means no loss. Raises ValueError
    if the left lead's band edge is not 0 (it is the zero of energy), the cell has no layer of finite thickness, or
    `periods` is not a whole number above 0.
    """

    left: Lead
    entry: tuple[Element, ...]
    cell: tuple[Element, ...]
    periods: int
    exit: tuple[Element, ...]
    right: Lead
    dephasing: float = 0.0

    def __post_init__(self) -> None:
        for name in ("entry", "cell", "exit"):
            object.__setattr__(self, name, tuple(getattr(self, name)))
        _require(self.left.band_edge == 0, "left.band_edge", self.left.band_edge,
                 "energies count from the left lead's band edge, so subtract it from every band edge")
        _require(isinstance(self.periods, int) and self.periods >= 1, "periods", self.periods,
                 "give a whole number of 1 or more")
        _require(self.period_length > 0, "cell", self.cell, "give it at least one layer of finite thickness")
        _require(math.isfinite(self.dephasing) and self.dephasing >= 0, "dephasing", self.dephasing,
                 "give a width of 0 eV or more")

    @property
    def period_length(self) -> float:
        """Length of one cell in nm."""
        return math.fsum(thickness(element) for element in self.cell)

    @property
    def length(self) -> float:
        """Length of the whole stack in nm, all periods and end layers."""
        ends = math.fsum(thickness(element) for element in self.entry + self.exit)
        return self.periods * self.period_length + ends

    def with_periods(self, periods: int) -> Stack:
        """The same stack with another number of periods."""
        return replace(self, periods=periods)

    def lossless(self) -> Stack:
        """The same stack without dephasing."""
        return replace(self, dephasing=0.0) if self.dephasing else self

    def reversed(self) -> Stack:
        """The same stack entered from the other side; energies then count from what was the right lead's edge."""
        shift = self.right.band_edge
        entry, cell, exit_ = (
            tuple(_shifted(e, -shift) for e in reversed(part)) for part in (self.exit, self.cell, self.entry)
        )
        left, right = _shifted(self.right, -shift), _shifted(self.left, -shift)
        return Stack(left, entry, cell, self.periods, exit_, right, self.dephasing)

    @property
    def elements(self) -> tuple[Element, ...]:
        """Every layer and delta that occurs, each place once (the cell is not repeated)."""
        return self.entry + self.cell + self.exit


def thickness(element: Element) -> float:
    """Thickness of a layer in nm; 0 for a delta."""
    return element.thickness if isinstance(element, Layer) else 0.0


def _shifted(part: Part, shift: float) -> Part:
    return part if isinstance(part, Delta) else replace(part, band_edge=part.band_edge + shift)


@dataclass(frozen=True, slots=True)
class Window:
    """One demand of a target: from `bottom` to `top` (eV) pass at least, or block to at most, `transmission`.

    `measure` says what of the window is compared: its minimum or mean (pass), its maximum or mean (block).
    """

    kind: Literal["pass", "block"]
    bottom: float
    top: float
    transmission: float
    measure: Literal["minimum", "maximum", "mean"]

    def __post_init__(self) -> None:
        _require(self.bottom < self.top, "top", self.top, f"give an energy above the bottom, {self.bottom!r}")
        _require(0 < self.transmission <= 1, "transmission", self.transmission, "give a value above 0, up to 1")
        extreme = "minimum" if self.kind == "pass" else "maximum"
        _require(self.measure in (extreme, "mean"), "measure", self.measure,
                 f"a {self.kind} window is measured by its {extreme} or its mean")


@dataclass(frozen=True, slots=True)
class Target:
    """What is asked of a stack: every window met, with at most `most_periods` periods."""

    windows: tuple[Window, ...]
    most_periods: int


@dataclass(frozen=True, slots=True)
class Profile:
    """The band edge along growth, for drawing.

    `position` (nm, 0 at the left face) and `potential` (eV): the corners of a step line, leads included;
    `deltas`: position (nm) and strength (eV nm) of each delta.
    """

    position: NDArray[np.float64]
    potential: NDArray[np.float64]
    deltas: tuple[tuple[float, float], ...] = field(default=())


def band_profile(stack: Stack) -> Profile:
    """The band edge along the whole stack with a margin of one period (at least 3 nm) of each lead."""
    margin = max(stack.period_length, 3.0)
    position, potential, deltas = [-margin, 0.0], [stack.left.band_edge] * 2, []
    for element in _unrolled(stack):
        here = position[-1]
        if isinstance(element, Delta):
            deltas.append((here, element.strength))
        else:
            position += [here, here + element.thickness]
            potential += [element.band_edge] * 2
    position += [position[-1], position[-1] + margin]
    potential += [stack.right.band_edge] * 2
    return Profile(np.array(position), np.array(potential), tuple(deltas))


def _unrolled(stack: Stack) -> Sequence[Element]:
    return stack.entry + stack.cell * stack.periods + stack.exit
