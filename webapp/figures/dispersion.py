"""The finite stack's own points on the infinite dispersion: N periods sample every miniband at K d = j pi/N."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from bokeh.models import ColumnDataSource, HoverTool, Range1d

from webapp.figures.frame import MEV, EnergyAxis, energy_frame, paint_frame
from webapp.figures.lattice import PHASE_LABEL, Minibands, dispersion_lines
from webapp.results import Floats, Lattice, Points
from webapp.theme import Palette


class DispersionFigure:
    """E over K d of the infinite lattice (line) and the finite stack (points, larger the more they pass)."""

    def __init__(self, axis: EnergyAxis, minibands: Minibands, drags: bool) -> None:
        self.figure: Any = energy_frame("dispersion", axis, PHASE_LABEL, Range1d(start=-0.02, end=1.02), drags)
        minibands.shade(self.figure)
        self._lines = ColumnDataSource({"energy": [], "phase": [], "decay": []})
        empty: dict[str, Any] = {"energy": [], "phase": [], "order": [], "transmission": [], "size": []}
        self._points = ColumnDataSource(empty)
        self._phase = self.figure.line("phase", "energy", source=self._lines, line_width=2.5)
        self._dots = self.figure.scatter("phase", "energy", source=self._points, size="size", line_width=0)
        self.figure.add_tools(HoverTool(renderers=[self._dots], tooltips=[
            ("K d", "@order \N{GREEK SMALL LETTER PI}"), ("E", "@energy{0.000} meV"), ("T", "@transmission{0.0000}")]))

    def show(self, lattice: Lattice) -> None:
        """Draw the dispersion."""
        self._lines.data = dispersion_lines(lattice)

    def show_points(self, points: Points, transmission: Floats, periods: int) -> None:
        """Draw the points, with what the stack passes at each."""
        order = np.rint(points.phase / math.pi * periods).astype(int)
        self._points.data = {
            "energy": points.energy * MEV, "phase": points.phase / math.pi, "transmission": transmission,
            "order": [f"{j}/{periods}" for j in order], "size": 5 + 4 * transmission,
        }

    def clear(self) -> None:
        """Take everything away."""
        for source in (self._lines, self._points):
            source.data = {name: [] for name in source.data}

    def paint(self, palette: Palette) -> None:
        """Take on the colours of a theme."""
        paint_frame(self.figure, palette)
        self._phase.glyph.line_color = palette.cool
        self._dots.glyph.update(fill_color=palette.warm, line_color=palette.warm)


def describe_points(points: Points, transmission: Floats, periods: int) -> str:
    """The figure in words."""
    if not points.energy.size:
        return f"{periods:,} periods: no points of their own are told apart on the dispersion."
    unit = int((transmission > 0.999).sum())
    return (f"{points.energy.size} points of {periods} periods on the infinite dispersion, at K d = j\u03c0/{periods}; "
            f"at {unit} of them the stack passes everything.")
