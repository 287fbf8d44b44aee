"""The page *Hand-off*: a layer sheet that was read, before it is taken."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from transport.document import LayerRecord
from webapp.fields import written

_MOST_SHOWN = 60


def sheet_view(layers: Sequence[LayerRecord], faults: Sequence[str]) -> dict[str, Any]:
    """The layers as a table, and what is wrong with which line."""
    many = f"{len(layers)} layer{'s' if len(layers) != 1 else ''} read"
    lines = f"{len(faults)} line{'s' if len(faults) != 1 else ''}"
    wrong = f", {lines} wrong: mend them to take the sheet" if faults else ""
    rows = [[str(place), layer.material or "", written(layer.x),
             f"{written(layer.thickness_nm)} nm" if layer.monolayers is None else f"{written(layer.monolayers)} ML"]
            for place, layer in enumerate(layers[:_MOST_SHOWN], 1)]
    return {"sentence": f"{many}{wrong}." if layers else "", "faults": list(faults[:_MOST_SHOWN]), "rows": rows,
            "takes": bool(layers) and not faults}
