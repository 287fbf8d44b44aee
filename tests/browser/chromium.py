"""Finds the browser of the browser tests: an installed Chromium or Chrome, else Playwright's own, else Debian's.

Needs nothing but the standard library, because it runs before the tests' environment is entered.
"""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
import tempfile
from pathlib import Path

NAMES = ("chromium", "chromium-browser", "google-chrome", "google-chrome-stable", "chrome")
FLAGS = ("--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--disable-background-networking",
         "--disable-component-update", "--disable-sync")
NO_DRIVER = "Playwright does not start, for want of a library: as root, apt-get install libatomic1; then start again."
NO_BROWSER = "No browser for the browser tests: install Chromium (as root, apt-get install chromium); then start again."


def found(python: Path) -> Path | None:
    """A browser on this machine that starts, an installed one before Playwright's.

    `python`: the interpreter that Playwright is installed for.
    """
    on_path = (Path(place) for place in map(shutil.which, NAMES) if place)
    return next((browser for browser in (*on_path, _playwrights(python)) if _starts(browser)), None)


def obtained(python: Path) -> Path:
    """The browser found, or one fetched now; ends the program with one sentence if there is none to be had."""
    if not _drives(python):
        _install("libatomic1")
        if not _drives(python):
            sys.exit(NO_DRIVER)
    browser = found(python)
    for fetch in (_fetch_playwrights, _fetch_debians):
        if browser is None:
            fetch(python)
            browser = found(python)
    return browser or sys.exit(NO_BROWSER)


def _drives(python: Path) -> bool:
    """Whether Playwright itself runs: its driver needs a library that a bare Debian has not."""
    return subprocess.run([python, "-m", "playwright", "--version"], capture_output=True, check=False).returncode == 0


def _playwrights(python: Path) -> Path:
    """Where Playwright keeps, or would keep, its own browser."""
    ask = "from playwright.sync_api import sync_playwright as s\nwith s() as p: print(p.chromium.executable_path)"
    return Path(subprocess.run([python, "-c", ask], capture_output=True, text=True, check=True).stdout.strip())


def _starts(browser: Path) -> bool:
    """Whether it runs at all: a browser fetched by Playwright may miss libraries of the machine."""
    if not browser.is_file():
        return False
    with tempfile.TemporaryDirectory(ignore_cleanup_errors=True) as profile:
        flags = (*FLAGS, f"--user-data-dir={profile}")
        trial: list[str | Path] = [browser, "--headless", *flags, "--dump-dom", "about:blank"]
        try:
            return subprocess.run(trial, capture_output=True, timeout=60, check=False).returncode == 0
        except subprocess.TimeoutExpired:
            return False


def _fetch_playwrights(python: Path) -> None:
    print("No browser found: fetching Playwright's own.", flush=True)
    libraries = ["--with-deps"] if _may_install() else []
    subprocess.run([python, "-m", "playwright", "install", *libraries, "chromium"], check=False)


def _fetch_debians(_python: Path) -> None:
    _install("chromium")


def _install(package: str) -> None:
    if not _may_install():
        return
    print(f"Installing Debian's {package}.", flush=True)
    silent = os.environ | {"DEBIAN_FRONTEND": "noninteractive"}
    for step in (["update"], ["install", "--yes", "--no-install-recommends", package]):
        subprocess.run(["apt-get", "--quiet=2", *step], env=silent, check=False)


def _may_install() -> bool:
    return os.geteuid() == 0 and shutil.which("apt-get") is not None
