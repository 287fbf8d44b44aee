"""How long a person waits: the first page, a key on the period slider, and what sessions cost the server.

Prints; nothing here fails for being slow. Run with `python3 -m tests.run tests/benchmarks -s`.
"""

from __future__ import annotations

import re
import statistics
import subprocess
import sys
import time
from pathlib import Path

from playwright.sync_api import Page

from tests.benchmarks.harness import machine
from tests.browser.conftest import browser, page, ready, served
from webapp.environment import CHECKOUT

__all__ = ["browser", "page", "served"]

PRESSES = 30

# Times of one key press, from the event to the end of the paint that shows its answer.
WATCH = """() => {
  const painted = (name) => requestAnimationFrame(() => setTimeout(() => {
    window.times[name] ??= performance.now() - window.pressed
  }, 0))
  const doc = Bokeh.documents[0]
  doc.get_model_by_name("preview").properties.data.change.connect(() => painted("preview"))
  doc.get_model_by_name("curve").properties.data.change.connect(() => painted("exact"))
  document.addEventListener("keydown", () => { window.times = {}; window.pressed = performance.now() }, true)
}"""


def test_a_key_press_on_the_slider(page: Page) -> None:
    page.wait_for_function("() => Bokeh.documents[0].get_model_by_name('rows').tags[0] >= 0")
    page.evaluate(WATCH)
    page.locator("#period-slider").focus()
    taken: dict[str, list[float]] = {"preview": [], "exact": []}
    for _ in range(PRESSES):
        page.keyboard.press("ArrowRight")
        page.wait_for_function("() => window.times.preview && window.times.exact")
        for name, times in taken.items():
            times.append(page.evaluate("(name) => window.times[name]", name))
    print(f"\n{machine()}")
    for name, times in taken.items():
        ordered = sorted(times)
        print(f"slider key to {name} repaint: median {statistics.median(times):.0f} ms, "
              f"95th percentile {ordered[int(0.95 * len(ordered))]:.0f} ms")


def test_the_first_page(browser: object, tmp_path: Path) -> None:
    begin = time.perf_counter()
    with subprocess.Popen([sys.executable, "-m", "webapp", "--port", "0", str(CHECKOUT / "scenarios")],
                          cwd=CHECKOUT, stdout=subprocess.PIPE, text=True) as server:
        assert server.stdout is not None
        address = re.search(r"http://\S+", server.stdout.readline())
        assert address is not None
        visited = browser.new_page()  # type: ignore[attr-defined]
        visited.goto(address[0])
        ready(visited)
        print(f"\ncommand to first page with its figures: {time.perf_counter() - begin:.1f} s")
        visited.close()
        server.terminate()


def resident(process: int) -> float:
    """Resident memory of a process in MB (Linux)."""
    return int(Path(f"/proc/{process}/statm").read_text().split()[1]) * 4096 / 1e6


def test_what_sessions_cost(browser: object, tmp_path: Path) -> None:
    with subprocess.Popen([sys.executable, "-m", "webapp", "--port", "0", str(CHECKOUT / "scenarios")],
                          cwd=CHECKOUT, stdout=subprocess.PIPE, text=True) as server:
        assert server.stdout is not None
        address = re.search(r"http://\S+", server.stdout.readline())
        assert address is not None
        rest, pages = resident(server.pid), []
        for _ in range(6):
            pages.append(browser.new_page())  # type: ignore[attr-defined]
            pages[-1].goto(address[0])
            ready(pages[-1])
            if len(pages) == 1:
                first = resident(server.pid)
        print(f"\nserver at rest {rest:.0f} MB, with one session {first:.0f} MB, "
              f"each further one {(resident(server.pid) - first) / 5:.1f} MB")
        for visited in pages:
            visited.close()
        server.terminate()
