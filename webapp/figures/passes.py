"""What the finite stack passes: transmission over the shared energy axis, with the target's windows drawn on it."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any, Literal

import numpy as np
from bokeh.models import (
    AdaptiveTicker,
    BasicTicker,
    ColumnDataSource,
    CustomJSTickFormatter,
    LinearAxis,
    NumeralTickFormatter,
    Range1d,
)

from transport import Target, Window
from webapp.figures.frame import MEV, EnergyAxis, energy_frame, paint_frame, text_style
from webapp.results import Emergence, Floats, Passage
from webapp.theme import Palette

Scale = Literal["log", "linear"]

_CURVE = ("energy", "log10", "drawn")
_DASHES = ([10, 3], [5, 3], [10, 3, 2, 3])
"""Lines of other stacks laid over this one, told apart without colour too."""
_LOWEST_DECADE = -330.0
_LABEL = "transmission T (share passed)"
_RIGHT = {"log": 0.35, "linear": 1.06}
# Powers of ten in figures of their own: a canvas has no markup.
_POWERS = """
    const high = "\u2070\u00b9\u00b2\u00b3\u2074\u2075\u2076\u2077\u2078\u2079"
    if (tick == 0) return "1"
    if (!Number.isInteger(tick)) return ""
    return "10" + String(tick).replace("-", "\u207b").replace(/[0-9]/g, (digit) => high[digit])
"""


class PassesFigure:
    """T over energy, on a logarithmic or linear axis.

    The exact curve and the browser's own preview are two lines, of which one is shown: the browser decides, because
    only it knows whether the curve it holds is still that of the slider's position.
    """

    def __init__(self, axis: EnergyAxis, drags: bool) -> None:
        self._x = Range1d(start=-8, end=_RIGHT["log"], name="passes-range")
        self.figure: Any = energy_frame("passes", axis, _LABEL, self._x, drags)
        self.scale: Scale = "log"
        self._floor = -8.0
        self._target: Target | None = None
        # `drawn` is T or its logarithm, as the axis has it; `log10` is for the readout.
        self._curve = ColumnDataSource({name: [] for name in _CURVE}, name="curve")
        self._beam = ColumnDataSource({"energy": [], "drawn": []})
        self._absorbed = ColumnDataSource({"energy": [], "drawn": []}, name="absorbed")
        self._rows = ColumnDataSource({"energy": [], "rows": [], "counts": []}, name="rows", tags=[-1])
        self._preview = ColumnDataSource({"energy": [], "log10": [], "drawn": []}, name="preview")
        self._envelope = ColumnDataSource({"energy": [], "lower": [], "upper": []})
        self._poles = ColumnDataSource({"energy": [], "drawn": []}, name="from-pole")
        self._before = ColumnDataSource({"energy": [], "drawn": []}, name="before")
        self._laid = [ColumnDataSource({"energy": [], "drawn": []}, name=f"laid-{n}") for n in range(len(_DASHES))]
        self._others: tuple[Passage, ...] = ()
        self._brackets = ColumnDataSource({"xs": [], "ys": []})
        self._hatched = ColumnDataSource({"left": [], "right": [], "bottom": [], "top": []})
        self._names = ColumnDataSource({"x": [], "y": [], "text": [], "align": [], "offset": []})
        # No glyph draws the rows; as a tag they travel with the figure all the same.
        self.figure.tags = [self._rows]
        # What the browser does to these is its own affair and is not sent back.
        self._preview.syncable = False
        self._passage: Passage | None = None
        self._earlier: Passage | None = None
        # Two axes of which one shows: to exchange the parts of one costs a look at every model of the page.
        self._log_axis = self.figure.xaxis[0]
        self._log_axis.update(
            formatter=CustomJSTickFormatter(code=_POWERS),
            ticker=AdaptiveTicker(min_interval=1, mantissas=[1, 2, 5], desired_num_ticks=5, num_minor_ticks=0))
        self._linear_axis = LinearAxis(axis_label=_LABEL, formatter=NumeralTickFormatter(format="0.0"),
                                       ticker=BasicTicker(desired_num_ticks=5, num_minor_ticks=0))
        self.figure.add_layout(self._linear_axis, "below")
        self._draw()
        self._rescale()

    def _draw(self) -> None:
        draw = self.figure
        self._hatching = draw.quad("left", "right", "top", "bottom", source=self._hatched, hatch_pattern="/",
                                   hatch_scale=9, hatch_weight=1, fill_alpha=0.35, line_width=1.5)
        self._between = draw.harea(x1="lower", x2="upper", y="energy", source=self._envelope, fill_alpha=0.5)
        self._over = [draw.line("drawn", "energy", source=source, line_width=1.8, line_dash=dash)
                      for source, dash in zip(self._laid, _DASHES, strict=True)]
        self._past = draw.line("drawn", "energy", source=self._before, line_width=1.5, line_dash=[2, 3])
        self._line = draw.line("drawn", "energy", source=self._curve, line_width=2, name="curve-line")
        self._loss = draw.line("drawn", "energy", source=self._absorbed, line_width=1.5, line_dash=[2, 2])
        self._measured = draw.line("drawn", "energy", source=self._beam, line_width=2, line_dash=[6, 3])
        self._stars = draw.scatter("drawn", "energy", source=self._poles, marker="star", size=9, line_width=1)
        self._held = draw.line("drawn", "energy", source=self._preview, line_width=2, name="preview-line",
                               visible=False)
        self._line.syncable = self._held.syncable = False
        self._bracket = draw.multi_line("xs", "ys", source=self._brackets, line_width=2.5)
        self._name = draw.text("x", "y", "text", source=self._names, text_baseline="middle", text_align="align",
                               x_offset="offset")

    def show(self, passage: Passage) -> None:
        """Draw the exact curve."""
        self._passage = passage
        self._line.glyph.line_alpha = 1.0 if passage.measured is None else 0.45
        self._show_curve()

    def _show_curve(self) -> None:
        passage, log = self._passage, self.scale == "log"
        if passage is None:
            return
        # First the count, then the curve: its arrival makes the browser look at the count. Tags of the source itself
        # would start a redrawing of the old data that the new then overtakes.
        self._line.tags = [passage.periods]
        drawn = passage.log10 if log else passage.transmission
        self._curve.data = {"energy": passage.energy * MEV, "log10": passage.log10.astype(np.float32),
                            "drawn": drawn.astype(np.float32)}
        top = 0.0 if log else 1.0
        _replace(self._poles, {"energy": passage.from_pole * MEV, "drawn": np.full(passage.from_pole.size, top)})
        beam, absorbed, lower, upper = (
            np.zeros(0) if side is None else _decades(side) if log else side
            for side in (passage.measured, passage.absorbed, passage.lower, passage.upper))
        _replace(self._absorbed, {"energy": passage.energy[: absorbed.size] * MEV, "drawn": absorbed})
        _replace(self._beam, {"energy": passage.energy[: beam.size] * MEV, "drawn": beam})
        _replace(self._envelope, {"energy": passage.energy[: lower.size] * MEV, "lower": lower, "upper": upper})

    def remember(self) -> None:
        """Keep the present curve beside the next one, as what was before."""
        self._earlier = self._passage
        self._show_before()

    def forget(self) -> None:
        """Take the curve of before away."""
        self._earlier = None
        self._show_before()

    @property
    def shows_before(self) -> bool:
        """Whether a curve of before is drawn."""
        return self._earlier is not None

    def _show_before(self) -> None:
        passage, log = self._earlier, self.scale == "log"
        data = {"energy": np.zeros(0), "drawn": np.zeros(0)} if passage is None else {
            "energy": passage.energy * MEV, "drawn": passage.log10 if log else passage.transmission}
        _replace(self._before, data)

    def lay(self, others: Sequence[Passage]) -> None:
        """Lay the curves of other stacks over this one's, in place of those that were."""
        self._others = tuple(others)
        for place, source in enumerate(self._laid):
            other = self._others[place] if place < len(self._others) else None
            drawn = np.zeros(0) if other is None else other.log10 if self.scale == "log" else other.transmission
            _replace(source, {"energy": np.zeros(0) if other is None else other.energy * MEV, "drawn": drawn})

    def clear(self) -> None:
        """Take the curve away, and the rows the browser holds."""
        self._passage = None
        self._line.tags = [-1]
        for source in (self._curve, self._poles, self._beam, self._absorbed, self._envelope):
            source.data = {name: [] for name in source.data}
        self.hold(None, -1)

    def hold(self, emergence: Emergence | None, version: int) -> None:
        """Give the browser the rows it may show at once, as those of a stack `version`; None takes them away."""
        if emergence is None:
            self._rows.update(tags=[-1], data={"energy": [], "rows": [], "counts": []})
            return
        self._rows.update(tags=[version], data={
            "energy": [(emergence.energy * MEV).astype(np.float32)], "rows": [emergence.rows],
            "counts": [emergence.counts.astype(np.int32)],
        })

    def ask(self, target: Target | None) -> None:
        """Draw the target's windows."""
        self._target = target
        blocks = [w.transmission for w in target.windows] if target else []
        deepest = min((math.log10(asked) for asked in blocks), default=-4.0)
        self._floor = min(-6.0, math.floor(deepest * 1.5 - 1))
        self._rescale()

    def switch(self, scale: Scale) -> None:
        """Show T on a logarithmic or a linear axis."""
        self.scale = scale
        self._rescale()
        self._show_curve()
        self._show_before()
        self.lay(self._others)

    @property
    def floor(self) -> float:
        """The lowest power of ten shown."""
        return self._floor

    def _rescale(self) -> None:
        log = self.scale == "log"
        low, high = (self._floor, _RIGHT["log"]) if log else (0.0, _RIGHT["linear"])
        self._x.update(start=low, end=high, reset_start=low, reset_end=high, tags=[self.scale])
        self._log_axis.visible, self._linear_axis.visible = log, not log
        self._show_windows(low, high)

    def _show_windows(self, low: float, high: float) -> None:
        windows = self._target.windows if self._target else ()
        place = [self._place(window.transmission) for window in windows]
        serif = 0.05 * (high - low)
        passing = [(w, x) for w, x in zip(windows, place, strict=True) if w.kind == "pass"]
        blocking = [(w, x) for w, x in zip(windows, place, strict=True) if w.kind == "block"]
        self._brackets.data = {
            "xs": [[x + serif, x, x, x + serif] for _, x in passing],
            "ys": [[w.bottom * MEV, w.bottom * MEV, w.top * MEV, w.top * MEV] for w, _ in passing],
        }
        self._hatched.data = {
            "left": [x for _, x in blocking], "right": [high for _ in blocking],
            "bottom": [w.bottom * MEV for w, _ in blocking], "top": [w.top * MEV for w, _ in blocking],
        }
        self._names.data = {
            "x": [x for _, x in (*passing, *blocking)],
            "y": [(w.bottom + w.top) / 2 * MEV for w, _ in (*passing, *blocking)],
            "text": [_caption(w) for w, _ in (*passing, *blocking)],
            "align": ["right"] * len(passing) + ["left"] * len(blocking),
            "offset": [-8] * len(passing) + [8] * len(blocking),
        }

    def _place(self, transmission: float) -> float:
        return math.log10(transmission) if self.scale == "log" else transmission

    def paint(self, palette: Palette) -> None:
        """Take on the colours of a theme."""
        paint_frame(self.figure, palette)
        for renderer in (self._line, self._held):
            renderer.glyph.line_color = palette.warm
        self._measured.glyph.line_color = palette.warm_deep
        self._stars.glyph.update(line_color=palette.warm_deep, fill_color=palette.card)
        self._loss.glyph.line_color = palette.missed
        self._past.glyph.line_color = palette.muted
        for renderer, colour in zip(self._over, palette.windows[1:], strict=False):
            renderer.glyph.line_color = colour
        self._between.glyph.fill_color = palette.warm
        self._bracket.glyph.line_color = palette.target
        self._hatching.glyph.update(line_color=palette.target, hatch_color=palette.target, hatch_alpha=0.4,
                                    fill_color=palette.target_tint)
        self._name.glyph.update(**text_style(palette.target), background_fill_color=palette.card,
                                background_fill_alpha=0.8, padding=2)


def _replace(source: ColumnDataSource, data: dict[str, Any]) -> None:
    """Set a source's data, unless it stays empty: the browser would draw the figure's lines once more for nothing."""
    if len(data["energy"]) or len(source.data["energy"]):
        source.data = data


def _decades(transmission: Floats) -> Floats:
    with np.errstate(divide="ignore"):
        return np.asarray(np.maximum(np.log10(transmission), _LOWEST_DECADE))


def _caption(window: Window) -> str:
    sign = "\N{GREATER-THAN OR EQUAL TO}" if window.kind == "pass" else "\N{LESS-THAN OR EQUAL TO}"
    mean = "mean " if window.measure == "mean" else ""
    return f"{window.kind}: {mean}{sign} {window.transmission:.3g}"


def describe_passes(passage: Passage, windows: Sequence[Window]) -> str:
    """The figure in words."""
    best = int(np.argmax(passage.transmission))
    low, high = passage.energy[0] * MEV, passage.energy[-1] * MEV
    asked = "; ".join(f"{w.kind} {w.bottom * MEV:.6g} to {w.top * MEV:.6g} meV, {_caption(w)}" for w in windows)
    return (f"Transmission of {passage.periods:,} periods from {low:.4g} to {high:.4g} meV: largest "
            f"{passage.transmission[best]:.4g} at {passage.energy[best] * MEV:.5g} meV, smallest "
            f"1e{passage.log10.min():.1f}. "
            f"{'Windows: ' + asked + '.' if asked else 'No window is asked.'} {passage.note}")
