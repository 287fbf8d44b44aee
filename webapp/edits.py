"""Edits of a scenario as plain data (the tree of its file): values, layers, windows. Nothing here judges a value.

A path names a value as the engine's sentences do: `stack.cell[0].x`, `target.windows[1].to_meV`. Every function
returns new data and leaves the old as it was, so that an undo stack may keep it.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping, Sequence
from typing import Any

from transport.checks import BASED_PROFILES, PROFILE_KEYS
from transport.document import default_measure
from transport.materials import is_alloy, material_names
from transport.resolve import SheetRow

Data = dict[str, Any]
Steps = tuple[str | int, ...]

MATERIAL = "material:"
"""How the choice of a material begins in a layer's or lead's `choice`; its name follows."""
PROFILE = "profile:"
"""How the choice of a profile begins; its kind follows."""
EXPLICIT, DELTA, GROUP = "explicit", "delta", "group"

# What a part of the stack starts from where nothing better is known; every value may be edited at once.
_START_X, _START_DELTA, _START_THICKNESS, _START_FEATURE = 0.3, 0.1, 5.0, 0.1
_START_TRANSMISSION = {"pass": 0.5, "block": 1e-3}
_START_WIDTH = 20.0
_CONVERTED_DIGITS = 6


def steps_of(path: str) -> Steps:
    """The keys and positions of a path."""
    return tuple(int(index) if index else name for index, name in re.findall(r"\[(\d+)\]|([^.\[\]]+)", path))


def value_at(data: Any, path: str) -> Any:
    """The value at a path; None where there is none."""
    for step in steps_of(path):
        try:
            data = data[step]
        except (KeyError, IndexError):
            return None
    return data


def with_value(data: Data, path: str, value: Any) -> Data:
    """The data with `value` at `path`; None takes the key away. Tables on the way are made where they lack."""
    result = _placed(data, steps_of(path), value)
    assert isinstance(result, dict)
    return result


def _placed(data: Any, steps: Steps, value: Any) -> Any:
    step, rest = steps[0], steps[1:]
    if isinstance(step, int):
        return [*data[:step], _placed(data[step], rest, value) if rest else value, *data[step + 1:]]
    if rest:
        return {**data, step: _placed(data.get(step, {}), rest, value)}
    if value is None:
        return {key: old for key, old in data.items() if key != step}
    return {**data, step: value}


# Lists of layers and windows.

Reorder = Callable[[int], int | None]
"""Where an entry of a list stands after an edit; None where it is gone."""


def inserted(data: Data, path: str, index: int, entry: Data) -> tuple[Data, Reorder]:
    """The list at `path` with `entry` put before position `index`."""
    entries = value_at(data, path) or []
    new = with_value(data, path, [*entries[:index], entry, *entries[index:]])
    return new, lambda old: old + 1 if old >= index else old


def deleted(data: Data, path: str, index: int) -> tuple[Data, Reorder]:
    """The list at `path` without its entry `index`."""
    entries = value_at(data, path)
    new = with_value(data, path, [*entries[:index], *entries[index + 1:]])
    return new, lambda old: None if old == index else old - 1 if old > index else old


def moved(data: Data, path: str, index: int, to: int) -> tuple[Data, Reorder]:
    """The list at `path` with its entry `index` at position `to`."""
    return _permuted(data, path, _moved_order(len(value_at(data, path)), index, to))


def _moved_order(size: int, index: int, to: int) -> list[int]:
    order = [place for place in range(size) if place != index]
    return [*order[:to], index, *order[to:]]


def mirrored(data: Data, path: str) -> tuple[Data, Reorder]:
    """The list at `path` turned round."""
    return _permuted(data, path, list(range(len(value_at(data, path) or [])))[::-1])


def _permuted(data: Data, path: str, order: list[int]) -> tuple[Data, Reorder]:
    entries = value_at(data, path) or []
    return with_value(data, path, [entries[old] for old in order]), lambda old: order.index(old)


def doubled(data: Data, path: str) -> tuple[Data, Reorder]:
    """The list at `path` written twice."""
    return with_value(data, path, 2 * (value_at(data, path) or [])), lambda old: old


def reordered(path: str, list_path: str, reorder: Reorder) -> str | None:
    """What a path into the list at `list_path` is after an edit of the list; None where its entry is gone."""
    match = re.fullmatch(re.escape(list_path) + r"\[(\d+)\](.*)", path)
    if match is None:
        return path
    new = reorder(int(match[1]))
    return None if new is None else f"{list_path}[{new}]{match[2]}"


def new_layer(data: Data) -> Data:
    """A layer that is sure to be accepted: of the left lead's own medium."""
    left = data["leads"]["left"]
    keys = ("material", "x", "band_edge_eV", "mass", "nonparabolicity_per_eV")
    return {key: left[key] for key in keys if key in left} | {"thickness_nm": _START_THICKNESS}


def new_window(data: Data, kind: str) -> Data:
    """A window that is sure to be accepted: above those that are there."""
    tops = [window["to_meV"] for window in value_at(data, "target.windows") or []]
    bottom = max(tops, default=0.0)
    return {"kind": kind, "from_meV": bottom, "to_meV": bottom + _START_WIDTH,
            "transmission": _START_TRANSMISSION[kind]}


# Switches that change several keys of one record at once, keeping of the old record what the new one can use.


def choice_of(record: Mapping[str, Any]) -> str:
    """What a layer or lead is: `material:NAME`, `profile:KIND`, `explicit`, `delta` or `group`."""
    if "material" in record:
        return MATERIAL + str(record["material"])
    if "profile" in record:
        return PROFILE + str(record["profile"])
    return DELTA if "delta_eV_nm" in record else GROUP if "repeat" in record else EXPLICIT


def chosen_lead(record: Data, choice: str, row: SheetRow | None, zero: float, own: Sequence[str]) -> Data:
    """A lead turned into `choice`; its doping stays. Arguments as for `chosen_layer`."""
    doping = {key: record[key] for key in ("donors_cm3", "fermi_meV") if key in record}
    return _medium(record, choice, row, zero, own) | doping


def chosen_layer(record: Data, choice: str, row: SheetRow | None, zero: float, own: Sequence[str]) -> Data:
    """A layer turned into `choice`.

    `row`: what the engine made of the record, from which an explicit layer takes its edge, mass and thickness; `zero`:
    the left lead's edge on the scale of explicit edges (eV); `own`: names the scenario defines itself.
    """
    if choice == DELTA:
        return {"delta_eV_nm": _START_DELTA}
    if choice == GROUP:
        return {"repeat": 2, "layers": [record]}
    if choice_of(record) == GROUP:
        record = record["layers"][0]
    thickness = _thickness(record, row, EXPLICIT if choice.startswith(PROFILE) else choice)
    if choice.startswith(PROFILE):
        return _profile(choice.removeprefix(PROFILE), _medium(record, EXPLICIT, row, zero, own), thickness)
    return _medium(record, choice, row, zero, own) | thickness


def _profile(kind: str, medium: Data, thickness: Data) -> Data:
    """A profile that begins flat, or with a small feature, at the edge the layer had."""
    edge, length = medium["band_edge_eV"], thickness["thickness_nm"]
    start = {"from_eV": edge, "to_eV": edge, "mean_eV": edge, "amplitude_eV": _START_FEATURE,
             "height_eV": _START_FEATURE, "step_eV": _START_FEATURE, "width_nm": _rounded(length / 8),
             "potential_eV": [edge, edge]}
    needed = {key: start[key] for key in PROFILE_KEYS[kind]}
    base = {"base_eV": edge} if kind in BASED_PROFILES else {}
    return {"profile": kind, "mass": medium["mass"], "thickness_nm": length} | needed | base


def graded(record: Data, on: bool) -> Data:
    """A layer of an alloy with one composition, or with one at either face."""
    others = {key: value for key, value in record.items() if key not in ("x", "x_from", "x_to")}
    if on:
        x = record.get("x", _START_X)
        return others | {"x_from": x, "x_to": x}
    return others | {"x": record.get("x_from", _START_X)}


def _medium(record: Data, choice: str, row: SheetRow | None, zero: float, own: Sequence[str]) -> Data:
    if choice == EXPLICIT:
        known = row is not None and row.band_edge is not None and row.mass is not None
        edge, mass = (row.band_edge + zero, row.mass) if known else (zero, 1.0)  # type: ignore[union-attr,operator]
        return {"band_edge_eV": _rounded(edge), "mass": _rounded(mass)}  # type: ignore[arg-type]
    name = choice.removeprefix(MATERIAL)
    alloy = name not in own and name in material_names() and is_alloy(name)
    return {"material": name} | ({"x": record.get("x", _START_X)} if alloy else {})


def _thickness(record: Data, row: SheetRow | None, choice: str) -> Data:
    if choice != EXPLICIT and "monolayers" in record:
        return {"monolayers": record["monolayers"]}
    if "thickness_nm" in record:
        return {"thickness_nm": record["thickness_nm"]}
    return {"thickness_nm": _rounded(row.thickness) if row and row.thickness else _START_THICKNESS}


def in_unit(record: Data, unit: str, row: SheetRow | None) -> Data:
    """A layer with its thickness given in `thickness_nm` or `monolayers`, as thick as before to six digits."""
    if unit in record or row is None:
        return record
    value = row.thickness if unit == "thickness_nm" else row.monolayers
    others = {key: old for key, old in record.items() if key not in ("thickness_nm", "monolayers")}
    # Without a known monolayer the number stays, and the engine says what it lacks.
    return others | {unit: _rounded(value) if value else record.get("thickness_nm", 1.0)}


def of_kind(window: Data, kind: str) -> Data:
    """A window turned into `pass` or `block`; an extremum that only the other kind has becomes its own."""
    plain = {**window, "kind": kind}
    if plain.get("measure") not in (None, "mean"):
        plain["measure"] = default_measure("pass" if kind == "pass" else "block")
    return plain


def _rounded(value: float) -> float:
    return float(f"{value:.{_CONVERTED_DIGITS}g}")
