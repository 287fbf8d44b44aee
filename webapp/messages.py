"""What the browser may say, one record for each kind of message, and how it is told of a fault."""

from __future__ import annotations

from typing import Literal

import msgspec


class Message(msgspec.Struct, frozen=True, forbid_unknown_fields=True, tag_field="type", tag=str.lower):
    """A message; `seq` counts them, so that the browser knows which of its edits an answer already contains."""

    seq: int


class Hello(Message, frozen=True):
    """The page is there, in this theme."""

    theme: Literal["light", "dark"]


class Theme(Message, frozen=True):
    """Light or dark."""

    theme: Literal["light", "dark"]


class Scale(Message, frozen=True):
    """How transmission is drawn."""

    scale: Literal["log", "linear"]


class Set(Message, frozen=True):
    """Text for a field."""

    path: str
    text: str


class Revert(Message, frozen=True):
    """Give up the draft of a field."""

    path: str


class Slide(Message, frozen=True):
    """The period slider moves."""

    periods: int


class Settle(Message, frozen=True):
    """The period slider has come to rest."""


class Layer(Message, frozen=True):
    """A new layer at a position of a list."""

    path: str
    index: int


class Window(Message, frozen=True):
    """A new window."""

    kind: Literal["pass", "block"]


class Duplicate(Message, frozen=True):
    """A copy of an entry."""

    path: str
    index: int


class Delete(Message, frozen=True):
    """An entry goes."""

    path: str
    index: int


class Move(Message, frozen=True):
    """An entry moves up (below 0) or down by so many places."""

    path: str
    index: int
    by: int


class Mirror(Message, frozen=True):
    """A list of layers is turned round."""

    path: str


class Double(Message, frozen=True):
    """A list of layers is written twice."""

    path: str


class Thicken(Message, frozen=True):
    """All barriers, or all wells, become thicker or thinner."""

    kind: Literal["barriers", "wells"]
    monolayers: float


class DropEnds(Message, frozen=True):
    """The end treatment goes."""


class Propose(Message, frozen=True):
    """Look for matched ends, or for the nearest stacks that meet the target."""

    what: Literal["ends", "nearest"]
    whole: bool = False


class StopProposing(Message, frozen=True):
    """Give up looking."""


class Adopt(Message, frozen=True):
    """Take a proposal, by its place in the list on screen."""

    index: int


class Trace(Message, frozen=True):
    """Show the wave of a resonance, by its place in the ledger, and what moves it."""

    place: int


class Density(Message, frozen=True):
    """Draw the local density of states, or no longer."""

    shown: bool


class Measure(Message, frozen=True):
    """A table of measured peaks, in place of those that are there; empty takes them away."""

    text: str
    lever_arm: str


class Fit(Message, frozen=True):
    """Fit figures of the stack to the measured peaks."""

    figures: tuple[str, ...]


class StopFit(Message, frozen=True):
    """Give up fitting."""


class TakeFit(Message, frozen=True):
    """Take the fitted figures into the stack."""


class Lay(Message, frozen=True):
    """Lay a scenario over the bench: a file of the folder, a demo, or the present one as it is (no name)."""

    name: str | None = None
    demo: bool = False


class Unlay(Message, frozen=True):
    """Take one of those laid over the bench away."""

    place: int


class Link(Message, frozen=True):
    """Make an address that reopens this bench, on this page."""

    page: Literal["periods", "peaks", "compare", "handoff"]


class Export(Message, frozen=True):
    """Make a file of what is shown."""

    what: Literal["report", "scenario", "python", "grower", "json", "spectrum", "bands", "resonances", "periods",
                  "peaks", "layers"]
    rates: str = ""


class Sheet(Message, frozen=True):
    """Read a pasted layer sheet and show what it comes to."""

    text: str
    unit: Literal["nm", "angstrom", "monolayers"] | None = None


class TakeSheet(Message, frozen=True):
    """Put the layers of the sheet in place of a list."""

    path: Literal["stack.entry", "stack.cell", "stack.exit"]


class OpenText(Message, frozen=True):
    """Open a file of the user's own: a scenario, or a report with one in it."""

    name: str
    text: str


class Undo(Message, frozen=True):
    """One step back."""


class Redo(Message, frozen=True):
    """One step forth."""


class Browse(Message, frozen=True):
    """Ask for the list of scenarios."""


class Open(Message, frozen=True):
    """Open a file of the folder, or a demo."""

    name: str
    demo: bool = False


class Restore(Message, frozen=True):
    """Edits that were never saved, kept by the browser; `base`: digest of the file they began from."""

    text: str
    drafts: dict[str, str]
    base: str


class Save(Message, frozen=True):
    """Save under a name; `agreed`: the user has read what would be lost."""

    name: str
    agreed: bool = False


class Cancel(Message, frozen=True):
    """Stop working out the verdict."""


class Again(Message, frozen=True):
    """Work out the verdict after all."""


AnyMessage = (Hello | Theme | Scale | Set | Revert | Slide | Settle | Layer | Window | Duplicate | Delete | Move
              | Mirror | Double | Thicken | Undo | Redo | DropEnds | Propose | StopProposing | Adopt | Trace
              | Density | Measure | Fit | StopFit | TakeFit | Link | Export | Sheet | TakeSheet | OpenText | Lay
              | Unlay | Browse | Open | Restore | Save | Cancel | Again)


def changes_something(message: AnyMessage) -> bool:
    """Whether a message would change or save more than the number of periods, or start long work."""
    looks = (Hello, Theme, Scale, Slide, Settle, Browse, Open, Undo, Redo, Trace, Density, Lay, Unlay, Link, Export,
             OpenText, Cancel, Again)
    return not isinstance(message, looks) and not (isinstance(message, Set) and message.path == "stack.periods")


def in_words(error: Exception) -> str:
    """A refusal of the engine is a sentence; anything else is a fault of ours, which the log has in full."""
    if isinstance(error, ValueError):
        return str(error)
    return "Something went wrong within the program; the server's log says what. Undo the last edit to go on."


def read(data: object) -> AnyMessage:
    """The message that plain data of the browser holds. Raises msgspec.ValidationError for anything else."""
    message: AnyMessage = msgspec.convert(data, AnyMessage)
    return message
