"""What the sessions of one server share: the folder, the pool of long jobs, their numbers, and what each may ask."""

from __future__ import annotations

import itertools
from dataclasses import dataclass

from transport import Target
from webapp import log
from webapp.files import Folder
from webapp.jobs import Jobs, Line


@dataclass(frozen=True, slots=True)
class Visit:
    """One session's share: its number, its way into the pool, the most periods of its target, whether it only looks."""

    number: int
    line: Line
    most_periods: int
    view_only: bool = False

    def allow(self, target: Target | None) -> None:
        """Raise ValueError for a target that this server does not work out."""
        if target is not None and target.most_periods > self.most_periods:
            raise ValueError(f"This server works out at most {self.most_periods:,} periods, and the target asks for "
                             f"{target.most_periods:,}: lower its most periods, or use the command line.")


class Service:
    """Counts the sessions of a server and gives each its share.

    `has_login`: visitors log in and out; `view_only`: they move sliders and look, and nothing is changed or saved.
    """

    def __init__(
        self, folder: Folder, jobs: Jobs, most_periods: int, has_login: bool = False, view_only: bool = False
    ) -> None:
        self.folder, self.jobs, self.has_login, self.view_only = folder, jobs, has_login, view_only
        self._most_periods = most_periods
        self._numbers = itertools.count(1)
        self._open: set[int] = set()

    @property
    def sessions(self) -> int:
        """How many sessions are open."""
        return len(self._open)

    def enter(self) -> Visit:
        """A session begins."""
        visit = Visit(next(self._numbers), self.jobs.line(), self._most_periods, self.view_only)
        self._open.add(visit.number)
        log.SESSION.set(visit.number)
        log.tell("session opened")
        return visit

    def leave(self, visit: Visit) -> None:
        """A session ends."""
        self._open.discard(visit.number)
        log.tell("session closed", session=visit.number)
