"""Tables as CSV that a spreadsheet may open: comment lines, headers with units, and no cell that runs as a formula."""

from __future__ import annotations

import csv
import io
import math
import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

Cell = str | float | int | bool | None

_RUNS = ("=", "+", "-", "@", "\t", "\r", "'")
"""Beginnings of text that a spreadsheet takes for a formula, and the mark itself that says text."""
_RUNS_INSIDE = re.compile(r"([,;\t|]\s*)(?=[=+\-@])")


@dataclass(frozen=True, slots=True)
class Table:
    """Named columns, their rows, and notes that stand above them."""

    columns: tuple[str, ...]
    rows: tuple[tuple[Cell, ...], ...]
    notes: tuple[str, ...] = ()


def table_of(records: Sequence[dict[str, Any]], columns: Iterable[str], notes: Iterable[str] = ()) -> Table:
    """The table of records that share their keys; `columns` names them where there is no record."""
    names = tuple(records[0]) if records else tuple(columns)
    return Table(names, tuple(tuple(record[name] for name in names) for record in records), tuple(notes))


def csv_text(table: Table, comments: Sequence[str] = ()) -> str:
    """The table as CSV: comments and notes as lines that begin with #, numbers with every digit, nothing for None."""
    written = io.StringIO()
    for line in (*comments, *table.notes):
        written.write(f"# {_comment(line)}\n")
    rows = csv.writer(written, lineterminator="\n")
    rows.writerow(table.columns)
    rows.writerows([_written(cell) for cell in row] for row in table.rows)
    return written.getvalue()


def _comment(line: str) -> str:
    """A line that neither ends early, nor opens a quoted cell, nor holds a formula where a separator splits it."""
    plain = "".join(c if c.isprintable() else " " for c in line).replace('"', "'")
    return _RUNS_INSIDE.sub(r"\1'", plain)


def _written(cell: Cell) -> str:
    if isinstance(cell, np.generic):
        cell = cell.item()
    if cell is None or (isinstance(cell, float) and not math.isfinite(cell)):
        return ""
    if isinstance(cell, str):
        return f"'{cell}" if cell.startswith(_RUNS) else cell
    return ("yes" if cell else "no") if isinstance(cell, bool) else repr(cell)


def text_of(cell: str) -> str:
    """The text that a cell of CSV stands for, without the mark that kept it from being a formula."""
    return cell[1:] if cell.startswith("'") and cell[1:].startswith(_RUNS) else cell
