"""The rail: which fields a document has, what stands in each, and what is wrong there. Drawn by `assets/rail.js`.

The rail is described as plain data, so that the browser knows no scenario keys and the server no markup.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from transport import describe_ends
from transport.checks import BASED_PROFILES, PROFILE_KEYS
from transport.document import GrowthRecord, LayerRecord, LeadRecord, WindowRecord, default_measure
from transport.materials import material_names, substrate_names
from transport.parameters import PARAMETERS, default
from transport.resolve import SheetRow
from webapp.bench import Bench
from webapp.edits import DELTA, EXPLICIT, GROUP, MATERIAL, PROFILE
from webapp.fields import CHOICE, GRADED, UNIT, written

View = dict[str, Any]
Options = Sequence[tuple[str, str]]

_LABELS = {
    "temperature_K": "temperature", "dephasing_meV": "dephasing", "resolution_meV": "beam resolution",
    "band_edge_eV": "band edge", "mass": "mass", "nonparabolicity_per_eV": "non-parabolicity", "x": "x",
    "thickness_nm": "thickness", "monolayers": "thickness", "delta_eV_nm": "strength", "repeat": "repeat",
    "cells": "cells at each end", "barrier_share": "barrier", "well_share": "well",
    "offset_percent": "band offsets \N{PLUS-MINUS SIGN}", "mass_percent": "masses \N{PLUS-MINUS SIGN}",
    "monolayer_error": "layers \N{PLUS-MINUS SIGN}",
    "x_from": "x, left", "x_to": "x, right", "grading_nm": "graded faces", "from_eV": "left", "to_eV": "right",
    "mean_eV": "mean", "amplitude_eV": "amplitude", "height_eV": "height", "width_nm": "width", "base_eV": "base",
    "step_eV": "step", "periods": "periods", "most_periods": "most periods", "from_meV": "from", "to_meV": "to",
}
_UNITS = {"m0": "m\N{SUBSCRIPT ZERO}", "1/eV": "eV\N{SUPERSCRIPT MINUS}\N{SUPERSCRIPT ONE}", "monolayers": "ML"}
_CHOICE_NAMES = {EXPLICIT: "band edge and mass", DELTA: "delta", GROUP: "repeat group"}
_PARTS = {"entry": "Entry layers", "cell": "Cell", "exit": "Exit layers"}
_PART_HELP = {
    "entry": "Grown once, between the left lead and the first cell.",
    "cell": "One period: repeated as often as the slider says.",
    "exit": "Grown once, between the last cell and the right lead.",
}


_LIST_ACTS = (("Turn round", "mirror", "the layers in reverse order"),
              ("Write twice", "double", "the same layers once more behind themselves"))


class Rail:
    """Describes the rail of one bench; every part is a list of fields, or of rows of fields."""

    def __init__(self, bench: Bench) -> None:
        self._bench, self._document = bench, bench.document
        self._rows: dict[str, SheetRow] = {row.key: row for row in bench.scenario.sheet}
        self._own = [entry.name for entry in self._document.materials]

    def view(self) -> View:
        """The whole rail."""
        return {
            "periods": self._periods(),
            "parts": [self._conditions(), self._lead("left"), *(self._part(name) for name in _PARTS),
                      self._layers(), self._lead("right"), self._ends(), self._target(), self._growth(), self._about()],
        }

    # One field.

    def _field(self, path: str, value: object, label: str, **more: Any) -> View:
        draft = self._bench.drafts.get(path)
        shown = written(value)
        return {"path": path, "label": label, "value": draft.text if draft else shown, "valid": shown,
                "message": draft.message if draft else "", **more}

    def _number(self, record: str, name: str, value: object, label: str = "") -> View:
        parameter = PARAMETERS[name]
        unit = _UNITS.get(parameter.unit, parameter.unit)
        return self._field(f"{record}.{name}", value, label or _LABELS[name], kind="number", unit=unit,
                           help=f"{parameter.help}; {parameter.requirement}")

    def _select(self, path: str, value: str, label: str, options: Options, help: str = "") -> View:
        view = self._field(path, value, label, kind="select", help=help, options=options)
        if view["value"] not in [option for option, _ in options]:
            view["options"] = [*options, (view["value"], view["value"])]
        return view

    # The parts.

    def _periods(self) -> View:
        most = self._document.target.most_periods if self._document.target else int(default("most_periods"))
        view = self._number("stack", "periods", self._document.stack.periods)
        return {**view, "count": self._document.stack.periods, "most": max(2, most)}

    def _conditions(self) -> View:
        conditions = self._document.conditions
        numbers = [self._number("conditions", name, getattr(conditions, name))
                   for name in ("temperature_K", "dephasing_meV", "resolution_meV")]
        substrates = [("", "none"), *((name, name) for name in substrate_names())]
        return {"id": "conditions", "title": "Conditions", "fields": [
            *numbers,
            self._select("conditions.substrate", conditions.substrate or "", "substrate", substrates,
                         "strain is counted against it"),
            self._field("conditions.nonparabolic", conditions.nonparabolic, "non-parabolic masses", kind="check",
                        help="Kane two-band masses for materials: the mass grows with energy"),
        ]}

    def _lead(self, side: str) -> View:
        path, lead = f"leads.{side}", getattr(self._document.leads, side)
        return {"id": path, "title": f"{side.capitalize()} lead", "fields": self._medium(path, lead, ())}

    def _part(self, name: str) -> View:
        path, layers = f"stack.{name}", getattr(self._document.stack, name)
        return {"id": path, "title": _PARTS[name], "help": _PART_HELP[name], **self._list(path, layers, name != "cell"),
                "adds": [{"label": "Add layer", "name": "layer"}], "acts": [
                    {"label": label, "type": act, "content": {"path": path}, "help": text}
                    for label, act, text in _LIST_ACTS if len(layers) > (act == "mirror")]}

    def _layers(self) -> View:
        notice = self._bench.notice
        return {"id": "layers", "title": "All barriers, all wells", "fields": [],
                "help": "Of entry, cell and exit at once; barriers are what lies above the middle of the cell.",
                "message": notice.sentence if notice and notice.about == "layers" else "", "acts": [
                    {"label": f"{kind} {sign}1 ML", "type": "thicken", "content": {"kind": kind, "monolayers": step},
                     "help": f"every one of the {kind} one monolayer {way}"}
                    for kind in ("barriers", "wells")
                    for sign, step, way in (("\N{MINUS SIGN}", -1, "thinner"), ("+", 1, "thicker"))]}

    def _list(self, path: str, layers: Sequence[LayerRecord], groups: bool) -> View:
        notice = self._bench.notice
        return {"list": path, "rows": [self._layer(path, index, layer, groups) for index, layer in enumerate(layers)],
                "message": notice.sentence if notice and notice.about == path else ""}

    def _layer(self, list_path: str, index: int, layer: LayerRecord, groups: bool) -> View:
        path = f"{list_path}[{index}]"
        switches = (DELTA, GROUP) if groups else (DELTA,)
        view: View = {"path": path, "index": index, "name": f"{_list_name(list_path)} {index + 1}"}
        if layer.kind == "group":
            fields = [self._choice(path, layer, switches), self._number(path, "repeat", layer.repeat)]
            return {**view, "fields": fields, **self._list(f"{path}.layers", layer.layers or (), groups=False),
                    "adds": [{"label": "Add layer to the group", "name": "layer"}]}
        row = self._rows.get(path)
        return {**view, "fields": self._medium(path, layer, switches), "warnings": list(row.warnings if row else ()),
                "swatch": _swatch(layer), "resolved": _resolved(row)}

    def _medium(self, path: str, record: LayerRecord | LeadRecord, switches: Sequence[str]) -> list[View]:
        fields = [self._choice(path, record, switches)]
        if isinstance(record, LayerRecord) and record.delta_eV_nm is not None:
            return [*fields, self._number(path, "delta_eV_nm", record.delta_eV_nm)]
        if isinstance(record, LayerRecord) and record.profile is not None:
            return [*fields, *self._profile(path, record), *self._thickness(path, record)]
        names = ["x", "x_from", "x_to"] if record.material is not None else [
            "band_edge_eV", "mass", "nonparabolicity_per_eV"]
        fields += [self._number(path, name, getattr(record, name, None)) for name in names
                   if name[0] != "x" or getattr(record, name, None) is not None
                   or f"{path}.{name}" in self._bench.drafts]
        if isinstance(record, LayerRecord):
            fields += [*self._thickness(path, record), *self._grading(path, record)]
        return fields

    def _profile(self, path: str, layer: LayerRecord) -> list[View]:
        assert layer.profile is not None
        names = [*PROFILE_KEYS[layer.profile], *(["base_eV"] if layer.profile in BASED_PROFILES else []),
                 "mass", "nonparabolicity_per_eV"]
        return [self._number(path, name, getattr(layer, name)) if name != "potential_eV" else
                self._field(f"{path}.{name}", layer.potential_eV, "band edges (eV)", kind="text",
                            help=PARAMETERS[name].help) for name in names]

    def _grading(self, path: str, layer: LayerRecord) -> list[View]:
        """Graded faces for any layer, a graded composition for an alloy."""
        runs = layer.x_from is not None
        switch = [self._field(f"{path}.{GRADED}", runs, "composition runs", kind="check",
                              help="from one composition at the left face to another at the right")]
        return [self._number(path, "grading_nm", layer.grading_nm), *(switch if runs or layer.x is not None else [])]

    def _thickness(self, path: str, layer: LayerRecord) -> list[View]:
        unit = "thickness_nm" if layer.monolayers is None else "monolayers"
        field = self._number(path, unit, getattr(layer, unit))
        if layer.material is None:
            return [field]
        switch = self._select(f"{path}.{UNIT}", unit, "unit of thickness", [("thickness_nm", "nm"),
                                                                           ("monolayers", "ML")],
                              "nanometres or monolayers")
        return [{**field, "unit": ""}, {**switch, "is_unit": True}]

    def _choice(self, path: str, record: LayerRecord | LeadRecord, switches: Sequence[str]) -> View:
        names = [*self._own, *(name for name in material_names() if name not in self._own)]
        options = [*((MATERIAL + name, name) for name in names),
                   *((switch, _CHOICE_NAMES[switch]) for switch in (EXPLICIT, *switches)),
                   *((PROFILE + kind, f"{kind} profile") for kind in PROFILE_KEYS if isinstance(record, LayerRecord))]
        if record.material is not None:
            value = MATERIAL + record.material
        else:
            value = record.kind if isinstance(record, LayerRecord) else EXPLICIT
            if isinstance(record, LayerRecord) and record.profile is not None:
                value = PROFILE + record.profile
        return self._select(f"{path}.{CHOICE}", value, "material", options, "a material, or an edge given by hand")

    def _target(self) -> View:
        target = self._document.target
        windows = target.windows if target else ()
        most = target.most_periods if target else int(default("most_periods"))
        notice = self._bench.notice
        return {
            "id": "target", "title": "Target windows", "list": "target.windows",
            "help": "Pass at least so much, block to at most so much, between two energies.",
            "rows": [self._window(index, window) for index, window in enumerate(windows)],
            "fields": [self._number("target", "most_periods", most)] if target else [],
            "message": notice.sentence if notice and notice.about == "target.windows" else "",
            "adds": [{"label": "Add pass window", "name": "pass"}, {"label": "Add block window", "name": "block"}],
        }

    def _window(self, index: int, window: WindowRecord) -> View:
        path = f"target.windows[{index}]"
        extreme = default_measure(window.kind)
        asked = "at least" if window.kind == "pass" else "at most"
        return {"path": path, "index": index, "name": f"window {index + 1}", "swatch": window.kind, "fields": [
            self._select(f"{path}.kind", window.kind, "kind", [("pass", "pass"), ("block", "block")]),
            self._select(f"{path}.measure", window.measure or extreme, "measure",
                         [(extreme, extreme), ("mean", "mean")], "what of the window is compared"),
            self._number(path, "from_meV", window.from_meV),
            self._number(path, "to_meV", window.to_meV),
            self._number(path, "transmission", window.transmission, asked),
        ]}

    def _ends(self) -> View:
        ends = self._document.stack.ends
        if ends is None:
            return {"id": "ends", "title": "Matched ends", "fields": [], "acts": [],
                    "help": "None. Periods, below the bench, proposes end layers that raise what the windows pass."}
        path, fields, described = "stack.ends", [], describe_ends(ends)
        if ends.cells is not None:
            fields.append(self._number(path, "cells", ends.cells))
        for side in ("left", "right"):
            for index, cell in enumerate(getattr(ends, f"{side}_cells") or ()):
                fields += [self._number(f"{path}.{side}_cells[{index}]", name, getattr(cell, name),
                                        f"{side} cell {index + 1}, {_LABELS[name]}")
                           for name in ("barrier_share", "well_share")]
        fields.append(self._field(f"{path}.whole_monolayers", ends.whole_monolayers, "whole monolayers", kind="check",
                                  help="thicknesses of the end cells rounded to whole monolayers"))
        return {"id": "ends", "title": "Matched ends", "fields": fields,
                "help": f"{described[:1].upper()}{described[1:]}.",
                "acts": [{"label": "Take the ends away", "type": "dropends"}]}

    def _growth(self) -> View:
        growth = self._document.growth or GrowthRecord()
        return {"id": "growth", "title": "Growth", "fields": [
            self._number("growth", name, getattr(growth, name))
            for name in ("offset_percent", "mass_percent", "monolayer_error")],
            "help": "How far a grown sample may be off: what the range of the verdict is worked out for."}

    def _about(self) -> View:
        return {"id": "about", "title": "Title and note", "fields": [
            self._field("title", self._document.title, "title", kind="text", help="shown in the list of scenarios"),
            self._field("note", self._document.note, "note", kind="area",
                        help="the decision this scenario poses; plain text"),
        ]}


def _list_name(path: str) -> str:
    part = path.split(".")[1].split("[")[0]
    return f"{part} group layer" if path.endswith(".layers") else f"{part} layer"


def _swatch(layer: LayerRecord) -> str:
    return "delta" if layer.kind == "delta" else "layer"


def _resolved(row: SheetRow | None) -> str:
    """What the engine makes of a material layer: its edge and mass, which the file does not say."""
    if row is None or row.material is None or row.band_edge is None or row.mass is None:
        return ""
    return f"edge {row.band_edge * 1e3:+.1f} meV, mass {row.mass:.4g} m\N{SUBSCRIPT ZERO}"
