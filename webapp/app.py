"""One session of the page: what the browser says goes to the bench, what the engine finds goes to the figures."""

from __future__ import annotations

import asyncio
from collections.abc import Callable
from dataclasses import asdict
from functools import partial
from typing import Any

from bokeh.document import Document
from panel.io.document import hold

from transport import Scenario, ScenarioError, Verdict
from transport.document import GrowthRecord
from transport.fewest import Asked
from webapp import log
from webapp import messages as say
from webapp.bench import Bench
from webapp.compare import Compare
from webapp.editor import Rail
from webapp.figures.board import Board
from webapp.files import Entry
from webapp.handing import Handing
from webapp.jobs import in_line
from webapp.latest import Latest, Stop
from webapp.link import Page, Shown, encode
from webapp.messages import in_words
from webapp.pages.periods import verdict_view
from webapp.peaks import Peaks
from webapp.ranges import Ranges
from webapp.remedies import Remedies
from webapp.results import Band, Span, most_periods, natural_span, question
from webapp.service import Visit
from webapp.theme import LIGHT, PALETTES
from webapp.wire import Wire
from webapp.work import Pictures, Wanted, pictures, verdict

_POLL = 0.2
_SLOW = 0.3
_PAUSE, _REST = 0.08, 0.25


class Session:
    """Owns the bench of one visitor, its figures and the work behind them."""

    def __init__(self, document: Document, bench: Bench, drags: bool, visit: Visit, linked: Shown | None) -> None:
        self._document, self._bench, self._visit, self._linked = document, bench, visit, linked
        self._palette = LIGHT
        self._seq, self._version, self._share = 0, 0, 0.0
        self._question: Asked | None = None
        self._verdict: Verdict | None = None
        self._verdict_state = "none"
        self._range: dict[str, str] | None = None
        self._growth: GrowthRecord | None = None
        self._held: tuple[object, ...] = ()
        self._wanted: Wanted | None = None
        self._page: asyncio.TimerHandle | None = None
        self._span = natural_span(question(bench.scenario))
        self.board = Board(self._span, drags)
        self.board.paint(LIGHT)
        self.board.axis.range.on_change("start", self._viewed)
        self.board.axis.range.on_change("end", self._viewed)
        self.wire = Wire(self.hear)
        self._pictures = Latest(pictures, self._later(self._show_pictures), self._later(self._fail_pictures))
        self._verdicts = Latest(self._work_out, self._later(self._show_verdict), self._later(self._fail_verdict),
                                interrupts=True, line=visit.line)
        self._ranges = Ranges(self._tell_range, self._draw_band, self._later, visit)
        self._remedies = Remedies(lambda view: self.wire.tell(remedies=view), self._later, visit)
        self._peaks = Peaks(self.wire.tell, self.board.ticks, self.board.profile, self._later, visit)
        self._compare = Compare(self.wire.tell, self.board.passes, self._later, visit)
        self._handing = Handing(self.wire.tell, self._later, visit)
        self._listing: Latest[None, tuple[Entry, ...]] = Latest(
            lambda _, stop: bench.folder.offered(), self._later(self._show_files), self._later(self._fail_files))

    def close(self) -> None:
        """The visitor has gone."""
        for worker in (self._pictures, self._verdicts, self._listing):
            worker.cancel()
        self._ranges.forget()
        self._remedies.forget()
        self._peaks.close()
        self._compare.close()
        self._handing.close()
        if self._page is not None:
            self._page.cancel()

    # From the browser.

    def hear(self, data: object) -> None:
        """Act on one message of the browser."""
        self._later(self._act)(say.read(data))

    def _act(self, message: say.AnyMessage) -> None:
        self._seq = message.seq
        if self._visit.view_only and say.changes_something(message):
            self._bench.refuse("view", "This page is for looking: sliders move, and nothing else is changed or saved.")
            self.wire.tell(status=self._status())
            return
        match message:
            case say.Hello(theme=theme):
                self._paint(theme)
                self._follow(reset=True)
                self._reopen()
            case say.Theme(theme=theme):
                self._paint(theme)
                self._tell_verdict()
            case say.Scale(scale=scale):
                self.board.passes.switch(scale)
            case say.Browse():
                self._listing.ask(None)
            case say.Cancel():
                self._verdicts.cancel()
                self._verdict_state = "stopped"
                self._tell_verdict()
            case say.Again():
                self._ask_verdict(question(self._bench.scenario))
            case say.Save(name=name, agreed=agreed):
                objections = self._bench.save(name, agreed)
                if objections:
                    self.wire.tell(objections={"name": name, "sentences": objections})
                elif (notice := self._bench.notice) and not notice.is_fault:
                    log.tell("saved", self._bench.place or "")
                self._tell_rail()
            case say.Slide(periods=periods):
                self._bench.slide(periods)
                self._follow(rail=False)
            case say.Settle():
                self._bench.settle()
                self.wire.tell(status=self._status(), kept=self._bench.kept())
            case _:
                self._act_on_page(message)

    def _act_on_page(self, message: say.AnyMessage) -> None:
        """What the pages below the bench ask for; anything else is an edit."""
        match message:
            case say.Propose(what=what, whole=whole):
                self._remedies.look(self._bench.scenario, what, whole)
            case say.StopProposing():
                self._remedies.stop()
            case say.Trace(place=place):
                self._peaks.choose(place)
            case say.Density(shown=shown):
                self._peaks.show_density(shown)
            case say.Lay(name=name, demo=demo):
                if laid := self._bench.laid(name, demo):
                    self._compare.lay(*laid)
                self.wire.tell(status=self._status())
            case say.Unlay(place=place):
                self._compare.take(place)
            case say.Link(page=page):
                self.wire.tell(link=self._link(page))
            case say.Export(what=what, rates=rates):
                self._handing.make(self._bench.scenario, what, self._span, rates)
            case say.Sheet(text=text, unit=unit):
                self._handing.look_at(text, unit)
            case say.Fit(figures=figures):
                self._peaks.look(figures)
            case say.StopFit():
                self._peaks.stop()
            case _:
                self._edit(message)

    def _link(self, page: Page) -> dict[str, str]:
        """An address that reopens this bench, or why there is none."""
        view = self._view()
        seen = None if view == self._span else (view[0] * 1e3, view[1] * 1e3)
        shown = Shown(self._bench.document, page, self.board.passes.scale, seen, self._peaks.shows_density)
        try:
            return {"text": encode(shown), "sentence": ""}
        except ScenarioError as error:
            return {"text": "", "sentence": str(error)}

    def _reopen(self) -> None:
        """Show what the link that led here showed, beside its scenario."""
        if (shown := self._linked) is None:
            return
        self._linked = None
        self.board.passes.switch(shown.scale)
        self._peaks.show_density(shown.density)
        if shown.energy_meV is not None:
            self.board.axis.range.update(start=shown.energy_meV[0], end=shown.energy_meV[1])
        self.wire.tell(view={"page": shown.page, "scale": shown.scale, "density": shown.density})

    def _edit(self, message: say.AnyMessage) -> None:
        bench, place = self._bench, self._bench.place
        self.board.passes.forget()
        match message:
            case say.Set(path=path, text=text):
                bench.set(path, text)
            case say.Revert(path=path):
                bench.revert(path)
            case say.Layer(path=path, index=index):
                bench.add_layer(path, index)
            case say.Window(kind=which):
                bench.add_window(which)
            case say.Duplicate(path=path, index=index):
                bench.duplicate(path, index)
            case say.Delete(path=path, index=index):
                bench.delete(path, index)
            case say.Move(path=path, index=index, by=by):
                bench.move(path, index, by)
            case say.Mirror(path=path):
                bench.mirror(path)
            case say.Double(path=path):
                bench.double(path)
            case say.Thicken(kind=kind, monolayers=monolayers):
                bench.thicken(kind, monolayers)
            case say.DropEnds():
                bench.drop_ends()
            case say.Adopt(index=index):
                if proposal := self._remedies.chosen(index):
                    self.board.passes.remember()
                    bench.adopt(proposal.scenario, proposal.words)
            case say.Measure(text=text, lever_arm=lever_arm):
                bench.measure(text, lever_arm)
            case say.TakeFit():
                if fitted := self._peaks.chosen_fit():
                    self.board.passes.remember()
                    bench.adopt(fitted, "fit to the measured peaks")
            case say.TakeSheet(path=path):
                if layers := self._handing.taken():
                    bench.take_layers(path, layers)
            case say.OpenText(name=name, text=text):
                bench.open_text(name, text)
            case say.Restore(text=text, drafts=drafts, base=base):
                bench.restore(text, drafts, base)
            case say.Undo():
                bench.undo()
            case say.Redo():
                bench.redo()
            case say.Open(name=name, demo=demo):
                if demo:
                    bench.begin_with(name)
                else:
                    bench.open(name)
        self._tell_shown()
        self._follow(reset=bench.place != place)

    # To the browser.

    def _follow(self, reset: bool = False, rail: bool = True) -> None:
        """Bring everything up to the bench's scenario. `reset`: another document, shown whole."""
        asked = question(self._bench.scenario)
        self._show_span(natural_span(asked), reset)
        key = (asked.stack, most_periods(asked.target), self._span)
        if key != self._held:
            self._held, self._version = key, self._version + 1
        if rail:
            self._tell_rail()
        else:
            self.wire.tell(status=self._status())
        self._ask_pictures()
        if asked != self._question:
            self._remedies.follow(asked)
            self.board.passes.ask(asked.target)
            self._ask_verdict(asked)
        else:
            self._tell_verdict()
            if self._verdict_state == "known" and self._growth != self._bench.document.growth:
                self._ask_range()

    def _show_span(self, natural: Span, reset: bool) -> None:
        """Follow the stack with the energy axis, unless the user has chosen another part of it."""
        if natural == self._span and not reset:
            return
        shows_all = self._view() == self._span
        self._span = natural
        if reset or shows_all:
            self.board.axis.reset_to(natural[0] * 1e3, natural[1] * 1e3)

    def _status(self) -> dict[str, Any]:
        bench = self._bench
        notice = bench.notice
        return {
            "seq": self._seq, "version": self._version, "periods": bench.scenario.stack.periods,
            "place": bench.place, "changed": bench.is_changed, "undo": bench.undo_step, "redo": bench.redo_step,
            "notice": None if notice is None else {"about": notice.about, "sentence": notice.sentence,
                                                   "fault": notice.is_fault},
        }

    def _tell_rail(self) -> None:
        scenario = self._bench.scenario
        self.wire.tell(status=self._status(), kept=self._bench.kept(), rail=Rail(self._bench).view(), about={
            "title": scenario.title, "note": scenario.note, "cautions": scenario.warnings,
            "beam": _extra_curves(scenario)})

    def _tell_verdict(self) -> None:
        view = verdict_view(self._verdict, self._bench.scenario.stack.periods, self._palette)
        if self._verdict_state != "known":
            view = {"state": self._verdict_state, "sentence": "", "present": "", "legend": [], "share": self._share,
                    "waits": in_line(self._verdicts.waits_behind)}
        self.wire.tell(verdict={**view, "range": self._range})

    def _tell_range(self, found: dict[str, str] | None) -> None:
        self._range = found
        if self._verdict_state == "known":
            self._tell_verdict()

    def _draw_band(self, band: Band | None) -> None:
        self.board.periods.margins.show_range(band)
        self._tell_shown()

    def _tell_shown(self) -> None:
        """Which of the extra curves are on screen, for the captions."""
        self.wire.tell(shown={"range": self.board.periods.margins.shows_range,
                              "earlier": self.board.passes.shows_before})

    def _paint(self, theme: str) -> None:
        self._palette = PALETTES[theme]
        self.board.paint(self._palette)
        self._compare.paint(self._palette)

    # The work behind the figures.

    def _later(self, show: Callable[..., None]) -> Callable[..., None]:
        """The way of messages and results to the figures: in turn, with the document's lock, as one change."""

        def locked(*arguments: Any) -> None:
            log.SESSION.set(self._visit.number)
            with hold(self._document):
                show(*arguments)

        return lambda *arguments: self._document.add_next_tick_callback(partial(locked, *arguments))

    def _view(self) -> Span:
        return self.board.axis.range.start / 1e3, self.board.axis.range.end / 1e3

    def _viewed(self, attr: str, old: float, new: float) -> None:
        """The user pans or zooms the energy axis: the curve is worked out for what is seen."""
        self._ask_pictures()

    def _ask_pictures(self) -> None:
        low, high = sorted(self._view())
        room = 0.25 * (high - low)
        span = (min(self._span[0], low), max(self._span[1], high))
        view = (max(low - room, span[0]), min(high + room, span[1]))
        wanted = Wanted(self._bench.scenario, span, view, self._version)
        if wanted != self._wanted:
            self._wanted = wanted
            self._pictures.ask(wanted)

    def _show_pictures(self, wanted: Wanted, found: Pictures) -> None:
        texts = self.board.show(wanted, found)
        self.wire.tell(pictured={"version": wanted.version, "fault": ""}, texts=texts)
        if self._page is not None:
            self._page.cancel()
        # The figures of the page, further down, wait until the slider pauses: the bench has the browser to itself.
        self._page = asyncio.get_running_loop().call_later(
            _PAUSE, lambda: self._later(self._show_page)(wanted, found))

    def _show_page(self, wanted: Wanted, found: Pictures) -> None:
        self.wire.tell(texts=self.board.show_page(wanted, found))
        # What takes longest waits until the slider rests.
        self._page = asyncio.get_running_loop().call_later(
            _REST - _PAUSE, lambda: self._later(self._follow_page)(wanted))

    def _follow_page(self, wanted: Wanted) -> None:
        self._peaks.follow(wanted.scenario, wanted.span, wanted.view)
        self._compare.follow(wanted.scenario, wanted.view)

    def _fail_pictures(self, wanted: Wanted, error: Exception) -> None:
        self.board.clear()
        self.wire.tell(pictured={"version": wanted.version, "fault": in_words(error)})
        self._peaks.follow(wanted.scenario, wanted.span, wanted.view)

    def _ask_verdict(self, asked: Asked) -> None:
        self._question, self._share, self._verdict_state = asked, 0.0, "working"
        self._ranges.forget()
        self._tell_verdict()
        self._verdicts.ask(asked)
        asyncio.get_running_loop().create_task(self._watch(asked))

    def _work_out(self, asked: Asked, stop: Stop) -> Verdict | None:
        self._visit.allow(asked.target)
        return verdict(asked, stop, self._progress)

    def _progress(self, share: float) -> None:
        self._share = share

    async def _watch(self, asked: Asked) -> None:
        """While a verdict takes long: say how far it is, and take the old margins off the screen."""
        await asyncio.sleep(_SLOW)
        while self._verdict_state == "working" and self._question == asked:
            self._later(self._show_progress)()
            await asyncio.sleep(_POLL)

    def _show_progress(self) -> None:
        if self._verdict_state == "working":
            self.board.periods.margins.show(None)
            self._tell_verdict()

    def _show_verdict(self, asked: Asked, found: Verdict | None) -> None:
        if asked != self._question:
            return
        self._verdict, self._verdict_state = found, "known"
        self._tell_verdict()
        self.wire.tell(texts=self.board.show_verdict(found))
        self._ask_range()

    def _ask_range(self) -> None:
        self._growth = self._bench.document.growth
        self._ranges.forget()
        self._ranges.ask(self._bench.scenario)

    def _fail_verdict(self, asked: Asked, error: Exception) -> None:
        self._verdict, self._verdict_state = None, "none"
        self.board.periods.margins.show(None)
        self.wire.tell(verdict={"state": "fault", "sentence": in_words(error), "present": "", "legend": []})

    def _show_files(self, _: None, entries: tuple[Entry, ...]) -> None:
        self.wire.tell(files=[asdict(entry) for entry in entries])

    def _fail_files(self, _: None, error: Exception) -> None:
        self.wire.tell(files=[], objection=in_words(error))


def _extra_curves(scenario: Scenario) -> str:
    """What a caption says of the curves beside T."""
    beam = [f"dashed: seen at {scenario.resolution * 1e3:g} meV"] if scenario.resolution else []
    lost = ["dotted: absorbed (T + R + A = 1)"] if scenario.stack.dephasing else []
    return ", ".join(beam + lost)
