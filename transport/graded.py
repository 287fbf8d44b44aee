"""From the rows of a layer sheet to layers and deltas: profiles resolved, interfaces graded, equal cells kept equal.

A graded interface lies half on either side of its face and takes the longer of its two layers' gradings. The cell's
outer faces are graded as inside the lattice, where the cell follows itself, so that every cell is the same; what
stands beside the periodic part grades its own half. The half that belongs to a lead is laid before the lead.

    lead | lead's half | entry layers | cell | cell | ... | exit layers | lead's half | lead
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from transport.parameters import PARAMETERS
from transport.profiles import MOST_SLICES, Course, Face, flat, slices
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


def lay_out(rows: Sequence[SheetRow], tops: Sequence[float] = ()) -> LaidOut:
    """The elements that the rows of a sheet (left lead first, right lead last) describe.

    Profiles are right to 1e-10 from the lowest band edge to three times as far above it as the highest band edge or
    top of a window (`tops`, eV), and at least 1 eV. Raises ScenarioError where a graded interface finds no room, and
    where profiles come to too many slices.
    """
    low, high = _range(rows, tops)
    made: dict[str, list[tuple[Element, ...]]] = {name: [] for name in _PARTS}
    lines = _lines(rows)
    ends = [_lead_half(lines["entry"][:2], low, high), _lead_half(lines["exit"][:-3:-1], low, high)]
    for name in _PARTS:
        line, place = lines[name], 0
        for row in (row for row in rows if row.where == name):
            if row.strength is not None:
                made[name].append((Delta(row.strength),))
                continue
            place += 1
            made[name].append(_elements(row, line[place - 1], line[place + 1], low, high))
    counts = (len(ends[0]), *(len(found) for name in _PARTS for found in made[name]), len(ends[1]))
    refuse_unless(sum(counts) <= max(MOST_SLICES, len(rows)), "stack",
                  f"comes to {sum(counts):,} slices with its profiles resolved, more than {MOST_SLICES:,}; "
                  "write fewer profile layers or smoother ones")
    entry, cell, exit_ = (tuple(element for found in made[name] for element in found) for name in _PARTS)
    return LaidOut((*ends[0], *entry), cell, (*exit_, *reversed(ends[1])), counts)


def _range(rows: Sequence[SheetRow], tops: Sequence[float]) -> tuple[float, float]:
    edges = [edge for row in rows if row.strength is None
             for edge in (row.course.reach() if row.course else (row.band_edge or 0.0,))]
    low = min(edges)
    return low, low + max(3 * (max(*edges, *tops) - low), _LEAST_RANGE)


def _lines(rows: Sequence[SheetRow]) -> dict[str, list[SheetRow]]:
    """The layers of each part, deltas left out, between what lies beyond on either side."""
    entry, cell, exit_ = ([row for row in rows if row.where == name and row.strength is None] for name in _PARTS)
    return {"entry": [rows[0], *entry, cell[0]], "cell": [cell[-1], *cell, cell[0]],
            "exit": [cell[-1], *exit_, rows[-1]]}


def _elements(row: SheetRow, left: SheetRow, right: SheetRow, low: float, high: float) -> tuple[Element, ...]:
    """What one layer comes to between its neighbours."""
    assert row.thickness is not None
    faces = _face(row, left, side=0), _face(row, right, side=1)
    _require_room(row, left, right, faces)
    if row.course is None and faces == (None, None):
        return (_plain(row),)
    course = replace(_course(row, row.thickness), left=faces[0], right=faces[1])
    return _resolved(row, course, low, high)


def _lead_half(pair: Sequence[SheetRow], low: float, high: float) -> tuple[Element, ...]:
    """A lead's half of the interface with the layer next to it, from the lead inwards."""
    lead, layer = pair
    face = _face(lead, layer, side=1 if lead.where == "left lead" else 0)
    if face is None:
        return ()
    return _resolved(layer, replace(_course(lead, face.length / 2), right=face), low, high)


def _resolved(row: SheetRow, course: Course, low: float, high: float) -> tuple[Element, ...]:
    try:
        return slices(course, low, high)
    except ValueError as error:
        raise ScenarioError(row.key, str(error).removeprefix("course: ")) from None


def _plain(row: SheetRow) -> Layer:
    assert row.thickness is not None and row.band_edge is not None and row.mass is not None
    return Layer(row.thickness, row.band_edge, row.mass, row.nonparabolicity or 0.0)


def _course(row: SheetRow, thickness: float) -> Course:
    if row.course is not None:
        return row.course
    return Course(thickness, flat(row.band_edge or 0.0), flat(row.mass or 0.0), flat(row.nonparabolicity or 0.0))


def _face(row: SheetRow, beyond: SheetRow, side: int) -> Face | None:
    """The graded interface of a row with the one beyond its left (0) or right (1) face; None where it is sharp."""
    length = max(row.grading or 0.0, beyond.grading or 0.0)
    values = _at_face(beyond, 1 - side)
    return Face(length, *values) if length and values != _at_face(row, side) else None


def _at_face(row: SheetRow, side: int) -> tuple[float, float, float]:
    return _course(row, 1.0).at_face(side)


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


def require_reach(key: str, course: Course) -> None:
    """Raise ScenarioError where a profile leaves the limits of a band edge."""
    limit = PARAMETERS["band_edge_eV"]
    for edge in course.reach():
        refuse_unless(limit.admits(edge), key,
                      f"reaches {edge:.6g} eV, but a band edge {limit.requirement}; give it smaller numbers")
