"""Measured peaks: read from CSV, placed on the energy axis, and paired with computed ones without crossing."""

from __future__ import annotations

import csv
import io
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from transport.checks import check_measured
from transport.document import MeasuredRecord, PeakRecord
from transport.oscillation import Floats
from transport.parameters import PARAMETERS
from transport.refusal import ScenarioError, nearest, refuse_unless, shown

COLUMNS = ("energy_meV", "bias_V", "width_meV", "uncertainty_meV")
"""Columns a table of peaks may have; one of the first two is needed."""

_MOST_BYTES = 1_000_000
_SKIPPED = 1e6  # more than any pairing costs: a peak is left out only where there are too few resonances


@dataclass(frozen=True, slots=True)
class MeasuredPeaks:
    """Peaks in ascending order: `energy` (eV), `width` and `uncertainty` (eV; NaN where not given)."""

    energy: Floats
    width: Floats
    uncertainty: Floats

    @property
    def weight(self) -> Floats:
        """1 over the uncertainty where every peak has one; else 1/eV each."""
        if self.uncertainty.size and np.isfinite(self.uncertainty).all():
            return np.asarray(1 / self.uncertainty)
        return np.ones(self.energy.size)


def measured_peaks(record: MeasuredRecord) -> MeasuredPeaks:
    """The peaks of a `[measured]` table on the energy axis.

    A bias V marks the resonance that it brings to the left lead's edge: E = lever_arm e V, for a drop that is linear
    across the stack (lever arm 0.5: the middle of the stack).
    """
    rows = []
    for peak in record.peaks:
        place = record.lever_arm * peak.bias_V if peak.bias_V is not None else (peak.energy_meV or 0.0) / 1e3
        rows.append((place, _eV(peak.width_meV), _eV(peak.uncertainty_meV)))
    table = np.array(sorted(rows)).reshape(-1, 3)
    return MeasuredPeaks(table[:, 0], table[:, 1], table[:, 2])


def _eV(value: float | None) -> float:
    return np.nan if value is None else value / 1e3


def read_peaks(text: str, lever_arm: float | None = None) -> MeasuredRecord:
    """The peaks of a CSV table with a line of headers: energy_meV or bias_V, optionally width_meV, uncertainty_meV.

    Separators: comma, semicolon or tab. Raises ScenarioError with the line and column at fault.
    """
    refuse_unless(len(text.encode("utf-8", "surrogatepass")) <= _MOST_BYTES, "peaks",
                  f"is larger than {_MOST_BYTES:,} bytes; cut the table to its peaks")
    lines = [line for line in text.lstrip("\ufeff").splitlines() if line.strip()]
    refuse_unless(bool(lines), "peaks", f"is empty; begin it with a line of headers such as {', '.join(COLUMNS[::2])}")
    separator = next((mark for mark in "\t;," if mark in lines[0]), ",")
    try:
        rows = list(csv.reader(io.StringIO("\n".join(lines)), delimiter=separator))
    except csv.Error as error:
        raise ScenarioError("peaks", f"is no table ({error}); give plain CSV") from None
    columns = _columns([name.strip() for name in rows[0]])
    most = int(PARAMETERS["file_peaks"].high)
    refuse_unless(len(rows) - 1 <= most, "peaks", f"lists {len(rows) - 1:,} peaks; at most {most:,} are read")
    refuse_unless(len(rows) > 1, "peaks", "has headers but no peak; add a line for each")
    peaks = tuple(_peak(number, columns, row) for number, row in enumerate(rows[1:], 2))
    record = MeasuredRecord(peaks) if lever_arm is None else MeasuredRecord(peaks, lever_arm)
    check_measured(record)
    return record


def format_peaks(record: MeasuredRecord) -> str:
    """The peaks as a CSV table that `read_peaks` reads back."""
    used = [name for name in COLUMNS if any(getattr(peak, name) is not None for peak in record.peaks)]
    rows = [["" if (value := getattr(peak, name)) is None else repr(value) for name in used] for peak in record.peaks]
    return "".join(",".join(row) + "\n" for row in [used, *rows]) if used else ""


def _columns(names: list[str]) -> list[str]:
    for name in names:
        refuse_unless(name in COLUMNS, f"peaks, column {shown(name)}", f"is not known here; {nearest(name, COLUMNS)}")
        refuse_unless(names.count(name) == 1, f"peaks, column {name}", "stands twice; keep one of them")
    refuse_unless("energy_meV" in names or "bias_V" in names, "peaks", "has no column energy_meV or bias_V; add one")
    return names


def _peak(line: int, columns: list[str], row: list[str]) -> PeakRecord:
    refuse_unless(len(row) == len(columns), f"peaks, line {line}",
                  f"has {len(row)} values for {len(columns)} columns; mend it")
    values = {}
    for name, text in zip(columns, (cell.strip() for cell in row), strict=True):
        if not text:
            continue
        try:
            values[name] = float(text.replace("\N{MINUS SIGN}", "-"))
        except ValueError:
            raise ScenarioError(f"peaks, line {line}, {name}",
                                f"must be a number such as 61.5, but is {shown(text)}") from None
        refuse_unless(PARAMETERS[name].admits(values[name]), f"peaks, line {line}, {name}",
                      f"{PARAMETERS[name].requirement}, but is {shown(text)}")
    return PeakRecord(**values)


def assigned(measured: Floats, computed: Floats, weight: Floats) -> NDArray[np.int64]:
    """Which computed peak each measured one is: a place in `computed`, or -1 where it has none.

    Both ascend. The pairing never crosses, uses every peak once at most, pairs as many as there can be pairs, and of
    all such has the least sum of squared weighted deviations (dynamic programming, as sequences are aligned:
    Needleman and Wunsch, J. Mol. Biol. 48, 443 (1970)).
    """
    rows, columns = measured.size, computed.size
    cost = (weight[:, None] * (measured[:, None] - computed)) ** 2
    left_out = _SKIPPED * (1.0 + float(cost.max(initial=0.0)))
    total = np.full((rows + 1, columns + 1), np.inf)
    total[0] = 0.0
    for row in range(rows):
        paired = np.append(np.inf, total[row, :-1] + cost[row])
        total[row + 1] = np.minimum.accumulate(np.minimum(paired, total[row] + left_out))
    found, column = np.full(rows, -1), columns
    for row in range(rows - 1, -1, -1):
        while column and total[row + 1, column] == total[row + 1, column - 1]:
            column -= 1
        if column and total[row + 1, column] == total[row, column - 1] + cost[row, column - 1]:
            column -= 1
            found[row] = column
    return found
