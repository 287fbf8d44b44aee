"""The state of one session: the document being edited, its undo and redo, and the scenario it comes to.

Free of Panel, so that it is tested without a browser. A value that cannot be used stays as a draft beside its field,
with the engine's sentence, while the last usable document remains in force: nothing typed is lost, nothing wrong is
computed.
"""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field, replace

import msgspec

from transport import (
    Document,
    Scenario,
    ScenarioError,
    document_from_data,
    document_to_data,
    format_scenario,
    parse_scenario,
    read_peaks,
    scenario_from_document,
)
from transport.document import LayerRecord
from transport.grouping import Kind, thickened
from webapp import edits
from webapp.edits import Data, Reorder
from webapp.enclosed import scenario_from_report
from webapp.fields import applied, name_of, number, record_of, sentence_beside
from webapp.files import DEMOS, Folder, with_suffix

MOST_STEPS = 300
"""Steps that undo goes back at most."""

NEW_SCENARIO = """
format = 1
title = "New scenario"
[leads.left]
material = "GaAs"
[leads.right]
material = "GaAs"
[stack]
periods = 8
cell = [ { material = "AlGaAs", x = 0.3, thickness_nm = 2.5 }, { material = "GaAs", thickness_nm = 6.0 } ]
exit = [ { material = "AlGaAs", x = 0.3, thickness_nm = 2.5 } ]
"""
"""What the page of an empty folder begins with."""


@dataclass(frozen=True, slots=True)
class Draft:
    """Text in a field that cannot be used, and the sentence that says why."""

    text: str
    message: str = ""


Kept = dict[str, str | dict[str, str]]
"""Unsaved edits as the browser keeps them: `text`, `drafts`, and `base`, a digest of the file they began from."""

Drafts = Mapping[str, Draft]
"""Drafts by the path of their field."""


@dataclass(frozen=True, slots=True)
class State:
    """One step of the undo stack: the document in force, the drafts beside it, the file's name, what led here."""

    document: Document
    drafts: Drafts = field(default_factory=dict)
    place: str | None = None
    step: str = ""


@dataclass(frozen=True, slots=True)
class Notice:
    """A sentence for the user that belongs to no field; `about`: the path of the list or the command it concerns."""

    about: str
    sentence: str
    is_fault: bool = True


class Bench:
    """What one session edits. Methods never raise for what a user wrote: they leave a draft or a `notice`."""

    def __init__(self, folder: Folder, wanted: str | None = None, linked: Document | None = None) -> None:
        self.folder = folder
        self.notice: Notice | None = None
        self._scenario = parse_scenario(NEW_SCENARIO)
        self._state = State(self._scenario.document)
        self._saved: dict[str | None, Document] = {None: self._scenario.document}
        self._texts: dict[str, str] = {}
        self._past: list[State] = []
        self._future: list[State] = []
        self._sliding = False
        if linked is not None:
            self._scenario = scenario_from_document(linked)
            self._state = State(linked)
        else:
            self._open_first(wanted)

    @property
    def document(self) -> Document:
        """The last usable document."""
        return self._state.document

    @property
    def scenario(self) -> Scenario:
        """What the document comes to."""
        return self._scenario

    @property
    def drafts(self) -> Drafts:
        """Unusable text by the path of its field."""
        return self._state.drafts

    @property
    def place(self) -> str | None:
        """The file the document was opened from or saved to."""
        return self._state.place

    @property
    def is_changed(self) -> bool:
        """Whether the file lacks something of what is on screen."""
        return bool(self.drafts) or self._saved.get(self.place) != self.document

    @property
    def undo_step(self) -> str | None:
        """What undo would take back, in words; None where there is nothing."""
        return self._state.step if self._past else None

    @property
    def redo_step(self) -> str | None:
        """What redo would bring back, in words; None where there is nothing."""
        return self._future[-1].step if self._future else None

    def refuse(self, about: str, sentence: str) -> None:
        """Tell the user of something that cannot be done; nothing changes."""
        self.notice = Notice(about, sentence)

    # Edits of values.

    def set(self, path: str, text: str) -> None:
        """Put `text` into the field at `path`: in force if it can be used, else a draft."""
        if self._holds(record_of(path)):
            self._use({**self.drafts, path: Draft(text)}, path, f"change of {name_of(path).replace('_', ' ')}")

    def revert(self, path: str) -> None:
        """Give up the draft at `path`."""
        drafts = {other: draft for other, draft in self.drafts.items() if other != path}
        self._enter(replace(self._state, drafts=drafts, step="draft given up"), self.scenario)

    def slide(self, periods: int) -> None:
        """Set the number of periods while a slider moves: one undo step from the first call to `settle`."""
        continues, depth = self._sliding, len(self._past)
        self.set("stack.periods", str(periods))
        if continues and len(self._past) > depth:
            del self._past[-1]
        self._sliding = True

    def settle(self) -> None:
        """The slider has come to rest."""
        self._sliding = False

    # Edits of lists.

    def add_layer(self, path: str, index: int) -> None:
        """Put a new layer into the list at `path`, before position `index`."""
        self._rearrange(path, lambda data: edits.inserted(data, path, index, edits.new_layer(data)), "new layer")

    def add_window(self, kind: str) -> None:
        """Put a new window at the end of the target."""
        path, windows = "target.windows", self.document.target.windows if self.document.target else ()
        self._rearrange(path, lambda data: edits.inserted(data, path, len(windows), edits.new_window(data, kind)),
                        f"new {kind} window")

    def duplicate(self, path: str, index: int) -> None:
        """Put a copy of an entry behind it."""
        if self._holds(f"{path}[{index}]"):
            self._rearrange(path, lambda data: edits.inserted(
                data, path, index + 1, edits.value_at(data, f"{path}[{index}]")), "copy")

    def delete(self, path: str, index: int) -> None:
        """Take an entry out of the list at `path`."""
        if self._holds(f"{path}[{index}]"):
            self._rearrange(path, lambda data: edits.deleted(data, path, index), "deletion")

    def move(self, path: str, index: int, by: int) -> None:
        """Move an entry of the list at `path` by so many places, up (below 0) or down."""
        if index + by >= 0 and self._holds(f"{path}[{index}]") and self._holds(f"{path}[{index + by}]"):
            self._rearrange(path, lambda data: edits.moved(data, path, index, index + by), "move")

    def mirror(self, path: str) -> None:
        """Turn a list of layers round."""
        self._rearrange(path, lambda data: edits.mirrored(data, path), "turning round")

    def double(self, path: str) -> None:
        """Write a list of layers twice."""
        self._rearrange(path, lambda data: edits.doubled(data, path), "writing twice")

    def thicken(self, kind: Kind, monolayers: float) -> None:
        """Make all barriers, or all wells, thicker or thinner by some monolayers."""
        try:
            scenario = thickened(self.scenario, kind, monolayers)
        except ScenarioError as error:
            self.notice = Notice("layers", str(error))
            return
        self._enter(replace(self._state, document=scenario.document, step=f"change of all {kind}"), scenario)

    def adopt(self, scenario: Scenario, step: str) -> None:
        """Take on a scenario that was proposed; undo leads back, to the drafts as well."""
        self._enter(State(scenario.document, {}, self.place, step), scenario)

    def drop_ends(self) -> None:
        """Take the end treatment away."""
        self._rearrange("stack.ends", lambda data: (edits.with_value(data, "stack.ends", None), lambda old: old),
                        "ends taken away")

    def measure(self, text: str, lever_arm: str) -> None:
        """Put the peaks of a table in place of those measured before; without text, take them away."""
        try:
            arm = number("measured.lever_arm", lever_arm)
            record = read_peaks(text, None if arm is None else float(arm)) if text.strip() else None
            scenario = scenario_from_document(msgspec.structs.replace(self.document, measured=record))
        except ScenarioError as error:
            self.notice = Notice("measured", str(error))
            return
        self._enter(replace(self._state, document=scenario.document,
                            step="measured peaks" if record else "measured peaks taken away"), scenario)

    def undo(self) -> None:
        """One step back."""
        if self._past:
            self._future.append(self._state)
            self._go(self._past.pop())

    def redo(self) -> None:
        """One step forth again."""
        if self._future:
            self._past.append(self._state)
            self._go(self._future.pop())

    # Files.

    def begin_with(self, name: str) -> None:
        """Begin a scenario of one's own with a demo; undo leads back."""
        if found := self._read(Folder(DEMOS), name):
            self._enter(State(found[1].document, {}, None, f"beginning with {name}"), found[1])

    def _read(self, folder: Folder, name: str) -> tuple[str, Scenario] | None:
        """Text and scenario of a file; None, and a notice, where it cannot be opened."""
        try:
            text = folder.text(name)
            return text, parse_scenario(text)
        except ScenarioError as error:
            self.notice = Notice("open", f"{name} cannot be opened: {error}")
            return None

    def open(self, name: str) -> None:
        """Open a file of the folder; undo leads back to what was on screen."""
        found = self._read(self.folder, name)
        if found is None:
            return
        text, scenario = found
        self._texts[name], self._saved[name] = text, scenario.document
        self._enter(State(scenario.document, {}, name, f"opening of {name}"), scenario)

    def kept(self) -> Kept | None:
        """What no file holds yet; None where there is nothing."""
        if not self.is_changed:
            return None
        texts = {path: draft.text for path, draft in self.drafts.items()}
        base = _digest(self._texts.get(self.place or ""))
        return {"text": format_scenario(self.scenario), "drafts": texts, "base": base}

    def restore(self, text: str, drafts: Mapping[str, str], base: str) -> None:
        """Bring back what was never saved; undo leads to the file. `base`: digest of the file it began from."""
        try:
            scenario = parse_scenario(text)
        except ScenarioError as error:
            self.notice = Notice("kept", f"Edits kept in this browser cannot be read and stay there: {error}")
            return
        refused = {path: _refused(scenario, path, Draft(text)) for path, text in drafts.items()}
        self._enter(State(scenario.document, refused, self.place, "return of unsaved edits"), scenario)
        sentence = "Edits that were not saved are back; Undo leads to the file."
        if self.place is not None and base != _digest(self._texts.get(self.place)):
            # Saving asks first, as for any file that others have changed.
            self._texts[self.place] = ""
            sentence += f" {self.place} was changed elsewhere in the meantime."
        self.notice = Notice("kept", sentence, is_fault=False)

    def laid(self, name: str | None, demo: bool = False) -> tuple[str, Scenario] | None:
        """A scenario to lay over the bench, with a name for it: the present one, or a file's; None, and a notice."""
        if name is None:
            return f"{self.scenario.title}, {self.scenario.stack.periods:,} periods", self.scenario
        found = self._read(Folder(DEMOS) if demo else self.folder, name)
        return found and (f"{found[1].title}, {found[1].stack.periods:,} periods", found[1])

    def open_text(self, name: str, text: str) -> None:
        """Open a file of the user's own, a scenario or a report with one in it; it belongs to no file of the folder."""
        try:
            scenario = scenario_from_report(text) if text.lstrip()[:1] == "<" else parse_scenario(text)
        except ScenarioError as error:
            self.notice = Notice("open", f"{name} cannot be opened: {error}")
            return
        self._enter(State(scenario.document, {}, None, f"opening of {name}"), scenario)

    def take_layers(self, path: str, layers: Sequence[LayerRecord]) -> None:
        """Put the layers of a sheet in place of a list; drafts in the old list go."""
        stack = msgspec.structs.replace(self.document.stack, **{name_of(path): tuple(layers)})
        try:
            scenario = scenario_from_document(msgspec.structs.replace(self.document, stack=stack))
        except ScenarioError as error:
            self.notice = Notice("sheet", str(error))
            return
        drafts = {place: draft for place, draft in self.drafts.items() if not place.startswith(f"{path}[")}
        self._enter(State(scenario.document, drafts, self.place, "layer sheet"), scenario)

    def save(self, name: str, agreed: bool) -> tuple[str, ...]:
        """Save under `name`; unless `agreed`, first return what would be lost, as sentences, and leave the file."""
        name = with_suffix(name)
        try:
            objections = () if agreed else self._objections(name)
            if objections:
                return objections
            self.folder.save(name, self.scenario)
        except ScenarioError as error:
            self.notice = Notice("save", str(error))
            return ()
        self._texts[name], self._saved[name] = format_scenario(self.scenario), self.document
        self._state = replace(self._state, place=name)
        self.notice = Notice("save", f"Saved as {name}.", is_fault=False)
        return ()

    def _objections(self, name: str) -> tuple[str, ...]:
        found = self.folder.objections(name, self._texts.get(name) if name == self.place else None)
        if self.drafts:
            found += ("The marked fields hold what cannot be used; their last usable values are saved instead.",)
        return found

    def _open_first(self, wanted: str | None) -> None:
        """The file asked for, else the first that can be opened; without a way back to the empty page."""
        try:
            names = self.folder.names()
        except ScenarioError as error:
            self.notice = Notice("open", str(error))
            return
        refused = None
        for name in ([wanted] if wanted else []) + list(names):
            self.open(name)
            if self.place is not None:
                break
            refused = refused or self.notice
        self.notice = refused if wanted else None
        if not names:
            self.notice = Notice("open", "The folder holds no scenario yet: this is a new one, which Save as keeps. "
                                 "Open offers demos to begin with.", is_fault=False)
        self._past.clear()

    # How an edit is taken.

    def _holds(self, path: str) -> bool:
        """Whether there is a record at `path`: a message about a row may arrive after the row is gone."""
        data = document_to_data(self.document)
        return path in ("", "target", "growth") or edits.value_at(data, path) is not None

    def _use(self, drafts: Drafts, path: str, step: str) -> None:
        """Bring as many drafts into force as go together, those beside the one at `path` before the others."""
        beside = {other: draft for other, draft in drafts.items() if record_of(other) == record_of(path)}
        scenario, used = self.scenario, frozenset[str]()
        for group in (drafts, beside, {path: drafts[path]}, *({o: drafts[o]} for o in drafts if o != path)):
            if not used & group.keys() and (found := _tried(scenario, group)):
                scenario, used = found, used | group.keys()
        left = {other: _refused(scenario, other, draft) for other, draft in drafts.items() if other not in used}
        self._enter(State(scenario.document, left, self.place, step), scenario)

    def _rearrange(self, path: str, edit: Callable[[Data], tuple[Data, Reorder]], step: str) -> None:
        """Change a list; drafts move with their entries."""
        data, reorder = edit(document_to_data(self.document))
        try:
            scenario = scenario_from_document(document_from_data(data))
        except ScenarioError as error:
            self.notice = Notice(path, sentence_beside(path, error))
            return
        places = {old: edits.reordered(old, path, reorder) for old in self.drafts}
        drafts = {new: self.drafts[old] for old, new in places.items() if new is not None}
        self._enter(State(scenario.document, drafts, self.place, step), scenario)

    def _enter(self, state: State, scenario: Scenario) -> None:
        """Make `state` the present, with the old one behind it, unless nothing has changed."""
        self._sliding, self.notice = False, None
        if (state.document, state.drafts, state.place) == (self.document, self.drafts, self.place):
            return
        self._past = [*self._past, self._state][-MOST_STEPS:]
        self._future.clear()
        self._state, self._scenario = state, scenario

    def _go(self, state: State) -> None:
        self._sliding, self.notice = False, None
        self._state, self._scenario = state, scenario_from_document(state.document)


def _digest(text: str | None) -> str:
    return hashlib.sha256((text or "").encode()).hexdigest()


def _with_drafts(scenario: Scenario, drafts: Drafts) -> Scenario:
    """The scenario with the text of `drafts` in its fields. Raises ScenarioError."""
    data = document_to_data(scenario.document)
    rows = {row.key: row for row in scenario.sheet}
    for path, draft in drafts.items():
        data = applied(data, path, draft.text, scenario.document, rows)
    return scenario_from_document(document_from_data(data))


def _tried(scenario: Scenario, drafts: Drafts) -> Scenario | None:
    try:
        return _with_drafts(scenario, drafts)
    except ScenarioError:
        return None


def _refused(scenario: Scenario, path: str, draft: Draft) -> Draft:
    """A draft with the reason why it cannot be used."""
    try:
        _with_drafts(scenario, {path: draft})
    except ScenarioError as error:
        return replace(draft, message=sentence_beside(path, error))
    return draft
