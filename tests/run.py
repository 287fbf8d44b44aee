"""The second command: `python3 -m tests.run` makes an environment if there is none, finds a browser and tests all.

Arguments are handed on to pytest, which then runs alone (`python3 -m tests.run tests/benchmarks`).
"""

from __future__ import annotations

import subprocess
import sys

from tests.browser.chromium import obtained
from webapp.environment import CHECKOUT, prepared

STATIC_CHECKS = [["ruff", "check", "."], ["mypy"]]
TOGETHER = ["--numprocesses=2", "--dist=loadgroup"]
"""All tests at once: those of the browser on one core, one after another, and the rest on the other."""


def main() -> int:
    """Style, types and tests, all of them whatever fails; 0 if nothing did."""
    python = prepared("test")
    obtained(python)
    wanted = sys.argv[1:]
    checks = [["pytest", *wanted]] if wanted else [*STATIC_CHECKS, ["pytest", *TOGETHER]]
    ends = [subprocess.run([python, "-m", *check], cwd=CHECKOUT, check=False).returncode for check in checks]
    return max(ends, key=abs)


if __name__ == "__main__":
    sys.exit(main())
