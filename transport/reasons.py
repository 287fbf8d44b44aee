"""Why no number of periods will do: each obstacle as one sentence a designer can act on."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from transport.floor import Floor, Miniband, minibands
from transport.lattice import bloch
from transport.oscillation import Floats
from transport.structure import Stack, Window
from transport.windows import threshold

DASH = "\N{EN DASH}"


@dataclass(frozen=True, slots=True)
class WindowHistory:
    """One window's log10 measure for each count from 1, where its extremum lies (eV), margin (dB), and limit."""

    window: Window
    log10: Floats
    energy: Floats
    margin: Floats
    floor: Floor | None = None

    @property
    def met(self) -> NDArray[np.bool_]:
        """Where the window alone is met."""
        blocked = (self.log10 == -np.inf) & (self.window.kind == "block")
        return np.asarray(blocked | (self.margin >= 0))


def why_not(stack: Stack, records: tuple[WindowHistory, ...], resolution: float) -> str:
    """The reason, or reasons, why no count meets the target. `records` must have no count that meets all."""
    most = records[0].log10.size
    failing = [record for record in records if not record.met.any()]
    if failing:
        causes = [_cause(stack, record, resolution) for record in failing]
        return f"No number of periods up to {most} will do: " + "; ".join(causes) + "."
    return f"No number of periods up to {most} meets every window at once: " + _conflict(records) + "."


def _cause(stack: Stack, record: WindowHistory, resolution: float) -> str:
    window = record.window
    if window.kind == "block":
        return _block_cause(stack, record)
    if window.bottom < threshold(stack) and window.measure == "minimum" and not resolution:
        return (
            f"{_name(window)} reaches below the lead edge at {_meV(threshold(stack))}, where nothing passes: "
            f"begin the window above it"
        )
    if stack.dephasing:
        return _short(record) + ", and with dephasing further periods only lose current"
    place = misplaced(stack, window)
    if place:
        return place
    if record.floor is not None and record.floor.value < window.transmission:
        return _floor_cause(record, resolution)
    return _short(record)


def misplaced(stack: Stack, window: Window) -> str:
    """What is wrong with where a pass window lies; empty if it lies within one miniband."""
    bands = [b for b in minibands(stack, window.bottom, window.top) if b.top > window.bottom]
    if not bands:
        return f"{_name(window)} lies outside every miniband, {_neighbours(stack, window)}: move it into one"
    if window.measure == "mean":
        return ""
    band = bands[0]
    if window.bottom < band.bottom:
        return _crossing(window, band, "bottom", band.bottom)
    if window.top > band.top:
        return _crossing(window, band, "top", band.top)
    return ""


def _crossing(window: Window, band: Miniband, end: str, edge: float) -> str:
    return (
        f"{_name(window)} crosses the {end} of {band.name} at {_meV(edge)}, beyond which transmission dies away "
        f"with every period: keep it within {_meV(band.bottom)} to {_meV(band.top)}"
    )


def _neighbours(stack: Stack, window: Window) -> str:
    span = window.top - window.bottom
    reach = span
    for _ in range(12):
        bands = minibands(stack, window.bottom - reach, window.top + reach)
        below, above = [b for b in bands if b.top <= window.bottom], [b for b in bands if b.bottom >= window.top]
        if above and (below or window.bottom - reach < threshold(stack)):
            break
        reach *= 2
    words = [f"{b.name} ({_span(b)})" for b in (below[-1:] + above[:1])]
    return ("between " if len(words) == 2 else "beside ") + " and ".join(words) if words else "far from any"


def _floor_cause(record: WindowHistory, resolution: float) -> str:
    window, floor = record.window, record.floor
    assert floor is not None
    seen = "measured " if resolution else ""
    if window.measure == "mean":
        return (
            f"as periods are added the {seen}mean over {_name(window)} tends to {floor.value:.3g}, and "
            f"{window.transmission:.3g} is asked: matched end layers would raise it, more periods will not"
        )
    return (
        f"as periods are added the {seen}minimum over {_name(window)} tends to {floor.value:.3g} at "
        f"{_meV(floor.energy)}, and {window.transmission:.3g} is asked: matched end layers would raise this ripple "
        f"floor, more periods will not"
    )


def _block_cause(stack: Stack, record: WindowHistory) -> str:
    window = record.window
    for band in minibands(stack, window.bottom, window.top):
        overlap = min(band.top, window.top) - max(band.bottom, window.bottom)
        if overlap > 0 and band.top > threshold(stack):
            return (
                f"{_name(window)} overlaps {band.name} ({_span(band)}) by "
                f"{overlap * 1e3:.3g} meV, which stays open however many periods: move the window or the miniband"
            )
    peak = float(record.energy[-1])
    if window.measure == "maximum" and window.bottom < peak < window.top and _is_peak(stack, record, peak):
        return f"an end state at {_meV(peak)} lets electrons through {_name(window)}: change the layers that hold it"
    return _short(record) + _how_many(stack, record)


def _is_peak(stack: Stack, record: WindowHistory, energy: float) -> bool:
    """Whether T at an inner maximum stands above what the decay at its energy leaves of the window's ends."""
    window = record.window
    rates = bloch(stack, np.array([window.bottom, energy, window.top])).decay
    return bool(rates[1] > min(rates[0], rates[2]))


def _how_many(stack: Stack, record: WindowHistory) -> str:
    """Roughly how many periods a block window would take, from what the last ones gained."""
    margin = record.margin
    if stack.dephasing or margin.size < 4:
        return ""
    gain = (margin[-1] - margin[-3]) / 2
    if gain <= 0.01:
        return ""
    enough = margin.size + int(np.ceil(-margin[-1] / gain))
    return f"; each further period adds {gain:.2g} dB, so about {enough} would do"


def _short(record: WindowHistory) -> str:
    best = int(np.argmax(np.where(np.isfinite(record.margin), record.margin, -np.inf)))
    periods = "1 period" if best == 0 else f"{best + 1} periods"
    return f"{_name(record.window)} is missed by {_decibels(-record.margin[best])} at best, with {periods}"


def _decibels(value: float) -> str:
    return f"{value:.2g} dB" if value < 10 else f"{value:.0f} dB"


def _conflict(records: tuple[WindowHistory, ...]) -> str:
    parts = []
    for record in records:
        where = np.flatnonzero(record.met) + 1
        if where.size < record.met.size:
            parts.append(f"{_name(record.window)} is met by {counts_in_words(where)}")
    return ", but ".join(parts)


def counts_in_words(counts: NDArray[np.int64]) -> str:
    """Ascending whole numbers with runs drawn together: 3, 5-9, 12."""
    groups = np.split(counts, np.flatnonzero(np.diff(counts) > 1) + 1)
    return ", ".join(f"{g[0]}{DASH}{g[-1]}" if g.size > 1 else str(g[0]) for g in groups)


def _name(window: Window) -> str:
    return f"the {window.kind} window {window.bottom * 1e3:.6g}{DASH}{window.top * 1e3:.6g} meV"


def _span(band: Miniband) -> str:
    return f"{_number(band.bottom)}{DASH}{_number(band.top)} meV"


def _meV(energy: float) -> str:
    return f"{_number(energy)} meV"


def _number(energy: float) -> str:
    """An energy (eV) in meV, to four digits and not beyond 0.0001."""
    return f"{round(energy * 1e3, 4) + 0.0:.4g}"
