"""The page *Peaks*: the ledger of resonances, one resonance and what moves it, measured peaks, and the fit."""

from __future__ import annotations

import math
from typing import Any

from transport import Effect, PeakFit
from transport.document import MeasuredRecord
from transport.measured import format_peaks
from transport.parameters import default
from transport.peaks import FIGURES
from webapp.fields import written
from webapp.figures.frame import MEV
from webapp.ledger import Ledger, Trace

View = dict[str, Any]
Cell = tuple[float | None, str]
"""What a table sorts a cell by (None: last), and what it shows."""

COLUMNS = (
    ("#", "its number in the range"), ("E (meV)", "energy above the left lead\N{RIGHT SINGLE QUOTATION MARK}s edge"),
    ("width (meV)", "full width at half maximum, \N{MINUS SIGN}2 Im E"), ("lifetime (ps)", "\u0127 over the width"),
    ("T at E", "transmission at the resonance"), ("to the left", "share of the width that leaks to the left lead"),
    ("miniband", "of the infinite lattice, and the number within it"),
    ("measured (meV)", "the measured peak paired with it"), ("off by (meV)", "measured less computed"),
)
FIGURE_NAMES = {"well": "thickness of the wells", "barrier": "thickness of the barriers",
                "edge": "band edge of the barriers", "shift": "offset of the measured energies"}
_MOST_EFFECTS = 40
_SUPERSCRIPTS = str.maketrans("-0123456789", "\u207b\u2070\u00b9\u00b2\u00b3\u2074\u2075\u2076\u2077\u2078\u2079")
_MINUS = "\N{MINUS SIGN}"


def number(value: float, digits: int = 4, sign: bool = False) -> str:
    """A number as a person writes it: a true minus, and powers of ten where it is very large or small."""
    text = f"{value:{'+' if sign else ''}.{digits}g}"
    head, _, power = text.partition("e")
    written_out = head if not power else f"{head}\N{MULTIPLICATION SIGN}10{str(int(power)).translate(_SUPERSCRIPTS)}"
    return written_out.replace("-", _MINUS)


def ledger_view(found: Ledger, chosen: int | None) -> View:
    """The ledger as a table of cells, with its certificate and what was measured in words."""
    known = found.found
    return {
        "state": "known", "sentence": "", "certificate": known.certificate.sentence,
        "complete": known.certificate.complete, "chosen": chosen,
        "columns": [{"name": name, "help": text} for name, text in COLUMNS[: 9 if found.compared else 7]],
        "rows": [_row(found, place) for place in range(known.energy.size)],
        "bound": _bound(found), "measured": _measured_sentence(found),
    }


def no_ledger(state: str, sentence: str) -> View:
    """The page while there is no ledger; `state`: working or fault."""
    return {"state": state, "sentence": sentence, "certificate": "", "complete": False, "chosen": None, "columns": [],
            "rows": [], "bound": "", "measured": ""}


def _row(found: Ledger, place: int) -> list[Cell]:
    known = found.found
    energy, width = float(known.energy[place]) * MEV, float(known.width[place]) * MEV
    lifetime, peak = float(known.lifetime[place]) * 1e12, float(known.peak_transmission[place])
    left = float(known.width_left[place] / known.width[place])
    band, order = int(known.miniband[place]), int(known.number[place])
    cells: list[Cell] = [
        (place + 1, str(place + 1)), (energy, f"{energy:.4f}".replace("-", _MINUS)), _width(found, place, width),
        (_finite(lifetime), number(lifetime) if math.isfinite(lifetime) else "beyond 10\u00b3\u2070\u2070"),
        (peak, (f"{peak:.4f}" if peak > 1e-3 else number(peak)) + (" \N{DAGGER}" if known.from_pole[place] else "")),
        (left, f"{left:.1%}"), (band * 1e6 + order, f"{band} \N{MIDDLE DOT} {order}" if band else "gap"),
    ]
    return cells if found.compared is None else [*cells, *_measured_cells(found, place)]


def _finite(value: float) -> float | None:
    return value if math.isfinite(value) else None


def _width(found: Ledger, place: int, width: float) -> Cell:
    power = float(found.found.log10_width[place])
    return power, number(width) if power > -290 else f"10{str(round(power + 3)).translate(_SUPERSCRIPTS)}"


def _measured_cells(found: Ledger, place: int) -> list[Cell]:
    compared = found.compared
    assert compared is not None
    (partners,) = (compared.pairs == place).nonzero()
    if not partners.size:
        return [(None, ""), (None, "")]
    mine = int(partners[0])
    energy, uncertainty = (float(v[mine]) * MEV for v in (compared.measured.energy, compared.measured.uncertainty))
    off = float(compared.deviation[mine]) * MEV
    told = "" if math.isnan(uncertainty) else f" \N{PLUS-MINUS SIGN} {number(uncertainty, 2)}"
    return [(energy, number(energy, 6) + told), (abs(off), number(off, 3, sign=True))]


def _bound(found: Ledger) -> str:
    bound = found.found.bound
    if not bound.size:
        return ""
    many = "1 state is" if bound.size == 1 else f"{bound.size} states are"
    named = ", ".join(number(float(e) * MEV, 6) for e in bound[:12]) + (" \u2026" if bound.size > 12 else "")
    return f"{many} bound below both leads and never seen in transmission: {named} meV."


def _measured_sentence(found: Ledger) -> str:
    compared = found.compared
    if compared is None:
        return ""
    alone = compared.measured.energy[compared.pairs < 0]
    paired = int((compared.pairs >= 0).sum())
    words = f"{paired} of {compared.pairs.size} measured peaks paired"
    words += f", root mean square deviation {number(compared.rms * MEV, 3)} meV." if paired else "."
    if alone.size:
        words += f" Without a resonance: {', '.join(number(float(e) * MEV, 5) for e in alone[:12])} meV."
    return words


def resonance_view(found: Ledger, place: int, traced: Trace) -> View:
    """One resonance: what it is, how its wave is drawn, and what moves it."""
    known = found.found
    band, order = int(known.miniband[place]), int(known.number[place])
    where = f"miniband {band}, number {order}" if band else "in a gap of the lattice"
    largest = float(traced.density.max())
    width = _width(found, place, float(known.width[place]) * MEV)[1]
    return {
        "title": f"Resonance {place + 1}: {where}",
        "facts": f"{float(known.energy[place]) * MEV:.4f} meV, width {width} meV. On the bench: |\u03c8|\u00b2 of its "
                 f"decaying state, {number(largest, 3)} per nm at the most; its probability within the stack is 1.",
        "effects": [_effect(effect, float(known.width[place])) for effect in traced.effects[:_MOST_EFFECTS]],
    }


def _effect(effect: Effect, width: float) -> View:
    part, _, place = effect.key.removeprefix("stack.").partition("[")
    position = f" {int(place.partition(']')[0]) + 1}" if place else ""
    share = effect.width / width if width else math.nan
    return {"layer": f"{effect.name}, {part}{position}", "figure": f"{effect.figure}, per {effect.step}",
            "shift": effect.energy * MEV, "energy": number(effect.energy * MEV, 3, sign=True),
            "width": number(share * 100, 2, sign=True) + " %" if math.isfinite(share) else ""}


def measured_view(record: MeasuredRecord | None) -> View:
    """The measured peaks as the table they are pasted as."""
    arm = record.lever_arm if record else float(default("lever_arm"))
    return {"text": format_peaks(record) if record else "", "lever_arm": written(arm),
            "any": bool(record and record.peaks)}


def fit_view(state: str, sentence: str, share: float, found: PeakFit | None) -> View:
    """The fit in words; `state`: none, working, known or fault."""
    view: View = {"state": state, "sentence": sentence, "share": share, "rows": [], "warnings": [], "takes": False}
    if found is None:
        return view
    units = [FIGURES[name] for name in found.figures]
    scale = [1.0 if unit == "nm" else MEV for unit in units]
    rows = [
        {"name": FIGURE_NAMES[name], "change": f"{number(float(value) * by, 4, sign=True)} {unit}",
         "error": "" if math.isnan(error) else f"\N{PLUS-MINUS SIGN} {number(float(error) * by, 2)}"}
        for name, value, error, unit, by in zip(found.figures, found.values, found.errors, units, scale, strict=True)
    ]
    before, after = found.before.rms * MEV, found.after.rms * MEV
    told = f"Root mean square deviation {number(before, 3)} meV before, {number(after, 3)} meV after."
    if found.scenario is None:
        told += " A file with groups or an end treatment has no place for the fitted figures: write its layers out."
    return view | {"sentence": told, "rows": rows, "warnings": list(found.warnings),
                   "takes": found.scenario is not None and set(found.figures) != {"shift"}}
