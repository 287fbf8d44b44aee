"""Everything that leaves as data: tables as CSV and JSON, and a script that computes the same numbers again.

Each carries the scenario's hash, its title and the versions it was made with, so that a number can be traced to what
it was computed from.
"""

from __future__ import annotations

import hashlib
import json
import platform
from collections.abc import Callable, Mapping
from importlib import metadata
from typing import Any

import numpy as np

from transport import report
from transport.document import document_to_data
from transport.lattice import default_range, lattice_bands, lowest_energy
from transport.periods import period_verdict
from transport.resonance import resonances
from transport.scenario import Scenario, format_scenario
from transport.sheet import Rates, grower_sheet
from transport.spectrum import spectrum
from transport.tables import Table, csv_text, table_of

Range = tuple[float, float]
"""Energies from and to, eV."""


def scenario_hash(scenario: Scenario) -> str:
    """SHA-256 (hexadecimal) of the scenario's canonical JSON: equal scenarios, equal hashes, however they are written.

    Canonical: every default written, keys in order, no spaces, the shortest digits of each double, UTF-8.
    """
    plain = _without_signed_zero(document_to_data(scenario.document))
    text = json.dumps(plain, sort_keys=True, separators=(",", ":"), ensure_ascii=False, allow_nan=False)
    return hashlib.sha256(text.encode()).hexdigest()


def _without_signed_zero(value: Any) -> Any:
    if isinstance(value, dict):
        return {key: _without_signed_zero(item) for key, item in value.items()}
    if isinstance(value, list):
        return [_without_signed_zero(item) for item in value]
    return 0.0 if isinstance(value, float) and value == 0 else value


def versions() -> dict[str, str]:
    """Versions of what computed the numbers."""
    try:
        own = metadata.version("colonnade")
    except metadata.PackageNotFoundError:
        own = "not installed"
    return {"colonnade": own, "numpy": np.__version__, "python": platform.python_version()}


def provenance(scenario: Scenario) -> dict[str, Any]:
    """Title, hash and versions."""
    return {"title": scenario.title, "scenario_sha256": scenario_hash(scenario), "versions": versions()}


def _comments(scenario: Scenario) -> tuple[str, ...]:
    made = ", ".join(f"{name} {version}" for name, version in versions().items())
    return f"title: {scenario.title}", f"scenario sha256: {scenario_hash(scenario)}", f"made with: {made}"


# Each makes a table of a scenario over a range of energies; None: the stack's own.

def _spectrum(scenario: Scenario, between: Range | None) -> Table:
    found = spectrum(scenario.stack, between=between or default_range(scenario.stack))
    record = report.spectrum_record(scenario, found)
    columns = {name: values for name, values in record.items() if isinstance(values, np.ndarray)}
    rows = zip(*(values.tolist() for values in columns.values()), strict=True)
    return Table(tuple(columns), tuple(rows), (found.note,) if found.note else ())


def _bands(scenario: Scenario, between: Range | None) -> Table:
    high = default_range(scenario.stack)[1]
    found = lattice_bands(scenario.stack, between or (min(lowest_energy(scenario.stack), high - 1e-6), high))
    columns = ("index", "bottom_meV", "top_meV", "bottom_mass", "top_mass")
    return table_of(report.bands_record(found)["bands"], columns, (found.certificate.sentence,))


def _resonances(scenario: Scenario, between: Range | None) -> Table:
    found = resonances(scenario.stack, between or default_range(scenario.stack))
    notes = [found.certificate.sentence]
    if found.bound.size:
        notes.append("bound below both leads (meV): " + " ".join(repr(e * 1e3) for e in found.bound.tolist()))
    columns = ("index", "energy_meV", "width_meV", "lifetime_ps", "peak_transmission", "width_left_meV",
               "width_right_meV", "miniband", "number", "from_pole")
    return table_of(report.resonances_record(found)["resonances"], columns, notes)


def _periods(scenario: Scenario, between: Range | None) -> Table:
    """Raises ScenarioError or ValueError where no window is asked."""
    found = period_verdict(scenario)
    return table_of(report.verdict_record(found)["per_period"], (), (found.sentence,))


def _layers(scenario: Scenario, between: Range | None) -> Table:
    return grower_sheet(scenario)


TABLES: Mapping[str, Callable[[Scenario, Range | None], Table]] = {
    "spectrum": _spectrum, "bands": _bands, "resonances": _resonances, "periods": _periods, "layers": _layers,
}
"""What leaves as a table, by its name: a maker that takes the scenario and a range of energies (None: its own)."""


def data_csv(scenario: Scenario, what: str, between: Range | None = None) -> str:
    """A table of TABLES as CSV, over `between` (eV) or the stack's own range. Raises ValueError."""
    return csv_text(_made(scenario, what, between), _comments(scenario))


def data_json(scenario: Scenario, what: str, between: Range | None = None) -> str:
    """A table of TABLES as a JSON object: provenance, notes, and each column as a list; null for what is not finite."""
    table = _made(scenario, what, between)
    columns = {name: [row[place] for row in table.rows] for place, name in enumerate(table.columns)}
    return report.to_json({**provenance(scenario), "notes": list(table.notes), what: columns})


def sheet_csv(scenario: Scenario, rates: Rates | None = None) -> str:
    """The grower's sheet as CSV, with times where rates (monolayers per second) are given. Raises ValueError."""
    return csv_text(grower_sheet(scenario, rates), _comments(scenario))


def _made(scenario: Scenario, what: str, between: Range | None) -> Table:
    if what not in TABLES:
        raise ValueError(f"what is {what!r}: give one of {', '.join(TABLES)}")
    return TABLES[what](scenario, between)


def python_script(scenario: Scenario, between: Range | None = None) -> str:
    """A program that computes verdict, bands, resonances and spectrum over `between` (eV) again and prints one JSON
    object. It holds the scenario and needs the library only. Raises ValueError for a range that is none."""
    low, high = between or default_range(scenario.stack)
    if not low < high:
        raise ValueError(f"between is ({low!r}, {high!r}): give two energies in eV, the lower one first")
    lines = format_scenario(scenario).splitlines(keepends=True)
    made = ", ".join(f"{name} {version}" for name, version in versions().items())
    return _SCRIPT.format(
        scenario="\n".join(f"    {line!r}" for line in lines), hash=scenario_hash(scenario), low=float(low),
        high=float(high), made=made, verdict=_VERDICT if scenario.target and scenario.target.windows else "")


_VERDICT = """
verdict = transport.period_verdict(scenario)
answer["verdict"] = verdict.sentence
answer["fewest_periods"] = verdict.fewest
answer["margin_dB"] = [check.margin_dB for check in verdict.per_period]
"""

_SCRIPT = '''"""Computes again what the screen showed, with Colonnade's library, and prints one JSON object.

Written with {made}. Energies are in eV here and in meV where a key says so.
"""

import json

import transport
from transport.handoff import scenario_hash

SCENARIO = (
{scenario}
)
SHA256 = "{hash}"
BETWEEN = ({low!r}, {high!r})

scenario = transport.parse_scenario(SCENARIO)
if scenario_hash(scenario) != SHA256:
    raise SystemExit("the scenario in this file is no longer the one it was written for; set SHA256 to go on")

answer = {{"scenario_sha256": SHA256}}
bands = transport.lattice_bands(scenario.stack, BETWEEN)
answer["bands_meV"] = [[band.bottom * 1e3, band.top * 1e3] for band in bands.bands]
found = transport.resonances(scenario.stack, BETWEEN)
answer["resonance_meV"] = (found.energy * 1e3).tolist()
answer["resonance_width_meV"] = (found.width * 1e3).tolist()
curve = transport.spectrum(scenario.stack, between=BETWEEN)
answer["energy_meV"] = (curve.energy * 1e3).tolist()
answer["transmission"] = curve.transmission.tolist()
{verdict}
print(json.dumps(answer, indent=1))
'''
