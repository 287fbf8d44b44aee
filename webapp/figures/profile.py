"""The band-edge profile along growth, with the wave of a resonance or the local density of states on it."""

from __future__ import annotations

from typing import Any

import numpy as np
from bokeh.models import ColumnDataSource, LinearColorMapper, Range1d

from transport import Profile, Stack
from webapp.figures.frame import MEV, EnergyAxis, energy_frame, paint_frame
from webapp.ledger import Density, Trace
from webapp.results import MOST_DRAWN_PERIODS, Span
from webapp.theme import Palette, heat_colours

_WAVE_HEIGHT = 0.16
"""How high a wave is drawn, as a share of the span shown."""
_DECADES = 6.0
"""Powers of ten of local density that colours tell apart."""

class ProfileFigure:
    """Band edge over position, deltas as stems with a head that says which way they point."""

    def __init__(self, axis: EnergyAxis, drags: bool) -> None:
        self._x = Range1d(start=0, end=1)
        self.figure: Any = energy_frame("profile", axis, "position along growth (nm)", self._x, drags)
        self._edge = ColumnDataSource({"position": [], "potential": [], "ground": []}, name="profile-source")
        self._deltas = ColumnDataSource({"position": [], "foot": [], "head": [], "marker": []})
        self._wave = ColumnDataSource({"position": [], "foot": [], "head": []}, name="wave")
        self._density = ColumnDataSource({"image": [], "x": [], "y": [], "width": [], "height": []}, name="density")
        self._height = 1.0
        self._colours = LinearColorMapper(low=-_DECADES, high=0, palette=["#000000", "#ffffff"])
        self._picture = self.figure.image("image", "x", "y", "width", "height", source=self._density,
                                          color_mapper=self._colours)
        self._area = self.figure.varea("position", "ground", "potential", source=self._edge, fill_alpha=0.55)
        self._line = self.figure.line("position", "potential", source=self._edge, line_width=2, line_join="miter")
        self._stems = self.figure.segment("position", "foot", "position", "head", source=self._deltas, line_width=2.5)
        self._heads = self.figure.scatter("position", "head", source=self._deltas, marker="marker", size=7)
        self._filling = self.figure.varea("position", "foot", "head", source=self._wave, fill_alpha=0.35)
        self._crest = self.figure.line("position", "head", source=self._wave, line_width=1.5)

    def show(self, profile: Profile, span: Span) -> None:
        """Draw a profile, filled down to the bottom of `span` (eV)."""
        self._height = _WAVE_HEIGHT * (span[1] - span[0]) * MEV
        position, potential = profile.position, profile.potential * MEV
        ground = np.full_like(position, min(span[0] * MEV, float(potential.min())))
        self._edge.data = {"position": position, "potential": potential, "ground": ground}
        if profile.deltas or len(self._deltas.data["position"]):
            self._deltas.data = _stems(profile, 0.3 * (span[1] - span[0]) * MEV)
        self._x.update(start=float(position[0]), end=float(position[-1]), reset_start=float(position[0]),
                       reset_end=float(position[-1]))

    def trace(self, found: Trace | None, energy: float) -> None:
        """Draw the wave of a resonance, standing on its energy (eV); None takes it away."""
        if found is None:
            if len(self._wave.data["position"]):
                self._wave.data = {"position": [], "foot": [], "head": []}
            return
        foot = np.full_like(found.position, energy * MEV)
        crest = foot + self._height * found.density / (float(found.density.max()) or 1.0)
        self._wave.data = {"position": found.position, "foot": foot, "head": crest}

    def shade(self, found: Density | None) -> None:
        """Draw the local density of states beneath the profile; None takes it away."""
        self._area.visible = found is None
        if found is None:
            self._density.data = {name: [] for name in self._density.data}
            return
        seen = found.image[np.isfinite(found.image)]
        top = float(seen.max()) if seen.size else 0.0
        self._colours.update(low=top - _DECADES, high=top)
        low, high = (edge * MEV for edge in found.span)
        self._density.data = {"image": [found.image.astype(np.float32)], "x": [0.0], "y": [low],
                              "width": [found.length], "height": [high - low]}

    def paint(self, palette: Palette) -> None:
        """Take on the colours of a theme."""
        paint_frame(self.figure, palette)
        self._area.glyph.fill_color = palette.warm_tint
        for renderer in (self._line, self._stems):
            renderer.glyph.line_color = palette.warm
        self._filling.glyph.fill_color = self._crest.glyph.line_color = palette.warm_deep
        self._colours.update(palette=heat_colours(palette), low_color=palette.card, nan_color=palette.card)
        self._heads.glyph.update(line_color=palette.warm, fill_color=palette.warm)


def _stems(profile: Profile, tallest: float) -> dict[str, Any]:
    """Every delta as a stem, the strongest `tallest` meV high: its strength has no place on the energy axis."""
    position = np.array([place for place, _ in profile.deltas])
    strength = np.array([value for _, value in profile.deltas])
    foot = np.interp(position, profile.position, profile.potential) * MEV if position.size else position
    largest = np.abs(strength).max() if strength.size else 1.0
    height = tallest * strength / (largest or 1.0)
    markers = np.where(strength >= 0, "triangle", "inverted_triangle")
    return {"position": position, "foot": foot, "head": foot + height, "marker": markers}


def describe_profile(stack: Stack, profile: Profile) -> str:
    """The figure in words."""
    length = profile.position[-2] - profile.position[1]
    top, bottom = profile.potential.max() * MEV, profile.potential.min() * MEV
    cut = f" Only the first {MOST_DRAWN_PERIODS} are drawn." if stack.periods > MOST_DRAWN_PERIODS else ""
    return (f"{stack.periods:,} periods of {stack.period_length:.4g} nm between the leads, {length:.4g} nm drawn. "
            f"The band edge runs from {bottom:.4g} to {top:.4g} meV above the left lead's.{cut}")
