"""Serves the page: python -m webapp [--host HOST] [--port PORT] [--open] [FOLDER]."""

from __future__ import annotations

import argparse
import signal
import sys
from collections.abc import Sequence
from pathlib import Path
from typing import Any, NoReturn

HIGHEST_PORT = 65_535


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
    from webapp.files import Folder

    try:
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
    return parser


def _port(text: str) -> int:
    if not text.isdecimal() or not 0 <= int(text) <= HIGHEST_PORT:
        raise argparse.ArgumentTypeError(f"{text!r} must be a whole number from 0 to {HIGHEST_PORT:,}")
    return int(text)


def _serve(folder: Any, options: argparse.Namespace) -> int:
    from webapp.server import server

    served = server(folder, options.host, options.port, options.open, options.view_only)
    for number in (signal.SIGINT, signal.SIGTERM):
        signal.signal(number, lambda *_: served.io_loop.add_callback_from_signal(served.io_loop.stop))
    served.start()
    print(f"Colonnade serves {folder.path} at http://{_shown(options.host)}:{served.port}  (Ctrl-C stops it)",
          flush=True)
    served.io_loop.start()
    served.stop(wait=False)
    return 0


def _shown(host: str) -> str:
    return f"[{host}]" if ":" in host else host


if __name__ == "__main__":
    sys.exit(main())
