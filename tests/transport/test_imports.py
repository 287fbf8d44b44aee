"""The wall between engine and screen, and how much an import may bring along."""

import subprocess
import sys

import pytest


@pytest.mark.parametrize("module", ["panel", "bokeh", "param", "webapp", "scipy"])
def test_importing_the_engine_does_not_bring(module: str) -> None:
    program = f"import sys, transport; sys.exit(any(m.split('.')[0] == {module!r} for m in sys.modules))"
    assert subprocess.run([sys.executable, "-c", program], check=False).returncode == 0
