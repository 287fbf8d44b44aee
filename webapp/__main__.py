"""Serves the page: python -m webapp [--host HOST] [--port PORT] [--open] [FOLDER], and options to serve others."""

from __future__ import annotations

import argparse
import os
import re
import signal
import sys
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Any, NoReturn

HIGHEST_PORT = 65_535
MOST_JOBS = 256
JOBS_PER_SESSION = 2

_HOST = re.compile(r"(?!-)[a-z0-9.-]{1,253}(:(\d{1,5}))?")


class _Parser(argparse.ArgumentParser):
    """A parser that says what is wrong in one sentence."""

    def error(self, message: str) -> NoReturn:
        """Print the sentence and leave with status 2."""
        self.exit(2, f"{message[:1].lower()}{message[1:]}; {self.prog} --help lists what there is\n")


def main(arguments: Sequence[str] | None = None) -> int:
    """Serve until told to stop; returns the exit status: 0 stopped, 2 bad input."""
    options = _parser().parse_args(arguments)
    # Imported here so that --help and a bad option are answered at once.
    from transport import ScenarioError
    from transport.parameters import PARAMETERS
    from webapp.files import Folder

    try:
        limit = PARAMETERS["most_periods"]
        options.most_periods = options.most_periods or int(limit.high)
        if not limit.admits(options.most_periods):
            raise ScenarioError("--most-periods", f"{limit.requirement}, the format's own limits")
        folder = Folder(options.folder)
        return _serve(folder, options)
    except ScenarioError as error:
        print(error, file=sys.stderr)
    except OSError as error:
        print(f"--host, --port: {options.host}:{options.port} cannot be served ({error.strerror}); choose another port",
              file=sys.stderr)
    return 2


def _parser() -> argparse.ArgumentParser:
    parser = _Parser(prog="python -m webapp", description="Serve the bench in a browser.")
    parser.add_argument("folder", nargs="?", default="scenarios", metavar="FOLDER", type=Path,
                        help="scenarios it lists and saves to (default: scenarios)")
    parser.add_argument("--host", default="127.0.0.1", help="address to listen on (default: 127.0.0.1, this machine)")
    parser.add_argument("--port", type=_port, default=5006, help="port to listen on (default: 5006)")
    parser.add_argument("--view-only", action="store_true", help="visitors move sliders and look; nothing is saved")
    parser.add_argument("--open", action="store_true", help="open a browser window")
    others = parser.add_argument_group("serving others")
    others.add_argument("--auth-file", type=_users, metavar="FILE", dest="users",
                        help="names and hashed passwords of those who may log in, made line by line by python -m "
                             "webapp.passwords NAME (default: no login, everybody may come in)")
    others.add_argument("--origin", type=_origin, action="append", default=[], metavar="HOST[:PORT]", dest="origins",
                        help="another address the page is reached at, as behind a proxy; may be repeated (default: "
                             "only its own address)")
    others.add_argument("--behind-proxy", action="store_true",
                        help="believe the proxy in front about a visitor's address and protocol (default: do not)")
    cores = min(os.cpu_count() or 1, MOST_JOBS)
    others.add_argument("--jobs", type=_whole(MOST_JOBS), default=cores, metavar="N",
                        help=f"long jobs at once for all visitors (default: the number of cores, here {cores})")
    others.add_argument("--jobs-per-session", type=_whole(MOST_JOBS), default=JOBS_PER_SESSION, metavar="N",
                        help=f"long jobs at once for one session (default: {JOBS_PER_SESSION})")
    others.add_argument("--most-periods", type=_whole(), metavar="N",
                        help="most periods of a target that a session may have worked out (default: the format's "
                             "limit of most_periods)")
    return parser


def _port(text: str) -> int:
    if not text.isdecimal() or not 0 <= int(text) <= HIGHEST_PORT:
        raise argparse.ArgumentTypeError(f"{text!r} must be a whole number from 0 to {HIGHEST_PORT:,}")
    return int(text)


def _whole(most: int | None = None) -> Callable[[str], int]:
    limits = "of at least 1" if most is None else f"from 1 to {most:,}"

    def read(text: str) -> int:
        # A number of ten digits is beyond every limit here.
        if not (text.isascii() and text.isdecimal() and len(text) < 10) or not 1 <= int(text) <= (most or int(text)):
            raise argparse.ArgumentTypeError(f"{text!r} must be a whole number {limits}")
        return int(text)

    return read


def _origin(text: str) -> str:
    found = _HOST.fullmatch(text.lower())
    if not found or int(found[2] or 1) > HIGHEST_PORT:
        raise argparse.ArgumentTypeError(f"{text!r} must be a host name or address and, where it is not the usual one, "
                                         "a port, such as bench.example.org or 192.0.2.7:8080")
    return text.lower()


def _users(text: str) -> Any:
    from webapp.passwords import read_users

    try:
        return read_users(text)
    except ValueError as error:
        raise argparse.ArgumentTypeError(str(error)) from None


def _serve(folder: Any, options: argparse.Namespace) -> int:
    from webapp import log
    from webapp.jobs import Jobs
    from webapp.server import VERSION, server
    from webapp.service import Service

    jobs = Jobs(options.jobs, options.jobs_per_session)
    service = Service(folder, jobs, options.most_periods, has_login=options.users is not None,
                      view_only=options.view_only)
    served = server(service, options.host, options.port, show=options.open, users=options.users,
                    origins=tuple(options.origins), behind_proxy=options.behind_proxy)
    log.start()
    for number in (signal.SIGINT, signal.SIGTERM):
        signal.signal(number, lambda *_: served.io_loop.add_callback_from_signal(served.io_loop.stop))
    served.start()
    print(f"Colonnade serves {folder.path} at http://{_shown(options.host)}:{served.port}  (Ctrl-C stops it)",
          flush=True)
    log.tell("started", f"version {VERSION} at http://{_shown(options.host)}:{served.port}, "
                        f"{'with' if options.users else 'without'} login")
    served.io_loop.start()
    jobs.close()
    served.stop(wait=False)
    return 0


def _shown(host: str) -> str:
    return f"[{host}]" if ":" in host else host


if __name__ == "__main__":
    sys.exit(main())
