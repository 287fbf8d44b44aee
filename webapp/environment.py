"""Makes the environment that the two start commands share: `.venv` at the top of the checkout.

Needs nothing but Python and its standard library, because it runs before anything is installed.
"""

from __future__ import annotations

import hashlib
import importlib.util
import os
import shutil
import subprocess
import sys
import tempfile
from pathlib import Path

CHECKOUT = Path(__file__).resolve().parent.parent
ENVIRONMENT = CHECKOUT / ".venv"
PYTHON = ENVIRONMENT / "bin" / "python"
OLDEST = (3, 11)


def prepared(extra: str = "") -> Path:
    """The environment's Python, with the project and its `extra` installed.

    What is installed already is found by a stamp, so that a second start asks no package index. Ends the program
    with one sentence when the environment cannot be made.
    """
    if sys.version_info < OLDEST:
        sys.exit(f"Colonnade needs Python {OLDEST[0]}.{OLDEST[1]} or newer, and this is "
                 f"{sys.version_info[0]}.{sys.version_info[1]}: start it with a newer python3.")
    if not _is_installed(extra):
        _install(extra)
    return PYTHON


def run(*command: str | Path, remedy: str) -> None:
    """Run a command of the set-up; if it fails, end the program with its exit status and what to do about it."""
    try:
        subprocess.run(command, check=True, cwd=CHECKOUT)
    except (OSError, subprocess.CalledProcessError) as error:
        sys.exit(f"{error}\n{remedy}")


def _is_installed(extra: str) -> bool:
    return PYTHON.exists() and any(
        stamp.is_file() and stamp.read_text() == _fingerprint() for stamp in {_stamp(extra), _stamp("test")}
    )


def _stamp(extra: str) -> Path:
    return ENVIRONMENT / f"installed-{extra or 'project'}"


def _fingerprint() -> str:
    """What an installation depends on: the requirements, and the place that the environment points to."""
    requirements = (CHECKOUT / "pyproject.toml").read_bytes()
    return hashlib.sha256(requirements + os.fsencode(CHECKOUT)).hexdigest()


def _install(extra: str) -> None:
    print("Installing into .venv; this happens once and takes a minute or two.", flush=True)
    if not PYTHON.exists() or not _has_pip():
        _make_environment()
    project = f".[{extra}]" if extra else "."
    run(PYTHON, "-m", "pip", "install", "--quiet", "--disable-pip-version-check", "--editable", project,
        remedy="The packages could not be installed: see what pip says above, then start again.")
    _stamp(extra).write_text(_fingerprint())


def _has_pip() -> bool:
    return subprocess.run([PYTHON, "-m", "pip", "--version"], capture_output=True, check=False).returncode == 0


def _make_environment() -> None:
    bundled = importlib.util.find_spec("ensurepip") is not None
    run(sys.executable, "-m", "venv", "--clear", *([] if bundled else ["--without-pip"]), ENVIRONMENT,
        remedy="The environment .venv could not be made: see what Python says above.")
    if not bundled:
        _install_debian_pip()


def _install_debian_pip() -> None:
    """Debian keeps pip in a package apart; it is unpacked beside the environment, which needs no administrator."""
    remedy = "This Python comes without pip: install python3-venv (as root: apt-get install python3-venv)."
    if shutil.which("apt-get") is None:
        sys.exit(remedy)
    with tempfile.TemporaryDirectory() as folder:
        if os.geteuid() == 0:
            run("apt-get", "update", "--quiet=2", remedy=remedy)
        fetch = ["apt-get", "download", "--quiet=2", "--option", "APT::Sandbox::User=root", "python3-pip-whl"]
        subprocess.run(fetch, cwd=folder, check=False)
        for package in Path(folder).glob("*.deb"):
            run("dpkg-deb", "--extract", package, folder, remedy=remedy)
        wheels = list(Path(folder).rglob("pip-*.whl"))
        if not wheels:
            sys.exit(remedy)
        run(PYTHON, wheels[0] / "pip", "install", "--quiet", "--no-index", wheels[0], remedy=remedy)
