"""The pool of long jobs: never more at once than allowed, fair between visitors, and a waiting job can be given up."""

from __future__ import annotations

import asyncio
import threading
from collections.abc import Callable, Coroutine
from concurrent.futures import ThreadPoolExecutor
from typing import Any

import pytest

from webapp.jobs import Jobs, Line, in_line
from webapp.latest import Latest, Stop, Stopped

PATIENCE = 10


def visited(visit: Callable[[], Coroutine[Any, Any, None]]) -> None:
    """Run it on an event loop in a thread of its own: the browser tests keep a loop running in this one."""
    with ThreadPoolExecutor() as aside:
        aside.submit(asyncio.run, visit()).result(timeout=3 * PATIENCE)


class Works:
    """Work that waits to be let go, and writes down in which order it began and how much there was at once."""

    def __init__(self) -> None:
        self.begun: list[str] = []
        self.most = 0
        self._now = 0
        self._lock = threading.Lock()
        self._gates: dict[str, threading.Event] = {}

    def __call__(self, name: str, stop: Stop) -> str:
        with self._lock:
            self.begun.append(name)
            self._now += 1
            self.most = max(self.most, self._now)
        assert self._gate(name).wait(PATIENCE)
        with self._lock:
            self._now -= 1
        stop.check()
        return name

    def _gate(self, name: str) -> threading.Event:
        return self._gates.setdefault(name, threading.Event())

    def let_go(self, *names: str) -> None:
        """Let work of these names end."""
        for name in names:
            self._gate(name).set()


async def asked(line: Line, work: Works, name: str) -> asyncio.Task[str]:
    """Ask for work, and let the pool take it in."""
    task = asyncio.create_task(line.run(work, name, Stop()))
    await asyncio.sleep(0)
    return task


def test_no_more_than_allowed_run_at_once_and_a_second_waits_behind_the_first_of_others() -> None:
    work = Works()

    async def visit() -> None:
        jobs = Jobs(at_once=1, each=1)
        ada, bob, carol = jobs.line(), jobs.line(), jobs.line()
        order = [(ada, "ada 1"), (ada, "ada 2"), (ada, "ada 3"), (bob, "bob 1"), (carol, "carol 1"), (bob, "bob 2")]
        tasks = [await asked(line, work, name) for line, name in order]
        assert jobs.waiting == 5
        for _, name in order:
            work.let_go(name)
        assert await asyncio.wait_for(asyncio.gather(*tasks), PATIENCE) == [name for _, name in order]
        assert jobs.waiting == 0
        jobs.close()

    visited(visit)
    assert work.begun == ["ada 1", "bob 1", "carol 1", "ada 2", "bob 2", "ada 3"]
    assert work.most == 1


def test_who_comes_again_waits_behind_who_comes_first_and_loses_nothing_by_what_was_given_up() -> None:
    work = Works()

    async def visit() -> None:
        jobs = Jobs(at_once=1, each=1)
        ada, bob, carol = jobs.line(), jobs.line(), jobs.line()
        tasks = [await asked(ada, work, "ada 1")]
        for _ in range(5):
            stop = Stop()
            given_up = asyncio.create_task(bob.run(work, "given up", stop))
            await asyncio.sleep(0)
            stop.set()
            with pytest.raises(Stopped):
                await asyncio.wait_for(given_up, PATIENCE)
        tasks += [await asked(line, work, name) for line, name in [(ada, "ada 2"), (bob, "bob 1"), (carol, "carol 1")]]
        work.let_go("ada 1", "ada 2", "bob 1", "carol 1")
        await asyncio.wait_for(asyncio.gather(*tasks), PATIENCE)
        jobs.close()

    visited(visit)
    assert work.begun == ["ada 1", "bob 1", "carol 1", "ada 2"]


def test_a_visitor_has_no_more_at_once_than_its_share_though_threads_are_free() -> None:
    work = Works()

    async def visit() -> None:
        jobs = Jobs(at_once=3, each=1)
        ada, bob = jobs.line(), jobs.line()
        tasks = [await asked(line, work, name) for line, name in
                 [(ada, "ada 1"), (ada, "ada 2"), (bob, "bob 1"), (bob, "bob 2")]]
        assert jobs.waiting == 2
        work.let_go("ada 1", "ada 2", "bob 1", "bob 2")
        await asyncio.wait_for(asyncio.gather(*tasks), PATIENCE)
        jobs.close()

    visited(visit)
    assert set(work.begun[:2]) == {"ada 1", "bob 1"} and work.most <= 2


def test_a_waiting_job_tells_its_place_and_one_given_up_makes_room() -> None:
    work = Works()

    async def visit() -> None:
        jobs = Jobs(at_once=1, each=1)
        stops = [Stop() for _ in range(4)]
        tasks = [asyncio.create_task(jobs.line().run(work, str(place), stop)) for place, stop in enumerate(stops)]
        await asyncio.sleep(0)
        assert [jobs.before(stop) for stop in stops] == [None, 0, 1, 2]
        stops[1].set()
        with pytest.raises(Stopped):
            await asyncio.wait_for(tasks[1], PATIENCE)
        assert [jobs.before(stop) for stop in stops] == [None, None, 0, 1]
        work.let_go("0", "2", "3")
        ends = await asyncio.wait_for(asyncio.gather(*(tasks[place] for place in (0, 2, 3))), PATIENCE)
        assert ends == ["0", "2", "3"]
        jobs.close()

    visited(visit)
    assert "1" not in work.begun


def test_work_that_fails_leaves_its_place_to_the_next() -> None:
    def broken(request: int, stop: Stop) -> int:
        raise RuntimeError("a fault")

    async def visit() -> None:
        jobs = Jobs(at_once=1, each=1)
        line = jobs.line()
        tasks = [asyncio.create_task(line.run(broken, number, Stop())) for number in range(3)]
        ends = await asyncio.wait_for(asyncio.gather(*tasks, return_exceptions=True), PATIENCE)
        assert all(isinstance(end, RuntimeError) for end in ends)
        assert jobs.waiting == 0
        jobs.close()

    visited(visit)


def test_closing_the_pool_stops_what_runs_and_gives_up_what_waits() -> None:
    work = Works()

    async def visit() -> None:
        jobs = Jobs(at_once=1, each=1)
        first, second = [await asked(jobs.line(), work, name) for name in ("first", "second")]
        jobs.close()
        work.let_go("first")
        ends = await asyncio.wait_for(asyncio.gather(first, second, return_exceptions=True), PATIENCE)
        assert all(isinstance(end, Stopped) for end in ends)

    visited(visit)
    assert work.begun == ["first"]


def test_the_latest_request_waits_in_line_and_a_newer_one_takes_its_place() -> None:
    work, done = Works(), []

    async def visit() -> None:
        jobs = Jobs(at_once=1, each=1)
        finished = asyncio.Event()

        def show(name: str, result: str) -> None:
            done.append(result)
            finished.set()

        def fail(name: str, error: Exception) -> None:
            raise error

        ahead = await asked(jobs.line(), work, "another's")
        latest: Latest[str, str] = Latest(work, show, fail, interrupts=True, line=jobs.line())
        latest.ask("old")
        await asyncio.sleep(0)
        assert latest.waits_behind == 0
        latest.ask("new")
        await asyncio.sleep(0)
        await asyncio.sleep(0)
        assert latest.waits_behind == 0 and jobs.waiting == 1
        work.let_go("another's", "new")
        await asyncio.wait_for(finished.wait(), PATIENCE)
        assert latest.waits_behind is None
        await ahead
        latest.ask("forgotten")
        latest.cancel()
        jobs.close()

    visited(visit)
    assert done == ["new"] and work.begun == ["another's", "new"]


@pytest.mark.parametrize(("before", "words"), [(None, ""), (0, "waiting, next in line"), (2, "waiting, 2 before")])
def test_a_place_in_line_in_words(before: int | None, words: str) -> None:
    assert in_line(before) == words
