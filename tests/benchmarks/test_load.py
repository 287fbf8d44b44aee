"""What many visitors at once cost: 20 that drag the slider of periods, and 100 that come and go.

Prints; nothing here fails for being slow. The aims, on two cores: a median of at most 300 ms from a slide to its
pictures, and a memory that after 100 sessions is within 20 MB of what it was. The visitors are websockets in this one
process and no browsers, which two cores could not hold: what is measured is the server, from the sending of a slide to
the last byte of the pictures, without the painting. Run with `python3 -m tests.run tests/benchmarks/test_load.py -s`.
"""

from __future__ import annotations

import asyncio
import json
import re
import shutil
import statistics
import time
from collections.abc import Coroutine
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path
from typing import Any
from urllib.request import urlopen

from tornado.httpclient import AsyncHTTPClient
from tornado.websocket import WebSocketClientConnection, websocket_connect

from tests.benchmarks.harness import machine
from tests.benchmarks.test_page import resident
from tests.browser.conftest import Served, serving
from webapp.environment import CHECKOUT

VISITORS, SLIDES, EVERY_S = 20, 20, 0.5
COMING_AND_GOING, TOGETHER, FIRST = 100, 20, 20
PATIENCE_S = 120


class Visitor:
    """A visitor without a browser: opens the page, speaks the wire's messages, and notes when pictures arrive."""

    def __init__(self, address: str) -> None:
        self._address, self._sequence = address, 0
        self._connection: WebSocketClientConnection
        self._wire = ""
        self._hears: asyncio.Task[None]
        self._asked: float | None = None
        self._pictured = asyncio.Event()
        self.taken: list[float] = []

    async def open(self) -> None:
        """Open the page and wait for its first pictures."""
        page = (await AsyncHTTPClient().fetch(self._address, request_timeout=PATIENCE_S)).body.decode()
        token = re.search(r'"token":"([^"]+)"', page)
        assert token is not None
        self._connection = await websocket_connect(
            self._address.replace("http", "ws") + "/ws", subprotocols=["bokeh", token[1]], max_message_size=10**9)
        await self._message()
        await self._send("PULL-DOC-REQ", {})
        while not self._wire:
            kind, content = await self._message()
            if kind == "PULL-DOC-REPLY":
                self._wire = _wire(json.loads(content)["doc"]["roots"])
        self._hears = asyncio.create_task(self._hear())
        await self._event("document_ready", [])
        await self.say("hello", theme="light")
        await asyncio.wait_for(self._pictured.wait(), PATIENCE_S)

    async def close(self) -> None:
        """Leave."""
        self._hears.cancel()
        self._connection.close()

    async def drag(self, delay: float) -> None:
        """Move the slider again and again."""
        await asyncio.sleep(delay)
        for place in range(SLIDES):
            begin = time.perf_counter()
            self._pictured.clear()
            self._asked = self._asked or begin
            await self.say("slide", periods=5 + place)
            await asyncio.sleep(max(0.0, begin + EVERY_S - time.perf_counter()))
        await asyncio.wait_for(self._pictured.wait(), PATIENCE_S)

    async def say(self, kind: str, **content: Any) -> None:
        """Send a message as the page does."""
        self._sequence += 1
        data = {"type": kind, "seq": self._sequence, **content}
        await self._event("data_event", [
            ["model", {"id": self._wire}], ["data", {"type": "map", "entries": list(map(list, data.items()))}]])

    async def _event(self, name: str, values: list[Any]) -> None:
        event = {"type": "event", "name": name, "values": {"type": "map", "entries": values}}
        await self._send("PATCH-DOC", {"events": [
            {"kind": "MessageSent", "msg_type": "bokeh_event", "msg_data": event}]})

    async def _send(self, kind: str, content: dict[str, Any]) -> None:
        for part in ({"msgid": f"{kind}-{self._sequence}", "msgtype": kind}, {}, content):
            await self._connection.write_message(json.dumps(part))

    async def _message(self) -> tuple[str, str]:
        """The next message with all its buffers: its kind and its content."""
        header = json.loads(await self._frame())
        await self._frame()
        content = await self._frame()
        for _ in range(2 * header.get("num_buffers", 0)):
            await self._frame()
        return header["msgtype"], str(content)

    async def _frame(self) -> str | bytes:
        frame = await self._connection.read_message()
        assert frame is not None, "the server closed the connection"
        return frame

    async def _hear(self) -> None:
        while True:
            _, content = await self._message()
            if "pictured" in content:
                if self._asked is not None:
                    # Of slides that were taken together the first counts, which waited longest.
                    self.taken.append((time.perf_counter() - self._asked) * 1e3)
                    self._asked = None
                self._pictured.set()


def _wire(models: list[dict[str, Any]]) -> str:
    """The id of the model that messages are sent to."""
    return next(str(model["id"]) for model in models if "colonnade:wire" in str(model["attributes"].get("esm", "")))


def run(work: Coroutine[Any, Any, None]) -> None:
    """Run it on an event loop in a thread of its own."""
    with ThreadPoolExecutor() as aside:
        aside.submit(asyncio.run, work).result()


def processor(process: int) -> float:
    """Processor time that a process has used, in s (Linux, 100 ticks a second)."""
    parts = Path(f"/proc/{process}/stat").read_text().rpartition(")")[2].split()
    return (int(parts[11]) + int(parts[12])) / 100


def test_twenty_visitors_drag_the_slider(tmp_path: Path) -> None:
    with serving(Path(shutil.copytree(CHECKOUT / "scenarios", tmp_path / "scenarios"))) as served:
        run(_drag(served))


async def _drag(served: Served) -> None:
    visitors = [Visitor(served.address) for _ in range(VISITORS)]
    for visitor in visitors:
        await visitor.open()
    # Verdicts, ranges and ledgers of the first scenario are no part of a drag.
    begin = time.perf_counter()
    while (health := _health(served))["jobs_running"] + health["jobs_waiting"]:
        await asyncio.sleep(0.2)
    print(f"\nlong jobs of {VISITORS} visitors done {time.perf_counter() - begin:.1f} s after the last one's pictures")
    used, begin = processor(served.process), time.perf_counter()
    await asyncio.gather(*(v.drag(place * EVERY_S / VISITORS) for place, v in enumerate(visitors)))
    share = (processor(served.process) - used) / (time.perf_counter() - begin)
    taken = sorted(time for visitor in visitors for time in visitor.taken)
    print(f"{machine()}\n{VISITORS} visitors, {SLIDES} slides each, one every {EVERY_S * 1e3:.0f} ms: "
          f"{len(taken)} repaints, median {statistics.median(taken):.0f} ms, "
          f"95th percentile {taken[int(0.95 * len(taken))]:.0f} ms, longest {taken[-1]:.0f} ms; "
          f"the server used {share:.0%} of one core")
    for visitor in visitors:
        await visitor.close()


def test_a_hundred_visitors_come_and_go(tmp_path: Path) -> None:
    with serving(Path(shutil.copytree(CHECKOUT / "scenarios", tmp_path / "scenarios"))) as served:
        run(_come_and_go(served))


async def _come_and_go(served: Served) -> None:
    rest = resident(served.process)
    await _visits(served, FIRST)
    before = resident(served.process)
    await _visits(served, COMING_AND_GOING)
    after = resident(served.process)
    print(f"\nserver at rest {rest:.0f} MB; after {FIRST} sessions have come and gone {before:.0f} MB, "
          f"after {COMING_AND_GOING} more {after:.0f} MB: {after - before:+.1f} MB")


async def _visits(served: Served, many: int) -> None:
    """So many sessions, some at a time, and all gone when it returns."""
    for _ in range(many // TOGETHER):
        visitors = [Visitor(served.address) for _ in range(TOGETHER)]
        for visitor in visitors:
            await visitor.open()
        for visitor in visitors:
            await visitor.close()
        del visitors
        while _health(served)["sessions"]:
            await asyncio.sleep(0.5)


def _health(served: Served) -> dict[str, int]:
    with urlopen(f"{served.address}/liveness") as answer:
        health: dict[str, int] = json.load(answer)
        return health
