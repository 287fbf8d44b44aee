"""How many periods a filter needs: the verdict of a target for every count, and why if there is none."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from transport.floor import Floor, mean_limit, measured_limit, ripple_floor, touches_miniband
from transport.reasons import WindowHistory, counts_in_words, why_not
from transport.structure import Stack, Target, Window
from transport.windows import window_values


class Question(Protocol):
    """What a verdict needs of a scenario."""

    @property
    def stack(self) -> Stack:
        """The resolved stack."""

    @property
    def target(self) -> Target | None:
        """What is asked of it."""

    @property
    def resolution(self) -> float:
        """Beam resolution, eV FWHM."""


@dataclass(frozen=True, slots=True)
class PeriodCheck:
    """One count of periods: whether it `meets` the target, with what margin, and the window that limits it.

    `margin_dB` is the least over the windows, None where a pass window has T = 0 or every window is a block window
    with T = 0; `limiting_window` counts from 0 in the target. `values`: T of each window's measure.
    """

    periods: int
    meets: bool
    margin_dB: float | None
    limiting_window: int | None
    values: tuple[float, ...]


@dataclass(frozen=True, slots=True)
class Verdict:
    """How many periods meet the target.

    `fewest`: the least count, or None; `meeting`: every count that does; `reason`: why none does, else None.
    `ripple_floor` and `ripple_floor_energy` (eV): the least limit of the minimum-measured pass windows that lie in a
    miniband; `mean_limit`: the least limit of the mean-measured ones. Both None where no such window exists and with
    dephasing, for which no such limit holds; with a beam resolution they are limits of what is measured.
    `loses_beyond`: with dephasing, the count beyond which no pass window ever passes more; else None.
    """

    fewest: int | None
    meeting: tuple[int, ...]
    reason: str | None
    ripple_floor: float | None
    ripple_floor_energy: float | None
    mean_limit: float | None
    per_period: tuple[PeriodCheck, ...]
    windows: tuple[Window, ...]
    loses_beyond: int | None = None

    @property
    def sentence(self) -> str:
        """The verdict in one sentence."""
        if self.fewest is None:
            return f"{self.reason or ''}{self._losses}"
        check = self.per_period[self.fewest - 1]
        words = f"Fewest periods: {self.fewest}."
        if len(self.meeting) != len(self.per_period) - self.fewest + 1:
            words += f" Met by {counts_in_words(np.array(self.meeting))} of up to {len(self.per_period)}."
        if check.limiting_window is not None:
            window = self.windows[check.limiting_window]
            words += f" Limiting: {window_in_words(window)}, {check.margin_dB:.1f} dB to spare."
        return words + self._losses

    @property
    def _losses(self) -> str:
        if self.loses_beyond is None:
            return ""
        count = "1 period" if self.loses_beyond == 1 else f"{self.loses_beyond} periods"
        return f" Beyond {count} further ones only lose current (coherent part only)."


def window_in_words(window: Window) -> str:
    """A window named by its kind and range."""
    return f"{window.kind} {window.bottom * 1e3:.6g}\N{EN DASH}{window.top * 1e3:.6g} meV"


_ROUNDING = 1e-10
"""A margin smaller than this (dB) is met exactly: T = 1 comes out a few 1e-16 below."""


def no_progress(share: float) -> None:
    """Take no notice of how far the work is."""


def period_verdict(
    scenario: Question, most: int | None = None, progress: Callable[[float], None] = no_progress
) -> Verdict:
    """The verdict of a scenario's target, for every count from 1 to `most` (default: the target's `most_periods`).

    With dephasing or a beam resolution, of what would be measured. Margins: 10 log10(T/asked) for pass windows,
    10 log10(asked/T) for block windows, T the window's minimum, maximum or mean. `progress` is told the share done,
    and stops the work by raising. Raises ValueError without windows.
    """
    target = scenario.target
    if target is None or not target.windows:
        raise ValueError("target.windows: give at least one pass or block window to decide by")
    most = target.most_periods if most is None else most
    if most < 1:
        raise ValueError(f"most: {most} periods asked for, give 1 or more")
    counts = np.arange(1, most + 1)
    records = tuple(replace(record, floor=_limit(scenario, record.window))
                    for record in histories(scenario, counts, progress))
    checks = checked(records, counts)
    meeting = tuple(check.periods for check in checks if check.meets)
    floors = [r.floor for r in records if r.floor and r.window.measure == "minimum"]
    limits = [r.floor.value for r in records if r.floor and r.window.measure == "mean"]
    least = min(floors, key=lambda floor: floor.value, default=None)
    return Verdict(
        fewest=meeting[0] if meeting else None,
        meeting=meeting,
        reason=None if meeting else why_not(scenario.stack, records, scenario.resolution),
        ripple_floor=least.value if least else None,
        ripple_floor_energy=least.energy if least else None,
        mean_limit=min(limits, default=None),
        per_period=checks,
        windows=target.windows,
        loses_beyond=_loses_beyond(records) if scenario.stack.dephasing else None,
    )


def _loses_beyond(records: tuple[WindowHistory, ...]) -> int | None:
    """The count from which on every pass window only loses; None where none passes anything, or all still gain."""
    passing = [r.log10 for r in records if r.window.kind == "pass" and np.isfinite(r.log10).all()]
    if not passing:
        return None
    last = max(int(np.argmax(log10)) + 1 for log10 in passing)
    return last if last < passing[0].size else None


def histories(
    question: Question, counts: NDArray[np.int64], progress: Callable[[float], None] = no_progress
) -> tuple[WindowHistory, ...]:
    """Every window of the target at ascending `counts` of periods, exact; without the limits of many periods."""
    windows = question.target.windows if question.target else ()
    share = 1 / max(1, len(windows))
    found = []
    for place, window in enumerate(windows):
        values = window_values(
            question.stack, window, counts, question.resolution, _part(progress, place * share, share))
        margin = 10 * (values.log10 - math.log10(window.transmission))
        margin = np.where(abs(margin) < _ROUNDING, 0.0, margin)
        margin = 0.0 - margin if window.kind == "block" else margin
        found.append(WindowHistory(window, values.log10, values.energy, margin))
    return tuple(found)


def checked(records: tuple[WindowHistory, ...], counts: NDArray[np.int64]) -> tuple[PeriodCheck, ...]:
    """The check of each count, from the histories of all windows."""
    return tuple(_check(records, place, int(count)) for place, count in enumerate(counts))


def _part(progress: Callable[[float], None], begin: float, share: float) -> Callable[[float], None]:
    """Progress of one part of the work, told as progress of the whole."""
    return lambda done: progress(begin + done * share)


def _limit(question: Question, window: Window) -> Floor | None:
    """The limit of a pass window; None for a block window, and with dephasing, which leaves none."""
    if window.kind == "block" or question.stack.dephasing:
        return None
    return pass_limit(question.stack, window, question.resolution)


def pass_limit(stack: Stack, window: Window, resolution: float) -> Floor | None:
    """What a pass window's measure tends to as periods of a lossless stack are added; None outside every miniband.

    With a beam resolution (eV FWHM) it is the limit of what is measured.
    """
    if resolution:
        limit = measured_limit(stack, window.bottom, window.top, resolution)
        if window.measure == "mean":
            return Floor(limit.mean(window.bottom, window.top), math.nan)
        return Floor(*limit.extremum(window.bottom, window.top, largest=False))
    if window.measure == "mean":
        return Floor(mean_limit(stack, window), math.nan) if touches_miniband(stack, window) else None
    return ripple_floor(stack, window)


def _check(records: tuple[WindowHistory, ...], place: int, count: int) -> PeriodCheck:
    values = tuple(10.0 ** float(r.log10[place]) for r in records)
    closed = [i for i, r in enumerate(records) if r.window.kind == "pass" and r.log10[place] == -math.inf]
    if closed:
        return PeriodCheck(count, False, None, closed[0], values)
    margins = {i: float(r.margin[place]) for i, r in enumerate(records) if r.log10[place] > -math.inf}
    if not margins:
        return PeriodCheck(count, True, None, None, values)
    limiting = min(margins, key=lambda i: margins[i])
    return PeriodCheck(count, margins[limiting] >= 0, margins[limiting], limiting, values)
