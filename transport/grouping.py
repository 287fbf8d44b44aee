"""Edits of many layers at once: all barriers, or all wells, thicker or thinner by some monolayers."""

from __future__ import annotations

import re
from typing import Any, Literal

from transport.document import document_from_data, document_to_data
from transport.refusal import ScenarioError
from transport.resolve import SheetRow, monolayer_of
from transport.scenario import Scenario, scenario_from_document

Kind = Literal["barriers", "wells"]


def thickened(scenario: Scenario, kind: Kind, monolayers: float) -> Scenario:
    """The scenario with every barrier, or every well, of entry, cell and exit thicker by some monolayers.

    A barrier's band edge lies above the middle between the lowest and the highest of the cell (common practice). A
    layer given in nm changes by the thickness of its material's monolayer. Layers of an end treatment follow the cell.
    Raises ScenarioError where no layer is higher than another, or nothing of one would be left.
    """
    edges = [row.band_edge for row in scenario.sheet if row.where == "cell" and row.band_edge is not None]
    if len(set(edges)) < 2:
        raise ScenarioError("stack.cell", "has layers of one band edge only, so none is a barrier or a well by itself; "
                            "change its layers one by one")
    level = (min(edges) + max(edges)) / 2
    chosen = {row.key: row for row in scenario.sheet
              if row.where in ("entry", "cell", "exit") and row.key != "stack.ends" and row.thickness
              and row.band_edge is not None and (row.band_edge > level) == (kind == "barriers")}
    data = document_to_data(scenario.document)
    for key, row in chosen.items():
        _thicken(_record_at(data, key), row, monolayers)
    return scenario_from_document(document_from_data(data))


def _record_at(data: Any, key: str) -> dict[str, Any]:
    for index, name in re.findall(r"\[(\d+)\]|([^.\[\]]+)", key):
        data = data[int(index)] if index else data[name]
    assert isinstance(data, dict)
    return data


def _thicken(record: dict[str, Any], row: SheetRow, monolayers: float) -> None:
    unit, step = ("monolayers", 1.0) if "monolayers" in record else ("thickness_nm", monolayer_of(row))
    thickness = record[unit] + monolayers * step
    if thickness <= 0:
        raise ScenarioError(f"{row.key}.{unit}", f"would be {thickness:.4g}, and must stay above 0; take fewer off")
    record[unit] = float(f"{thickness:.12g}")
