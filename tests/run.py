"""The second command: `python3 -m tests.run` makes an environment if there is none, finds a browser and tests all.

Arguments are handed on to pytest, which then runs alone (`python3 -m tests.run tests/benchmarks`).
"""

from __future__ import annotations

import subprocess
import sys
import tempfile
from pathlib import Path

from tests.browser.chromium import obtained
from webapp.environment import CHECKOUT, prepared

STATIC_CHECKS = [["ruff", "check", "."], ["mypy"]]
BROWSER = "tests/browser"


def main() -> int:
    """Style, types and tests, all of them whatever fails; 0 if nothing did."""
    python = prepared("test")
    obtained(python)
    wanted = sys.argv[1:]
    checks = [["pytest", *wanted]] if wanted else STATIC_CHECKS
    ends = [subprocess.run([python, "-m", *check], cwd=CHECKOUT, check=False).returncode for check in checks]
    return max(ends if wanted else [*ends, *_all_tests(python)], key=abs)


def _all_tests(python: Path) -> tuple[int, int]:
    """Those of the browser and all others at the same time, a core for each; their exit statuses."""
    command = [str(python), "-m", "pytest"]
    with tempfile.TemporaryFile("w+") as told:
        others = subprocess.Popen([*command, f"--ignore={BROWSER}", "-p", "no:cacheprovider"], cwd=CHECKOUT,
                                  stdin=subprocess.DEVNULL, stdout=told, stderr=subprocess.STDOUT)
        browser = subprocess.run([*command, BROWSER], cwd=CHECKOUT, check=False).returncode
        other = others.wait()
        told.seek(0)
        print(told.read(), flush=True)
    return browser, other


if __name__ == "__main__":
    sys.exit(main())
