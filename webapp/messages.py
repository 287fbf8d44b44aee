"""What the browser may say: one record for each kind of message, checked before anything acts on it."""

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
    """An entry moves up or down."""

    path: str
    index: int
    by: Literal[-1, 1]


class Undo(Message, frozen=True):
    """One step back."""


class Redo(Message, frozen=True):
    """One step forth."""


class Browse(Message, frozen=True):
    """Ask for the list of scenarios."""


class Open(Message, frozen=True):
    """Open a file of the folder."""

    name: str


class Save(Message, frozen=True):
    """Save under a name; `agreed`: the user has read what would be lost."""

    name: str
    agreed: bool = False


class Cancel(Message, frozen=True):
    """Stop working out the verdict."""


class Again(Message, frozen=True):
    """Work out the verdict after all."""


AnyMessage = (Hello | Theme | Scale | Set | Revert | Slide | Settle | Layer | Window | Duplicate | Delete | Move | Undo
              | Redo | Browse | Open | Save | Cancel | Again)


def read(data: object) -> AnyMessage:
    """The message that plain data of the browser holds. Raises msgspec.ValidationError for anything else."""
    message: AnyMessage = msgspec.convert(data, AnyMessage)
    return message
