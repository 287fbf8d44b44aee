"""Long work of all visitors in one bounded pool: everybody's first job comes before anybody's second."""

from __future__ import annotations

import asyncio
import contextvars
from collections import Counter
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from typing import TypeVar

from webapp.latest import Stop, Stopped

Request = TypeVar("Request")
Result = TypeVar("Result")


@dataclass(frozen=True, eq=False)
class _Job:
    """A job that waits or runs; `begins` comes true when its turn has come, false if it was given up before.

    `round_`: the round that was on when it came.
    """

    line: Line
    stop: Stop
    round_: int
    begins: asyncio.Future[bool]


class Jobs:
    """Runs `at_once` jobs at a time in threads of its own, `each` at most of one visitor. Used on the event loop.

    The order is that of fair queueing (Nagle, RFC 970): in each round everybody has one job, in the order they came.
    """

    def __init__(self, at_once: int, each: int) -> None:
        self._at_once, self._each = at_once, each
        self._waiting: list[_Job] = []
        self._running: list[_Job] = []
        self._round = 0
        self._threads = ThreadPoolExecutor(at_once, thread_name_prefix="job")

    @property
    def waiting(self) -> int:
        """How many jobs wait."""
        return len(self._waiting)

    @property
    def running(self) -> int:
        """How many jobs run."""
        return len(self._running)

    def line(self) -> Line:
        """The way of one visitor's jobs into the pool."""
        return Line(self)

    def close(self) -> None:
        """Stop what runs and give up what waits."""
        for job in [*self._waiting, *self._running]:
            job.stop.set()
        self._threads.shutdown(wait=False, cancel_futures=True)

    def before(self, stop: Stop) -> int | None:
        """How many jobs will begin before the one with this `stop`; None where it does not wait."""
        return next((place for place, (_, job) in enumerate(self._in_order()) if job.stop is stop), None)

    async def run(self, line: Line, work: Callable[[Request, Stop], Result], request: Request, stop: Stop) -> Result:
        """Wait for a turn, then work in a thread. Raises Stopped if stopped before, and what the work raises."""
        loop = asyncio.get_running_loop()
        job = _Job(line, stop, self._round, loop.create_future())
        self._waiting.append(job)
        stop.then(lambda: self._give_up(job))
        self._begin()
        if not await job.begins:
            raise Stopped
        try:
            return await loop.run_in_executor(
                self._threads, contextvars.copy_context().run, work, request, stop)
        finally:
            self._running.remove(job)
            self._begin()

    def _give_up(self, job: _Job) -> None:
        if job in self._waiting:
            self._waiting.remove(job)
            job.begins.set_result(False)

    def _begin(self) -> None:
        while len(self._running) < self._at_once:
            running = Counter(job.line for job in self._running)
            ready = ((its, job) for its, job in self._in_order() if running[job.line] < self._each)
            its, job = next(ready, (0, None))
            if job is None:
                return
            self._round = max(self._round, its)
            job.line.last_round = its
            self._waiting.remove(job)
            self._running.append(job)
            job.begins.set_result(True)

    def _in_order(self) -> list[tuple[int, _Job]]:
        """The jobs that wait, each with its round: the present one, or the one after its visitor's job before it."""
        last: dict[Line, int] = {}
        found = []
        for job in self._waiting:
            last[job.line] = max(job.round_, last.get(job.line, job.line.last_round) + 1)
            found.append((last[job.line], job))
        return sorted(found, key=lambda pair: pair[0])


class Line:
    """One visitor's way into the pool; `last_round` is the round in which it had its last job."""

    def __init__(self, jobs: Jobs) -> None:
        self._jobs, self.last_round = jobs, 0

    async def run(self, work: Callable[[Request, Stop], Result], request: Request, stop: Stop) -> Result:
        """Work in a thread when it is this visitor's turn. Raises Stopped, and what the work raises."""
        return await self._jobs.run(self, work, request, stop)

    def before(self, stop: Stop) -> int | None:
        """How many jobs of all visitors come before the one with this `stop`; None where it does not wait."""
        return self._jobs.before(stop)


def in_line(before: int | None) -> str:
    """The place of a waiting job in words; nothing where it does not wait."""
    if before is None:
        return ""
    return f"waiting, {before} before" if before else "waiting, next in line"
