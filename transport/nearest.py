"""The remedy: the stacks that meet a target and differ least from the one at hand.

Every layer of the cell may change by some monolayers, and the ends may be matched. Candidates come in the order of
their number of changes; a bound from a few energies rules most of them out (`fewest.py`), and exact checks come last.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from itertools import combinations, product

from msgspec.structs import replace

from transport.document import EndsRecord, LayerRecord
from transport.fewest import best_check, fewest_periods
from transport.matching import describe_ends, matched_ends, with_ends
from transport.parameters import default
from transport.periods import PeriodCheck, no_progress, window_in_words
from transport.refusal import ScenarioError
from transport.resolve import SheetRow, monolayer_of
from transport.scenario import Scenario, scenario_from_document

MOST_MONOLAYERS = int(default("remedy_monolayers"))
"""By how many monolayers a layer may change, either way."""
ENOUGH = 8
"""Proposals after which nothing with more changes is tried."""
MOST_TRIED = 1500
"""Candidates tried at most; a cell of many layers is then changed in fewer of them at once."""


@dataclass(frozen=True, slots=True)
class Change:
    """One layer of the cell (its place from 0), what it is, and by how many monolayers it changes."""

    layer: int
    name: str
    monolayers: int

    @property
    def words(self) -> str:
        """The change in words."""
        size = abs(self.monolayers)
        way = "thicker" if self.monolayers > 0 else "thinner"
        return f"{self.name} {size} monolayer{'s' if size > 1 else ''} {way}"


@dataclass(frozen=True, slots=True)
class Remedy:
    """A stack near the one at hand: what changes, the check of its periods, its length in nm.

    `ends` is None where the ends stay as they are. `scenario` has every change in it, the periods included.
    """

    changes: tuple[Change, ...]
    ends: EndsRecord | None
    check: PeriodCheck
    length: float
    scenario: Scenario

    @property
    def words(self) -> str:
        """What changes, in words."""
        parts = [change.words for change in self.changes] + ([describe_ends(self.ends)] if self.ends else [])
        return "; ".join(parts) or "as it is"


@dataclass(frozen=True, slots=True)
class NearestStacks:
    """The remedies that meet the target, the least changed first, and a sentence.

    `miss`: where none does, the one that misses by least. `tried` candidates had up to `together` changes at once.
    """

    proposals: tuple[Remedy, ...]
    miss: Remedy | None
    tried: int
    together: int
    sentence: str


def nearest_stacks(
    scenario: Scenario, monolayers: int = MOST_MONOLAYERS, progress: Callable[[float], None] = no_progress
) -> NearestStacks:
    """The stacks that meet the target with the fewest changes, then the thinnest: at most 8 of them.

    A change is one layer of the cell (and the equal ones of entry and exit with it) thicker or thinner by up to
    `monolayers`, or matched ends; the number of periods is free up to the target's `most_periods`. Every proposal has
    met the exact verdict. Raises ValueError without windows.
    """
    if scenario.target is None or not scenario.target.windows:
        raise ValueError("target.windows: give at least one pass or block window to decide by")
    space = _Space(scenario, monolayers, _treatments(scenario, lambda share: progress(0.3 * share)))
    found: list[Remedy] = []
    tried: list[_Candidate] = []
    together = 0
    for level in space.levels():
        for candidate in level:
            tried.append(candidate)
            progress(0.3 + 0.6 * len(tried) / space.size)
            check = fewest_periods(candidate.scenario, candidate.least_periods)
            if check is not None:
                found.append(candidate.remedy(check))
        together = level[-1].count
        if len(found) >= ENOUGH:
            break
    found.sort(key=lambda remedy: (len(remedy.changes) + (remedy.ends is not None), remedy.length))
    miss = None if found else _nearest_miss(tried)
    progress(1.0)
    sentence = _found(found[:ENOUGH]) if found else _none(scenario, miss, monolayers, together, space)
    return NearestStacks(tuple(found[:ENOUGH]), miss, len(tried), together, sentence)


@dataclass(frozen=True)
class _Candidate:
    """Changes, and the scenario they make."""

    changes: tuple[Change, ...]
    ends: EndsRecord | None
    scenario: Scenario

    @property
    def count(self) -> int:
        return len(self.changes) + (self.ends is not None)

    @property
    def least_periods(self) -> int:
        ends = self.scenario.document.stack.ends
        return (ends.cells or 1) if ends and ends.kind not in ("half", "cells") else 1

    def remedy(self, check: PeriodCheck) -> Remedy:
        stack = replace(self.scenario.document.stack, periods=check.periods)
        scenario = scenario_from_document(replace(self.scenario.document, stack=stack))
        return Remedy(self.changes, self.ends, check, scenario.stack.length, scenario)


@dataclass(frozen=True)
class _Space:
    """The neighbourhood of a scenario."""

    scenario: Scenario
    monolayers: int
    treatments: tuple[EndsRecord, ...]
    layers: tuple[SheetRow, ...] = field(init=False)

    def __post_init__(self) -> None:
        rows = tuple(row for row in self.scenario.sheet if row.where == "cell" and row.strength is None)
        object.__setattr__(self, "layers", rows)

    @property
    def size(self) -> int:
        """How many candidates there are, as far as they are tried."""
        return min(MOST_TRIED, (1 + len(self.treatments)) * int((2 * self.monolayers + 1) ** len(self.layers)))

    def _ways(self, count: int) -> int:
        """Ways to change so many layers at once."""
        return math.comb(len(self.layers), count) * int((2 * self.monolayers) ** count)

    def levels(self) -> Iterator[list[_Candidate]]:
        """Candidates with 0, 1, 2 ... changes, as long as there are not too many of them."""
        total = 0
        for count in range(len(self.layers) + 2):
            total += self._ways(count) + (self._ways(count - 1) * len(self.treatments) if count else 0)
            if count and total > MOST_TRIED:
                return
            if level := [*self._candidates(count, None), *(
                candidate for ends in self.treatments if count for candidate in self._candidates(count - 1, ends))]:
                yield level

    def _candidates(self, count: int, ends: EndsRecord | None) -> Iterator[_Candidate]:
        steps = [step for step in range(-self.monolayers, self.monolayers + 1) if step]
        for rows in combinations(self.layers, count):
            for chosen in product(steps, repeat=count):
                changes = tuple(Change(_place(row), _name(row, self.layers), step)
                                for row, step in zip(rows, chosen, strict=True))
                try:
                    changed = _changed(self.scenario, dict(zip(rows, chosen, strict=True)))
                    yield _Candidate(changes, ends, with_ends(changed, ends) if ends else changed)
                except ScenarioError:  # nothing of a layer is left, or it is thicker than is allowed
                    continue


def _treatments(scenario: Scenario, progress: Callable[[float], None]) -> tuple[EndsRecord, ...]:
    """The end treatments worth trying: the best of each kind for the stack at hand."""
    whole = all(row.monolayers is None or row.monolayers.is_integer() for row in scenario.sheet if row.where == "cell")
    try:
        return tuple(p.ends for p in matched_ends(scenario, whole, progress=progress).proposals)
    except ScenarioError:  # no pass window, or no barrier: ends have nothing to raise
        return ()


def _changed(scenario: Scenario, steps: dict[SheetRow, int]) -> Scenario:
    """The scenario with some layers of the cell, and their equals in entry and exit, thicker by some monolayers."""
    stack = scenario.document.stack
    new = {stack.cell[_place(row)]: _thicker(stack.cell[_place(row)], row, step) for row, step in steps.items()}
    cell = tuple(
        next((new[record] for row in steps if _place(row) == place), record) for place, record in enumerate(stack.cell)
    )
    entry, exit_ = (tuple(new.get(record, record) for record in part) for part in (stack.entry, stack.exit))
    return scenario_from_document(
        replace(scenario.document, stack=replace(stack, entry=entry, cell=cell, exit=exit_)))


def _thicker(record: LayerRecord, row: SheetRow, step: int) -> LayerRecord:
    if record.monolayers is not None:
        return replace(record, monolayers=record.monolayers + step)
    return replace(record, thickness_nm=(record.thickness_nm or 0.0) + step * monolayer_of(row))


def _place(row: SheetRow) -> int:
    """The place of a cell's layer, from its key stack.cell[place]."""
    return int(row.key[len("stack.cell["):-1])


def _name(row: SheetRow, layers: tuple[SheetRow, ...]) -> str:
    """Barrier or well where the cell has one of each; else the layer's place and material."""
    if len(layers) == 2 and layers[0].band_edge != layers[1].band_edge:
        edges = [layer.band_edge or 0.0 for layer in layers]
        return "barrier" if row.band_edge == max(edges) else "well"
    return f"cell layer {_place(row) + 1}" + (f" ({row.material})" if row.material else "")


def _nearest_miss(tried: list[_Candidate]) -> Remedy | None:
    """The candidate with the largest margin, none of which meets the target."""
    best, beyond = None, -math.inf
    for candidate in tried:
        check = best_check(candidate.scenario, candidate.least_periods, beyond)
        if check is not None and check.margin_dB is not None:
            best, beyond = candidate.remedy(check), check.margin_dB
    return best


def _found(found: list[Remedy]) -> str:
    best = found[0]
    if not best.changes and best.ends is None:
        return f"The stack as it is meets the target, with {_periods(best)}."
    others = {0: "", 1: " One other stack does too."}.get(len(found) - 1, f" {len(found) - 1} others do too.")
    return f"Nearest stack that meets the target: {best.words}; {_periods(best)}.{others}"


def _periods(remedy: Remedy) -> str:
    count = remedy.check.periods
    return f"{count} period{'s' if count > 1 else ''}, {remedy.length:.4g} nm"


def _none(scenario: Scenario, miss: Remedy | None, monolayers: int, together: int, space: _Space) -> str:
    within = f"None within \N{PLUS-MINUS SIGN}{monolayers} monolayers"
    if together < len(space.layers):
        within += f" (up to {together} changes at once)"
    if miss is None or miss.check.margin_dB is None or miss.check.limiting_window is None or not scenario.target:
        return f"{within}; none of the stacks tried lets anything through a pass window."
    window = scenario.target.windows[miss.check.limiting_window]
    return (f"{within}; the nearest misses by {-miss.check.margin_dB:.1f} dB in the {window.kind} window "
            f"{window_in_words(window).partition(' ')[2]}: {miss.words}; {_periods(miss)}.")
