"""Whether a document makes sense: limits, kinds of layer, groups, text. Materials are `resolve.py`'s concern."""

from __future__ import annotations

import unicodedata
from collections.abc import Iterator

from transport.document import (
    Document,
    EndsRecord,
    GrowthRecord,
    LayerRecord,
    LeadRecord,
    MeasuredRecord,
    Record,
    StackRecord,
    TargetRecord,
    UserMaterial,
    WindowRecord,
    default_measure,
)
from transport.parameters import PARAMETERS
from transport.refusal import ScenarioError, check_limits, refuse_unless, shown

_ALLOWED = {
    "material": ("material", "x", "x_from", "x_to", "thickness_nm", "monolayers", "grading_nm"),
    "explicit": ("band_edge_eV", "mass", "thickness_nm", "nonparabolicity_per_eV", "grading_nm"),
    "profile": ("profile", "mass", "thickness_nm", "nonparabolicity_per_eV"),
    "delta": ("delta_eV_nm",),
    "group": ("repeat", "layers"),
}
_LEAD_ALLOWED = {
    "material": ("material", "x", "donors_cm3", "fermi_meV"),
    "explicit": ("band_edge_eV", "mass", "nonparabolicity_per_eV", "donors_cm3", "fermi_meV"),
}
PROFILE_KEYS = {
    "linear": ("from_eV", "to_eV"), "cosine": ("mean_eV", "amplitude_eV"), "gaussian": ("height_eV", "width_nm"),
    "sech2": ("height_eV", "width_nm"), "fermi": ("step_eV", "width_nm"), "parabola": ("height_eV", "width_nm"),
    "samples": ("potential_eV",),
}
"""What each profile needs."""
BASED_PROFILES = ("gaussian", "sech2")
"""Profiles that may also have a base_eV."""
_KIND_NAMES = {"material": "material layer", "explicit": "layer given by its band edge",
               "profile": "profile layer", "delta": "delta", "group": "repeat group"}
# The key that makes a layer what it is, in the order in which kinds are named to the user.
_KIND_KEYS = {"material": "material", "band_edge_eV": "explicit", "delta_eV_nm": "delta", "profile": "profile",
              "repeat": "group"}


def check_document(document: Document) -> None:
    """Raise ScenarioError for the first value that is out of limits or does not fit its neighbours."""
    _check_text("title", document.title, "title")
    _check_text("note", document.note, "note", also="\n\t")
    _check_numbers("conditions", document.conditions)
    _check_materials(document.materials)
    _check_lead("leads.left", document.leads.left)
    _check_lead("leads.right", document.leads.right)
    _check_stack(document.stack)
    if document.target is not None:
        _check_target(document.target)
    if document.growth is not None:
        _check_growth(document.growth)
    if document.measured is not None:
        check_measured(document.measured)


def written_out(key: str, records: tuple[LayerRecord, ...]) -> Iterator[tuple[str, LayerRecord]]:
    """Every layer under `key` with its own key, repeat groups written out; the same key comes again each time."""
    for index, record in enumerate(records):
        here = f"{key}[{index}]"
        if record.kind != "group":
            yield here, record
            continue
        inner = record.layers or ()
        for _ in range(record.repeat or 1):
            yield from ((f"{here}.layers[{i}]", layer) for i, layer in enumerate(inner))


def _check_numbers(key: str, record: Record) -> None:
    """Compare every number of `record` with the table."""
    for field in record.__struct_fields__:
        value = getattr(record, field)
        if isinstance(value, (int, float)) and field in PARAMETERS:
            check_limits(f"{key}.{field}", field, value)


def _check_text(key: str, text: str, limit: str, also: str = "") -> None:
    count = PARAMETERS[limit]
    refuse_unless(count.low <= len(text) <= count.high, key,
                  f"must have {count.low:g} to {count.high:,g} characters, but has {len(text):,}")
    unfit = [c for c in text if unicodedata.category(c) in ("Cc", "Cs", "Zl", "Zp") and c not in also]
    if unfit:
        raise ScenarioError(key, f"holds the control character U+{ord(unfit[0]):04X}; take it out")


def _check_materials(materials: tuple[UserMaterial, ...]) -> None:
    _check_count("materials", "file_materials", len(materials), "defines", "materials")
    for entry in materials:
        _check_text(f"materials.{entry.name}", entry.name, "name")
        _check_numbers(f"materials.{entry.name}", entry)


def _check_count(key: str, limit: str, count: int, verb: str, things: str) -> None:
    most = int(PARAMETERS[limit].high)
    refuse_unless(count <= most, key, f"{verb} {count:,} {things}; at most {most:,} are read, so take some out")


def _check_lead(key: str, lead: LeadRecord) -> None:
    refuse_unless(lead.material is not None or lead.band_edge_eV is not None, key,
                  "says nothing of its material; give material, or band_edge_eV and mass")
    refuse_unless(lead.material is None or lead.band_edge_eV is None, f"{key}.band_edge_eV",
                  "stands beside material; keep one of them")
    kind = "material" if lead.material is not None else "explicit"
    _refuse_others(key, lead, _LEAD_ALLOWED[kind], f"a lead given by its {kind.replace('explicit', 'band edge')}")
    refuse_unless(kind == "material" or lead.mass is not None, f"{key}.mass",
                  "is missing; a lead given by its band edge needs a mass")
    refuse_unless(lead.donors_cm3 is None or lead.fermi_meV is None, f"{key}.fermi_meV",
                  "stands beside donors_cm3; keep one of them")
    _check_numbers(key, lead)


def _check_stack(stack: StackRecord) -> None:
    _check_numbers("stack", stack)
    for part, records in (("entry", stack.entry), ("cell", stack.cell), ("exit", stack.exit)):
        for index, record in enumerate(records):
            _check_layer(f"stack.{part}[{index}]", record, groups=part != "cell")
    refuse_unless(len(stack.cell) > 0, "stack.cell", "is empty; give it at least one layer")
    refuse_unless(any(record.kind != "delta" for record in stack.cell), "stack.cell",
                  "holds deltas only and has no length; give it at least one layer with a thickness")
    sizes = [_size(record) for record in (*stack.entry, *stack.cell, *stack.exit)]
    _check_count("stack", "file_layers", sum(sizes), "holds", "layers, repeat groups written out")
    if stack.ends is not None:
        _check_ends(stack.ends, stack.periods)


def _size(record: LayerRecord) -> int:
    return (record.repeat or 1) * len(record.layers or ()) if record.kind == "group" else 1


def _check_layer(key: str, record: LayerRecord, groups: bool) -> None:
    given = [name for name in _KIND_KEYS if getattr(record, name) is not None]
    refuse_unless(len(given) > 0, key,
                  "does not say what it is; give material, or band_edge_eV and mass, or delta_eV_nm, or profile")
    refuse_unless(len(given) == 1, f"{key}.{given[-1]}", f"stands beside {given[0]}; keep one of them")
    kind = _KIND_KEYS[given[0]]
    if kind == "profile":
        _check_profile(key, record)
    else:
        _refuse_others(key, record, _ALLOWED[kind], f"a {_KIND_NAMES[kind]}")
    _check_numbers(key, record)
    _check_composition(key, record)
    if kind == "group":
        _check_group(key, record, groups)
    elif kind != "delta":
        _check_thickness(key, record)
    refuse_unless(kind not in ("explicit", "profile") or record.mass is not None, f"{key}.mass",
                  f"is missing; a {_KIND_NAMES[kind]} needs a mass")


def _check_profile(key: str, record: LayerRecord) -> None:
    assert record.profile is not None
    needed = PROFILE_KEYS[record.profile]
    based = ("base_eV",) if record.profile in BASED_PROFILES else ()
    _refuse_others(key, record, (*_ALLOWED["profile"], *needed, *based), f"a {record.profile} profile")
    for name in needed:
        refuse_unless(getattr(record, name) is not None, f"{key}.{name}",
                      f"is missing; a {record.profile} profile needs {' and '.join(needed)}")
    if record.potential_eV is not None:
        count, size = PARAMETERS["file_samples"], len(record.potential_eV)
        refuse_unless(count.admits(size), f"{key}.potential_eV",
                      f"must have {count.low:g} to {count.high:,g} values, but has {size:,}")
        for index, value in enumerate(record.potential_eV):
            check_limits(f"{key}.potential_eV[{index}]", "potential_eV", value)


def _check_composition(key: str, record: LayerRecord) -> None:
    """A composition is one number, or two for a graded alloy."""
    for name, other in (("x_from", "x_to"), ("x_to", "x_from")):
        if getattr(record, name) is None:
            continue
        refuse_unless(record.x is None, f"{key}.{name}", "stands beside x; keep x, or x_from with x_to")
        refuse_unless(getattr(record, other) is not None, f"{key}.{other}",
                      "is missing; a graded alloy runs from x_from to x_to")


def _refuse_others(key: str, record: Record, allowed: tuple[str, ...], title: str) -> None:
    for field in record.__struct_fields__:
        refuse_unless(field in allowed or getattr(record, field) is None, f"{key}.{field}",
                      f"does not belong to {title}, which takes {', '.join(allowed)}; take it out")


def _check_group(key: str, record: LayerRecord, groups: bool) -> None:
    refuse_unless(groups, f"{key}.repeat",
                  "has no place in the cell, which stack.periods repeats already; write its layers out")
    refuse_unless(bool(record.layers), f"{key}.layers", "is missing or empty; list the layers to repeat")
    for index, layer in enumerate(record.layers or ()):
        here = f"{key}.layers[{index}]"
        refuse_unless(layer.repeat is None, f"{here}.repeat", "stands in another repeat group; write its layers out")
        _check_layer(here, layer, groups=False)


def _check_thickness(key: str, record: LayerRecord) -> None:
    refuse_unless(record.thickness_nm is None or record.monolayers is None, f"{key}.monolayers",
                  "stands beside thickness_nm; keep one of them")
    remedy = "give it" if record.material is None else "give it, or monolayers"
    refuse_unless(record.thickness_nm is not None or record.monolayers is not None, f"{key}.thickness_nm",
                  f"is missing; {remedy}")


def _check_ends(ends: EndsRecord, periods: int) -> None:
    key, kind = "stack.ends", ends.kind
    tapered = kind not in ("half", "cells")
    allowed = ("of", "cells") if tapered else ("left_cells", "right_cells") if kind == "cells" else ()
    _refuse_others(key, ends, ("kind", "whole_monolayers", *allowed), f"ends of kind {kind}")
    _check_numbers(key, ends)
    if tapered:
        cells = ends.cells or 1
        refuse_unless(cells <= periods, f"{key}.cells",
                      f"is {cells}: a taper longer than the stack of {periods:,} periods; give at most {periods:,}")
    if kind == "cells":
        refuse_unless(bool(ends.left_cells), f"{key}.left_cells", "is missing or empty; list the end cells")
        refuse_unless(ends.right_cells != (), f"{key}.right_cells", "is empty; list the end cells, or leave it out")
    for name in ("left_cells", "right_cells"):
        cells_here = getattr(ends, name) or ()
        _check_count(f"{key}.{name}", "file_end_cells", len(cells_here), "lists", "end cells")
        for index, cell in enumerate(cells_here):
            _check_numbers(f"{key}.{name}[{index}]", cell)


def _check_growth(growth: GrowthRecord) -> None:
    _check_numbers("growth", growth)
    refuse_unless(any((growth.offset_percent, growth.mass_percent, growth.monolayer_error)), "growth",
                  "leaves no range, all its figures are 0; give offset_percent, mass_percent or monolayer_error, "
                  "or take it out")


def check_measured(measured: MeasuredRecord) -> None:
    """Raise ScenarioError unless every measured peak has a place, and its values are within their limits."""
    _check_numbers("measured", measured)
    _check_count("measured.peaks", "file_peaks", len(measured.peaks), "lists", "peaks")
    for index, peak in enumerate(measured.peaks):
        key = f"measured.peaks[{index}]"
        _check_numbers(key, peak)
        refuse_unless(peak.energy_meV is not None or peak.bias_V is not None, key,
                      "has no place; give energy_meV, or bias_V")
        refuse_unless(peak.energy_meV is None or peak.bias_V is None, f"{key}.bias_V",
                      "stands beside energy_meV; keep one of them")


def _check_target(target: TargetRecord) -> None:
    _check_numbers("target", target)
    _check_count("target.windows", "file_windows", len(target.windows), "lists", "windows")
    for index, window in enumerate(target.windows):
        _check_window(f"target.windows[{index}]", window)


def _check_window(key: str, window: WindowRecord) -> None:
    _check_numbers(key, window)
    refuse_unless(window.from_meV < window.to_meV, f"{key}.to_meV",
                  f"must be above from_meV ({shown(window.from_meV)}), but is {shown(window.to_meV)}")
    extreme = default_measure(window.kind)
    refuse_unless(window.measure in (None, extreme, "mean"), f"{key}.measure",
                  f'is "{window.measure}", but a {window.kind} window is measured by its {extreme} or its mean')
