"""A scenario as it is written: the tree of the file, format 1, and its way from and to plain data.

Frozen records that mirror the file key by key; an editor changes them with `msgspec.structs.replace`. Nothing here
looks up a material: `resolve.py` does, and `checks.py` says whether the values make sense.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import Any, Literal

import msgspec

from transport.parameters import default
from transport.refusal import ScenarioError, nearest, refuse_unless, shown

FORMAT = 1


class Record(msgspec.Struct, frozen=True, forbid_unknown_fields=True):
    """A table of the file. A key that is absent is None."""


class Conditions(Record, frozen=True):
    """What holds for the whole stack."""

    temperature_K: float = default("temperature_K")
    dephasing_meV: float = default("dephasing_meV")
    resolution_meV: float = default("resolution_meV")
    nonparabolic: bool = False
    substrate: str | None = None


class LeadRecord(Record, frozen=True):
    """A lead: a material, or a band edge and a mass; donors or a Fermi level where currents are wanted."""

    material: str | None = None
    x: float | None = None
    band_edge_eV: float | None = None
    mass: float | None = None
    nonparabolicity_per_eV: float | None = None
    donors_cm3: float | None = None
    fermi_meV: float | None = None


class Leads(Record, frozen=True):
    """Both leads; the electron comes from the left."""

    left: LeadRecord
    right: LeadRecord


class LayerRecord(Record, frozen=True):
    """A layer, a profile layer, a delta or a `repeat` group; `kind` says which."""

    material: str | None = None
    x: float | None = None
    x_from: float | None = None
    x_to: float | None = None
    thickness_nm: float | None = None
    monolayers: float | None = None
    band_edge_eV: float | None = None
    mass: float | None = None
    nonparabolicity_per_eV: float | None = None
    grading_nm: float | None = None
    profile: Literal["linear", "cosine", "gaussian", "sech2", "fermi", "parabola", "samples"] | None = None
    from_eV: float | None = None
    to_eV: float | None = None
    mean_eV: float | None = None
    amplitude_eV: float | None = None
    height_eV: float | None = None
    width_nm: float | None = None
    base_eV: float | None = None
    step_eV: float | None = None
    potential_eV: tuple[float, ...] | None = None
    delta_eV_nm: float | None = None
    repeat: int | None = None
    layers: tuple[LayerRecord, ...] | None = None

    @property
    def kind(self) -> Literal["material", "explicit", "profile", "delta", "group"]:
        """What the record describes; meaningful once it has been checked."""
        if self.material is not None:
            return "material"
        if self.delta_eV_nm is not None:
            return "delta"
        if self.profile is not None:
            return "profile"
        return "explicit" if self.repeat is None else "group"


class EndCellRecord(Record, frozen=True):
    """One end cell, as shares of the cell's own thicknesses."""

    barrier_share: float
    well_share: float = 1.0


class EndsRecord(Record, frozen=True):
    """An end treatment (`ends.py` says what it comes to); lists run from the lead inwards."""

    kind: Literal["half", "cells", "linear", "gaussian", "poisson"]
    of: Literal["width", "height"] | None = None
    cells: int | None = None
    left_cells: tuple[EndCellRecord, ...] | None = None
    right_cells: tuple[EndCellRecord, ...] | None = None
    whole_monolayers: bool = False


class StackRecord(Record, frozen=True, kw_only=True):
    """What lies between the leads."""

    periods: int
    bias_V: float = default("bias_V")
    drop_V: float | None = None
    entry: tuple[LayerRecord, ...] = ()
    cell: tuple[LayerRecord, ...]
    exit: tuple[LayerRecord, ...] = ()
    ends: EndsRecord | None = None


class WindowRecord(Record, frozen=True):
    """One demand: pass at least, or block to at most, `transmission` between two energies."""

    kind: Literal["pass", "block"]
    from_meV: float
    to_meV: float
    transmission: float
    measure: Literal["minimum", "maximum", "mean"] | None = None


def default_measure(kind: Literal["pass", "block"]) -> Literal["minimum", "maximum"]:
    """What of a window is compared where its `measure` is not given: the value that decides."""
    return "minimum" if kind == "pass" else "maximum"


class TargetRecord(Record, frozen=True):
    """What is asked of the stack."""

    most_periods: int = int(default("most_periods"))
    windows: tuple[WindowRecord, ...] = ()


class GrowthRecord(Record, frozen=True):
    """How far a grown stack may be from the written one."""

    offset_percent: float = default("offset_percent")
    mass_percent: float = default("mass_percent")
    monolayer_error: int = int(default("monolayer_error"))


class PeakRecord(Record, frozen=True):
    """A measured peak: where it was seen, by energy or by bias, and how sure that is."""

    energy_meV: float | None = None
    bias_V: float | None = None
    width_meV: float | None = None
    uncertainty_meV: float | None = None


class MeasuredRecord(Record, frozen=True):
    """Peaks of an experiment; `lever_arm`: the share of a bias dropped before the resonance."""

    peaks: tuple[PeakRecord, ...] = ()
    lever_arm: float = default("lever_arm")


class UserMaterial(Record, frozen=True):
    """A material the scenario defines as [materials.NAME]."""

    name: str
    band_edge_eV: float
    mass: float
    gap_eV: float | None = None
    nonparabolicity_per_eV: float | None = None
    monolayer_nm: float | None = None


class Document(Record, frozen=True, kw_only=True):
    """The whole file."""

    format: int
    title: str = "untitled"
    note: str = ""
    conditions: Conditions = Conditions()
    leads: Leads
    stack: StackRecord
    target: TargetRecord | None = None
    growth: GrowthRecord | None = None
    measured: MeasuredRecord | None = None
    materials: tuple[UserMaterial, ...] = ()


def document_from_data(data: object) -> Document:
    """The document that plain data (of TOML or JSON) describes.

    Types and keys are checked here, values by `checks.check_document`. Raises ScenarioError.
    """
    if not isinstance(data, Mapping):
        raise ScenarioError("scenario", "must be a table of keys and values")
    _require_format(data)
    plain = {**data, "materials": _named_list(data.get("materials", {}))}
    try:
        return msgspec.convert(plain, Document)
    except msgspec.ValidationError as error:
        raise _translated(str(error), plain) from None
    except UnicodeEncodeError:
        # Only JSON can carry one half of a surrogate pair, and msgspec cannot name its place.
        raise ScenarioError("scenario", "holds half of a surrogate pair, which is no text; take it out") from None
    except RecursionError:
        raise ScenarioError("scenario", "is nested too deeply; a list of layers holds plain layers") from None


def document_to_data(document: Document) -> dict[str, Any]:
    """Plain data, ready for TOML or JSON: absent keys left out, every other default written."""
    plain = _without_none(msgspec.to_builtins(document))
    materials = {entry.pop("name"): entry for entry in plain.pop("materials")}
    return {**plain, "materials": materials} if materials else plain


def _without_none(value: Any) -> Any:
    if isinstance(value, dict):
        return {key: _without_none(item) for key, item in value.items() if item is not None}
    return [_without_none(item) for item in value] if isinstance(value, (list, tuple)) else value


def _require_format(data: Mapping[str, object]) -> None:
    refuse_unless("format" in data, "format", f"is missing; begin the file with format = {FORMAT}")
    found = data["format"]
    refuse_unless(type(found) is int and found == FORMAT, "format",
                  f"is {shown(found)}, but this version reads format = {FORMAT} only")


def _named_list(materials: object) -> list[dict[str, object]]:
    """[materials.NAME] as a list: tuples are frozen, hashable, and numbered in error messages."""
    if not isinstance(materials, Mapping):
        raise ScenarioError("materials", "must be tables [materials.NAME]")
    entries = []
    for name, entry in materials.items():
        key = f"materials.{name}"
        if not isinstance(entry, Mapping):
            raise ScenarioError(key, f"must be a table, but is {shown(entry)}")
        refuse_unless("name" not in entry, f"{key}.name", "is not a key here; the name stands in the heading")
        entries.append({"name": name, **entry})
    return entries


# msgspec stops at the first fault and says what and where; below, its words become ours.

_TABLES: Mapping[str, tuple[type[Record], str]] = {
    "": (Document, "a scenario"), "conditions": (Conditions, "[conditions]"), "leads": (Leads, "[leads]"),
    "left": (LeadRecord, "a lead"), "right": (LeadRecord, "a lead"), "stack": (StackRecord, "[stack]"),
    "entry": (LayerRecord, "a layer"), "cell": (LayerRecord, "a layer"), "exit": (LayerRecord, "a layer"),
    "layers": (LayerRecord, "a layer"), "ends": (EndsRecord, "[stack.ends]"),
    "left_cells": (EndCellRecord, "an end cell"), "right_cells": (EndCellRecord, "an end cell"),
    "growth": (GrowthRecord, "[growth]"), "measured": (MeasuredRecord, "[measured]"), "peaks": (PeakRecord, "a peak"),
    "target": (TargetRecord, "[target]"),
    "windows": (WindowRecord, "a window"), "materials": (UserMaterial, "a material"),
}
_TYPES = {"float": "a number", "int": "a whole number", "str": "text in quotes", "bool": "true or false",
          "object": "a table of keys and values", "array": "a list in [ ]"}


def _translated(message: str, plain: Mapping[str, Any]) -> ScenarioError:
    what, _, where = message.partition(" - at `$")
    steps = [int(index) if index else name for index, name in re.findall(r"\[(\d+)\]|\.(\w+)", where)]
    key = _key(steps, plain)
    if named := re.fullmatch(r"Object (contains unknown|missing required) field `(.*)`", what, re.DOTALL):
        return _key_fault(named[1] == "contains unknown", named[2], key, steps)
    if what.startswith("Expected"):
        wanted = re.findall(r"`([^`]*)`", what)[0].split(" | ")[0]
        return ScenarioError(key, _type_fault(wanted, _at(steps, plain)))
    if what.startswith("Invalid enum value"):
        choices = _choices(steps)
        return ScenarioError(key, f"must be one of {', '.join(choices)}, but is {shown(_at(steps, plain))}")
    return ScenarioError(key, f"is {shown(_at(steps, plain))}, too large a number; write a smaller one")


def _key_fault(unknown: bool, field: str, key: str, steps: list[int | str]) -> ScenarioError:
    record, title = _table_at(steps)
    full = f"{key}.{field}" if steps else field
    if not unknown:
        return ScenarioError(full, f"is missing; {title} needs it")
    known = [name for name in record.__struct_fields__ if name != "name"]
    return ScenarioError(full, f"is not a key of {title}; {nearest(field, known)}")


def _type_fault(wanted: str, found: object) -> str:
    remedy = "; write it without quotes" if isinstance(found, str) and wanted in ("float", "int", "bool") else ""
    if wanted == "int" and isinstance(found, float):
        remedy = "; write it without a decimal point"
    described = "a table" if isinstance(found, dict) else "a list" if isinstance(found, list) else shown(found)
    return f"must be {_TYPES[wanted]}, but is {described}{remedy}"


def _table_at(steps: list[int | str]) -> tuple[type[Record], str]:
    names = [step for step in steps if isinstance(step, str)]
    return _TABLES[names[-1] if names else ""]


def _choices(steps: list[int | str]) -> tuple[str, ...]:
    record, _ = _table_at(steps[:-1])
    (field,) = (field for field in msgspec.structs.fields(record) if field.name == steps[-1])
    return tuple(re.findall(r"'(\w+)'", str(field.type)))


def _key(steps: list[int | str], plain: Mapping[str, Any]) -> str:
    if len(steps) > 1 and steps[0] == "materials":
        name = plain["materials"][steps[1]]["name"]
        return ".".join(["materials", str(name), *(str(step) for step in steps[2:])])
    key = "".join(f"[{step}]" if isinstance(step, int) else f".{step}" for step in steps)
    return key.removeprefix(".") or "scenario"


def _at(steps: list[int | str], plain: Any) -> object:
    for step in steps:
        plain = plain[step]
    return plain
