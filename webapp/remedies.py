"""The remedies of one session: looked for when asked, off the event loop, and forgotten when the stack changes."""

from __future__ import annotations

import asyncio
from collections.abc import Callable
from typing import Any, Literal

from transport import Scenario
from transport.fewest import Asked
from webapp.jobs import in_line
from webapp.latest import Latest, Stop
from webapp.messages import in_words
from webapp.pages.remedies import Proposal, remedies_view
from webapp.results import question
from webapp.service import Visit
from webapp.work import Search, proposals

_POLL = 0.2

Later = Callable[[Callable[..., None]], Callable[..., None]]
"""Makes a function run in turn, with the document's lock."""


class Remedies:
    """Proposals for the stack on the bench. `tell` draws their list; `later` is the way of results to the page."""

    def __init__(self, tell: Callable[[dict[str, Any]], None], later: Later, visit: Visit) -> None:
        self._tell, self._later, self._visit = tell, later, visit
        self._state, self._sentence, self._share = "none", "", 0.0
        self._proposals: tuple[Proposal, ...] = ()
        self._about: list[Asked] = []
        self._search = Latest(self._work, later(self._show), later(self._fail), interrupts=True,
                              line=visit.line)

    def look(self, scenario: Scenario, what: Literal["ends", "nearest"], whole: bool) -> None:
        """Look for remedies of a scenario."""
        self._state, self._sentence, self._proposals, self._share = "working", "", (), 0.0
        self._about = [question(scenario)]
        self._search.ask(Search(scenario, what, whole))
        self._draw()
        asyncio.get_running_loop().create_task(self._watch())

    def follow(self, asked: Asked) -> None:
        """Keep the list as long as the bench shows the stack it is for, or one of its proposals."""
        if asked not in self._about + [question(proposal.scenario) for proposal in self._proposals]:
            self.forget()

    def forget(self) -> None:
        """Stop looking, and take the list away."""
        self._about = []
        if self._state != "none" or self._sentence:
            self._search.cancel()
            self._state, self._sentence, self._proposals = "none", "", ()
            self._draw()

    def stop(self) -> None:
        """Give up looking."""
        self._search.cancel()
        if self._state == "working":
            self._state, self._sentence = "none", "No remedy was looked for to the end."
            self._draw()

    def chosen(self, index: int) -> Proposal | None:
        """The proposal at a place of the list; None where the list is another by now."""
        return self._proposals[index] if 0 <= index < len(self._proposals) else None

    def _work(self, search: Search, stop: Stop) -> tuple[str, tuple[Proposal, ...]]:
        self._visit.allow(search.scenario.target)
        return proposals(search, stop, self._progress)

    def _progress(self, share: float) -> None:
        self._share = share

    async def _watch(self) -> None:
        while self._state == "working":
            await asyncio.sleep(_POLL)
            self._later(self._draw)()

    def _show(self, _: Search, found: tuple[str, tuple[Proposal, ...]]) -> None:
        if self._state == "working":
            self._state = "known"
            self._sentence, self._proposals = found
            self._draw()

    def _fail(self, _: Search, error: Exception) -> None:
        if self._state == "working":
            self._state, self._sentence = "fault", in_words(error)
            self._draw()

    def _draw(self) -> None:
        view = remedies_view(self._state, self._sentence, self._proposals, self._share)
        self._tell(view | {"waits": in_line(self._search.waits_behind)})
