"""Headers of layer sheets as the trade spells them, and what each column then means."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

from transport.refusal import ScenarioError, refuse_unless, shown
from transport.sheet import COLUMNS

Unit = Literal["nm", "angstrom", "monolayers"]
Meaning = Literal["thickness", "material", "x", "where", "times", "band_edge_eV", "mass", "nonparabolicity_per_eV",
                  "delta_eV_nm"]

UNITS: dict[str, Unit] = {
    "nm": "nm", "nanometer": "nm", "nanometers": "nm", "nanometre": "nm", "nanometres": "nm",
    "a": "angstrom", "\u00e5": "angstrom", "ang": "angstrom", "angstrom": "angstrom", "angstroms": "angstrom",
    "\u00e5ngstr\u00f6m": "angstrom", "\u00e5ngstrom": "angstrom", "angstr\u00f6m": "angstrom",
    "ml": "monolayers", "mls": "monolayers", "monolayer": "monolayers", "monolayers": "monolayers",
}
"""Spellings of the units of thickness, in lower case."""

_NAMES: dict[str, Meaning] = {
    **dict.fromkeys(("thickness", "thick", "thk", "layer thickness", "nominal thickness", "width", "d", "t"),
                    "thickness"),
    **dict.fromkeys(("material", "mat", "layer material", "compound", "alloy", "semiconductor"), "material"),
    **dict.fromkeys(("x", "composition", "comp", "fraction", "mole fraction", "alloy fraction", "content"), "x"),
    **dict.fromkeys(("where", "part", "section"), "where"),
    **dict.fromkeys(("times", "repeat", "repeats", "loop", "loops"), "times"),
    "band edge ev": "band_edge_eV", "mass": "mass", "nonparabolicity per ev": "nonparabolicity_per_eV",
    "delta ev nm": "delta_eV_nm",
}
_ELEMENT = re.compile(r"(?:x )?(al|ga|in)(?: (?:x|content|fraction|mole fraction|composition))?")
_BRACKETS = re.compile(r"(.*?)\s*[(\[{]\s*([^()\[\]{}]*?)\s*[)\]}]")
_TAIL = re.compile(r"(.+)[\s_/,]+([^\s_/,]+)")
_SHARES = {"": 1.0, "1": 1.0, "-": 1.0, "%": 0.01, "percent": 0.01}


@dataclass(frozen=True, slots=True)
class Column:
    """A column that is read: its place and header, what it means, the unit of a thickness, and for a composition its
    scale and the element (None: the alloy's first-named) it counts."""

    place: int
    header: str
    meaning: Meaning
    unit: Unit | None = None
    scale: float = 1.0
    element: str | None = None


def read_columns(headers: Sequence[str], unit: Unit | None) -> tuple[tuple[Column, ...], tuple[str, ...]]:
    """The columns that are read, and the headers of those that are not.

    `unit`: of a thickness whose header names none. Raises ScenarioError where a meaning stands twice, a thickness has
    no unit, or there is none.
    """
    found, unused = [], []
    for place, header in enumerate(headers):
        column = _column(place, header.strip(), unit)
        if column is not None:
            found.append(column)
        elif header.strip() and header.strip() not in COLUMNS:
            unused.append(header.strip())
    for column in found:
        same = (column.meaning, column.unit)
        twin = next((c for c in found if (c.meaning, c.unit) == same and c is not column), None)
        if twin is not None:
            raise ScenarioError("sheet", f"has two columns for the same, {shown(column.header)} and "
                                f"{shown(twin.header)}; keep one of them")
    refuse_unless(any(c.meaning in ("thickness", "delta_eV_nm") for c in found), "sheet",
                  "has no column of thicknesses; head one thickness_nm, or thickness (\u00c5), or monolayers")
    return tuple(found), tuple(unused)


def _column(place: int, header: str, unit: Unit | None) -> Column | None:
    plain = _plain(header)
    if plain in UNITS and plain != "a":
        return Column(place, header, "thickness", UNITS[plain])
    if header in COLUMNS and plain not in _NAMES and header != "thickness_nm":
        return None  # this project's own sheet: what it derives from the layers
    name, stated = _divided(header)
    meaning = _NAMES.get(plain) or _NAMES.get(name)
    element = _ELEMENT.fullmatch(name)
    if meaning == "thickness":
        return Column(place, header, meaning, _unit(header, stated, unit))
    if element and meaning is None:
        meaning = "x"
    if meaning != "x":
        return Column(place, header, meaning) if meaning else None
    named = element[1] if element else stated if stated in ("al", "ga", "in") else None
    share = "" if named == stated else stated
    refuse_unless(share in _SHARES, f"sheet, column {shown(header)}", "is in a unit not known here; give x from 0 to 1")
    return Column(place, header, "x", scale=_SHARES[share], element=named.capitalize() if named else None)


def _plain(text: str) -> str:
    return re.sub(r"[\s_.]+", " ", text).strip().lower()


def _divided(header: str) -> tuple[str, str]:
    """A header without its unit, and the unit, both in lower case."""
    if bracketed := _BRACKETS.fullmatch(header):
        return _plain(bracketed[1]), _plain(bracketed[2])
    tail = _TAIL.fullmatch(header)
    if tail and (_plain(tail[2]) in UNITS or _plain(tail[2]) in ("%", "percent", "um", "\u00b5m", "\u03bcm")):
        return _plain(tail[1]), _plain(tail[2])
    return _plain(header), ""


def _unit(header: str, stated: str, unit: Unit | None) -> Unit:
    if stated:
        refuse_unless(stated in UNITS, f"sheet, column {shown(header)}",
                      "is in a unit not known here; give nm, \u00c5 or monolayers")
        return UNITS[stated]
    if unit is None:
        raise ScenarioError(f"sheet, column {shown(header)}",
                            "says no unit; write it as thickness (nm), thickness (\u00c5) or monolayers")
    return unit
