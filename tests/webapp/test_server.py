"""The server's log holds faults and nothing else."""

from __future__ import annotations

import asyncio
import logging

import pytest
from tornado.websocket import WebSocketClosedError

from webapp.server import unexpected_only


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
