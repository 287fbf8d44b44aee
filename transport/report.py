"""Results as people and programs read them: plain text, and JSON objects whose keys end in their unit."""

from __future__ import annotations

import json
import math
from collections.abc import Iterable, Sequence
from typing import Any

import msgspec
import numpy as np

from transport.allowance import VerdictRange
from transport.document import EndsRecord
from transport.lattice import Bands, default_range
from transport.limits import GROWTH
from transport.matching import MatchedEnds
from transport.measuring import measured_transmission
from transport.nearest import NearestStacks, Remedy
from transport.peaks import FIGURES, PeakComparison, PeakFit
from transport.periods import Verdict
from transport.propagation import model_end
from transport.resolve import SheetRow
from transport.resonance import Resonances
from transport.scenario import Scenario, format_scenario
from transport.spectrum import Spectrum

Record = dict[str, Any]


def to_json(record: Record) -> str:
    """Strict JSON: numbers that are not finite become null."""
    return json.dumps(_finite(record), ensure_ascii=False, allow_nan=False, indent=1)


def _finite(value: Any) -> Any:
    if isinstance(value, dict):
        return {key: _finite(item) for key, item in value.items()}
    if isinstance(value, np.ndarray):
        return _finite(value.tolist())
    if isinstance(value, list | tuple):
        return [_finite(item) for item in value]
    if isinstance(value, np.generic):
        return _finite(value.item())
    if isinstance(value, float) and not math.isfinite(value):
        return None
    return value


def spectrum_record(scenario: Scenario, spectrum: Spectrum) -> Record:
    """Energies with transmission, reflection and log10 of transmission; more where the scenario asks for it."""
    record: Record = {
        "energy_meV": spectrum.energy * 1e3,
        "transmission": spectrum.transmission,
        "reflection": spectrum.reflection,
        "log10_transmission": spectrum.log10_transmission,
    }
    if scenario.resolution:
        record["measured_transmission"] = measured_transmission(spectrum.stack, spectrum.energy, scenario.resolution)
    if spectrum.narrow is not None:
        record |= {"from_pole_meV": (spectrum.narrow.energy * 1e3).tolist(), "note": spectrum.note}
    if spectrum.envelope is not None:
        record |= {
            "envelope_lower": np.where(spectrum.envelope.passing, spectrum.envelope.lower, spectrum.transmission),
            "envelope_upper": np.where(spectrum.envelope.passing, spectrum.envelope.upper, spectrum.transmission),
            "note": spectrum.note,
        }
    return record


def bands_record(bands: Bands) -> Record:
    """Every band with its edges and edge masses, and the certificate."""
    return {
        "bands": [
            {"index": b.index, "bottom_meV": b.bottom * 1e3, "top_meV": b.top * 1e3,
             "bottom_mass": b.bottom_mass, "top_mass": b.top_mass}
            for b in bands.bands
        ],
        "certificate": {
            "complete": bands.certificate.complete,
            "counted": bands.certificate.counted,
            "found": bands.certificate.found,
        },
    }


def verdict_record(verdict: Verdict) -> Record:
    """The verdict with every count's check."""
    energy = verdict.ripple_floor_energy
    return {
        "fewest_periods": verdict.fewest,
        "meeting_periods": list(verdict.meeting),
        "reason": verdict.reason,
        "sentence": verdict.sentence,
        "ripple_floor": verdict.ripple_floor,
        "ripple_floor_meV": None if energy is None else energy * 1e3,
        "mean_limit": verdict.mean_limit, "loses_beyond_periods": verdict.loses_beyond,
        "per_period": [
            {"periods": c.periods, "meets": c.meets, "margin_dB": c.margin_dB, "limiting_window": c.limiting_window}
            for c in verdict.per_period
        ],
    }


def range_record(found: VerdictRange) -> Record:
    """The range of a verdict, figure by figure and case by case."""
    return {
        "fewest_periods": found.nominal, "low": found.low, "high": found.high, "unanswered": found.unanswered,
        "cases": [{"signs": list(case.signs), "fewest_periods": case.fewest} for case in found.cases],
        "figures": [{"name": f.name, "fewest_low": f.low, "fewest_high": f.high} for f in found.figures],
        "matters_most": found.matters_most, "sentence": found.sentence,
    }


def ends_record(found: MatchedEnds) -> Record:
    """What end treatments do, the best first; `scenario` is the file to open or save."""
    return {
        "sentence": found.sentence, "windows": list(found.windows), "before": list(found.before),
        "proposals": [
            {"name": p.name, "ends": _plain(p.ends), "limits": list(p.limits), "gain_dB": p.gain_dB,
             "scenario": format_scenario(p.scenario)}
            for p in found.proposals
        ],
    }


def remedy_record(found: NearestStacks) -> Record:
    """The nearest stacks that meet the target, or the nearest miss; `scenario` is the file to open or save."""
    return {
        "sentence": found.sentence, "tried": found.tried, "together": found.together,
        "proposals": [_remedy(remedy) for remedy in found.proposals],
        "nearest_miss": None if found.miss is None else _remedy(found.miss),
    }


def _remedy(remedy: Remedy) -> Record:
    return {
        "words": remedy.words,
        "changes": [{"layer": c.layer, "name": c.name, "monolayers": c.monolayers} for c in remedy.changes],
        "ends": None if remedy.ends is None else _plain(remedy.ends),
        "periods": remedy.check.periods, "margin_dB": remedy.check.margin_dB,
        "limiting_window": remedy.check.limiting_window, "length_nm": remedy.length,
        "scenario": format_scenario(remedy.scenario),
    }


def _plain(ends: EndsRecord) -> Record:
    """The table [stack.ends] without its absent keys."""
    return {key: value for key, value in msgspec.to_builtins(ends).items() if value is not None}


def resonances_record(found: Resonances) -> Record:
    """The ledger: every resonance, the bound states, and the certificate."""
    certificate = found.certificate
    return {
        "resonances": [
            {"index": int(found.index[i]), "energy_meV": found.energy[i] * 1e3, "width_meV": found.width[i] * 1e3,
             "lifetime_ps": found.lifetime[i] * 1e12, "peak_transmission": found.peak_transmission[i],
             "width_left_meV": found.width_left[i] * 1e3, "width_right_meV": found.width_right[i] * 1e3,
             "miniband": int(found.miniband[i]), "number": int(found.number[i]), "from_pole": bool(found.from_pole[i])}
            for i in range(found.energy.size)
        ],
        "bound_meV": found.bound * 1e3,
        "certificate": {"complete": certificate.complete, "counted": certificate.counted, "found": certificate.found,
                        "sentence": certificate.sentence},
    }


def peaks_record(compared: PeakComparison, fit: PeakFit | None) -> Record:
    """Measured peaks beside their resonances, and what a fit of some figures makes of them."""
    measured, found = compared.measured, compared.resonances
    rows = []
    for place, partner in enumerate(compared.pairs):
        paired = partner >= 0
        rows.append({
            "measured_meV": measured.energy[place] * 1e3, "measured_width_meV": measured.width[place] * 1e3,
            "uncertainty_meV": measured.uncertainty[place] * 1e3,
            "resonance": int(found.index[partner]) if paired else None,
            "energy_meV": found.energy[partner] * 1e3 if paired else None,
            "width_meV": found.width[partner] * 1e3 if paired else None,
            "deviation_meV": compared.deviation[place] * 1e3,
        })
    record: Record = {"peaks": rows, "rms_meV": compared.rms * 1e3,
                      "certificate": {"complete": found.certificate.complete, "counted": found.certificate.counted}}
    return record if fit is None else record | {"fit": fit_record(fit)}


def fit_record(fit: PeakFit) -> Record:
    """The fitted figures with standard errors, in the units of their names."""
    figures = {}
    for place, name in enumerate(fit.figures):
        factor, unit = (1.0, "nm") if FIGURES[name] == "nm" else (1e3, "meV")
        figures[f"{name}_{unit}"] = {"change": fit.values[place] * factor, "error": fit.errors[place] * factor}
    return {"figures": figures, "rms_before_meV": fit.before.rms * 1e3, "rms_after_meV": fit.after.rms * 1e3,
            "correlation": fit.correlation, "warnings": list(fit.warnings),
            "scenario": None if fit.scenario is None else format_scenario(fit.scenario)}


def layers_record(scenario: Scenario) -> Record:
    """The grower's sheet, from the left lead's side."""
    return {
        "layers": [
            {"where": row.where, "material": row.material, "x": row.x, "thickness_nm": row.thickness,
             "monolayers": row.monolayers, "band_edge_eV": row.band_edge, "mass": row.mass,
             "delta_eV_nm": row.strength, "profile": row.profile, "x_from": row.x_ends and row.x_ends[0],
             "x_to": row.x_ends and row.x_ends[1], "grading_nm": row.grading}
            for row in scenario.sheet
        ],
        "warnings": list(scenario.warnings),
    }


def check_record(scenario: Scenario) -> Record:
    """That a scenario is sound, what it is, and what to beware of."""
    return {
        "valid": True,
        "title": scenario.title,
        "periods": scenario.stack.periods,
        "layers_per_cell": len(scenario.stack.cell),
        "period_nm": scenario.stack.period_length,
        "windows": len(scenario.target.windows) if scenario.target else 0,
        "warnings": _cautions(scenario),
    }


def _cautions(scenario: Scenario) -> list[str]:
    """The scenario's warnings, and where the one-band model ends if that is within what is looked at by itself."""
    end = model_end(scenario.stack.elements)
    if end < default_range(scenario.stack)[0]:
        return list(scenario.warnings)
    return [*scenario.warnings, f"The one-band model ends at {end * 1e3:.6g} meV, where a layer's mass falls to 0: "
            "ask for energies above it."]


def table(header: Sequence[str], rows: Iterable[Sequence[Any]]) -> str:
    """Right-aligned columns."""
    cells = [list(header), *([_cell(value) for value in row] for row in rows)]
    widths = [max(len(row[column]) for row in cells) for column in range(len(header))]
    return "\n".join("  ".join(text.rjust(width) for text, width in zip(row, widths, strict=True)) for row in cells)


def _cell(value: Any) -> str:
    if value is None or (isinstance(value, float) and not math.isfinite(value)):
        return "-"
    if isinstance(value, bool | np.bool_):
        return "yes" if value else "no"
    return f"{value:.6g}" if isinstance(value, float | np.floating) else str(value)


def columns_text(record: Record) -> str:
    """The columns of a record of equally long arrays, and its note."""
    columns = {key: value for key, value in record.items() if isinstance(value, np.ndarray)}
    note = f"{record['note']}\n" if "note" in record else ""
    return note + table(list(columns), zip(*(column.tolist() for column in columns.values()), strict=True))


def bands_text(bands: Bands) -> str:
    """Bands as a table, with the certificate in words."""
    rows = [(b.index, b.bottom * 1e3, b.top * 1e3, (b.top - b.bottom) * 1e3, b.bottom_mass, b.top_mass)
            for b in bands.bands]
    header = ("band", "bottom_meV", "top_meV", "width_meV", "bottom_mass", "top_mass")
    return table(header, rows) + f"\n{bands.certificate.sentence}"


def verdict_text(verdict: Verdict) -> str:
    """The verdict sentence, its limits, and a table of counts."""
    lines = [verdict.sentence]
    if verdict.ripple_floor is not None and verdict.ripple_floor_energy is not None:
        lines.append(f"Ripple floor {verdict.ripple_floor:.4g} at {verdict.ripple_floor_energy * 1e3:.6g} meV.")
    if verdict.mean_limit is not None:
        lines.append(f"Mean limit {verdict.mean_limit:.4g}.")
    rows = [(c.periods, c.meets, c.margin_dB, c.limiting_window) for c in verdict.per_period]
    return "\n".join([*lines, table(("periods", "meets", "margin_dB", "limiting_window"), rows)])


def ends_text(found: MatchedEnds) -> str:
    """What end treatments do, as a table of limits."""
    if not found.proposals:
        return found.sentence
    rows = [(None, *found.before), *((p.gain_dB, *p.limits) for p in found.proposals)]
    lines = table(("gain_dB", *(f"limit_of_window_{place}" for place in found.windows)), rows).split("\n")
    words = ["ends", "as they are", *(p.name for p in found.proposals)]
    return "\n".join([found.sentence, *(f"{line}  {what}" for line, what in zip(lines, words, strict=True))])


def remedy_text(found: NearestStacks) -> str:
    """The nearest stacks that meet the target, as a table."""
    rows = [(p.check.periods, p.check.margin_dB, p.length) for p in found.proposals]
    lines = table(("periods", "margin_dB", "length_nm"), rows).split("\n") if rows else []
    words = ["change", *(p.words for p in found.proposals)]
    return "\n".join([found.sentence, *(f"{line}  {what}" for line, what in zip(lines, words, strict=False))])


def resonances_text(found: Resonances) -> str:
    """The ledger as a table, with its certificate in words."""
    rows = [(int(found.index[i]), found.energy[i] * 1e3, found.width[i] * 1e3, found.lifetime[i] * 1e12,
             found.peak_transmission[i], f"{found.miniband[i]}.{found.number[i]}" if found.miniband[i] else "gap")
            for i in range(found.energy.size)]
    lines = [table(("resonance", "energy_meV", "width_meV", "lifetime_ps", "peak_transmission", "miniband"), rows)]
    if found.bound.size:
        lines.append("bound below both leads (meV): " + ", ".join(f"{e * 1e3:.6g}" for e in found.bound))
    return "\n".join([*lines, found.certificate.sentence])


def peaks_text(compared: PeakComparison, fit: PeakFit | None) -> str:
    """Measured peaks beside their resonances as a table, and the fit in words."""
    record = peaks_record(compared, fit)
    columns = ("measured_meV", "resonance", "energy_meV", "deviation_meV", "measured_width_meV", "width_meV")
    lines = [table(columns, [[row[name] for name in columns] for row in record["peaks"]]),
             f"root mean square deviation {record['rms_meV']:.4g} meV"]
    if fit is not None:
        lines += [f"{name.rpartition('_')[0]} {value['change']:+.4g} \N{PLUS-MINUS SIGN} {value['error']:.2g} "
                  f"{name.rpartition('_')[2]}" for name, value in record["fit"]["figures"].items()]
        lines += [f"root mean square deviation after the fit {record['fit']['rms_after_meV']:.4g} meV", *fit.warnings]
    return "\n".join(lines)


def layers_text(scenario: Scenario) -> str:
    """The grower's sheet as a table, with warnings and the usual caution."""
    graded = any(r.grading for r in scenario.sheet)
    rows = [(r.where, r.material or r.profile or "-", _composition(r), r.thickness, r.monolayers, r.band_edge, r.mass,
             *([r.grading] if graded else [])) for r in scenario.sheet]
    header = ("where", "material", "x", "thickness_nm", "monolayers", "band_edge_eV", "mass",
              *(["grading_nm"] if graded else []))
    means = [_MEANS] if any(r.profile for r in scenario.sheet) else []
    return "\n".join([table(header, rows), *means, *_warning_lines(scenario), GROWTH])


def _composition(row: SheetRow) -> float | str | None:
    return f"{row.x_ends[0]:g} to {row.x_ends[1]:g}" if row.x_ends else row.x


_MEANS = "Band edge and mass of a layer through which they run are means over it."


def check_text(scenario: Scenario) -> str:
    """One line that says the scenario is sound, and its warnings."""
    stack = scenario.stack
    first = f"{scenario.title}: sound. {stack.periods} periods of {stack.period_length:.4g} nm."
    return "\n".join([first, *(f"warning: {warning}" for warning in _cautions(scenario))])


def _warning_lines(scenario: Scenario) -> list[str]:
    return [f"warning: {warning}" for warning in scenario.warnings]
