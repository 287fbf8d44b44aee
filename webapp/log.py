"""The server's log: one JSON object a line on standard error, what happened and in which session."""

from __future__ import annotations

import json
import logging
import sys
import threading
from contextvars import ContextVar
from datetime import UTC, datetime
from types import TracebackType

SESSION: ContextVar[int | None] = ContextVar("session", default=None)
"""The number of the session that is being served."""

_OURS = "webapp"
_OTHERS = ("bokeh", "panel", "param", "tornado", "asyncio")

_log = logging.getLogger(_OURS)


def tell(event: str, what: str = "", session: int | None = None, level: int = logging.INFO) -> None:
    """Log an event; `session`: where it is not the one being served."""
    _log.log(level, event, extra={"what": what, "session": session})


class JsonLines(logging.Formatter):
    """A record as one line of JSON: time, level, event, session, what, and the traceback of a fault."""

    def format(self, record: logging.LogRecord) -> str:
        """The line."""
        ours = record.name == _OURS
        number = getattr(record, "session", None)
        line = {
            "time": datetime.fromtimestamp(record.created, UTC).isoformat(timespec="milliseconds"),
            "level": record.levelname.lower(),
            "event": record.getMessage() if ours else "fault" if record.levelno >= logging.ERROR else "notice",
            "session": SESSION.get() if number is None else number,
            "what": getattr(record, "what", "") if ours else f"{record.name}: {_said(record)}",
        }
        if record.exc_info and record.exc_info[0] is not None:
            line["traceback"] = self.formatException(record.exc_info)
        return json.dumps(line, ensure_ascii=False)


def _said(record: logging.LogRecord) -> str:
    # Beside a fault the libraries quote the browser's message, and with it the scenario: only their words are kept.
    return str(record.msg) if record.exc_info else record.getMessage()


def start() -> None:
    """Log to standard error from now on, the libraries and uncaught faults included."""
    handler = logging.StreamHandler(sys.stderr)
    handler.setFormatter(JsonLines())
    logging.basicConfig(handlers=[handler], level=logging.WARNING, force=True)
    logging.captureWarnings(True)
    _log.setLevel(logging.INFO)
    for name in _OTHERS:
        other = logging.getLogger(name)
        # Not empty, or param adds a handler of its own.
        other.handlers[:] = [logging.NullHandler()]
        other.propagate = True
        other.setLevel(logging.WARNING)
    # A request that was refused is no fault of the server.
    logging.getLogger("tornado.access").setLevel(logging.ERROR)
    sys.excepthook = _uncaught
    threading.excepthook = lambda fault: _uncaught(fault.exc_type, fault.exc_value, fault.exc_traceback)


def _uncaught(kind: type[BaseException], fault: BaseException | None, trace: TracebackType | None) -> None:
    if fault is not None and not issubclass(kind, KeyboardInterrupt | SystemExit):
        _log.critical("uncaught fault", exc_info=(kind, fault, trace))
