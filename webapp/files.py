"""The served folder: what scenarios it holds, and reading and saving them there and nowhere else."""

from __future__ import annotations

import os
import re
from dataclasses import dataclass, replace
from pathlib import Path

from transport import Scenario, ScenarioError, parse_scenario, save_scenario
from transport.scenario import has_comments, read_text
from webapp.environment import CHECKOUT

DEMOS = CHECKOUT / "scenarios"
"""The demo scenarios, which any folder may begin with."""
MOST_LISTED = 200
"""Files that the list of scenarios shows at most."""

_PLAIN_NAME = re.compile(r"[^\W_][\w .,+()-]{0,98}\.toml")


@dataclass(frozen=True, slots=True)
class Entry:
    """A file of the folder: its scenario's title and note, or the problem that keeps it from being opened."""

    name: str
    title: str
    note: str
    problem: str | None = None
    demo: bool = False


class Folder:
    """The one folder that the page lists, opens from and saves to.

    A name is a plain file name: no path, no hidden file, no symbolic link that leads out. Raises ScenarioError where
    there is no such folder.
    """

    def __init__(self, path: str | os.PathLike[str]) -> None:
        self.path = Path(os.path.realpath(path))
        if not self.path.is_dir():
            raise ScenarioError(os.fspath(path), "is not a folder; name the folder that holds the scenarios")

    def names(self) -> tuple[str, ...]:
        """Names of the scenario files, in alphabetical order, at most MOST_LISTED. Raises ScenarioError."""
        try:
            found = sorted((path.name for path in self.path.iterdir()), key=str.casefold)
        except OSError as error:
            raise ScenarioError(self.path.name, f"cannot be read ({error.strerror}); mend that and try again") from None
        return tuple(name for name in found if self._is_ours(name))[:MOST_LISTED]

    def entries(self) -> tuple[Entry, ...]:
        """Every scenario with its title and note. Raises ScenarioError where the folder cannot be read."""
        return tuple(self._entry(name) for name in self.names())

    def offered(self) -> tuple[Entry, ...]:
        """Every scenario, and demos to begin with unless the folder is theirs. Raises ScenarioError."""
        if not DEMOS.is_dir() or self.path == Path(os.path.realpath(DEMOS)):
            return self.entries()
        return (*self.entries(), *(replace(entry, demo=True) for entry in Folder(DEMOS).entries()))

    def text(self, name: str) -> str:
        """The text of a file. Raises ScenarioError."""
        place = self._place(name)
        if not place.exists():
            raise ScenarioError(name, "is not in the served folder; choose one of the list")
        return read_text(place)

    def objections(self, name: str, known: str | None) -> tuple[str, ...]:
        """What would be lost by saving under `name`, as sentences. Raises ScenarioError for a name of no use.

        `known`: the file's text as this session last saw it; None where the session did not open or save it.
        """
        if not self._place(name).exists():
            return ()
        text = self.text(name)
        found = []
        if known is None:
            found.append(f"{name} is there already and would be replaced.")
        elif text != known:
            found.append(f"{name} has been changed elsewhere since this page read it; those changes would go.")
        if has_comments(text):
            found.append(f"{name} holds comments; they would go, because saving writes the file anew.")
        return tuple(found)

    def save(self, name: str, scenario: Scenario) -> None:
        """Write the scenario, whole or not at all. Raises ScenarioError."""
        save_scenario(scenario, self._place(name))

    def _entry(self, name: str) -> Entry:
        try:
            scenario = parse_scenario(self.text(name))
        except ScenarioError as error:
            return Entry(name, name, "", str(error))
        return Entry(name, scenario.title, scenario.note)

    def _is_ours(self, name: str) -> bool:
        try:
            return self._place(name).is_file()
        except ScenarioError:
            return False

    def _place(self, name: str) -> Path:
        if not _PLAIN_NAME.fullmatch(name):
            raise ScenarioError(name, "must be a plain file name that begins with a letter or digit and ends in .toml")
        place = Path(os.path.realpath(self.path / name))
        if place.parent != self.path:
            raise ScenarioError(name, "leads out of the served folder; choose another name")
        return place


def with_suffix(name: str) -> str:
    """A name as it is saved: `.toml` added where it lacks."""
    name = name.strip()
    return name if name.endswith(".toml") else f"{name}.toml"
