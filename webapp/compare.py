"""Comparing in one session: up to three stacks laid over the one on the bench, and a table of what differs."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from transport import Scenario
from webapp.figures.passes import PassesFigure
from webapp.latest import Latest, Stop
from webapp.messages import in_words
from webapp.pages.compare import Facts, compare_view, facts
from webapp.remedies import Later
from webapp.results import Passage, Span, passage
from webapp.service import Visit
from webapp.theme import LIGHT, Palette

MOST_LAID = 3
"""Stacks laid over the one on the bench at most."""


@dataclass(frozen=True, slots=True)
class Laid:
    """A stack laid over the bench, and what it is called there."""

    name: str
    scenario: Scenario


@dataclass(frozen=True, slots=True)
class Comparison:
    """A comparison to be worked out: the present scenario, those laid over it, and the energies seen (eV)."""

    present: Scenario
    laid: tuple[Laid, ...]
    view: Span


def comparison(asked: Comparison, stop: Stop) -> tuple[tuple[Passage, ...], tuple[Facts, ...]]:
    """The curves of those laid over the bench, and the facts of all. Raises Stopped."""
    curves = []
    for one in asked.laid:
        stop.check()
        curves.append(passage(one.scenario.stack, asked.view, 0.0))
    columns = []
    for scenario in (asked.present, *(one.scenario for one in asked.laid)):
        stop.check()
        columns.append(facts(scenario))
    return tuple(curves), tuple(columns)


class Compare:
    """What is laid over the bench. `tell` hands named parts to the page; `later` is the way of results to it."""

    def __init__(self, tell: Callable[..., None], passes: PassesFigure, later: Later, visit: Visit) -> None:
        self._tell, self._passes = tell, passes
        self._palette = LIGHT
        self._laid: tuple[Laid, ...] = ()
        self._present: Scenario | None = None
        self._view: Span = (0.0, 0.0)
        self._columns: tuple[Facts, ...] = ()
        self._work = Latest(comparison, later(self._show), later(self._fail), interrupts=True, line=visit.line)

    def close(self) -> None:
        """The visitor has gone."""
        self._work.cancel()

    def lay(self, name: str, scenario: Scenario) -> None:
        """Lay a stack over the bench; the oldest goes where there are too many."""
        self._laid = (*self._laid, Laid(name, scenario))[-MOST_LAID:]
        self._ask()

    def take(self, place: int) -> None:
        """Take one of those laid over the bench away."""
        self._laid = tuple(one for index, one in enumerate(self._laid) if index != place)
        self._ask()

    def follow(self, scenario: Scenario, view: Span) -> None:
        """The bench shows `scenario` over `view` (eV)."""
        if (scenario, view) != (self._present, self._view):
            self._present, self._view = scenario, view
            if self._laid:
                self._ask()

    def paint(self, palette: Palette) -> None:
        """Take on the colours of a theme."""
        self._palette = palette
        if self._columns:
            self._draw()

    def _ask(self) -> None:
        if self._present is None:
            return
        if self._laid:
            self._work.ask(Comparison(self._present, self._laid, self._view))
        else:
            self._work.cancel()
            self._columns = ()
            self._passes.lay(())
            self._draw()

    def _show(self, asked: Comparison, found: tuple[tuple[Passage, ...], tuple[Facts, ...]]) -> None:
        if asked.laid == self._laid:
            curves, self._columns = found
            self._passes.lay(curves)
            self._draw()

    def _fail(self, asked: Comparison, error: Exception) -> None:
        self._columns = ()
        self._passes.lay(())
        self._tell(compare={"names": [], "colours": [], "rows": [], "fault": in_words(error)})

    def _draw(self) -> None:
        names = ["on the bench", *(one.name for one in self._laid)]
        colours = [self._palette.warm, *self._palette.windows[1:MOST_LAID + 1]]
        self._tell(compare=compare_view(names, list(self._columns), colours) | {"fault": ""})
