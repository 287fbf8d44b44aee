"""The server's log holds faults and nothing else."""

from __future__ import annotations

import asyncio
import json
import logging
import sys
from concurrent.futures import ThreadPoolExecutor

import pytest
from tornado.websocket import WebSocketClosedError

from transport import Target
from webapp.jobs import Jobs
from webapp.latest import Latest, Stop
from webapp.log import SESSION, JsonLines
from webapp.server import unexpected_only
from webapp.service import Visit


@pytest.mark.parametrize(("fault", "lines"), [(WebSocketClosedError(), 0), (RuntimeError("a fault"), 1)])
def test_a_browser_that_leaves_is_not_logged_and_a_fault_is(
    fault: Exception, lines: int, caplog: pytest.LogCaptureFixture
) -> None:
    loop = asyncio.new_event_loop()
    try:
        with caplog.at_level(logging.ERROR, logger="asyncio"):
            unexpected_only(loop, {"message": "Task exception was never retrieved", "exception": fault})
    finally:
        loop.close()
    assert len(caplog.records) == lines


def line(record: logging.LogRecord) -> dict[str, object]:
    """What the log holds of a record."""
    text = JsonLines().format(record)
    assert "\n" not in text
    found: dict[str, object] = json.loads(text)
    return found


def test_work_that_fails_is_logged_with_its_session_and_traceback(caplog: pytest.LogCaptureFixture) -> None:
    failed: list[Exception] = []

    def work(request: int, stop: Stop) -> int:
        raise RuntimeError("a fault")

    async def visit() -> None:
        SESSION.set(7)
        told = asyncio.Event()

        def fail(request: int, error: Exception) -> None:
            failed.append(error)
            found.append(line(caplog.records[-1]))
            told.set()

        Latest(work, lambda request, result: None, fail).ask(1)
        await asyncio.wait_for(told.wait(), timeout=10)

    found: list[dict[str, object]] = []
    with ThreadPoolExecutor() as aside:  # a thread of its own: the browser tests keep a loop running in this one
        aside.submit(asyncio.run, visit()).result(timeout=30)
    assert [type(error) for error in failed] == [RuntimeError]
    assert (found[0]["event"], found[0]["session"], found[0]["level"]) == ("work failed", 7, "error")
    assert str(found[0]["traceback"]).endswith("RuntimeError: a fault")


def test_a_fault_within_a_library_is_logged_without_the_message_it_quotes() -> None:
    try:
        raise KeyError("shape")
    except KeyError:
        fault = sys.exc_info()
    quoting = logging.LogRecord("bokeh.server", logging.ERROR, "", 1, "cannot read %r", ("title = 'Secret'",), fault)
    plain = logging.LogRecord("bokeh.server", logging.WARNING, "", 1, "%d too many", (3,), None)
    assert line(quoting)["what"] == "bokeh.server: cannot read %r" and line(quoting)["event"] == "fault"
    assert "Secret" not in JsonLines().format(quoting)
    assert (line(plain)["what"], line(plain)["event"]) == ("bokeh.server: 3 too many", "notice")


def test_a_target_beyond_what_a_server_works_out_is_refused_in_a_sentence() -> None:
    visit = Visit(1, Jobs(at_once=1, each=1).line(), most_periods=60)
    visit.allow(None)
    visit.allow(Target((), 60))
    with pytest.raises(ValueError, match="works out at most 60 periods, and the target asks for 61: lower"):
        visit.allow(Target((), 61))
