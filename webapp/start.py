"""The first command: `python3 -m webapp.start` makes an environment if there is none and serves the page.

Options are handed on to the server (`--port`, `--host`, `--open`, a folder of scenarios).
"""

from __future__ import annotations

import os
import sys

from webapp.environment import prepared


def main() -> None:
    """Become the server, so that a stop signal reaches it directly."""
    python = prepared()
    os.execv(python, [str(python), "-m", "webapp", *sys.argv[1:]])


if __name__ == "__main__":
    main()
