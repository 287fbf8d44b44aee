"""What all figures share: the energy axis, frames that line up, tools, the crosshair, the colours of both themes."""

from __future__ import annotations

from typing import Any

from bokeh.core.properties import value
from bokeh.models import (
    BoxZoomTool,
    CrosshairTool,
    PanTool,
    Range1d,
    ResetTool,
    SaveTool,
    Span,
    WheelZoomTool,
)
from bokeh.plotting import figure

from webapp.theme import FONT, Palette

MEV = 1e3
"""meV per eV: the engine speaks eV, screens meV."""
ENERGY_LABEL = "E above the left lead\N{RIGHT SINGLE QUOTATION MARK}s band edge (meV)"

_TEXT, _SMALL = "12px", "11px"
_TOOLBAR = ":host{--icon-color:var(--muted);--highlight-color:var(--cool)} .bk-divider{background-color:var(--line)}"
"""The toolbar in the page's own colours, whatever the theme."""


class EnergyAxis:
    """The one energy axis of the page: its range (meV) and the horizontal line that follows the pointer."""

    def __init__(self, low: float, high: float) -> None:
        self.range = Range1d(low, high, name="energy-range")
        self.pointer = Span(dimension="width", line_width=1, line_dash=[4, 3], name="energy-pointer",
                            syncable=False)

    def reset_to(self, low: float, high: float) -> None:
        """Show `low` to `high` (meV), and make them what the reset tool goes back to."""
        self.range.update(start=low, end=high, reset_start=low, reset_end=high)


def energy_frame(name: str, axis: EnergyAxis, x_label: str, x_range: Range1d, drags: bool) -> Any:
    """An empty figure on the shared energy axis. `drags`: a drag zooms; without, it scrolls the page (touch)."""
    frame = _frame(name, x_label, x_range, axis.range, drags, dimensions="height")
    frame.yaxis.axis_label = ENERGY_LABEL
    frame.add_tools(CrosshairTool(overlay=[axis.pointer, Span(dimension="height", visible=False)]))
    return frame


def plain_frame(name: str, x_label: str, y_label: str, x_range: Range1d, y_range: Range1d, drags: bool) -> Any:
    """An empty figure with a vertical axis of its own."""
    frame = _frame(name, x_label, x_range, y_range, drags, dimensions="both")
    frame.yaxis.axis_label = y_label
    return frame


def _frame(name: str, x_label: str, x_range: Range1d, y_range: Range1d, drags: bool, dimensions: Any) -> Any:
    zoom = BoxZoomTool(dimensions=dimensions)
    # Without a key held down the wheel keeps scrolling the page.
    wheel = WheelZoomTool(modifiers="ctrl", description="Wheel zoom (hold Ctrl)")
    frame = figure(
        name=name, x_range=x_range, y_range=y_range, sizing_mode="stretch_both", toolbar_location="above",
        tools=[zoom, PanTool(), wheel, ResetTool(), SaveTool(filename=f"colonnade-{name}")],
        active_drag=zoom if drags else None, active_scroll=wheel,
        # Fixed borders: frames of different axes would else differ by some pixels, and equal energies with them.
        min_border_left=64, min_border_right=14, min_border_bottom=52, min_border_top=10,
    )
    frame.toolbar.update(logo=None, stylesheets=[_TOOLBAR])
    frame.xaxis.axis_label = x_label
    frame.grid.grid_line_width = 1
    return frame


def paint_frame(frame: Any, palette: Palette) -> None:
    """Axes, grid and ground of a figure in the colours of a theme."""
    frame.update(background_fill_color=palette.card, border_fill_color=palette.card, border_line_color=None,
                 outline_line_color=palette.line)
    for axis in frame.axis:
        axis.update(
            axis_label_text_color=palette.ink, axis_label_text_font=FONT, axis_label_text_font_size=_TEXT,
            axis_label_text_font_style="normal", axis_label_standoff=8,
            major_label_text_color=palette.muted, major_label_text_font=FONT, major_label_text_font_size=_SMALL,
            axis_line_color=palette.line, major_tick_line_color=palette.line, minor_tick_line_color=None,
            major_tick_in=0, major_tick_out=4,
        )
    frame.grid.grid_line_color = palette.grid


def text_style(colour: str) -> dict[str, Any]:
    """Properties of a text glyph within a figure."""
    return {"text_color": colour, "text_font": value(FONT), "text_font_size": value(_SMALL)}
