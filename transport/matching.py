"""Matched ends: the end treatments that raise the ripple floor or the mean limit of the pass windows most.

Between leads and bands a wave is reflected as between two media, and end cells act as the coatings of optics do
(quarter-wave-like cells: Pacher et al., Appl. Phys. Lett. 79, 1486 (2001)). What a window tends to as periods are
added does not depend on their number (`floor.py`), so it alone judges the ends.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass
from itertools import product
from typing import Literal

import numpy as np
from msgspec.structs import replace

from transport.chain import Chain
from transport.document import Document, EndCellRecord, EndsRecord
from transport.oscillation import Floats
from transport.periods import no_progress, pass_limit, window_in_words
from transport.reasons import misplaced
from transport.refusal import ScenarioError
from transport.resolve import resolve
from transport.scenario import Scenario, scenario_from_document
from transport.structure import Stack, Window

LONGEST_TAPER = 4
"""End cells that a taper is given at most, unless more are asked for."""

_SHAPES: tuple[Literal["linear", "gaussian", "poisson"], ...] = ("linear", "gaussian", "poisson")
_SHAPE_NAMES = {"linear": "linear", "gaussian": "Gaussian", "poisson": "Poisson"}
_SAMPLES = 33
_LEAST_GAIN = 0.01  # dB: less is none
_BARRIERS, _WELLS = np.linspace(0.2, 1.1, 7), np.linspace(0.55, 1.45, 7)
_THINNEST, _THICKEST = 0.05, 2.0  # shares that an end cell may take in the search
_OUTER = ((0.3, 1.0), (0.6, 1.0), (0.6, 1.3))  # where the search for a second end cell begins

Search = Callable[[EndsRecord], float]
"""The least margin (dB) that the pass windows tend to with a treatment; -inf where one tends to 0."""


@dataclass(frozen=True, slots=True)
class EndsProposal:
    """One treatment: its record, the scenario that has it, and the limit (T) of each pass window with it.

    `gain_dB`: by how much the least margin of these limits rises; inf where one was 0.
    """

    name: str
    ends: EndsRecord
    scenario: Scenario
    limits: tuple[float, ...]
    gain_dB: float


@dataclass(frozen=True, slots=True)
class MatchedEnds:
    """What end treatments do for the pass windows (`windows`: their places in the target), best proposal first."""

    windows: tuple[int, ...]
    before: tuple[float, ...]
    proposals: tuple[EndsProposal, ...]
    sentence: str


def matched_ends(
    scenario: Scenario,
    whole_monolayers: bool = False,
    cells: int | None = None,
    progress: Callable[[float], None] = no_progress,
) -> MatchedEnds:
    """The best treatment of each kind, in place of the entry and exit layers there are.

    Kinds: end barriers of half width; one or two end cells of free thicknesses; tapers of the barriers' width or
    height over up to `cells` cells (default 4, and not more than there are periods). Limits are those of the stack
    without dephasing and before a beam blurs them. Raises ScenarioError without pass windows or barriers, and for a
    taper longer than the stack.
    """
    windows = scenario.target.windows if scenario.target else ()
    places = tuple(i for i, window in enumerate(windows) if window.kind == "pass")
    if not places:
        raise ScenarioError("target.windows", "holds no pass window, so ends have nothing to raise; add one")
    asked = tuple(windows[i] for i in places)
    before = _limits(scenario.stack, asked)
    start = _least_margin(before, asked)
    with_ends(scenario, EndsRecord("half"))  # a cell without barriers is refused here
    found: list[EndsProposal] = []
    for share, record in _treatments(scenario, asked, whole_monolayers, _longest(scenario, cells)):
        progress(share)
        treated = with_ends(scenario, record)
        limits = _limits(treated.stack, asked)
        gain = _least_margin(limits, asked) - start
        if gain >= _LEAST_GAIN and treated.stack not in [proposal.scenario.stack for proposal in found]:
            found.append(EndsProposal(describe_ends(record), record, treated, limits, gain))
    found.sort(key=lambda proposal: -_least_margin(proposal.limits, asked))
    return MatchedEnds(places, before, tuple(found), _sentence(scenario.stack, asked, before, found))


def with_ends(scenario: Scenario, ends: EndsRecord) -> Scenario:
    """The scenario with an end treatment in place of its entry and exit layers. Raises ScenarioError."""
    return scenario_from_document(_treated(scenario.document, ends))


def _treated(document: Document, ends: EndsRecord) -> Document:
    return replace(document, stack=replace(document.stack, entry=(), exit=(), ends=ends))


def describe_ends(ends: EndsRecord) -> str:
    """A treatment in a few words."""
    whole = ", in whole monolayers" if ends.whole_monolayers else ""
    if ends.kind == "half":
        return "end barriers of half width" + whole
    if ends.kind == "cells":
        left, right = ends.left_cells or (), ends.right_cells or ends.left_cells or ()
        count = "one end cell" if len(left) == 1 else f"{len(left)} end cells"
        if left == right:
            return f"{count} at each end: {_in_words(left)}{whole}"
        return f"{count} at each end: left {_in_words(left)}; right {_in_words(right)}{whole}"
    cells = "1 cell" if (ends.cells or 1) == 1 else f"{ends.cells} cells"
    return f"{_SHAPE_NAMES[ends.kind]} taper of the barriers' {ends.of or 'width'} over {cells} at each end{whole}"


def _in_words(cells: Iterable[EndCellRecord]) -> str:
    return ", then ".join(f"barrier {c.barrier_share:.3g} and well {c.well_share:.3g} of the cell's" for c in cells)


def _longest(scenario: Scenario, cells: int | None) -> int:
    periods = scenario.stack.periods
    if cells is not None and cells > periods:
        raise ScenarioError("cells", f"is {cells}, a taper longer than the stack of {periods:,} periods; "
                            f"ask for at most {periods:,}")
    return min(cells or LONGEST_TAPER, periods)


# What is tried.

def _treatments(
    scenario: Scenario, windows: tuple[Window, ...], whole: bool, longest: int
) -> Iterator[tuple[float, EndsRecord]]:
    """The best treatment of each kind, with the share of the work done."""

    def score(record: EndsRecord) -> float:
        try:
            return _quick_margin(resolve(_treated(scenario.document, record)).stack.lossless(), windows)
        except ScenarioError:  # a barrier that cannot be lowered, a layer thicker than is allowed
            return -math.inf

    yield 0.05, EndsRecord("half", whole_monolayers=whole)
    for share, of in ((0.1, "width"), (0.2, "height")):
        tapers = [EndsRecord(shape, of=of, cells=n, whole_monolayers=whole)  # type: ignore[arg-type]
                  for shape, n in product(_SHAPES, range(1, longest + 1))]
        best = max(tapers, key=score)
        if score(best) > -math.inf:
            yield share, best
    shares, record = _one_cell(scenario, score, whole)
    if score(record) > -math.inf:
        yield 0.5, record
        yield 1.0, _two_cells(scenario, score, shares, whole)


def _one_cell(scenario: Scenario, score: Search, whole: bool) -> tuple[Floats, EndsRecord]:
    grid = [np.array(pair) for pair in product(_BARRIERS, _WELLS)]
    best = max(grid, key=lambda shares: score(_cells(shares, 1, whole=False)))
    return _refined(scenario, score, _for_both_leads(scenario.stack, best), 1, whole)


def _two_cells(scenario: Scenario, score: Search, inner: Floats, whole: bool) -> EndsRecord:
    sides = np.split(inner, len(inner) // 2)
    starts = [np.concatenate([np.concatenate([outer, side]) for side in sides]) for outer in _OUTER]
    best = max(starts, key=lambda shares: score(_cells(shares, 2, whole=False)))
    return _refined(scenario, score, best, 2, whole)[1]


def _for_both_leads(stack: Stack, shares: Floats) -> Floats:
    """Shares for the left end, and for the right end too where the leads differ: each lead has its own match."""
    return shares if stack.left == stack.right else np.tile(shares, 2)


def _cells(shares: Floats, cells: int, whole: bool) -> EndsRecord:
    """End cells with shares barrier, well, barrier, well ... from the lead inwards; the left end, then the right."""
    sides = [tuple(EndCellRecord(float(b), float(w)) for b, w in side.reshape(cells, 2))
             for side in np.split(shares, len(shares) // (2 * cells))]
    return EndsRecord("cells", left_cells=sides[0], right_cells=sides[1] if len(sides) > 1 else None,
                      whole_monolayers=whole)


def _refined(
    scenario: Scenario, score: Search, start: Floats, cells: int, whole: bool
) -> tuple[Floats, EndsRecord]:
    """The best shares near `start` (Nelder and Mead, Comput. J. 7, 308 (1965)), then in whole monolayers if wanted."""
    from scipy.optimize import minimize

    bounds = [(_THINNEST, _THICKEST)] * start.size
    found = minimize(lambda shares: -_bounded(score(_cells(shares, cells, whole=False))), start, method="Nelder-Mead",
                     bounds=bounds, options={"maxfev": 60 * start.size, "xatol": 1e-3, "fatol": 1e-3,
                                              "adaptive": start.size > 4})
    shares = np.asarray(found.x)
    if not whole:
        return shares, _cells(shares.round(4), cells, whole)
    return shares, _in_whole_steps(scenario, score, shares, cells)


def _bounded(margin: float) -> float:
    """A margin that the simplex can average; nothing real is as bad."""
    return max(margin, -1e4)


def _in_whole_steps(scenario: Scenario, score: Search, shares: Floats, cells: int) -> EndsRecord:
    """The best end cells in whole monolayers near `shares`: one step at a time as long as any helps."""
    rows = [row for row in scenario.sheet if row.where == "cell" and row.monolayers]
    if not rows:
        return _cells(shares.round(4), cells, whole=True)
    edges = [row.band_edge or 0.0 for row in rows]
    counts = [rows[int(np.argmax(edges))].monolayers or 1.0, rows[int(np.argmin(edges))].monolayers or 1.0]
    unit = np.tile(1 / np.array(counts), shares.size // 2)
    steps = np.maximum(1, np.round(shares / unit))
    best = score(_cells(steps * unit, cells, whole=True))
    while True:
        near = [np.maximum(1, steps + way * np.eye(steps.size)[i]) for i in range(steps.size) for way in (-1, 1)]
        scores = [score(_cells(other * unit, cells, whole=True)) for other in near]
        place = int(np.argmax(scores))
        if scores[place] <= best:
            return _cells((steps * unit).round(6), cells, whole=True)
        best, steps = scores[place], near[place]


# What it is worth.

def _quick_margin(stack: Stack, windows: tuple[Window, ...]) -> float:
    """The least margin (dB) of the windows' limits from some energies: enough to choose by."""
    energy = np.concatenate([np.linspace(w.bottom, w.top, _SAMPLES) for w in windows])
    envelope = Chain(stack, energy).envelope
    values = []
    for place, window in enumerate(windows):
        part = slice(place * _SAMPLES, (place + 1) * _SAMPLES)
        lower, upper = envelope.lower[part], envelope.upper[part]
        values.append(float(np.sqrt(lower * upper).mean() if window.measure == "mean" else lower.min()))
    return _least_margin(values, windows)


def _limits(stack: Stack, windows: tuple[Window, ...]) -> tuple[float, ...]:
    """The exact limit of each window as periods are added; 0 for one outside every miniband."""
    found = (pass_limit(stack.lossless(), window, resolution=0.0) for window in windows)
    return tuple(limit.value if limit else 0.0 for limit in found)


def _least_margin(limits: Iterable[float], windows: tuple[Window, ...]) -> float:
    return min(10 * math.log10(limit / window.transmission) if limit > 0 else -math.inf
               for limit, window in zip(limits, windows, strict=True))


def _sentence(
    stack: Stack, windows: tuple[Window, ...], before: tuple[float, ...], found: list[EndsProposal]
) -> str:
    hopeless = [words for window in windows if (words := misplaced(stack, window))]
    if hopeless:
        return "No ends will do: " + "; ".join(hopeless) + "."
    place = int(np.argmin([limit / window.transmission for limit, window in zip(before, windows, strict=True)]))
    window = windows[place]
    limit = "mean limit" if window.measure == "mean" else "ripple floor"
    what = f"the {limit} over {window_in_words(window)}"
    if not found:
        return f"No ends tried raise {what} above the {before[place]:.3g} it has."
    best = found[0]
    return f"Matched ends raise {what} from {before[place]:.3g} to {best.limits[place]:.3g}: {best.name}."
