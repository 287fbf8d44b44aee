"""What leaves the tool as data: tables in CSV and JSON with units, the scenario's hash and versions; a script."""

from __future__ import annotations

import csv
import hashlib
import io
import json
import re
import sys
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from importlib.metadata import version
from typing import Any

import numpy as np

from transport import report
from transport.document import document_to_data
from transport.fewest import Asked
from transport.lattice import default_range, lattice_bands
from transport.limits import GROWTH
from transport.peaks import compare_peaks
from transport.periods import period_verdict
from transport.resonance import resonances
from transport.scenario import Scenario, format_scenario
from transport.sheet import grower_rows
from transport.spectrum import spectrum

_FORMULA_INSIDE = re.compile(r"([,;]\s*)(?=[=+\-@])")

Record = dict[str, Any]
Span = tuple[float, float]


def scenario_hash(scenario: Scenario) -> str:
    """SHA-256 of the scenario in canonical JSON: the same for files that differ only in layout or comments."""
    plain = json.dumps(document_to_data(scenario.document), sort_keys=True, ensure_ascii=False, separators=(",", ":"))
    return hashlib.sha256(plain.encode()).hexdigest()


def versions() -> dict[str, str]:
    """Versions of what the numbers come from."""
    return {"colonnade": version("colonnade"), "python": sys.version.split()[0], "numpy": np.__version__}


@dataclass(frozen=True, slots=True)
class Table:
    """A table: what it is, its rows under headers that end in their unit, and sentences that belong to it."""

    title: str
    rows: tuple[Record, ...]
    notes: tuple[str, ...] = ()


def _spectrum_table(scenario: Scenario, span: Span) -> Table:
    record = report.spectrum_record(scenario, spectrum(scenario.stack, between=span))
    columns = {key: value.tolist() for key, value in record.items() if isinstance(value, np.ndarray)}
    rows = (dict(zip(columns, values, strict=True)) for values in zip(*columns.values(), strict=True))
    return Table("Transmission and reflection", tuple(rows), (record["note"],) if "note" in record else ())


def _bands_table(scenario: Scenario, span: Span) -> Table:
    found = lattice_bands(scenario.stack, span)
    return Table("Bands of the infinite lattice", tuple(report.bands_record(found)["bands"]),
                 (found.certificate.sentence,))


def _resonances_table(scenario: Scenario, span: Span) -> Table:
    found = resonances(scenario.stack, span)
    return Table("Ledger of resonances", tuple(report.resonances_record(found)["resonances"]),
                 (found.certificate.sentence,))


def _periods_table(scenario: Scenario, span: Span) -> Table:
    if scenario.target is None or not scenario.target.windows:
        return Table("Margin of every count", (), ("No window is asked.",))
    found = period_verdict(Asked(scenario.stack, scenario.target, scenario.resolution))
    return Table("Margin of every count", tuple(report.verdict_record(found)["per_period"]), (found.sentence,))


def _layers_table(scenario: Scenario, span: Span) -> Table:
    return Table("Layers as written", tuple(report.layers_record(scenario)["layers"]), (*scenario.warnings, GROWTH))


def _peaks_table(scenario: Scenario, span: Span) -> Table:
    if scenario.document.measured is None:
        return Table("Measured peaks", (), ("No peak was measured.",))
    found = compare_peaks(scenario)
    return Table("Measured peaks", tuple(report.peaks_record(found, None)["peaks"]),
                 (found.resonances.certificate.sentence,))


TABLES: Mapping[str, Callable[[Scenario, Span], Table]] = {
    "spectrum": _spectrum_table, "bands": _bands_table, "resonances": _resonances_table, "periods": _periods_table,
    "peaks": _peaks_table, "layers": _layers_table,
}
"""Every table that leaves, by name; a new capability adds its own here."""


def table(scenario: Scenario, name: str, span: Span | None = None) -> Table:
    """The table called `name` over `span` (eV; default: `lattice.default_range`). Raises ValueError."""
    if name not in TABLES:
        raise ValueError(f"table: {name!r} is not known; known here: {', '.join(TABLES)}")
    return TABLES[name](scenario, span or default_range(scenario.stack))


def to_csv(scenario: Scenario, found: Table) -> str:
    """A table as CSV; lines that begin with # say what it is of."""
    lines = [found.title, f"scenario: {scenario.title}", f"sha256: {scenario_hash(scenario)}",
             ", ".join(f"{name} {number}" for name, number in versions().items()), *found.notes]
    return _with_header(lines, found.rows)


def to_json(scenario: Scenario, tables: Mapping[str, Table]) -> str:
    """Tables as one JSON object, with the scenario itself."""
    return report.to_json({
        "scenario_sha256": scenario_hash(scenario), "title": scenario.title, "versions": versions(),
        "scenario": document_to_data(scenario.document),
        **{name: {"title": t.title, "notes": list(t.notes), "rows": list(t.rows)} for name, t in tables.items()},
    })


def grower_csv(scenario: Scenario, rates: Mapping[str, float] | None = None) -> str:
    """The sheet for growth as CSV: whole monolayers with the rounding shown, height, and time where a rate is known.

    Raises ScenarioError as `sheet.grower_rows` does.
    """
    rows = [
        {"number": r.number, "where": r.where, "material": r.material, "x": r.x, "thickness_nm": r.thickness,
         "monolayers": None if r.monolayers is None else round(r.monolayers, 4), "whole_monolayers": r.whole,
         "rounding_nm": None if r.rounding is None else round(r.rounding, 5), "height_nm": round(r.height, 5),
         "growth_s": None if r.seconds is None else round(r.seconds, 3), "band_edge_eV": r.band_edge, "mass": r.mass,
         "nonparabolicity_per_eV": r.nonparabolicity}
        for r in grower_rows(scenario, rates)
    ]
    lines = [f"Layers to grow, in order: {scenario.title}", f"sha256: {scenario_hash(scenario)}", GROWTH,
             *scenario.warnings]
    if any(row.strength is not None for row in scenario.sheet):
        lines.append("Deltas have no thickness and are left out here: the stack as grown is not the one worked out.")
    return _with_header(lines, rows)


def _with_header(lines: Iterable[str], rows: Iterable[Record]) -> str:
    out = io.StringIO()
    out.writelines(f"# {_comment(line)}\n" for line in lines)
    writer, header = csv.writer(out, lineterminator="\n"), None
    for row in rows:
        if header is None:
            header = list(row)
            writer.writerow(header)
        writer.writerow([_cell(value) for value in row.values()])
    return out.getvalue()


def _comment(line: str) -> str:
    """One line of text: no quote in it opens a cell, and where a separator cuts it no formula begins."""
    return _FORMULA_INSIDE.sub(r"\1'", " ".join(line.split()).replace('"', "'"))


def _cell(value: Any) -> Any:
    """Text that a spreadsheet would take for a formula is kept text by a quote before it."""
    if isinstance(value, str) and value[:1] in ("=", "+", "-", "@", "\t"):
        return "'" + value
    return value


def python_script(scenario: Scenario, span: Span | None = None) -> str:
    """A script of its own that works the numbers of the screen out again with `transport`, and prints them as JSON."""
    low, high = span or default_range(scenario.stack)
    # Literals of Python, not of JSON, which writes letters beyond 16 bits as two halves.
    lines = (f"    {line!r}" for line in format_scenario(scenario).splitlines(keepends=True))
    return _SCRIPT.format(title=repr(scenario.title), sha=scenario_hash(scenario), text="\n".join(lines),
                          low=repr(float(low)), high=repr(float(high)))


_SCRIPT = '''\
"""Works the numbers of a scenario out again and prints them as one JSON object. Needs colonnade installed."""

import json

import transport

TITLE = {title}
SHA256 = "{sha}"
SCENARIO = (
{text}
)
LOW, HIGH = {low}, {high}  # eV

scenario = transport.parse_scenario(SCENARIO)
stack = scenario.stack
found = {{"title": TITLE, "sha256": SHA256, "periods": stack.periods}}

curve = transport.spectrum(stack, between=(LOW, HIGH))
found["energy_eV"], found["transmission"] = curve.energy.tolist(), curve.transmission.tolist()

bands = transport.lattice_bands(stack, (LOW, HIGH))
found["bands_eV"] = [[band.bottom, band.top] for band in bands.bands]
found["bands_certificate"] = bands.certificate.sentence

ledger = transport.resonances(stack, (LOW, HIGH))
found["resonances_eV"], found["widths_eV"] = ledger.energy.tolist(), ledger.width.tolist()
found["resonances_certificate"] = ledger.certificate.sentence

if scenario.target is not None and scenario.target.windows:
    verdict = transport.period_verdict(scenario)
    found["fewest_periods"], found["verdict"] = verdict.fewest, verdict.sentence

print(json.dumps(found))
'''
