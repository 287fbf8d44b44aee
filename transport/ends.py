"""End treatments: what `[stack.ends]` grows between the leads and the periodic part, so that the two match.

Each treatment is a row of end cells, copies of the cell with thicker, thinner or lower barriers and wells. The left
row runs from the lead inwards; the right one mirrors it, after the layers that close the last cell:

    left lead | entry layers | end cells | cell^N | closing layers | mirrored end cells | exit layers | right lead
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

from msgspec.structs import replace

from transport.document import EndsRecord, LayerRecord
from transport.media import Medium
from transport.refusal import ScenarioError, refuse_unless

Layers = tuple[LayerRecord, ...]
Lookup = Callable[[str, LayerRecord], Medium]

KEY = "stack.ends"


@dataclass(frozen=True, slots=True)
class EndCell:
    """One end cell: thickness of its barriers and wells, and height of its barriers, as shares of the cell's."""

    barrier: float = 1.0
    well: float = 1.0
    height: float = 1.0


def end_layers(ends: EndsRecord, cell: Layers, medium: Lookup) -> tuple[Layers, Layers]:
    """The layers that a treatment adds on the left and on the right of the periodic part.

    `medium` looks up what a layer is made of. Raises ScenarioError where the cell has no barrier, and where a barrier
    cannot be lowered.
    """
    walls = _barriers(cell, medium)
    left, right = end_cells(ends)
    scaled = [_scaled(ends, part, cell, walls, medium) for part in (left, right)]
    return scaled[0], (*closing(cell, walls), *reversed(scaled[1]))


def end_cells(ends: EndsRecord) -> tuple[tuple[EndCell, ...], tuple[EndCell, ...]]:
    """The end cells on the left and on the right, each from the lead inwards."""
    if ends.kind == "half":
        cells: tuple[EndCell, ...] = (EndCell(barrier=0.5),)
    elif ends.kind == "cells":
        left, right = ends.left_cells or (), ends.right_cells or ends.left_cells or ()
        return tuple(EndCell(c.barrier_share, c.well_share) for c in left), tuple(
            EndCell(c.barrier_share, c.well_share) for c in right)
    else:
        shares = taper(ends.kind, ends.cells or 1)
        cells = tuple(EndCell(height=s) if ends.of == "height" else EndCell(barrier=s) for s in shares)
    return cells, cells


def taper(shape: str, cells: int) -> tuple[float, ...]:
    """Shares of the full barrier over `cells` end cells, rising from the lead inwards; the next would be 1.

    Linear: k/(n+1). Gaussian: exp(-2 (1 - k/(n+1))^2). Poisson: the probabilities of k events where n + 3/2 are
    expected, over that of n + 1 (the likeliest).
    """
    steps = range(1, cells + 1)
    if shape == "linear":
        return tuple(k / (cells + 1) for k in steps)
    if shape == "gaussian":
        return tuple(math.exp(-2 * (1 - k / (cells + 1)) ** 2) for k in steps)
    mean = cells + 1.5
    return tuple(math.exp((k - cells - 1) * math.log(mean) + math.lgamma(cells + 2) - math.lgamma(k + 1))
                 for k in steps)


def closing(cell: Layers, walls: tuple[bool, ...]) -> Layers:
    """The layers that make cell^N symmetric: the shortest beginning of the cell that, like the rest, is its own mirror.

    A cell that has none is closed by its first barrier where it begins with one.
    """
    for length in range(len(cell)):
        first, rest = cell[:length], cell[length:]
        if first == first[::-1] and rest == rest[::-1]:
            return first
    return cell[:1] if walls[0] else ()


def _barriers(cell: Layers, medium: Lookup) -> tuple[bool, ...]:
    """Which layers of the cell are barriers: repulsive deltas, and what lies above the middle of its band edges."""
    edges = [math.nan if record.kind == "delta" else medium(f"stack.cell[{index}]", record).band_edge
             for index, record in enumerate(cell)]
    known = [edge for edge in edges if not math.isnan(edge)]
    middle = (min(known) + max(known)) / 2
    walls = tuple((record.delta_eV_nm or 0.0) > 0 if record.kind == "delta" else edge > middle
                  for record, edge in zip(cell, edges, strict=True))
    refuse_unless(any(walls), KEY, "treats the barriers of the cell, but the cell has none; take it out")
    return walls


def _scaled(
    ends: EndsRecord, cells: tuple[EndCell, ...], cell: Layers, walls: tuple[bool, ...], medium: Lookup
) -> Layers:
    """The layers of a row of end cells."""
    return tuple(
        _lowered(_thicker(record, part.barrier, ends.whole_monolayers, medium), part.height, cell, walls, medium)
        if wall else _thicker(record, part.well, ends.whole_monolayers, medium)
        for part in cells for record, wall in zip(cell, walls, strict=True)
    )


def _thicker(record: LayerRecord, share: float, whole: bool, medium: Lookup) -> LayerRecord:
    """A layer with a share of its thickness; in whole monolayers where it has monolayers and that is wanted."""
    if record.delta_eV_nm is not None:
        return replace(record, delta_eV_nm=record.delta_eV_nm * share)
    monolayer = medium(KEY, record).monolayer if whole else None
    if monolayer is not None:
        count = record.monolayers if record.thickness_nm is None else record.thickness_nm / monolayer
        return replace(record, thickness_nm=None, monolayers=float(max(1, round((count or 0.0) * share))))
    if record.thickness_nm is not None:
        return replace(record, thickness_nm=record.thickness_nm * share)
    return replace(record, monolayers=(record.monolayers or 0.0) * share)


def _lowered(
    record: LayerRecord, share: float, cell: Layers, walls: tuple[bool, ...], medium: Lookup
) -> LayerRecord:
    """A barrier with a share of its height above the cell's lowest layer."""
    if share == 1:
        return record
    if record.delta_eV_nm is not None:
        return replace(record, delta_eV_nm=record.delta_eV_nm * share)
    wells = [layer for layer, wall in zip(cell, walls, strict=True) if not wall and layer.kind != "delta"]
    if not wells:
        raise ScenarioError(f"{KEY}.of", "is height, but the cell has no layer to count it from; taper the width")
    well = min(wells, key=lambda layer: medium(KEY, layer).band_edge)
    if record.profile is not None or record.x_from is not None:
        raise ScenarioError(f"{KEY}.of", "is height, but the band edge of a barrier runs and keeps its height; "
                            "taper the width")
    if record.band_edge_eV is not None:
        ground = medium(KEY, well).band_edge
        return replace(record, band_edge_eV=ground + share * (record.band_edge_eV - ground))
    made = medium(KEY, record)
    if record.x is None or made.base != well.material:
        into = well.material or "its well"
        raise ScenarioError(f"{KEY}.of", f"is height, but {record.material} does not turn into {into} as x falls to 0; "
                            "taper the width")
    return replace(record, x=record.x * share)
