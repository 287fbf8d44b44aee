"""The page *Peaks* of one session: ledger, chosen resonance, local density and fit, worked out off the event loop."""

from __future__ import annotations

import asyncio
from collections.abc import Callable, Sequence

from transport import PeakFit, Scenario, Stack
from webapp.figures.profile import ProfileFigure
from webapp.figures.ticks import Ticks
from webapp.jobs import in_line
from webapp.latest import Latest, Stop
from webapp.ledger import Density, Fitting, Ledger, Listing, Trace, Traced, density, fit, ledger, trace
from webapp.messages import in_words
from webapp.pages.peaks import fit_view, ledger_view, measured_view, no_ledger, resonance_view
from webapp.remedies import Later
from webapp.results import Span
from webapp.service import Visit

_POLL = 0.2


class Peaks:
    """Follows the bench. `tell` hands named parts to the page; `later` is the way of results to it."""

    def __init__(
        self, tell: Callable[..., None], ticks: Ticks, profile: ProfileFigure, later: Later, visit: Visit
    ) -> None:
        self._tell, self._ticks, self._profile, self._later = tell, ticks, profile, later
        self._listing: Listing | None = None
        self._ledger: Ledger | None = None
        self._chosen: int | None = None
        self._name: tuple[int, int] | None = None
        self._shows_density, self._seen = False, (0.0, 0.0)
        self._fit: PeakFit | None = None
        self._fit_state, self._sentence, self._share = "none", "", 0.0
        self._ledgers = Latest(ledger, later(self._listed), later(self._not_listed), interrupts=True, line=visit.line)
        self._traces = Latest(trace, later(self._traced), later(self._not_traced), interrupts=True)
        self._densities: Latest[tuple[Stack, Span], Density] = Latest(
            density, later(self._pictured), later(self._not_pictured), interrupts=True)
        self._fits = Latest(self._work, later(self._fitted), later(self._not_fitted), interrupts=True,
                            line=visit.line)

    def close(self) -> None:
        """The visitor has gone."""
        for worker in (self._ledgers, self._traces, self._densities, self._fits):
            worker.cancel()

    # The ledger.

    def follow(self, scenario: Scenario, span: Span, view: Span) -> None:
        """The bench shows `scenario` over `span` (eV), of which `view` is seen."""
        self._seen = view
        listing = Listing(scenario, span)
        if listing != self._listing:
            if self._listing is None or scenario != self._listing.scenario:
                self._forget_fit()
            self._listing = listing
            self._ledgers.ask(listing)
            self._tell(measured=measured_view(scenario.document.measured))
        self._ask_density()

    def _listed(self, listing: Listing, found: Ledger) -> None:
        if listing != self._listing:
            return
        self._ledger = found
        names = list(zip(found.found.miniband.tolist(), found.found.number.tolist(), strict=True))
        # After an edit the same resonance is meant, not the one that now has its place in the list.
        self._chosen = names.index(self._name) if self._name in names else None
        self._ticks.show(found)
        self._tell(ledger=ledger_view(found, self._chosen))
        self._trace()

    def _not_listed(self, listing: Listing, error: Exception) -> None:
        if listing == self._listing:
            self._ledger, self._chosen = None, None
            self._ticks.show(None)
            self._trace()
            self._tell(ledger=no_ledger("fault", in_words(error)))

    # One resonance.

    def choose(self, place: int) -> None:
        """Trace the resonance at a place of the ledger; the one traced already is let go."""
        if self._ledger is None or not 0 <= place < self._ledger.found.energy.size:
            return
        self._chosen = None if place == self._chosen else place
        found = self._ledger.found
        self._name = (None if self._chosen is None
                      else (int(found.miniband[self._chosen]), int(found.number[self._chosen])))
        self._trace()

    def _trace(self) -> None:
        if self._ledger is None or self._chosen is None or self._listing is None:
            self._traces.cancel()
            self._profile.trace(None, 0.0)
            self._ticks.choose(None)
            self._tell(resonance=None, chosen=None)
            return
        self._ticks.choose(float(self._ledger.found.energy[self._chosen]))
        self._tell(chosen=self._chosen)
        self._traces.ask(Traced(self._listing.scenario, self._ledger.found, self._chosen))

    def _traced(self, asked: Traced, found: Trace) -> None:
        if self._ledger is not None and asked.found is self._ledger.found and asked.place == self._chosen:
            self._profile.trace(found, float(asked.found.energy[asked.place]))
            self._tell(resonance=resonance_view(self._ledger, asked.place, found))

    def _not_traced(self, asked: Traced, error: Exception) -> None:
        self._profile.trace(None, 0.0)
        self._tell(resonance={"title": f"Resonance {asked.place + 1}", "facts": in_words(error), "effects": []})

    # Local density of states.

    def show_density(self, shown: bool) -> None:
        """Draw the local density of states beneath the profile, or no longer."""
        self._shows_density = shown
        if not shown:
            self._densities.cancel()
            self._profile.shade(None)
        self._ask_density()

    @property
    def shows_density(self) -> bool:
        """Whether the local density of states is drawn."""
        return self._shows_density

    def _ask_density(self) -> None:
        if self._shows_density and self._listing is not None:
            self._densities.ask((self._listing.scenario.stack, self._seen))

    def _pictured(self, _: object, found: Density) -> None:
        self._profile.shade(found if self._shows_density else None)

    def _not_pictured(self, _: object, error: Exception) -> None:
        self._profile.shade(None)

    # The fit.

    def look(self, figures: Sequence[str]) -> None:
        """Fit some figures to the measured peaks."""
        if self._listing is None:
            return
        self._fit, self._fit_state, self._sentence, self._share = None, "working", "", 0.0
        self._draw_fit()
        self._fits.ask(Fitting(self._listing.scenario, tuple(figures)))
        asyncio.get_running_loop().create_task(self._watch())

    def stop(self) -> None:
        """Give up fitting."""
        self._forget_fit()

    def chosen_fit(self) -> Scenario | None:
        """The scenario with the fitted figures; None where there is none."""
        return self._fit.scenario if self._fit else None

    def _forget_fit(self) -> None:
        if self._fit_state != "none":
            self._fits.cancel()
            self._fit, self._fit_state, self._sentence = None, "none", ""
            self._draw_fit()

    def _work(self, asked: Fitting, stop: Stop) -> PeakFit:
        return fit(asked, stop, self._progress)

    def _progress(self, share: float) -> None:
        self._share = share

    async def _watch(self) -> None:
        while self._fit_state == "working":
            await asyncio.sleep(_POLL)
            self._later(self._draw_fit)()

    def _fitted(self, _: Fitting, found: PeakFit) -> None:
        if self._fit_state == "working":
            self._fit, self._fit_state = found, "known"
            self._draw_fit()

    def _not_fitted(self, _: Fitting, error: Exception) -> None:
        if self._fit_state == "working":
            self._fit_state, self._sentence = "fault", in_words(error)
            self._draw_fit()

    def _draw_fit(self) -> None:
        view = fit_view(self._fit_state, self._sentence, self._share, self._fit)
        self._tell(fit=view | {"waits": in_line(self._fits.waits_behind)})
