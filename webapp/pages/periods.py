"""The page *Periods*: how many are needed, what limits each count, and how the bands emerge as periods are added."""

from __future__ import annotations

from typing import Any

from bokeh.models import Span

from transport import Verdict
from webapp.figures.dispersion import DispersionFigure
from webapp.figures.emergence import EmergenceFigure
from webapp.figures.frame import EnergyAxis
from webapp.figures.lattice import Minibands
from webapp.figures.margins import MarginsFigure, window_colour, window_name
from webapp.theme import Palette

View = dict[str, Any]


class PeriodsPage:
    """Three figures; a vertical line in two of them marks the present number of periods."""

    def __init__(self, axis: EnergyAxis, minibands: Minibands, drags: bool) -> None:
        self._marker = Span(location=1, dimension="height", line_width=2, name="periods-marker")
        self.margins = MarginsFigure(self._marker, drags)
        self.emergence = EmergenceFigure(axis, minibands, self._marker, drags)
        self.dispersion = DispersionFigure(axis, minibands, drags)

        self.reveal(False)

    def reveal(self, visible: bool = True) -> None:
        """Let the figures be seen: not before those of the bench are, which a visitor waits for first."""
        for part in (self.margins, self.emergence, self.dispersion):
            part.figure.visible = visible

    def mark(self, periods: int) -> None:
        """Mark the present number of periods."""
        self._marker.location = periods

    def paint(self, palette: Palette) -> None:
        """Take on the colours of a theme."""
        self._marker.line_color = palette.marker
        for part in (self.margins, self.emergence, self.dispersion):
            part.paint(palette)


def verdict_view(verdict: Verdict | None, periods: int, palette: Palette) -> View:
    """The verdict as the page shows it: the sentence, whether it is good, and how the present count stands."""
    if verdict is None:
        return {"state": "none", "sentence": "No window is asked: add a pass or block window to get a verdict.",
                "present": "", "legend": []}
    return {
        "state": "met" if verdict.fewest is not None else "missed",
        "sentence": verdict.sentence,
        "present": _present(verdict, periods),
        "legend": [{"colour": window_colour(index, palette), "kind": window.kind, "name": window_name(verdict, index)}
                   for index, window in enumerate(verdict.windows)],
    }


def _present(verdict: Verdict, periods: int) -> str:
    """How the stack on screen stands."""
    words = "1 period" if periods == 1 else f"{periods:,} periods"
    if periods > len(verdict.per_period):
        return f"This stack: {words}, more than the {len(verdict.per_period)} that may be grown."
    check = verdict.per_period[periods - 1]
    outcome = "meet" if check.meets else "miss"
    verb = outcome + ("es" if outcome == "miss" and periods == 1 else "s" if periods == 1 else "")
    margin = "" if check.margin_dB is None else f", margin {check.margin_dB:+.1f} dB".replace("-", "\N{MINUS SIGN}")
    limiting = "" if check.limiting_window is None else f" ({window_name(verdict, check.limiting_window)})"
    return f"This stack: {words} {verb} the target{margin}{limiting}."
