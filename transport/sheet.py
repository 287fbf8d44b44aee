"""Layer sheets: the grower's list out, with monolayers rounded and times; lists of layers in, from a pasted table."""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from transport.document import LayerRecord
from transport.materials import base_of, is_alloy, material_names
from transport.parameters import PARAMETERS
from transport.refusal import ScenarioError, check_limits, nearest, refuse_unless, shown
from transport.resolve import SheetRow
from transport.scenario import Scenario

_MOST_BYTES = 1_000_000


@dataclass(frozen=True, slots=True)
class GrowerRow:
    """A layer as it is grown, in order.

    Lengths nm. `whole`: monolayers rounded, `rounding` what that adds (nm); `height`: top of the layer above the first
    face; `seconds` at the given rate; None where the material has no monolayer, or no rate is known. A layer of no
    material is its `band_edge` (eV), `mass` (m0) and `nonparabolicity` (1/eV), which all others leave None.
    """

    number: int
    where: str
    material: str
    x: str
    thickness: float
    monolayers: float | None
    whole: int | None
    rounding: float | None
    height: float
    seconds: float | None
    band_edge: float | None = None
    mass: float | None = None
    nonparabolicity: float | None = None


def read_rates(text: str) -> dict[str, float]:
    """Growth rates (monolayers a second) by material, "" for all others: `0.8`, or `GaAs=0.8,AlGaAs=1.1`.

    Raises ScenarioError for what is no rate.
    """
    found = {}
    for part in filter(None, (part.strip() for part in text.split(","))):
        name, _, value = part.rpartition("=")
        try:
            found[name.strip()] = float(value)
        except ValueError:
            raise ScenarioError("rate", f"{shown(part)} is none; write 0.8 for all materials, or GaAs=0.8,AlGaAs=1.1 "
                                "(monolayers a second)") from None
    return found


def grower_rows(scenario: Scenario, rates: Mapping[str, float] | None = None) -> tuple[GrowerRow, ...]:
    """Every layer to be grown, all periods written out, from the left lead's side up.

    `rates`: monolayers a second by material, "" for all others. Raises ScenarioError for a rate that is not above 0 or
    of a material that is not grown, and for more rows than a file may have layers times 50.
    """
    rates = rates or {}
    for name, rate in rates.items():
        refuse_unless(0 < rate < 1e6, f"rate {name}".strip(), f"is {rate:g}; give monolayers a second, above 0")
    grown = {row.material for row in scenario.sheet[1:-1]} - {None}
    for name in rates:
        refuse_unless(not name or name in grown, "rate", f"names {shown(name)}, which is not grown here; "
                      f"{nearest(name, sorted(name for name in grown if name))}")
    parts = {part: [row for row in scenario.sheet if row.where == part and row.strength is None]
             for part in ("entry", "cell", "exit")}
    total = len(parts["entry"]) + len(parts["cell"]) * scenario.stack.periods + len(parts["exit"])
    most = 50 * int(PARAMETERS["file_layers"].high)
    refuse_unless(total <= most, "stack.periods", f"makes {total:,} layers to grow; at most {most:,} are written out")
    rows: list[GrowerRow] = []
    height = 0.0
    for row, where in _in_order(parts, scenario.stack.periods):
        height += row.thickness or 0.0
        rows.append(_grown(len(rows) + 1, row, where, height, rates))
    return tuple(rows)


def _in_order(parts: Mapping[str, Sequence[SheetRow]], periods: int) -> list[tuple[SheetRow, str]]:
    cells = [(row, f"period {n + 1}") for n in range(periods) for row in parts["cell"]]
    return [*((row, "entry") for row in parts["entry"]), *cells, *((row, "exit") for row in parts["exit"])]


def _grown(number: int, row: SheetRow, where: str, height: float, rates: Mapping[str, float]) -> GrowerRow:
    thickness, monolayers = row.thickness or 0.0, row.monolayers
    whole = None if monolayers is None else max(1, round(monolayers))
    rounding = None if monolayers is None or whole is None else (whole - monolayers) * thickness / monolayers
    rate = rates.get(row.material or "", rates.get(""))
    seconds = None if monolayers is None or rate is None else monolayers / rate
    composition = f"{row.x_ends[0]:g} to {row.x_ends[1]:g}" if row.x_ends else "" if row.x is None else repr(row.x)
    name = row.material or row.profile or ""
    explicit = () if name else (row.band_edge, row.mass, row.nonparabolicity)
    return GrowerRow(number, where, name, composition, thickness, monolayers, whole, rounding, height, seconds,
                     *explicit)


# Lists of layers in.

_EXPLICIT = ("band_edge_eV", "mass", "nonparabolicity_per_eV")
_SPELLINGS = {
    "thickness": ("thickness", "thick", "d", "width", "length", "nm", "angstrom", "ml", "monolayers", "monolayer"),
    "material": ("material", "mat", "layer", "alloy", "compound", "semiconductor"),
    "x": ("x", "composition", "comp", "content", "fraction", "mole fraction", "al", "x(al)", "al content"),
}
_UNITS = {"nm": 1.0, "nanometre": 1.0, "nanometer": 1.0, "å": 0.1, "a": 0.1, "angstrom": 0.1, "ångström": 0.1,
          "ångstrom": 0.1}
# A lone # is the header of a column that numbers the layers.
_COMMENT = re.compile(r"\s*#(?!\s*[,;\t])")
_MONOLAYERS = ("ml", "mls", "monolayer", "monolayers")
UNITS = ("nm", "angstrom", "monolayers")
"""In what a table may give its thicknesses."""


@dataclass(frozen=True, slots=True)
class ReadSheet:
    """The layers of a table, and a sentence for each line that is none; both in the order of the lines."""

    layers: tuple[LayerRecord, ...]
    faults: tuple[str, ...]


def read_layer_sheet(text: str, unit: str | None = None) -> ReadSheet:
    """Layers of a CSV table with a line of headers: thickness, material, and x for alloys; or band_edge_eV and mass.

    Header names in the usual spellings; the unit of thickness stands in its header ("thickness (nm)", "d [Å]", "ML") or
    in `unit`. Separators: comma, semicolon or tab; with the last two, decimals may have a comma. Lines that begin with
    # are left out, and so are the columns of this project's own sheet that are worked out. Raises ScenarioError where
    no table can be made out; a line that is no layer is a sentence in `faults`.
    """
    refuse_unless(len(text.encode("utf-8", "surrogatepass")) <= _MOST_BYTES, "sheet",
                  f"is larger than {_MOST_BYTES:,} bytes; cut it to its layers")
    lines = [(number, line) for number, line in enumerate(text.lstrip("\ufeff").splitlines(), 1)
             if line.strip() and not _COMMENT.match(line)]
    refuse_unless(bool(lines), "sheet", "is empty; begin it with headers such as thickness (nm), material, x")
    separator = next((mark for mark in "\t;," if mark in lines[0][1]), ",")
    try:
        rows = list(csv.reader(io.StringIO("\n".join(line for _, line in lines)), delimiter=separator, strict=True))
    except csv.Error as error:
        raise ScenarioError("sheet", f"is no table ({error}); give plain CSV") from None
    if separator != ",":
        rows = [rows[0], *([cell.replace(",", ".") for cell in row] for row in rows[1:])]
    refuse_unless(len(rows) == len(lines), "sheet", "has cells that run over several lines; give one layer a line")
    columns, found, percent = _columns(rows[0], unit)
    most = int(PARAMETERS["file_layers"].high)
    refuse_unless(len(rows) - 1 <= most, "sheet", f"lists {len(rows) - 1:,} layers; at most {most:,} are read")
    refuse_unless(len(rows) > 1, "sheet", "has headers but no layer; add a line for each")
    layers, faults = [], []
    for (number, _), row in zip(lines[1:], rows[1:], strict=True):
        try:
            layers.append(_layer(number, columns, row, found, percent))
        except ScenarioError as error:
            faults.append(str(error))
    return ReadSheet(tuple(layers), tuple(faults))


def _columns(header: Sequence[str], unit: str | None) -> tuple[dict[str, int], str, bool]:
    """Where thickness, material and x stand, the unit of thickness, and whether x is in percent."""
    places: dict[str, int] = {}
    units: dict[str, str | None] = {}
    for place, title in enumerate(header):
        if title.strip() in _EXPLICIT:
            places[title.strip()] = place
            continue
        name, stated = _title(title)
        kind = next((kind for kind, spellings in _SPELLINGS.items() if name in spellings), None)
        if kind is not None and (kind not in places or (kind == "thickness" and units[kind] is None)):
            places[kind], units[kind] = place, stated
    for kind in ("thickness", "material"):
        refuse_unless(kind in places or (kind == "material" and "band_edge_eV" in places), "sheet",
                      f"has no column {kind}; its headers are {shown(', '.join(header))}")
    found = unit or units["thickness"]
    refuse_unless(found != "%", "sheet", "gives thicknesses in %; write thickness (nm), (A) or (ML)")
    refuse_unless(found is not None, "sheet", "does not say in what its thicknesses are; write thickness (nm), "
                  "thickness (A) or thickness (ML), or choose the unit")
    assert found is not None
    return places, found, units.get("x") == "%"


def _title(title: str) -> tuple[str, str | None]:
    """A header's name in lower case without its unit, and the unit it states."""
    words = re.sub(r"[\[\](){}/,_]+", " ", title.strip().lower()).split()
    known = (*_UNITS, *_MONOLAYERS, "%")
    stated = next((word for word in words if word in known and not (word == "a" and len(words) == 1)), None)
    name = " ".join(word for word in words if word != stated) or (stated or "")
    if stated is None:
        return name, None
    if stated == "%":
        return name, stated
    return name, "monolayers" if stated in _MONOLAYERS else "nm" if _UNITS[stated] == 1 else "angstrom"


def _layer(line: int, columns: Mapping[str, int], row: Sequence[str], unit: str, percent: bool) -> LayerRecord:
    def cell(kind: str) -> str:
        place = columns.get(kind)
        return row[place].strip() if place is not None and place < len(row) else ""

    thickness = _number(line, "thickness", cell("thickness"))
    key = "monolayers" if unit == "monolayers" else "thickness_nm"
    value = float(f"{thickness / 10:.12g}") if unit == "angstrom" else thickness
    refuse_unless(PARAMETERS[key].admits(value), f"line {line}, thickness",
                  f"{PARAMETERS[key].requirement}, but is {value:g}")
    if not cell("material") and cell("band_edge_eV") and key == "thickness_nm":
        figures = {name: _number(line, name, cell(name) or "0") for name in _EXPLICIT}
        for name, figure in figures.items():
            check_limits(f"line {line}, {name}", name, figure)
        bend = figures.pop("nonparabolicity_per_eV") or None
        return LayerRecord(thickness_nm=value, nonparabolicity_per_eV=bend, **figures)  # type: ignore[arg-type]
    share = cell("x")
    name, x = _material(line, cell("material"), f"{share}%" if percent and share else share)
    return LayerRecord(material=name, x=x, **{key: value})  # type: ignore[arg-type]


_NUMBER = re.compile(r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")
_ELEMENT = re.compile(r"([A-Z][a-z]?)\(?([0-9]*\.?[0-9]+)?\)?")
_CATIONS = ("Al", "Ga", "In")


def _material(line: int, text: str, x: str) -> tuple[str, float | None]:
    """The material's name and composition; Al0.3Ga0.7As is read as AlGaAs with x = 0.3."""
    where = f"line {line}, material"
    refuse_unless(bool(text), where, "is missing; name it, as in GaAs or AlGaAs")
    names = {name.lower(): name for name in material_names()}
    plain, composed = _composed(line, text.replace(" ", ""))
    name = names.get(plain.lower())
    if name is None:
        raise ScenarioError(where, f"{shown(text)} is not known here; {nearest(text, material_names())}")
    blank = x in ("", "-", "%", "-%")
    share = None if blank else _number(line, "x", x.removesuffix("%").strip())
    if not is_alloy(name):
        refuse_unless(not share, f"line {line}, x", f"stands beside {name}, which is no alloy; leave it empty")
        return name, None
    if share is not None and x.endswith("%"):
        share = float(f"{share / 100:.12g}")
    refuse_unless(composed is None or share is None or abs(composed - share) < 1e-6, f"line {line}, x",
                  f"is not that of {shown(text)} as it is written; keep one of them")
    share = composed if share is None else share
    if share is None:
        raise ScenarioError(f"line {line}, x", f"is missing; {name} needs a composition from 0 to 1")
    refuse_unless(0 <= share <= 1, f"line {line}, x", f"must be from 0 to 1, but is {share:g}")
    return name, share


def _composed(line: int, text: str) -> tuple[str, float | None]:
    """A formula of three elements, in any order, as the library's name and x; other text as it is, and None."""
    parts = _ELEMENT.findall(text)
    shares = {element: float(share) for element, share in parts if share}
    same = [name for name in material_names() if is_alloy(name)
            and {element for element, _ in _ELEMENT.findall(name)} == {element for element, _ in parts}]
    if not (shares and same and _ELEMENT.sub("", text) == "" and len(parts) == 3):
        return text, None
    base = base_of(same[0]) or ""
    (varied,) = (element for element, _ in parts if element not in base)
    (other,) = (element for element, _ in parts
                if element != varied and (element in _CATIONS) == (varied in _CATIONS))
    x = shares.get(varied, 1 - shares.get(other, 0.0))
    refuse_unless(set(shares) <= {varied, other} and abs(x + shares.get(other, 1 - x) - 1) < 1e-6,
                  f"line {line}, material", f"{shown(text)} has shares that do not add up to 1; mend them")
    return same[0], float(f"{x:.12g}")


def _number(line: int, column: str, text: str) -> float:
    plain = text.replace("\N{MINUS SIGN}", "-")
    refuse_unless(_NUMBER.fullmatch(plain) is not None, f"line {line}, {column}",
                  f"must be a number, but is {shown(text)}")
    return float(plain)
