"""The band-edge profile along growth."""

from __future__ import annotations

from typing import Any

import numpy as np
from bokeh.models import ColumnDataSource, Range1d

from transport import Profile, Stack
from webapp.figures.frame import MEV, EnergyAxis, energy_frame, paint_frame
from webapp.results import MOST_DRAWN_PERIODS, Span
from webapp.theme import Palette


class ProfileFigure:
    """Band edge over position, deltas as stems with a head that says which way they point."""

    def __init__(self, axis: EnergyAxis, drags: bool) -> None:
        self._x = Range1d(start=0, end=1)
        self.figure: Any = energy_frame("profile", axis, "position along growth (nm)", self._x, drags)
        self._edge = ColumnDataSource({"position": [], "potential": [], "ground": []}, name="profile-source")
        self._deltas = ColumnDataSource({"position": [], "foot": [], "head": [], "marker": []})
        self._area = self.figure.varea("position", "ground", "potential", source=self._edge, fill_alpha=0.55)
        self._line = self.figure.line("position", "potential", source=self._edge, line_width=2, line_join="miter")
        self._stems = self.figure.segment("position", "foot", "position", "head", source=self._deltas, line_width=2.5)
        self._heads = self.figure.scatter("position", "head", source=self._deltas, marker="marker", size=7)

    def show(self, profile: Profile, span: Span) -> None:
        """Draw a profile, filled down to the bottom of `span` (eV)."""
        position, potential = profile.position, profile.potential * MEV
        ground = np.full_like(position, min(span[0] * MEV, float(potential.min())))
        self._edge.data = {"position": position, "potential": potential, "ground": ground}
        if profile.deltas or len(self._deltas.data["position"]):
            self._deltas.data = _stems(profile, 0.3 * (span[1] - span[0]) * MEV)
        self._x.update(start=float(position[0]), end=float(position[-1]), reset_start=float(position[0]),
                       reset_end=float(position[-1]))

    def paint(self, palette: Palette) -> None:
        """Take on the colours of a theme."""
        paint_frame(self.figure, palette)
        self._area.glyph.fill_color = palette.warm_tint
        for renderer in (self._line, self._stems):
            renderer.glyph.line_color = palette.warm
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
