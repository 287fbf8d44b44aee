"""What moves a resonance, figure by figure of the layer sheet, the largest effect first."""

from __future__ import annotations

import itertools
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from transport.graded import lay_out_like
from transport.materials import material
from transport.resolve import SheetRow, altered, monolayer_of
from transport.scenario import Scenario
from transport.sensitivity import Slopes, pole_slopes
from transport.structure import Layer

_FIGURES = ("thickness", "band_edge", "mass", "nonparabolicity")


@dataclass(frozen=True, slots=True)
class Effect:
    """How one figure of one layer moves a resonance: eV per `step`, of energy and width.

    `key`: the layer's place in the file; `figure`: thickness, composition, band edge, mass or strength; `step`: the
    size of one step, in words.
    """

    key: str
    name: str
    figure: str
    step: str
    energy: float
    width: float


def sensitivities(scenario: Scenario, energy: float, width: float) -> tuple[Effect, ...]:
    """What moves the resonance at `energy` (eV) of `width` (eV), the largest effect on its energy first.

    A layer of the cell counts for every period. Steps: one monolayer, 0.01 in x (at the same thickness in nm), 10 meV
    of band edge, one per cent of mass or delta strength. Dephasing is left out, and so is the composition of a layer
    whose band edge runs (graded alloys, graded interfaces); its thickness is that of the file, widths in nm stay.
    """
    slopes = pole_slopes(scenario.stack.lossless(), [complex(energy, -width / 2)])
    starts = itertools.accumulate((row.slices for row in scenario.sheet), initial=0)
    effects = []
    for place, (row, start) in enumerate(zip(scenario.sheet, starts, strict=False)):
        if row.where in ("left lead", "right lead"):
            continue
        if row.slices == 1:
            steps = _steps(scenario, row, _of_row(slopes, start))
        else:
            steps = _steps_of_a_variation(scenario, place, slopes)
        effects += [_effect(row, figure, step, shift) for figure, step, shift in steps]
    return tuple(sorted(effects, key=lambda effect: -abs(effect.energy)))


def _of_row(slopes: Slopes, place: int) -> dict[str, complex]:
    return {name: complex(getattr(slopes, name)[0, place])
            for name in ("thickness", "band_edge", "mass", "nonparabolicity", "strength")}


def _steps(scenario: Scenario, row: SheetRow, slope: dict[str, complex]) -> Iterator[tuple[str, str, complex]]:
    """Each figure of a row with its step and the complex shift per step."""
    if row.strength is not None:
        yield "strength", "1 %", slope["strength"] * row.strength / 100
        return
    yield "thickness", "1 monolayer", slope["thickness"] * monolayer_of(row)
    yield "band edge", "10 meV", slope["band_edge"] * 0.01
    yield "mass", "1 %", slope["mass"] * (row.mass or 0.0) / 100
    conditions = scenario.document.conditions
    if row.x is not None and row.material not in {entry.name for entry in scenario.document.materials}:
        edge, mass, gap = composition_slopes(row.material or "", row.x, conditions.temperature_K, conditions.substrate)
        shift = slope["band_edge"] * edge + slope["mass"] * mass
        if conditions.nonparabolic and row.nonparabolicity:
            shift -= slope["nonparabolicity"] * row.nonparabolicity**2 * gap
        yield "composition", "0.01 in x", shift * 0.01


def _steps_of_a_variation(scenario: Scenario, place: int, slopes: Slopes) -> Iterator[tuple[str, str, complex]]:
    """The same for a row that comes to many layers: each moves as its figure says, and the shifts add up."""
    row = scenario.sheet[place]
    small = 1e-3  # of a step: what the layers are, follows from it to rounding

    def shift(**step: float) -> complex:
        rows = [tuple(altered(r, **{name: sign * small * size for name, size in step.items()}) if r is row else r
                      for r in scenario.sheet) for sign in (1, -1)]
        more, less = (lay_out_like(changed, scenario.stack.elements).elements for changed in rows)
        return sum((complex(getattr(slopes, name)[0, i]) * (getattr(a, name) - getattr(b, name))
                    for i, (a, b) in enumerate(zip(more, less, strict=True)) if isinstance(a, Layer) and a != b
                    for name in _FIGURES), 0j) / (2 * small)

    yield "thickness", "1 monolayer", shift(thickness=monolayer_of(row))
    yield "band edge", "10 meV", shift(band_edge=0.01)
    yield "mass", "1 %", shift(mass_share=0.01)


def composition_slopes(name: str, x: float, temperature: float, substrate: str | None) -> tuple[float, float, float]:
    """d/dx of band edge (eV), mass (m0) and gap (eV) of a library alloy.

    The library's laws are polynomials in x of fourth degree at most, strain apart: the polynomial through five
    compositions is differentiated.
    """
    nodes = np.linspace(0, 1, 5)
    found = [material(name, float(node), temperature, substrate) for node in nodes]
    values = np.array([[m.band_edge, m.mass, m.gap] for m in found])
    coefficients = np.polynomial.polynomial.polyfit(nodes, values, 4)
    slopes = np.array([1, 2 * x, 3 * x**2, 4 * x**3]) @ coefficients[1:]
    return float(slopes[0]), float(slopes[1]), float(slopes[2])


def _effect(row: SheetRow, figure: str, step: str, shift: complex) -> Effect:
    known = row.material or row.profile or ("delta" if row.strength is not None else None)
    name = known or f"layer at {(row.band_edge or 0.0) * 1e3:.4g} meV"
    return Effect(row.key, name, figure, step, shift.real, -2 * shift.imag)
