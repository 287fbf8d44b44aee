"""A real server and a real browser: the server as its own process on a copy of the scenarios, a page that is ready."""

from __future__ import annotations

import json
import re
import shutil
import subprocess
import sys
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import IO

import pytest
from playwright.sync_api import Browser, Page, expect, sync_playwright

from tests.browser.chromium import FLAGS, found
from webapp.environment import CHECKOUT

ADDRESS = re.compile(r"at (http://\S+)")
# What is expected comes when it comes: on a busy machine later than Playwright's own 5 s.
expect.set_options(timeout=20_000)
FAULTS = ("error", "critical")
"""Levels of the log that no visit may cause."""


@dataclass(frozen=True)
class Served:
    """A running server: its address, the folder it serves, its log, and its process."""

    address: str
    folder: Path
    log: Path
    process: int

    def events(self) -> list[dict[str, object]]:
        """What the log holds; every line of it is a JSON object."""
        return [json.loads(line) for line in self.log.read_text().splitlines()]

    def faults(self, begin: int = 0) -> list[dict[str, object]]:
        """Lines of the log from `begin` on that tell of a fault."""
        return [line for line in self.events()[begin:] if line["level"] in FAULTS or "traceback" in line]


@pytest.fixture(scope="session")
def browser() -> Iterator[Browser]:
    place = found(Path(sys.executable))
    assert place is not None, "no browser: run the tests with python3 -m tests.run, which finds or fetches one"
    with sync_playwright() as playwright:
        chromium = playwright.chromium.launch(executable_path=str(place), args=list(FLAGS))
        yield chromium
        chromium.close()


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """A copy of the demo scenarios."""
    place = tmp_path / "scenarios"
    shutil.copytree(CHECKOUT / "scenarios", place)
    return place


@pytest.fixture(scope="session")
def lasting(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Served]:
    """One server for all tests that need none of their own: to start one takes longer than most tests."""
    place = tmp_path_factory.mktemp("lasting") / "scenarios"
    shutil.copytree(CHECKOUT / "scenarios", place)
    with serving(place) as server:
        yield server


@pytest.fixture
def served(lasting: Served) -> Iterator[Served]:
    """The lasting server with its folder as new; afterwards no fault of this test may stand in its log."""
    shutil.rmtree(lasting.folder)
    shutil.copytree(CHECKOUT / "scenarios", lasting.folder)
    before = len(lasting.events())
    yield lasting
    assert lasting.faults(before) == []


@contextmanager
def serving(folder: Path, *options: str, port: int = 0) -> Iterator[Served]:
    """A server of a folder; at the end it must stop when told, unless it was killed, and its log hold no fault."""
    command = [sys.executable, "-m", "webapp", "--port", str(port), *options, str(folder)]
    log = folder.parent / "server.log"
    with log.open("a") as written, subprocess.Popen(
        command, cwd=CHECKOUT, stdout=subprocess.PIPE, stderr=written, text=True
    ) as server:
        assert server.stdout is not None
        try:
            running = Served(_address(server.stdout, log), folder, log, server.pid)
            yield running
            killed = server.poll() is not None
        finally:
            server.terminate()
        assert server.wait(timeout=20) == 0 or killed, log.read_text()
    assert running.faults() == []


def _address(output: IO[str], log: Path) -> str:
    """The address a server prints when it is ready; its log if it dies before."""
    for line in output:
        if named := ADDRESS.search(line):
            return named[1]
    raise AssertionError(f"the server ended before it was ready:\n{log.read_text()}")


@pytest.fixture
def page(browser: Browser, served: Served) -> Iterator[Page]:
    """The start page, ready; afterwards no error may stand in its console and no request may have left the server."""
    with visiting(browser, served) as visited:
        yield visited


@contextmanager
def visiting(browser: Browser, served: Served, path: str = "") -> Iterator[Page]:
    """A page of a server, ready, watched for errors and for requests to other servers."""
    context = browser.new_context(viewport={"width": 1280, "height": 800})
    visited = context.new_page()
    faults: list[str] = []
    visited.on("console", lambda message: faults.append(message.text) if message.type == "error" else None)
    visited.on("pageerror", lambda error: faults.append(str(error)))
    visited.on("request", lambda request: None if _local(request.url, served) else faults.append(request.url))
    visited.goto(served.address + path)
    ready(visited)
    yield visited
    context.close()
    assert not faults


def _local(url: str, served: Served) -> bool:
    return url.startswith((served.address, served.address.replace("http", "ws"), "data:", "blob:"))


def ready(page: Page) -> None:
    """Wait until the figures show the scenario."""
    page.wait_for_selector("body[data-ready=yes]")
    page.wait_for_function("() => window.Bokeh.documents.length && window.Bokeh.documents.every((d) => d.is_idle)")
