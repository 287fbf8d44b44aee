"""The server of the page: one function for each visitor, bound to one address, its messages sent without delay."""

from __future__ import annotations

import logging
import os
import tomllib
from asyncio import AbstractEventLoop
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path
from typing import Any
from urllib.parse import urlparse

import panel as pn
from bokeh.server.urls import per_app_patterns
from bokeh.server.util import check_allowlist
from tornado.web import RequestHandler
from tornado.websocket import WebSocketClosedError

from webapp import log
from webapp.environment import CHECKOUT
from webapp.login import LIVENESS, Door
from webapp.passwords import Users
from webapp.service import Service
from webapp.visitor import session

_MOST_ORIGIN = 200
_ASSETS = Path(__file__).parent / "assets"
UNUSED_SESSION_S = 15
"""How long a session is kept after its browser has gone."""


def server(
    service: Service, host: str, port: int, *, show: bool = False, users: Users | None = None,
    origins: tuple[str, ...] = (), behind_proxy: bool = False,
) -> Any:
    """A server of the page, not started yet; `show` opens a browser. Raises OSError where it cannot listen.

    `users`: who may come in, after a login (None: everybody). `origins`: further hosts, with their port where it is
    not the usual one, whose pages may connect. `behind_proxy`: believe the forwarded address and protocol.
    """
    _send_at_once()
    door = Door(users) if users is not None else None
    served = pn.serve(
        # A function of its own, because Panel takes nothing else that can be called.
        {"/": lambda: session(service)}, address=host, port=port, show=show, start=False, title="Colonnade",
        verbose=False, static_dirs={"assets": str(_ASSETS)}, use_xheaders=behind_proxy,
        # A list of one's own takes the place of localhost, which stays one's own.
        websocket_origin=[*origins, f"localhost:{port}"] if origins else None,
        extra_patterns=[(LIVENESS, LivenessHandler, {"service": service})],
        unused_session_lifetime_milliseconds=UNUSED_SESSION_S * 1000,
        # What a session is told of the request goes into the page, where no cookie belongs.
        include_headers=["User-Agent"], include_cookies=[],
        **_closed(door),
    )
    if door is not None:
        door.close(served._tornado)
    loop = served.io_loop.asyncio_loop
    loop.set_exception_handler(unexpected_only)
    # More threads than cores would gain nothing and keep the event loop from its turn.
    loop.set_default_executor(ThreadPoolExecutor(os.cpu_count(), thread_name_prefix="prompt"))
    return served


def _closed(door: Door | None) -> dict[str, Any]:
    """What the server needs to know of the door."""
    if door is None:
        return {}
    return {"auth_provider": door, "cookie_secret": door.cookie_secret, "xsrf_cookies": True,
            "xsrf_cookie_kwargs": {"httponly": True, "samesite": "Strict"}}


class LivenessHandler(RequestHandler):
    """Says that the server is alive, its version, how many sessions are open, how many long jobs run and wait."""

    def initialize(self, service: Service) -> None:
        """Called with the service for each request."""
        self._service = service

    def get(self) -> None:
        """Answer in JSON."""
        jobs = self._service.jobs
        self.write({"version": VERSION, "sessions": self._service.sessions, "jobs_running": jobs.running,
                    "jobs_waiting": jobs.waiting})


VERSION: str = tomllib.loads((CHECKOUT / "pyproject.toml").read_text(encoding="utf-8"))["project"]["version"]
"""The version that is served."""


def unexpected_only(loop: AbstractEventLoop, context: dict[str, Any]) -> None:
    """Log what went wrong in a task, except that a browser left while a message was on its way: that is no fault."""
    if not isinstance(context.get("exception"), WebSocketClosedError):
        loop.default_exception_handler(context)


def _send_at_once() -> None:
    """Switch off the collecting of small packets: a message of several frames would wait 40 ms for its second one."""
    per_app_patterns[:] = [(route, _prompt(handler) if route == r"/ws" else handler)
                           for route, handler, *_ in per_app_patterns]


def _prompt(handler: Any) -> Any:
    if handler.__name__ == "PromptHandler":
        return handler

    class PromptHandler(handler):  # type: ignore[misc]
        def check_origin(self, origin: str) -> bool:
            allowed: bool = check_allowlist(urlparse(origin).netloc.lower(), self.application.websocket_origins)
            if not allowed:
                log.tell("origin refused", origin[:_MOST_ORIGIN], level=logging.WARNING)
            return allowed

        def open(self, *args: Any, **kwargs: Any) -> Any:
            self.set_nodelay(True)
            return super().open(*args, **kwargs)

    return PromptHandler
