"""The grower's sheet: every layer in whole monolayers with the rounding shown, heights, and times at given rates."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

from transport.cautions import GROWTH
from transport.refusal import shown
from transport.resolve import SheetRow
from transport.scenario import Scenario
from transport.tables import Table

Rates = float | Mapping[str, float]
"""Monolayers per second: one rate, or one for each material."""

COLUMNS = (
    "where", "times", "material", "x", "thickness_nm", "monolayers", "whole_monolayers", "whole_thickness_nm",
    "difference_nm", "top_first_nm", "top_last_nm", "rate_ML_per_s", "growth_s", "band_edge_eV", "mass",
    "nonparabolicity_per_eV", "delta_eV_nm",
)
"""Columns of the sheet, with their units."""


@dataclass(frozen=True, slots=True)
class GrownLayer:
    """A line of the sheet: a layer or delta as written, and as whole monolayers would have it.

    Lengths nm. `times`: how often it is grown; `whole`: monolayers after rounding; `difference`: what rounding adds to
    its thickness; `first` and `last`: its top above the left lead when it is grown first and last, as written; `rate`
    (monolayers per second) and `seconds`, of one growth. None where the layer has no monolayers, or no rate is given.
    """

    row: SheetRow
    times: int
    whole: int | None
    whole_thickness: float | None
    difference: float | None
    first: float
    last: float
    rate: float | None
    seconds: float | None


def grown_layers(scenario: Scenario, rates: Rates | None = None) -> tuple[GrownLayer, ...]:
    """The layers in the order of growth, from the left lead upwards; the cell stands once.

    Raises ValueError for a rate that is not above 0, and where a material has none.
    """
    stack, height = scenario.stack, 0.0
    found: list[GrownLayer] = []
    for row in scenario.sheet:
        if row.where not in ("entry", "cell", "exit"):
            continue
        if row.where == "exit" and (not found or found[-1].row.where != "exit"):
            height = stack.length - math.fsum(r.thickness or 0.0 for r in scenario.sheet if r.where == "exit")
        height += row.thickness or 0.0
        repeated = row.where == "cell"
        found.append(_grown(row, stack.periods if repeated else 1, height,
                            height + (stack.periods - 1) * stack.period_length if repeated else height, rates))
    return tuple(found)


def _grown(row: SheetRow, times: int, first: float, last: float, rates: Rates | None) -> GrownLayer:
    if not row.thickness or not row.monolayers:
        return GrownLayer(row, times, None, None, None, first, last, None, None)
    # A half rounds up: a layer that is written is grown, so no layer rounds to nothing.
    whole = max(1, math.floor(row.monolayers + 0.5))
    thickness = row.thickness if whole == row.monolayers else whole * (row.thickness / row.monolayers)
    rate = None if rates is None else _rate(row.material, rates)
    return GrownLayer(row, times, whole, thickness, thickness - row.thickness, first, last, rate,
                      None if rate is None else whole / rate)


def _rate(material: str | None, rates: Rates) -> float:
    rate = rates.get(material or "") if isinstance(rates, Mapping) else rates
    if rate is None:
        raise ValueError(f"rate: none is given for {shown(material)}; give it as {material}=0.5, or one for all")
    if not (math.isfinite(rate) and rate > 0):
        raise ValueError(f"rate: {rate:g} monolayers per second is no rate; give a number above 0")
    return rate


def grower_sheet(scenario: Scenario, rates: Rates | None = None) -> Table:
    """The sheet as a table, with totals and the caution as notes. Raises ValueError as grown_layers does."""
    layers = grown_layers(scenario, rates)
    rows = tuple(
        (g.row.where, g.times, g.row.material, g.row.x, g.row.thickness, g.row.monolayers, g.whole, g.whole_thickness,
         g.difference, g.first, g.last, g.rate, g.seconds, g.row.band_edge, g.row.mass, g.row.nonparabolicity,
         g.row.strength)
        for g in layers)
    return Table(COLUMNS, rows, (*sheet_notes(scenario, layers), GROWTH))


def sheet_notes(scenario: Scenario, layers: tuple[GrownLayer, ...]) -> tuple[str, ...]:
    """What the sheet comes to, in sentences."""
    stack = scenario.stack
    periods = "once" if stack.periods == 1 else f"{stack.periods:,} times"
    notes = [f"Growth begins at the left lead. The cell is grown {periods}: {stack.period_length:.6g} nm each, "
             f"{stack.length:.6g} nm in all, leads not counted."]
    off = math.fsum(g.times * g.difference for g in layers if g.difference is not None)
    notes.append(f"Whole monolayers add {off:+.4g} nm in all; the other numbers of this scenario are those of the "
                 "layers as written." if abs(off) > 5e-7 or any(abs(g.difference or 0.0) > 5e-7 for g in layers) else
                 "Every layer with monolayers is a whole number of them.")
    times = [g.times * g.seconds for g in layers if g.seconds is not None]
    if times:
        total = math.fsum(times)
        notes.append(f"Growth takes {total:.6g} s ({total / 60:.4g} min) at these rates, in whole monolayers, without "
                     "pauses.")
    bare = sum(g.whole is None and g.row.strength is None for g in layers)
    if bare:
        notes.append(f"{bare} of the layers are given by their band edge or by a material without monolayers: no "
                     "whole monolayers and no time are known for them.")
    return tuple(notes)
