"""From the rows of a layer sheet to layers and deltas: profiles resolved, interfaces graded, equal cells kept equal.

A graded interface lies half on either side of its face and takes the longer of its two layers' gradings. Every cell
is the same, so where one of its outer faces is graded, the first and the last cell must be met by their neighbours as
cells meet each other; else the file is refused. The half that belongs to a lead is laid before the lead.

    lead | lead's half | entry layers | cell | cell | ... | exit layers | lead's half | lead
"""

from __future__ import annotations

import itertools
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from transport.parameters import PARAMETERS
from transport.profiles import MOST_SLICES, Face, Variation, VariationError, flat, like, slices
from transport.refusal import ScenarioError, refuse_unless
from transport.structure import Delta, Element, Layer

if TYPE_CHECKING:
    from transport.resolve import SheetRow

_PARTS = ("entry", "cell", "exit")
_LEAST_RANGE = 1.0  # eV


@dataclass(frozen=True, slots=True)
class LaidOut:
    """The elements of the three parts, and how many of them each row of the sheet comes to, leads included."""

    entry: tuple[Element, ...]
    cell: tuple[Element, ...]
    exit: tuple[Element, ...]
    counts: tuple[int, ...]

    @property
    def elements(self) -> tuple[Element, ...]:
        """All of them, each part once."""
        return self.entry + self.cell + self.exit


Slicer = Callable[[int, Variation, int], tuple[Layer, ...]]
"""The constant layers of a variation of the row at a place: all of the row (0), its left (-1) or its right end (1)."""


def lay_out(rows: Sequence[SheetRow], tops: Sequence[float] = ()) -> LaidOut:
    """The elements that the rows of a sheet (left lead first, right lead last) describe.

    Profiles are right to 1e-10 from the lowest band edge to three times as far above it as the highest band edge or
    top of a window (`tops`, eV), and at least 1 eV. Raises ScenarioError where a graded interface finds no room, and
    where profiles come to too many slices.
    """
    low, high = _range(rows, tops)

    def resolved(place: int, variation: Variation, end: int) -> tuple[Layer, ...]:
        try:
            return slices(variation, low, high)
        except VariationError as error:
            raise ScenarioError(rows[place].key, str(error)) from None

    found = _laid_out(rows, resolved)
    refuse_unless(sum(found.counts) <= max(MOST_SLICES, len(rows)), "stack",
                  f"comes to {sum(found.counts):,} slices with its profiles resolved, more than {MOST_SLICES:,}; "
                  "write fewer profile layers or smoother ones")
    return found


def lay_out_like(rows: Sequence[SheetRow], elements: Sequence[Element]) -> LaidOut:
    """The elements of rows that hardly differ from those of a resolved sheet, with the same steps through profiles.

    `elements`: those of that sheet (`Stack.elements`); every row still says how many `slices` it had.
    """
    starts = [0, *itertools.accumulate(row.slices for row in rows)]

    def resolved(place: int, variation: Variation, end: int) -> tuple[Layer, ...]:
        before = [e for e in elements[starts[place]:starts[place + 1]] if isinstance(e, Layer)]
        if place == len(rows) - 1:
            return like(variation, before[::-1])
        if end:
            along = itertools.accumulate(layer.thickness for layer in before[::-end])
            size = sum(reached < variation.thickness * (1 + 1e-9) for reached in along)
            before = before[:size] if end < 0 else before[-size:]
        return like(variation, before)

    return _laid_out(rows, resolved)


def _laid_out(rows: Sequence[SheetRow], resolved: Slicer) -> LaidOut:
    made: dict[str, list[tuple[Element, ...]]] = {name: [] for name in _PARTS}
    lines = _lines(rows)
    _require_equal_cells(lines)
    ends = [_lead_half(lines["entry"][:2], 0, resolved), _lead_half(lines["exit"][:-3:-1], len(rows) - 1, resolved)]
    passed = dict.fromkeys(_PARTS, 0)
    for place, row in enumerate(rows[1:-1], start=1):
        if row.strength is not None:
            made[row.where].append((Delta(row.strength),))
            continue
        passed[row.where] += 1
        left, _, right = lines[row.where][passed[row.where] - 1:passed[row.where] + 2]
        made[row.where].append(_elements(row, left, right, place, resolved))
    counts = (len(ends[0]), *(len(found) for name in _PARTS for found in made[name]), len(ends[1]))
    entry, cell, exit_ = (tuple(element for found in made[name] for element in found) for name in _PARTS)
    return LaidOut((*ends[0], *entry), cell, (*exit_, *reversed(ends[1])), counts)


def _range(rows: Sequence[SheetRow], tops: Sequence[float]) -> tuple[float, float]:
    edges = [edge for row in rows if row.strength is None
             for edge in (row.variation.reach() if row.variation else (row.band_edge or 0.0,))]
    low = min(edges)
    return low, low + max(3 * (max(*edges, *tops) - low), _LEAST_RANGE)


def _lines(rows: Sequence[SheetRow]) -> dict[str, list[SheetRow]]:
    """The layers of each part, deltas left out, between what lies beyond on either side."""
    entry, cell, exit_ = ([row for row in rows if row.where == name and row.strength is None] for name in _PARTS)
    return {"entry": [rows[0], *entry, cell[0]], "cell": [cell[-1], *cell, cell[0]],
            "exit": [cell[-1], *exit_, rows[-1]]}


def _elements(
    row: SheetRow, left: SheetRow, right: SheetRow, place: int, resolved: Slicer
) -> tuple[Element, ...]:
    """What one layer comes to between its neighbours."""
    assert row.thickness is not None
    faces = _face(row, left, side=0), _face(row, right, side=1)
    _require_room(row, left, right, faces)
    if row.variation is None and faces == (None, None):
        return (_plain(row),)
    if row.variation is not None:
        return resolved(place, replace(row.variation, left=faces[0], right=faces[1]), 0)
    left_half, right_half = (face.length / 2 if face else 0.0 for face in faces)
    rest = row.thickness - left_half - right_half
    return (
        *(resolved(place, replace(_variation(row, left_half), left=faces[0]), -1) if faces[0] else ()),
        *((_plain(replace(row, thickness=rest)),) if rest > 1e-9 * row.thickness else ()),
        *(resolved(place, replace(_variation(row, right_half), right=faces[1]), 1) if faces[1] else ()),
    )


def _lead_half(pair: Sequence[SheetRow], place: int, resolved: Slicer) -> tuple[Element, ...]:
    """A lead's half of the interface with the layer next to it, from the lead inwards."""
    lead, layer = pair
    face = _face(lead, layer, side=0 if place else 1)
    if face is None:
        return ()
    return resolved(place, replace(_variation(lead, face.length / 2), right=face), 0)


def _plain(row: SheetRow) -> Layer:
    assert row.thickness is not None and row.band_edge is not None and row.mass is not None
    return Layer(row.thickness, row.band_edge, row.mass, row.nonparabolicity or 0.0)


def _variation(row: SheetRow, thickness: float) -> Variation:
    if row.variation is not None:
        return row.variation
    return Variation(thickness, flat(row.band_edge or 0.0), flat(row.mass or 0.0), flat(row.nonparabolicity or 0.0))


def _face(row: SheetRow, beyond: SheetRow, side: int) -> Face | None:
    """The graded interface of a row with the one beyond its left (0) or right (1) face; None where it is sharp."""
    length = max(row.grading or 0.0, beyond.grading or 0.0)
    if not length:
        return None
    values = _at_face(beyond, 1 - side)
    return Face(length, *values) if values != _at_face(row, side) else None


def _at_face(row: SheetRow, side: int) -> tuple[float, float, float]:
    return _variation(row, 1.0).at_face(side)


def _require_room(
    row: SheetRow, left: SheetRow, right: SheetRow, faces: tuple[Face | None, Face | None]
) -> None:
    """Refuse interfaces whose halves do not fit into the layer."""
    thickness = row.thickness or 0.0
    wanted = sum(face.length / 2 for face in faces if face is not None)
    if wanted <= thickness * (1 + 1e-9):
        return
    blamed = max((row, left, right), key=lambda other: other.grading or 0.0)
    key = blamed.key if blamed.key == "stack.ends" else f"{blamed.key}.grading_nm"
    where = "the layer" if blamed is row else row.key
    raise ScenarioError(key, f"is {blamed.grading:g}: the halves of graded interfaces that lie in {where} take "
                        f"{wanted:.4g} nm, but it is {thickness:.4g} nm thick; give a shorter grading")


def _require_equal_cells(lines: dict[str, list[SheetRow]]) -> None:
    """Refuse a graded outer face of the cell that is not the same at the stack's ends as between two cells."""
    first, last = lines["cell"][1], lines["cell"][-2]
    before, behind = lines["entry"][-2], lines["exit"][1]
    for inner, within, beyond, side in ((first, last, before, 0), (last, first, behind, 1)):
        if _face(inner, within, side) == _face(inner, beyond, side):
            continue
        blamed = max((inner, within, beyond), key=lambda row: row.grading or 0.0)
        where, place, remedy = (("before the first", "left", "the entry end like the cell"),
                                ("behind the last", "right", "the exit begin like the cell"))[side]
        raise ScenarioError(
            blamed.key if blamed.key == "stack.ends" else f"{blamed.key}.grading_nm",
            f"grades the {place} face of the cell, but what stands {where} cell is not what stands between two, and "
            f"all cells are the same; let {remedy}, or cut the cell within a layer, half of it at either end")


def require_reach(key: str, variation: Variation) -> None:
    """Raise ScenarioError where a profile leaves the limits of a band edge."""
    limit = PARAMETERS["band_edge_eV"]
    for edge in variation.reach():
        refuse_unless(limit.admits(edge / (1 + 1e-9)), key,
                      f"reaches {edge:.6g} eV, but a band edge {limit.requirement}; give it smaller numbers")
