"""Markup of the report from plain text: whatever comes from a file or the engine stays text."""

from __future__ import annotations

import math
import re
from collections.abc import Iterable, Sequence
from html import escape
from typing import Any

import numpy as np


class Markup(str):
    """Text that is markup already."""


Shown = str | float | int | bool | None


def text(value: object) -> str:
    """Plain text as markup shows it."""
    return escape(str(value), quote=True)


def coded(sentence: str) -> str:
    """A sentence of this program with its `names` set as code."""
    return re.sub(r"`([^`]*)`", r"<code>\1</code>", text(sentence))


def number(value: float, digits: int = 5) -> str:
    """A number as people read it: a true minus, powers of ten written out, a dash for what is not finite."""
    if not math.isfinite(value):
        return "\N{EN DASH}"
    mantissa, _, power = f"{value:.{digits}g}".partition("e")
    if power:
        mantissa = f"{mantissa}\N{MULTIPLICATION SIGN}".removeprefix("1\N{MULTIPLICATION SIGN}")
        mantissa += f"10<sup>{int(power)}</sup>"
    return mantissa.replace("-", "\N{MINUS SIGN}")


def table(head: Sequence[str], rows: Iterable[Sequence[Shown]], caption: str, digits: int = 5) -> str:
    """A table: numbers to the right, text to the left; it scrolls by itself where the screen is narrow."""
    body = "".join(f"<tr>{''.join(_cell(value, digits) for value in row)}</tr>" for row in rows)
    heads = "".join(f'<th scope="col">{text(name)}</th>' for name in head)
    return (f'<div class="table" tabindex="0" role="region" aria-label="{text(caption)}"><table>'
            f"<thead><tr>{heads}</tr></thead><tbody>{body}</tbody></table></div>")


def _cell(value: Any, digits: int) -> str:
    if isinstance(value, np.generic):
        value = value.item()
    if value is None:
        return '<td class="none">\N{EN DASH}</td>'
    if isinstance(value, bool):
        return f"<td>{'yes' if value else 'no'}</td>"
    if isinstance(value, (int, float)):
        shown = f"{value:,}" if isinstance(value, int) else number(value, digits)
        return f'<td class="number">{shown}</td>'
    return f"<td>{value if isinstance(value, Markup) else text(value)}</td>"


def paragraphs(sentences: Iterable[str], kind: str = "note") -> str:
    """Sentences, each a paragraph."""
    return "".join(f'<p class="{kind}">{text(sentence)}</p>' for sentence in sentences)


def listed(items: Iterable[str]) -> str:
    """A list of items that are markup already."""
    return "<ul>" + "".join(f"<li>{item}</li>" for item in items) + "</ul>"
