"""Layers from a pasted sheet: CSV of this project or of the trade, read row by row, with a sentence for each fault."""

from __future__ import annotations

import csv
import math
import re
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Literal

from transport.document import LayerRecord
from transport.headers import Column, Meaning, Unit, read_columns
from transport.materials import is_alloy, material_names
from transport.parameters import PARAMETERS
from transport.refusal import ScenarioError, check_limits, nearest, refuse_unless, shown
from transport.tables import text_of

MOST_BYTES = 1_000_000
"""Size of a sheet that is read."""
MOST_LAYERS = int(PARAMETERS["file_layers"].high)
"""Layers of a sheet that are read."""

MOST_FAULTS = 100
"""Faults after which the rest of a sheet is not read."""

_MOST_COLUMNS = 200
_NUMBER = re.compile(r"[+-]?(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")
_SHARE = r"\(?([0-9]*[.,]?[0-9]+)?\)?"
_FORMULA = re.compile(rf"(Al|Ga|In){_SHARE}(Al|Ga|In){_SHARE}(As|P|Sb)", re.IGNORECASE)
_SYMBOLS = re.compile(r"(Al|Ga|In)x(Al|Ga|In)\(?1-x\)?(As|P|Sb)", re.IGNORECASE)
# A lone # heads a column of numbers.
_COMMENT = re.compile(r'\s*"?#(?!"?\s*[,;\t])')
_BLANKS = ("", "-", "\N{EN DASH}", "n/a", "N/A")
_UNIT_ORDER: tuple[Unit, ...] = ("nm", "angstrom", "monolayers")


@dataclass(frozen=True, slots=True)
class PastedLayer:
    """A layer of a sheet: the row it stood in, the part of the stack it belongs to (None: the sheet does not say)."""

    row: int
    where: Literal["entry", "cell", "exit"] | None
    layer: LayerRecord


@dataclass(frozen=True, slots=True)
class LayerSheet:
    """What a sheet says: its layers in order, faults as sentences, and headers of columns that were not read."""

    layers: tuple[PastedLayer, ...]
    faults: tuple[str, ...]
    unused: tuple[str, ...]


def read_layer_sheet(text: str, unit: Unit | None = None, materials: Iterable[str] = ()) -> LayerSheet:
    """The layers of a CSV table with a line of headers; separators comma, semicolon or tab, comments after #.

    Columns: thickness (its unit in the header, else `unit`) or monolayers, material, x; or band_edge_eV and mass, or
    delta_eV_nm, as this project's own sheet has them, whose leads are passed over. `materials`: names known beside the
    library's. A row that cannot be read is a fault of one sentence. Raises ScenarioError where the sheet as such is
    at fault: too large, without headers, thicknesses or unit.
    """
    refuse_unless(len(text) <= MOST_BYTES and len(text.encode("utf-8", "surrogatepass")) <= MOST_BYTES, "sheet",
                  f"is larger than {MOST_BYTES:,} bytes; cut it to its layers")
    lines = [(number, line) for number, line in enumerate(re.split(r"\r\n|\r|\n", text.lstrip("\ufeff")), 1)
             if line.strip() and not _COMMENT.match(line)]
    refuse_unless(bool(lines), "sheet", "is empty; begin it with a line of headers such as material,x,thickness_nm")
    separator = next((mark for mark in "\t;," if mark in lines[0][1]), ",")
    headers = _cells(lines[0][1], separator)
    refuse_unless(len(headers) <= _MOST_COLUMNS, "sheet",
                  f"has more than {_MOST_COLUMNS} columns; cut it to its layers")
    refuse_unless(len(lines) - 1 <= MOST_LAYERS, "sheet",
                  f"lists {len(lines) - 1:,} layers; at most {MOST_LAYERS:,} are read")
    refuse_unless(len(lines) > 1, "sheet", "has headers but no layer; add a row for each")
    columns, unused = read_columns(headers, unit)
    reader = _Reader(columns, len(headers), separator, tuple(materials))
    layers: list[PastedLayer] = []
    faults: list[str] = []
    for number, line in lines[1:]:
        try:
            layers += reader.layers(number, line)
        except ScenarioError as error:
            faults.append(str(error))
        if len(faults) == MOST_FAULTS:
            faults.append(f"row {number}: the rows after this one are not read; mend these first")
            break
    return LayerSheet(tuple(layers), tuple(faults), unused)


def _cells(line: str, separator: str) -> list[str]:
    try:
        (cells,) = csv.reader([line], delimiter=separator, strict=True)
    except csv.Error as error:
        raise ScenarioError("sheet", f"holds a line that is no row of a table ({error}); give plain CSV") from None
    return [text_of(cell.strip()) for cell in cells]


class _Row:
    """One row: its cells by meaning; knows its number for the sentences."""

    def __init__(self, number: int, columns: Sequence[Column], cells: list[str], separator: str) -> None:
        self.number, self._columns, self._cells, self._separator = number, columns, cells, separator

    def column(self, meaning: Meaning) -> Column | None:
        """The first column of a meaning whose cell says something."""
        held = [c for c in self._columns if c.meaning == meaning and self._cells[c.place] not in _BLANKS]
        held.sort(key=lambda c: _UNIT_ORDER.index(c.unit) if c.unit else 0)
        return held[0] if held else None

    def text(self, meaning: Meaning) -> str:
        """The text of a meaning; empty where there is none."""
        column = self.column(meaning)
        return self._cells[column.place] if column else ""

    def key(self, column: Column | Meaning) -> str:
        """How a sentence names a cell."""
        return f"row {self.number}, column {column.header if isinstance(column, Column) else column}"

    def number_in(self, column: Column) -> float:
        """The number in a cell. Raises ScenarioError."""
        text = self._cells[column.place].replace("\N{MINUS SIGN}", "-")
        plain = text.replace(",", ".") if self._separator != "," else text
        refuse_unless(_NUMBER.fullmatch(plain) is not None, self.key(column),
                      f"must be a plain number such as 2.5, but is {shown(text)}")
        return float(plain)


class _Reader:
    """Reads the rows of one sheet."""

    def __init__(self, columns: Sequence[Column], width: int, separator: str, own: tuple[str, ...]) -> None:
        self._columns, self._width, self._separator, self._own = columns, width, separator, own

    def layers(self, number: int, line: str) -> Iterator[PastedLayer]:
        """The layer of a row; none for a lead of this project's own sheet. Raises ScenarioError."""
        cells = self._row_cells(number, line)
        row = _Row(number, self._columns, cells, self._separator)
        where = row.text("where").lower()
        if where in ("left lead", "right lead"):
            return
        refuse_unless(where in ("", "entry", "cell", "exit"), row.key("where"),
                      f"must be entry, cell or exit, but is {shown(where)}")
        self._refuse_repeats(row, where)
        part: Mapping[str, Literal["entry", "cell", "exit"]] = {"entry": "entry", "cell": "cell", "exit": "exit"}
        yield PastedLayer(number, part.get(where), self._layer(row))

    def _row_cells(self, number: int, line: str) -> list[str]:
        try:
            cells = _cells(line, self._separator)
        except ScenarioError as error:
            raise ScenarioError(f"row {number}", error.message) from None
        while len(cells) > self._width and not cells[-1]:
            cells.pop()
        refuse_unless(len(cells) <= self._width, f"row {number}",
                      f"has {len(cells)} cells for {self._width} columns; mend it"
                      + (", and write decimals with a point" if self._separator == "," else ""))
        return cells + [""] * (self._width - len(cells))

    def _refuse_repeats(self, row: _Row, where: str) -> None:
        column = row.column("times")
        if column is not None and where != "cell":
            refuse_unless(row.number_in(column) == 1, row.key(column), "repeats a layer outside the cell, which is not "
                          "read; write it out, or put cell into a column where")

    def _layer(self, row: _Row) -> LayerRecord:
        if strength := row.column("delta_eV_nm"):
            return LayerRecord(delta_eV_nm=self._limited(row, strength, "delta_eV_nm"))
        thickness, monolayers = self._thickness(row)
        if text := row.text("material"):
            column = row.column("material")
            assert column is not None
            name, share = self._material(row.key(column), text)
            share_used = self._x(row, name, share)
            return LayerRecord(material=name, x=share_used, thickness_nm=thickness, monolayers=monolayers)
        edge, mass = row.column("band_edge_eV"), row.column("mass")
        if edge is None or mass is None:
            raise ScenarioError(row.key("material"), "is missing; give one, or columns band_edge_eV and mass")
        refuse_unless(thickness is not None, row.key("thickness"),
                      "is in monolayers, but no material says how thick one is; give it in nm")
        bend = row.column("nonparabolicity_per_eV")
        return LayerRecord(
            band_edge_eV=self._limited(row, edge, "band_edge_eV"), mass=self._limited(row, mass, "mass"),
            nonparabolicity_per_eV=(self._limited(row, bend, "nonparabolicity_per_eV") or None) if bend else None,
            thickness_nm=thickness)

    def _limited(self, row: _Row, column: Column, name: str) -> float:
        value = row.number_in(column)
        check_limits(row.key(column), name, value)
        return value

    def _thickness(self, row: _Row) -> tuple[float | None, float | None]:
        """Thickness in nm or in monolayers."""
        column = row.column("thickness")
        if column is None:
            raise ScenarioError(row.key("thickness"), "is missing; give the layer one")
        given = row.number_in(column)
        name = "monolayers" if column.unit == "monolayers" else "thickness_nm"
        value = given / 10 if column.unit == "angstrom" else given
        limits = PARAMETERS[name]
        refuse_unless(limits.admits(value), row.key(column), f"{limits.requirement}, but is {given:g} {column.unit}")
        return (None, value) if column.unit == "monolayers" else (value, None)

    def _material(self, key: str, text: str) -> tuple[str, tuple[str, float] | None]:
        """The name of a material and, where the text is a formula, the share of its first element."""
        known = (*self._own, *material_names())
        if text in known:
            return text, None
        written = _SYMBOLS.fullmatch(text)
        shares = _FORMULA.fullmatch(text)
        if shares and (shares[2] or shares[4]):
            return self._alloy(key, text, shares)
        plain = "".join(written.groups()) if written else text
        same = [name for name in known if name.lower() == plain.lower()]
        if len(same) != 1:
            raise ScenarioError(key, f"{shown(text)} is neither in the library nor in [materials]; "
                                f"{nearest(plain, known)}")
        return same[0], None

    def _alloy(self, key: str, text: str, shares: re.Match[str]) -> tuple[str, tuple[str, float] | None]:
        first, second, anion = (shares[place].capitalize() for place in (1, 3, 5))
        given = [None if share is None else float(share.replace(",", ".")) for share in (shares[2], shares[4])]
        one = given[0] if given[0] is not None else 1 - (given[1] or 0.0)
        refuse_unless(None in given or math.isclose(sum(g or 0.0 for g in given), 1, abs_tol=1e-6), key,
                      f"{shown(text)} has shares that do not add up to 1; mend them")
        for name, element in ((first + second + anion, first), (second + first + anion, second)):
            if name in material_names():
                return name, (element, one if element == first else round(1 - one, 12))
        raise ScenarioError(key, f"{shown(text)} is not in the library; {nearest(text, material_names())}")

    def _x(self, row: _Row, name: str, share: tuple[str, float] | None) -> float | None:
        column = row.column("x")
        alloy = name in material_names() and is_alloy(name)
        if column is None:
            refuse_unless(share is not None or not alloy or name in self._own, row.key("x"),
                          f"is missing; {name} is an alloy, give its share from 0 to 1")
            found = share[1] if share else None
        elif not alloy and row.number_in(column) == 0:
            return None
        else:
            found = self._share(row, column, name)
            refuse_unless(share is None or math.isclose(found, share[1], abs_tol=1e-6), row.key(column),
                          f"is {found:g}, but the material says {share[1] if share else 0:g}; keep one of them")
        if not alloy:
            refuse_unless(not found, row.key(column or "x"), f"does not belong to {name}, which is no alloy; leave it "
                          "empty")
            return None
        if found is not None:
            check_limits(row.key(column or "x"), "x", found)
        return found

    def _share(self, row: _Row, column: Column, name: str) -> float:
        """The share of the alloy's first-named element, whichever the column counts."""
        value = row.number_in(column)
        if column.scale != 1:
            value = round(value * column.scale, 12)
        if column.element is None or name.startswith(column.element):
            return value
        refuse_unless(column.element in name, row.key(column), f"counts {column.element}, which {name} does not hold; "
                      "head the column x")
        return round(1 - value, 12)
