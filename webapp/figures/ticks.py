"""Resonances as ticks at both sides of every figure of the bench, and measured peaks beside them."""

from __future__ import annotations

from typing import Any

import numpy as np
from bokeh.models import ColumnDataSource, Range1d, Span

from webapp.figures.frame import MEV
from webapp.ledger import Ledger
from webapp.theme import Palette

_TICKS = ("energy", "from", "to")
_LENGTH = 0.035
"""How long a tick is, as a share of a figure's width."""
_MEASURED = ("energy", "low", "high", "place")


class Ticks:
    """One source for every figure; places along x are shares of a figure's width."""

    def __init__(self) -> None:
        self._ticks = ColumnDataSource({name: [] for name in _TICKS}, name="ticks")
        self._measured = ColumnDataSource({name: [] for name in _MEASURED}, name="measured-peaks")
        self._chosen = Span(dimension="width", line_width=1.5, visible=False, name="chosen-resonance")
        self._marks: list[Any] = []
        self._whiskers: list[Any] = []
        self._diamonds: list[Any] = []

    def draw(self, frame: Any, measured: bool = False) -> None:
        """Draw the ticks in a figure; with `measured`, the measured peaks as well."""
        frame.extra_x_ranges = {"share": Range1d(start=0, end=1)}
        self._marks.append(frame.segment("from", "energy", "to", "energy", source=self._ticks, x_range_name="share",
                                         line_width=1.5, level="overlay"))
        frame.add_layout(self._chosen)
        if measured:
            self._whiskers.append(frame.segment("place", "low", "place", "high", source=self._measured,
                                                x_range_name="share", line_width=1.5, level="overlay"))
            self._diamonds.append(frame.scatter("place", "energy", source=self._measured, x_range_name="share",
                                               marker="diamond", size=10, line_width=1.5, level="overlay"))

    def show(self, found: Ledger | None) -> None:
        """Take on the resonances of a ledger and what was measured; None takes them away."""
        energy = found.found.energy * MEV if found else np.zeros(0)
        if energy.size or len(self._ticks.data["energy"]):
            from_ = np.repeat([0.0, 1.0 - _LENGTH], energy.size)
            self._ticks.data = {"energy": np.tile(energy, 2), "from": from_, "to": from_ + _LENGTH}
        measured = found.compared.measured if found and found.compared else None
        if measured is None and not len(self._measured.data["energy"]):
            return
        peaks = measured.energy * MEV if measured else np.zeros(0)
        room = np.nan_to_num(measured.uncertainty * MEV) if measured else peaks
        self._measured.data = {"energy": peaks, "low": peaks - room, "high": peaks + room,
                               "place": np.full(peaks.size, 0.93)}

    def choose(self, energy: float | None) -> None:
        """Draw a line through all figures at the chosen resonance (eV); None takes it away."""
        if energy is not None:
            self._chosen.location = energy * MEV
        self._chosen.visible = energy is not None

    def paint(self, palette: Palette) -> None:
        """Take on the colours of a theme."""
        self._chosen.line_color = palette.warm_deep
        for mark in self._marks:
            mark.glyph.line_color = palette.warm_deep
        for whisker in self._whiskers:
            whisker.glyph.line_color = palette.target
        for diamond in self._diamonds:
            diamond.glyph.update(line_color=palette.target, fill_color=palette.card)
