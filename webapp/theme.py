"""Colour, type and spacing of the whole page, figures included: the one place where the look is decided.

Two families of colour carry the contrast everywhere: warm for the finite stack, cool for the infinite lattice. The
target is ink of neither family; that a window passes or blocks is told by shape (open bracket, hatching).
"""

from __future__ import annotations

from dataclasses import asdict, dataclass

FONT = "'Inter', 'Segoe UI', 'Helvetica Neue', 'Liberation Sans', system-ui, sans-serif"
"""Typefaces in order of preference, all from the reader's own machine: the page asks no other server for any."""


@dataclass(frozen=True, slots=True)
class Palette:
    """Colours of one theme; `heat` runs from no transmission to full, `marker` shows on every part of it."""

    name: str
    page: str
    card: str
    sunken: str
    ink: str
    muted: str
    line: str
    grid: str
    warm: str
    warm_deep: str
    warm_tint: str
    cool: str
    cool_deep: str
    cool_tint: str
    target: str
    target_tint: str
    met: str
    met_tint: str
    missed: str
    missed_tint: str
    focus: str
    marker: str
    shadow: str
    heat: tuple[str, ...]
    windows: tuple[str, ...]


LIGHT = Palette(
    name="light",
    page="#f4f2ee", card="#ffffff", sunken="#f8f6f2", ink="#1c2128", muted="#5b626c", line="#dcd7ce", grid="#ece8e1",
    warm="#c2571a", warm_deep="#8f3c0c", warm_tint="#fbe6d6",
    cool="#1b7691", cool_deep="#0f5468", cool_tint="#d8ecf2",
    target="#41385e", target_tint="#ebe8f3",
    met="#24734a", met_tint="#e2f2e9", missed="#a32457", missed_tint="#fae6ee",
    focus="#1b7691", marker="#7a5cd6", shadow="0 1px 2px rgb(40 30 10 / .06), 0 4px 16px rgb(40 30 10 / .05)",
    heat=("#fdfaf5", "#fae9d2", "#f6cf9f", "#eeaa68", "#e08240", "#c45c1f", "#9a3d10", "#662407"),
    windows=("#41385e", "#8a6d00", "#a32457", "#4d6a2f", "#6a55b0", "#7a4a3a"),
)

DARK = Palette(
    name="dark",
    page="#11151a", card="#191e25", sunken="#141920", ink="#eceae5", muted="#a3acb7", line="#2f3843", grid="#232a33",
    warm="#f2975a", warm_deep="#ffc08f", warm_tint="#3a2517",
    cool="#62bdd6", cool_deep="#a4deee", cool_tint="#163642",
    target="#cfc6ee", target_tint="#2a2640",
    met="#6fcf9b", met_tint="#16301f", missed="#f287b0", missed_tint="#3a1a28",
    focus="#62bdd6", marker="#a58cff", shadow="0 1px 2px rgb(0 0 0 / .4), 0 4px 16px rgb(0 0 0 / .25)",
    heat=("#11151a", "#2a1a12", "#4d2a15", "#7c421c", "#b2602a", "#df8742", "#f7b877", "#ffeacb"),
    windows=("#cfc6ee", "#e5cc5c", "#f287b0", "#a9cf83", "#a892f2", "#d8a08c"),
)

PALETTES = {palette.name: palette for palette in (LIGHT, DARK)}

_SCALE = {
    "font": FONT,
    "text-small": "0.8125rem", "text": "0.9375rem", "text-large": "1.1875rem",
    "space-1": "0.25rem", "space-2": "0.5rem", "space-3": "0.75rem", "space-4": "1rem", "space-5": "1.5rem",
    "radius": "8px", "radius-small": "5px", "rail": "352px",
}


def heat_colours(palette: Palette, steps: int = 256) -> list[str]:
    """The heat scale in even steps of straight lines between its colours."""
    stops = [[int(colour[i:i + 2], 16) for i in (1, 3, 5)] for colour in palette.heat]
    result = []
    for step in range(steps):
        place = step * (len(stops) - 1) / (steps - 1)
        left = min(int(place), len(stops) - 2)
        mixed = (round(a + (b - a) * (place - left)) for a, b in zip(stops[left], stops[left + 1], strict=True))
        result.append("#" + "".join(f"{channel:02x}" for channel in mixed))
    return result


def css_variables() -> str:
    """The same colours and sizes as CSS custom properties, for `assets/page.css`."""
    scale = "".join(f"--{name}:{value};" for name, value in _SCALE.items())
    return (f":root{{{scale}{_colours(LIGHT)}color-scheme:light}}\n"
            f":root[data-theme=dark]{{{_colours(DARK)}color-scheme:dark}}")


def _colours(palette: Palette) -> str:
    plain = {name: value for name, value in asdict(palette).items() if isinstance(value, str) and name != "name"}
    heat = ",".join(palette.heat)
    return "".join(f"--{name.replace('_', '-')}:{value};" for name, value in plain.items()) + f"--heat:{heat};"
