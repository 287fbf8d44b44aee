"""All figures of the page on their one energy axis."""

from __future__ import annotations

from typing import Any

from transport import Verdict
from webapp.figures.dispersion import describe_points
from webapp.figures.emergence import describe_emergence
from webapp.figures.frame import MEV, EnergyAxis
from webapp.figures.lattice import LatticeFigure, Minibands, describe_lattice
from webapp.figures.margins import describe_margins
from webapp.figures.passes import PassesFigure, describe_passes
from webapp.figures.profile import ProfileFigure, describe_profile
from webapp.figures.ticks import Ticks
from webapp.pages.periods import PeriodsPage
from webapp.results import Emergence, Lattice, Span
from webapp.theme import Palette
from webapp.work import Pictures, Wanted

Texts = dict[str, str]
"""Figures in words, by name: the text alternative of each canvas."""


class Board:
    """The three figures of the bench and those of the pages."""

    def __init__(self, span: Span, drags: bool) -> None:
        self.axis = EnergyAxis(span[0] * MEV, span[1] * MEV)
        self.minibands = Minibands()
        self.profile = ProfileFigure(self.axis, drags)
        self.passes = PassesFigure(self.axis, drags)
        self.lattice = LatticeFigure(self.axis, self.minibands, drags)
        self.periods = PeriodsPage(self.axis, self.minibands, drags)
        self.minibands.shade(self.profile.figure)
        self.minibands.shade(self.passes.figure)
        self.ticks = Ticks()
        self.ticks.draw(self.profile.figure)
        self.ticks.draw(self.passes.figure, measured=True)
        self.ticks.draw(self.lattice.figure)
        self._lattice: Lattice | None = None
        self._emergence: Emergence | None = None
        self._version = -1

    @property
    def figures(self) -> tuple[Any, ...]:
        """Every figure; each is known by its name."""
        page = self.periods
        parts = (self.profile, self.passes, self.lattice, page.margins, page.emergence, page.dispersion)
        return tuple(part.figure for part in parts)

    def paint(self, palette: Palette) -> None:
        """Take on the colours of a theme."""
        for part in (self.profile, self.passes, self.lattice, self.minibands, self.ticks, self.periods):
            part.paint(palette)

    def show(self, wanted: Wanted, found: Pictures) -> Texts:
        """Draw the bench, and of it only what has changed; returns its figures in words."""
        stack = wanted.scenario.stack
        self.profile.show(found.profile, wanted.span)
        self.passes.show(found.passage)
        if found.lattice is not self._lattice:
            self._lattice = found.lattice
            self.minibands.show(found.lattice.bands)
            self.lattice.show(found.lattice)
        self.lattice.show_points(found.points)
        if wanted.version != self._version:
            self._version = wanted.version
            self.passes.hold(found.emergence, wanted.version)
        windows = wanted.scenario.target.windows if wanted.scenario.target else ()
        return {
            "profile": describe_profile(stack, found.profile),
            "passes": describe_passes(found.passage, windows),
            "curve-note": found.passage.note,
            "lattice": describe_lattice(found.lattice),
            "certificate": found.lattice.bands.certificate.sentence,
        }

    def show_page(self, wanted: Wanted, found: Pictures) -> Texts:
        """Draw the figures of the page, and of them only what has changed; returns them in words."""
        page, periods = self.periods, wanted.scenario.stack.periods
        page.reveal()
        page.mark(periods)
        page.dispersion.show_points(found.points, found.at_points, periods)
        if found.emergence is not self._emergence:
            self._emergence = found.emergence
            page.emergence.show(found.emergence, self.passes.floor)
            page.dispersion.show(found.lattice)
        return {
            "emergence": describe_emergence(found.emergence),
            "dispersion": describe_points(found.points, found.at_points, periods),
        }

    def show_verdict(self, verdict: Verdict | None) -> Texts:
        """Draw the margins; returns the figure in words."""
        self.periods.margins.show(verdict)
        return {"margins": describe_margins(verdict) if verdict else "No window is asked, so there is no margin."}

    def clear(self) -> None:
        """Take away what belongs to a stack that cannot be worked out."""
        self._lattice, self._emergence, self._version = None, None, -1
        self.minibands.show(None)
        for part in (self.passes, self.lattice, self.periods.emergence, self.periods.dispersion):
            part.clear()
