"""What the text of a field means: a number, a name, or a switch that changes its whole record."""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import Any

from transport import Document, ScenarioError
from transport.parameters import PARAMETERS
from transport.refusal import shown
from transport.resolve import SheetRow
from webapp import edits
from webapp.edits import Data

CHOICE, UNIT, GRADED = "choice", "unit", "graded"
"""Fields that are no keys of the file: what a layer or lead is, the unit of its thickness, whether its alloy runs."""

_TEXTS = ("title", "note", "name", "measure", "substrate", "kind", "of")
_SWITCHES = ("nonparabolic", "whole_monolayers")
_EMPTY_IS_TEXT = ("title", "note")


def name_of(path: str) -> str:
    """The last part of a path: the name of a field."""
    return path.rpartition(".")[2]


def record_of(path: str) -> str:
    """The path of the record a field belongs to."""
    return path.rpartition(".")[0]


def applied(data: Data, path: str, text: str, document: Document, rows: Mapping[str, SheetRow]) -> Data:
    """The data with the text of one field brought in. `rows`: what the engine made of `document`, by key.

    Raises ScenarioError where the text is no number; whether it is a good one is the engine's to say.
    """
    name, record = name_of(path), record_of(path)
    if name in (CHOICE, UNIT, GRADED) or (name == "kind" and record.startswith("target.windows")):
        return edits.with_value(data, record, _switched(data, record, name, text, document, rows))
    return edits.with_value(data, path, _value(path, name, text))


def _switched(
    data: Data, path: str, name: str, text: str, document: Document, rows: Mapping[str, SheetRow]
) -> Data:
    """The record at `path` after one of its switches."""
    record, row = edits.value_at(data, path), rows.get(path)
    if name == "kind":
        return edits.of_kind(record, text)
    if name == GRADED:
        return edits.graded(record, text == "true")
    if name == UNIT:
        return edits.in_unit(record, text, row)
    turned = edits.chosen_lead if path.startswith("leads.") else edits.chosen_layer
    return turned(record, text, row, _zero(document), [entry.name for entry in document.materials])


def _zero(document: Document) -> float:
    """The left lead's edge on the document's scale of explicit edges, eV."""
    left = document.leads.left
    if left.band_edge_eV is not None:
        return left.band_edge_eV
    return next((entry.band_edge_eV for entry in document.materials if entry.name == left.material), 0.0)


def _value(path: str, name: str, text: str) -> Any:
    if name in _SWITCHES:
        return text == "true"
    if name in _TEXTS:
        return text if text or name in _EMPTY_IS_TEXT else None
    if name == "potential_eV":
        return [number(f"{path}[{index}]", part) for index, part in enumerate(re.split(r"[,;\s]+", text.strip()))]
    return number(path, text, PARAMETERS[name].whole)


def number(path: str, text: str, whole: bool = False) -> float | int | None:
    """The number a text holds; None for an empty one. Raises ScenarioError where it is none."""
    text = text.strip().replace("\N{MINUS SIGN}", "-")
    if not text:
        return None
    try:
        if whole and text.lstrip("+-").isdigit():
            return int(text)
        value = float(text)
    except ValueError:
        raise ScenarioError(path, f"must be a number such as 0.25 or 1e-4, but is {shown(text)}") from None
    return int(value) if whole and value.is_integer() else value


def sentence_beside(path: str, error: ScenarioError) -> str:
    """The engine's sentence as it stands beside the field at `path`; it names its key only if that is another."""
    if error.key == path:
        return error.message
    if record_of(error.key) == record_of(path):
        return f"{name_of(error.key)} {error.message}"
    return str(error)


def written(value: object) -> str:
    """A value as it stands in a field: the shortest text that reads back as the same."""
    if value is None:
        return ""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, tuple):
        return ", ".join(written(item) for item in value)
    return repr(value).removesuffix(".0") if isinstance(value, float) else str(value)
