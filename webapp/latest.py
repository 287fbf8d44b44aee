"""Work off the event loop, one piece at a time: of the requests that come meanwhile only the newest counts."""

from __future__ import annotations

import asyncio
import functools
import logging
import threading
from collections import OrderedDict
from collections.abc import Callable
from typing import TYPE_CHECKING, Concatenate, Generic, ParamSpec, TypeVar

from transport.periods import no_progress

if TYPE_CHECKING:
    from webapp.jobs import Line

Request = TypeVar("Request")
Result = TypeVar("Result")
Rest = ParamSpec("Rest")

_log = logging.getLogger("webapp")


class Stopped(Exception):
    """Raised within the work once it is told to stop."""


class Stop:
    """Tells work in a thread to stop; `check` is called by the work now and then, all else on the event loop."""

    def __init__(self) -> None:
        self._event = threading.Event()
        self._told: Callable[[], None] = lambda: None

    def set(self) -> None:
        """Ask the work to stop."""
        self._event.set()
        self._told()

    def then(self, told: Callable[[], None]) -> None:
        """Call `told` too when the work is asked to stop."""
        self._told = told

    def check(self) -> None:
        """Raise Stopped if the work was asked to stop."""
        if self._event.is_set():
            raise Stopped


def checked(stop: Stop, progress: Callable[[float], None] = no_progress) -> Callable[[float], None]:
    """Progress that also stops the work where that is asked."""

    def told(share: float) -> None:
        stop.check()
        progress(share)

    return told


_KEPT = 64
"""Results that a `remembered` work keeps."""


def remembered(work: Callable[Concatenate[Request, Rest], Result]) -> Callable[Concatenate[Request, Rest], Result]:
    """The work, its last results kept by request: what one session has had worked out is there for all.

    Requests must be frozen values, results must not be changed. Work that raises is not kept.
    """
    kept: OrderedDict[Request, Result] = OrderedDict()
    lock = threading.Lock()

    def answered(request: Request, /, *rest: Rest.args, **more: Rest.kwargs) -> Result:
        with lock:
            if request in kept:
                kept.move_to_end(request)
                return kept[request]
        result = work(request, *rest, **more)
        with lock:
            kept[request] = result
            while len(kept) > _KEPT:
                kept.popitem(last=False)
        return result

    functools.update_wrapper(answered, work)
    return answered


class Latest(Generic[Request, Result]):
    """Runs `work(request, stop)` in a thread and hands its result to `done(request, result)` on the event loop.

    With `interrupts`, a newer request stops the work in hand; without, that is finished and shown, and the newest
    request follows, so that a dragged slider sees its curve move. `failed(request, error)` is told of any exception.
    Long work waits its turn in a `line`; without one a thread is had at once.
    """

    def __init__(
        self,
        work: Callable[[Request, Stop], Result],
        done: Callable[[Request, Result], None],
        failed: Callable[[Request, Exception], None],
        interrupts: bool = False,
        line: Line | None = None,
    ) -> None:
        self._line = line
        self._work, self._done, self._failed, self._interrupts = work, done, failed, interrupts
        self._waiting: list[Request] = []
        self._task: asyncio.Task[None] | None = None
        self._stop = Stop()

    @property
    def is_busy(self) -> bool:
        """Whether work is in hand or waits."""
        return self._task is not None and not self._task.done()

    @property
    def waits_behind(self) -> int | None:
        """How many jobs of all visitors come before this one's; None where it does not wait for its turn."""
        return self._line.before(self._stop) if self._line else None

    def ask(self, request: Request) -> None:
        """Want `request` done, in place of any that still waits. Call on the event loop."""
        self._waiting = [request]
        if not self.is_busy:
            self._task = asyncio.get_running_loop().create_task(self._run())
        elif self._interrupts:
            self._stop.set()

    def cancel(self) -> None:
        """Stop the work in hand and forget what waits; nothing more is handed on."""
        self._waiting = []
        self._stop.set()

    async def _run(self) -> None:
        while self._waiting:
            request = self._waiting.pop()
            self._stop = stop = Stop()
            try:
                turn = self._line.run if self._line else asyncio.to_thread
                result = await turn(self._work, request, stop)
                stop.check()
            except Stopped:
                continue
            except Exception as error:  # noqa: BLE001 - the outermost handler: what is not foreseen goes to the log
                if not isinstance(error, ValueError):
                    _log.exception("work failed")
                self._failed(request, error)
            else:
                self._done(request, result)
