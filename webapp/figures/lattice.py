"""The infinite lattice: dispersion in the minibands, decay per period in the gaps, minibands shaded everywhere."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from bokeh.models import ColumnDataSource, HStrip, Range1d

from transport import Bands
from webapp.figures.frame import MEV, EnergyAxis, energy_frame, paint_frame, text_style
from webapp.results import Lattice, Points
from webapp.theme import Palette

PHASE_LABEL = "Bloch phase K d / \u03c0"
_BOTH_LABEL = "K d / \u03c0,  in gaps \u03bad / \u03c0 (dotted)"
_WIDEST = 2.0


_BAND_COLUMNS = ("bottom", "top", "name", "corner", "below")


class Minibands:
    """The minibands as shaded strips, one source for every figure that shows them."""

    def __init__(self) -> None:
        self._source = ColumnDataSource({name: [] for name in _BAND_COLUMNS}, name="bands")
        self._glyphs: list[Any] = []
        self._names: list[Any] = []

    def shade(self, frame: Any, names: bool = False) -> None:
        """Shade the minibands in a figure, beneath everything else; with `names`, number them at x = 0."""
        glyph = HStrip(y0="bottom", y1="top", fill_alpha=0.55, line_width=1, line_alpha=0.7)
        frame.add_glyph(self._source, glyph, level="underlay")
        self._glyphs.append(glyph)
        if names:
            self._names.append(frame.text(0, "corner", "name", source=self._source,
                                          x_offset=2, y_offset="below"))

    def outline(self, frame: Any) -> None:
        """Draw the edges only, over everything else."""
        glyph = HStrip(y0="bottom", y1="top", fill_alpha=0.0, line_width=1.5, line_dash=[6, 3])
        frame.add_glyph(self._source, glyph, level="overlay")
        self._glyphs.append(glyph)

    def show(self, bands: Bands | None) -> None:
        """Take on the bands found."""
        found = bands.bands if bands else ()
        self._source.data = {
            "bottom": [b.bottom * MEV for b in found], "top": [b.top * MEV for b in found],
            "name": [f"miniband {b.index}" for b in found],
            # The corner at K = 0 that the dispersion leaves free: the top of odd bands, the bottom of even ones.
            "corner": [(b.top if b.index % 2 else b.bottom) * MEV for b in found],
            "below": [13 if b.index % 2 else -5 for b in found],
        }

    def paint(self, palette: Palette) -> None:
        """Take on the colours of a theme."""
        for glyph in self._glyphs:
            glyph.update(fill_color=palette.cool_tint, line_color=palette.cool)
        for renderer in self._names:
            renderer.glyph.update(**text_style(palette.cool_deep))


class LatticeFigure:
    """K d in the bands, the decay in the gaps, both in units of pi, with the finite stack's own points."""

    def __init__(self, axis: EnergyAxis, minibands: Minibands, drags: bool) -> None:
        self._x = Range1d(start=-0.03, end=1.03)
        self.figure: Any = energy_frame("lattice", axis, _BOTH_LABEL, self._x, drags)
        minibands.shade(self.figure, names=True)
        self._bloch = ColumnDataSource({"energy": [], "phase": [], "decay": [], "rejection": []}, name="bloch")
        # No glyph draws these, which the readout needs; as a tag they travel with the figure all the same.
        self.figure.tags = [self._bloch]
        self._lines = ColumnDataSource({"energy": [], "phase": [], "decay": []})
        self._points = ColumnDataSource({"energy": [], "phase": []})
        self._decay = self.figure.line("decay", "energy", source=self._lines, line_width=2, line_dash=[2, 3])
        self._phase = self.figure.line("phase", "energy", source=self._lines, line_width=2.5)
        self._dots = self.figure.scatter("phase", "energy", source=self._points, size=5, line_width=0)

    def show(self, lattice: Lattice) -> None:
        """Draw dispersion and decay."""
        found = lattice.bloch
        whole = {"energy": found.energy * MEV, "phase": found.phase / math.pi, "decay": found.decay,
                 "rejection": found.rejection_dB}
        self._bloch.data = whole
        self._lines.data = dispersion_lines(lattice)
        end = min(max(1.03, 1.05 * float(found.decay.max(initial=0.0)) / math.pi), _WIDEST)
        self._x.update(end=end, reset_start=-0.03, reset_end=end)

    def show_points(self, points: Points) -> None:
        """Draw the finite stack's own points."""
        self._points.data = {"energy": points.energy * MEV, "phase": points.phase / math.pi}

    def clear(self) -> None:
        """Take everything away."""
        for source in (self._bloch, self._lines, self._points):
            source.data = {name: [] for name in source.data}

    def paint(self, palette: Palette) -> None:
        """Take on the colours of a theme."""
        paint_frame(self.figure, palette)
        self._phase.glyph.line_color = palette.cool
        self._decay.glyph.line_color = palette.cool_deep
        self._dots.glyph.update(fill_color=palette.warm, line_color=palette.warm)


def dispersion_lines(lattice: Lattice) -> dict[str, Any]:
    """Phase where there is a band, decay where there is none, NaN elsewhere so that the lines break there."""
    found, edges = lattice.bloch, lattice.bands.bands
    energy = found.energy
    inside = np.zeros(energy.shape, dtype=bool)
    for band in edges:
        inside |= (energy >= band.bottom) & (energy <= band.top)
    # An edge belongs to both lines.
    gap = ~inside | np.isin(energy, [edge for band in edges for edge in (band.bottom, band.top)])
    return {"energy": energy * MEV, "phase": np.where(inside, found.phase / math.pi, math.nan),
            "decay": np.where(gap, found.decay / math.pi, math.nan)}


def describe_lattice(lattice: Lattice) -> str:
    """The figure in words."""
    bands = "; ".join(f"miniband {b.index} from {b.bottom * MEV:.5g} to {b.top * MEV:.5g} meV"
                      for b in lattice.bands.bands)
    return f"Infinite lattice, {lattice.bands.certificate.sentence}: {bands or 'no miniband in this range'}."
