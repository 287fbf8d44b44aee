"""How far a verdict can be trusted: the same verdict for band offsets, masses and layers as far off as they may be.

One figure at a time, and all at once in every combination of ends (the corners). Band offsets are known to some
20 meV at best and layers are grown to a monolayer at best, so a single number of periods says too much.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from itertools import product

import numpy as np
from numpy.typing import NDArray

from transport.document import GrowthRecord
from transport.fewest import Asked, fewest_periods
from transport.oscillation import Floats
from transport.periods import checked, histories, no_progress
from transport.refusal import ScenarioError
from transport.resolve import SheetRow, monolayer_of, stack_of
from transport.scenario import Scenario
from transport.structure import Stack

MOST_CORNERED = 6
"""Figures that are combined in corners at most: those that matter most alone."""


@dataclass(frozen=True, slots=True)
class Figure:
    """One figure that may be off: its name, and the fewest periods with it as low and as high as it may be."""

    name: str
    low: int | None
    high: int | None


@dataclass(frozen=True, slots=True)
class Case:
    """One case: which figures are off (-1, 0 or 1 each), and the fewest periods."""

    signs: tuple[int, ...]
    fewest: int | None


@dataclass(frozen=True, slots=True)
class VerdictRange:
    """The range of a verdict over `figures`, each alone and in all corners.

    `nominal`: the fewest periods as written; `low`, `high`: over all cases that have an answer (None: none has);
    `unanswered`: how many of `cases` have none; `matters_most`: the figure that moves the answer most.
    """

    nominal: int | None
    low: int | None
    high: int | None
    unanswered: int
    cases: tuple[Case, ...]
    figures: tuple[Figure, ...]
    matters_most: str | None
    sentence: str

    @property
    def assumed(self) -> str:
        """What may be off, in words."""
        return "For " + ", ".join(figure.name for figure in self.figures) + ", each alone and all at once."


def verdict_range(scenario: Scenario, progress: Callable[[float], None] = no_progress) -> VerdictRange:
    """The range of a scenario's verdict for the figures of its `[growth]`, or their defaults.

    Raises ValueError without windows, and ScenarioError where an error would take away the whole of a layer.
    """
    if scenario.target is None or not scenario.target.windows:
        raise ValueError("target.windows: give at least one pass or block window to decide by")
    off = Deviations.of(scenario)
    fewest: dict[tuple[int, ...], int | None] = {}

    def solved(signs: tuple[int, ...], share: float) -> int | None:
        if signs not in fewest:
            check = fewest_periods(off.question(signs))
            fewest[signs] = check.periods if check else None
        progress(share)
        return fewest[signs]

    size = len(off.names)
    nominal = solved((0,) * size, 0.05)
    figures = tuple(
        Figure(name, solved(off.alone(place, -1), 0.3), solved(off.alone(place, 1), 0.3))
        for place, name in enumerate(off.names)
    )
    moved = [_moved(figure, nominal, scenario.target.most_periods) for figure in figures]
    chosen = sorted(sorted(range(size), key=lambda place: -moved[place])[:MOST_CORNERED])
    corners = list(off.corners(chosen))
    for place, signs in enumerate(corners):
        solved(signs, 0.3 + 0.7 * (place + 1) / len(corners))
    known = [count for count in fewest.values() if count is not None]
    most = off.names[int(np.argmax(moved))] if any(moved) else None
    found = VerdictRange(
        nominal, min(known, default=None), max(known, default=None), len(fewest) - len(known),
        tuple(Case(signs, count) for signs, count in fewest.items()), figures, most, "")
    return replace(found, sentence=_sentence(found))


def margin_range(
    scenario: Scenario,
    found: VerdictRange,
    counts: NDArray[np.int64],
    progress: Callable[[float], None] = no_progress,
) -> tuple[Floats, Floats]:
    """The least and the largest margin (dB) of each of some ascending counts, over all cases of a range.

    NaN where no case has a margin.
    """
    off = Deviations.of(scenario)
    low, high = np.full(counts.size, np.inf), np.full(counts.size, -np.inf)
    for place, case in enumerate(found.cases):
        margins = np.array([np.nan if check.margin_dB is None else check.margin_dB
                            for check in checked(histories(off.question(case.signs), counts), counts)])
        low, high = np.fmin(low, margins), np.fmax(high, margins)
        progress((place + 1) / len(found.cases))
    return np.where(np.isfinite(low), low, np.nan), np.where(np.isfinite(high), high, np.nan)


@dataclass(frozen=True)
class Deviations:
    """The figures that may be off: band offsets, masses, and the thickness of every kind of layer."""

    scenario: Scenario
    growth: GrowthRecord
    kinds: tuple[tuple[object, ...], ...]
    names: tuple[str, ...]

    @classmethod
    def of(cls, scenario: Scenario) -> Deviations:
        """The figures of a scenario."""
        growth = scenario.document.growth or GrowthRecord()
        rows = {_kind(row): row for row in scenario.sheet if row.thickness}
        kinds = tuple(rows) if growth.monolayer_error else ()
        names = [f"{name} \N{PLUS-MINUS SIGN}{percent:g} %" for name, percent in
                 (("band offset", growth.offset_percent), ("mass", growth.mass_percent)) if percent]
        return cls(scenario, growth, kinds, (*names, *(
            f"{name} \N{PLUS-MINUS SIGN}{growth.monolayer_error} ML" for name in _kind_names(list(rows.values()))
            if kinds)))

    def alone(self, place: int, sign: int) -> tuple[int, ...]:
        """Only one figure off."""
        return tuple(sign if other == place else 0 for other in range(len(self.names)))

    def corners(self, chosen: list[int]) -> Iterator[tuple[int, ...]]:
        """Every combination of ends of the chosen figures, the others as written."""
        for signs in product((-1, 1), repeat=len(chosen)):
            off = dict(zip(chosen, signs, strict=True))
            yield tuple(off.get(place, 0) for place in range(len(self.names)))

    def question(self, signs: tuple[int, ...]) -> Asked:
        """The scenario's question of a stack whose figures are off by these signs."""
        assert self.scenario.target is not None
        return Asked(self._stack(signs), self.scenario.target, self.scenario.resolution)

    def _stack(self, signs: tuple[int, ...]) -> Stack:
        rest = list(signs)
        offset = 1 + (rest.pop(0) * self.growth.offset_percent / 100 if self.growth.offset_percent else 0.0)
        mass = 1 + (rest.pop(0) * self.growth.mass_percent / 100 if self.growth.mass_percent else 0.0)
        errors = dict(zip(self.kinds, rest, strict=True))
        rows = [self._row(row, offset, mass, errors.get(_kind(row), 0)) for row in self.scenario.sheet]
        return stack_of(rows, self.scenario.target, 1, self.scenario.stack.dephasing)[0]

    def _row(self, row: SheetRow, offset: float, mass: float, error: int) -> SheetRow:
        if row.strength is not None:
            return row
        thickness = row.thickness
        if thickness and error:
            thickness += error * self.growth.monolayer_error * monolayer_of(row)
            if thickness <= 0:
                raise ScenarioError("growth.monolayer_error", f"would leave nothing of {row.key}; give a smaller one")
        variation = row.variation.scaled(thickness or 0.0, offset, mass) if row.variation else None
        return replace(row, thickness=thickness, band_edge=(row.band_edge or 0.0) * offset,
                       mass=(row.mass or 0.0) * mass, variation=variation)


def _kind(row: SheetRow) -> tuple[object, ...]:
    """Layers of one kind are grown alike: same material and composition, or same edge, mass and profile."""
    return (row.material, row.x, row.band_edge, row.mass, row.profile)


def _kind_names(rows: list[SheetRow]) -> list[str]:
    """Barrier and well where there is one kind of each; else materials or edges."""
    if len(rows) == 2 and rows[0].band_edge != rows[1].band_edge:
        top = max(row.band_edge or 0.0 for row in rows)
        return ["barrier" if row.band_edge == top else "well" for row in rows]
    return [f"{row.material}" + (f" (x = {row.x:g})" if row.x is not None else "") if row.material
            else f"layer at {(row.band_edge or 0.0) * 1e3:.4g} meV" for row in rows]


def _moved(figure: Figure, nominal: int | None, most: int) -> int:
    """By how many periods a figure alone moves the answer; no answer counts as one more than the most."""
    counts = [most + 1 if count is None else count for count in (figure.low, nominal, figure.high)]
    return max(counts) - min(counts)


def _sentence(found: VerdictRange) -> str:
    cases = len(found.cases)
    if found.low is None:
        return f"No answer anywhere in the range ({cases} cases)."
    span = f"{found.low}" if found.low == found.high else f"{found.low}\N{EN DASH}{found.high}"
    none = f", none in {found.unanswered} of {cases} cases" if found.unanswered else ""
    words = f"Fewest {found.nominal} ({span}{none})" if found.nominal else f"None as written ({span} elsewhere{none})"
    return f"{words}; {_most_in_words(found.matters_most)}."


def _most_in_words(name: str | None) -> str:
    if name is None:
        return "no figure alone changes it"
    what, _, size = name.partition(" \N{PLUS-MINUS SIGN}")
    return f"the {what}'s monolayer matters most" if size.endswith("ML") else f"the {what} matters most"
