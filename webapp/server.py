"""The server of the page: one function for each visitor, bound to one address, its messages sent without delay."""

from __future__ import annotations

from asyncio import AbstractEventLoop
from pathlib import Path
from typing import Any

import panel as pn
from bokeh.server.urls import per_app_patterns
from tornado.websocket import WebSocketClosedError

from webapp.app import session
from webapp.files import Folder

_ASSETS = Path(__file__).parent / "assets"
UNUSED_SESSION_S = 15
"""How long a session is kept after its browser has gone."""


def server(folder: Folder, host: str, port: int, show: bool = False, view_only: bool = False) -> Any:
    """A server of the page, not started yet. Raises OSError where it cannot listen.

    `show` opens a browser; `view_only`: visitors move sliders and look, nothing is changed or saved.
    """
    _send_at_once()
    served = pn.serve(
        # A function of its own, because Panel takes nothing else that can be called.
        {"/": lambda: session(folder, view_only)}, address=host, port=port, show=show, start=False, title="Colonnade",
        verbose=False, liveness=True, static_dirs={"assets": str(_ASSETS)},
        unused_session_lifetime_milliseconds=UNUSED_SESSION_S * 1000,
    )
    served.io_loop.asyncio_loop.set_exception_handler(unexpected_only)
    return served


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
        def open(self, *args: Any, **kwargs: Any) -> Any:
            self.set_nodelay(True)
            return super().open(*args, **kwargs)

    return PromptHandler
