"""Transmission over energy and number of periods: the bands are seen to emerge between the lattice's edges."""

from __future__ import annotations

from typing import Any

import numpy as np
from bokeh.models import ColorBar, ColumnDataSource, LinearColorMapper, Range1d, Span

from webapp.figures.frame import MEV, EnergyAxis, energy_frame, paint_frame
from webapp.figures.lattice import Minibands
from webapp.results import Emergence
from webapp.theme import FONT, Palette, heat_colours


class EmergenceFigure:
    """log10 T as a picture over (N, energy), with the infinite lattice's band edges drawn over it."""

    def __init__(self, axis: EnergyAxis, minibands: Minibands, marker: Span, drags: bool) -> None:
        self._x = Range1d(start=0.5, end=60.5)
        self.figure: Any = energy_frame("emergence", axis, "number of periods N", self._x, drags)
        self._source = ColumnDataSource({"image": [], "x": [], "y": [], "width": [], "height": []})
        self._colours = LinearColorMapper(low=-8, high=0, palette=["#000000", "#ffffff"])
        self._image = self.figure.image("image", "x", "y", "width", "height", source=self._source,
                                        color_mapper=self._colours)
        minibands.outline(self.figure)
        self.figure.add_layout(marker)
        self._bar = ColorBar(color_mapper=self._colours, width=10, padding=6, label_standoff=6, border_line_color=None)
        self.figure.add_layout(self._bar, "right")

    def clear(self) -> None:
        """Take the picture away."""
        self._source.data = {name: [] for name in self._source.data}

    def show(self, emergence: Emergence, floor: float) -> None:
        """Draw the picture; `floor`: the power of ten at which its colours begin."""
        most, (low, high) = float(emergence.counts[-1]), emergence.span
        self._colours.low = floor
        self._source.data = {"image": [emergence.image], "x": [0.5], "y": [low * MEV], "width": [most],
                             "height": [(high - low) * MEV]}
        self._x.update(start=0.5, end=most + 0.5, reset_start=0.5, reset_end=most + 0.5)

    def paint(self, palette: Palette) -> None:
        """Take on the colours of a theme."""
        paint_frame(self.figure, palette)
        self._colours.palette = heat_colours(palette)
        self._bar.update(background_fill_color=palette.card, major_label_text_color=palette.muted,
                         major_label_text_font=FONT, major_tick_line_color=palette.muted)


def describe_emergence(emergence: Emergence) -> str:
    """The figure in words."""
    low, high = (edge * MEV for edge in emergence.span)
    last = emergence.image[:, -1]
    open_share = float(np.mean(last > -1))
    return (f"Transmission of 1 to {emergence.counts[-1]} periods from {low:.4g} to {high:.4g} meV as a picture; with "
            f"{emergence.counts[-1]} periods {open_share:.0%} of the range passes more than a tenth. The lattice's "
            "band edges are drawn over it as dashed lines.")
