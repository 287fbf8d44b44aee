"""The margin of every number of periods, with the window that limits it."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from bokeh.models import (
    BoxAnnotation,
    ColumnDataSource,
    HoverTool,
    Range1d,
    Span,
)

from transport import PeriodCheck, Verdict
from webapp.figures.frame import paint_frame, plain_frame
from webapp.results import Band
from webapp.theme import Palette

_MARKERS = {"pass": "circle", "block": "square"}
_COLUMNS = ("periods", "margin", "window", "meets", "colour", "fill", "marker")


class MarginsFigure:
    """Margin in dB over N: filled marks meet the target, hollow ones miss it; colour and shape name the window."""

    def __init__(self, marker: Span, drags: bool) -> None:
        self._x, self._y = Range1d(start=0.5, end=60.5), Range1d(start=-10, end=10)
        self.figure: Any = plain_frame("margins", "number of periods N", "least margin (dB)", self._x, self._y, drags)
        self._met = BoxAnnotation(bottom=0, fill_alpha=0.5, line_color=None, level="underlay")
        self._zero = Span(location=0, dimension="width", line_width=1.5)
        for annotation in (self._met, self._zero, marker):
            self.figure.add_layout(annotation)
        self._range = ColumnDataSource({"periods": [], "low": [], "high": []})
        self._band = self.figure.varea("periods", "low", "high", source=self._range, fill_alpha=0.6)
        self._source = ColumnDataSource({name: [] for name in _COLUMNS})
        self._line = self.figure.line("periods", "margin", source=self._source, line_width=1)
        marks = self.figure.scatter("periods", "margin", source=self._source, marker="marker", size=7, line_width=1.5,
                                    line_color="colour", fill_color="fill")
        self.figure.add_tools(HoverTool(renderers=[marks], tooltips=[
            ("N", "@periods"), ("margin", "@margin{+0.0} dB"), ("limiting", "@window"), ("target", "@meets")]))
        self._verdict: Verdict | None = None
        self._palette: Palette | None = None

    def show(self, verdict: Verdict | None) -> None:
        """Draw the margins of a verdict."""
        self._verdict = verdict
        self._draw()
        if verdict is None:
            return
        most = len(verdict.per_period)
        self._x.update(start=0.5, end=most + 0.5, reset_start=0.5, reset_end=most + 0.5)
        known = [check.margin_dB for check in verdict.per_period if check.margin_dB is not None]
        low, high = min([-3.0, *known]), max([3.0, *known])
        # One hopeless count would else flatten all the others.
        low = max(low, -60.0)
        room = 0.06 * (high - low)
        self._y.update(start=low - room, end=high + room, reset_start=low - room, reset_end=high + room)

    def show_range(self, band: Band | None) -> None:
        """Draw the range of the margins over all that growth may do; None takes it away."""
        if band is None:
            self._range.data = {"periods": [], "low": [], "high": []}
            return
        known = np.isfinite(band.low) & np.isfinite(band.high)
        self._range.data = {"periods": band.counts[known], "low": band.low[known], "high": band.high[known]}

    @property
    def shows_range(self) -> bool:
        """Whether a range is drawn."""
        return len(self._range.data["periods"]) > 0

    def _draw(self) -> None:
        if self._verdict is None or self._palette is None:
            self._source.data = {name: [] for name in _COLUMNS}
            return
        rows = [self._mark(check, self._verdict, self._palette) for check in self._verdict.per_period]
        self._source.data = dict(zip(_COLUMNS, map(list, zip(*rows, strict=True)), strict=True))

    def _mark(self, check: PeriodCheck, verdict: Verdict, palette: Palette) -> tuple[Any, ...]:
        margin = math.nan if check.margin_dB is None else check.margin_dB
        if check.limiting_window is None:
            return (check.periods, margin, "none", _meets(check), palette.muted, palette.muted, "circle")
        colour = window_colour(check.limiting_window, palette)
        window = verdict.windows[check.limiting_window]
        return (check.periods, margin, window_name(verdict, check.limiting_window), _meets(check), colour,
                colour if check.meets else palette.card, _MARKERS[window.kind])

    def paint(self, palette: Palette) -> None:
        """Take on the colours of a theme."""
        self._palette = palette
        paint_frame(self.figure, palette)
        self._line.glyph.line_color = palette.line
        self._band.glyph.fill_color = palette.warm_tint
        self._met.fill_color = palette.met_tint
        self._zero.line_color = palette.met
        self._draw()


def window_colour(index: int, palette: Palette) -> str:
    """The colour that stands for a window of the target."""
    return palette.windows[index % len(palette.windows)]


def window_name(verdict: Verdict, index: int) -> str:
    """A window by its number, kind and range."""
    window = verdict.windows[index]
    return f"window {index + 1}: {window.kind} {window.bottom * 1e3:.6g}\N{EN DASH}{window.top * 1e3:.6g} meV"


def _meets(check: PeriodCheck) -> str:
    return "met" if check.meets else "missed"


def describe_margins(verdict: Verdict) -> str:
    """The figure in words."""
    known = [check for check in verdict.per_period if check.margin_dB is not None]
    if not known:
        return "No count of periods has a margin that can be drawn."
    best = max(known, key=lambda check: check.margin_dB or -math.inf)
    limiting = f", limited by {window_name(verdict, best.limiting_window)}" if best.limiting_window is not None else ""
    return (f"Least margin of 1 to {len(verdict.per_period)} periods: {len(verdict.meeting)} counts meet the target; "
            f"the best is {best.margin_dB:+.1f} dB with {best.periods} periods{limiting}.")
