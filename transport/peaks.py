"""Peaks against measurement: which resonance each measured peak is, how far off, and what would explain it."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import msgspec
import numpy as np
from numpy.typing import NDArray

from transport.document import LayerRecord
from transport.lattice import default_range
from transport.measured import MeasuredPeaks, assigned, measured_peaks
from transport.oscillation import Floats
from transport.periods import no_progress
from transport.refusal import ScenarioError, nearest
from transport.resolve import SheetRow
from transport.resonance import Resonances, resonances
from transport.scenario import Scenario, scenario_from_document
from transport.sensitivity import pole_slopes
from transport.structure import Element, Layer, Stack

FIGURES = {"well": "nm", "barrier": "nm", "edge": "meV", "shift": "meV"}
"""What a fit may choose: thickness of all wells, of all barriers, the barriers' band edge, and an offset of the
measured energies (a contact's drop, a work function); each with the unit of its value on screens."""

_UNTOLD = 0.98
"""Correlation from which two figures count as not told apart by the data."""
_ROOM = 0.3  # of the measured span, on either side: where resonances are looked for


@dataclass(frozen=True, slots=True)
class PeakComparison:
    """Measured peaks beside computed resonances.

    `pairs`: for each measured peak the place of its resonance in `resonances`, or -1; `deviation` (eV): measured less
    computed energy, NaN without a partner; `rms` (eV) over all pairs.
    """

    measured: MeasuredPeaks
    resonances: Resonances
    pairs: NDArray[np.int64]
    deviation: Floats

    @property
    def rms(self) -> float:
        """Root mean square of the deviations (eV); NaN without a pair."""
        known = self.deviation[np.isfinite(self.deviation)]
        return float(np.sqrt(np.mean(known**2))) if known.size else float("nan")


@dataclass(frozen=True, slots=True)
class PeakFit:
    """A least-squares fit of some figures to the measured peaks.

    `values` and `errors` (standard errors; NaN where the data leave none): nm for thicknesses, eV for energies, as
    changes from the scenario. `warnings` are sentences. `scenario` has the fitted figures in it, a barrier whose edge
    was fitted as an explicit layer; None where the file has no place for them (groups, an end treatment).
    """

    figures: tuple[str, ...]
    values: Floats
    errors: Floats
    correlation: Floats
    before: PeakComparison
    after: PeakComparison
    warnings: tuple[str, ...]
    scenario: Scenario | None


def compare_peaks(
    scenario: Scenario, peaks: MeasuredPeaks | None = None, among: Resonances | None = None
) -> PeakComparison:
    """Pair the measured peaks of a scenario (or others) with its resonances, never crossing.

    `among`: resonances of its stack that are known already; else those around the peaks are looked for. Raises
    ScenarioError where no peak is measured, and where all lie below both leads.
    """
    measured = _known(scenario, peaks)
    return _paired(measured, among or resonances(scenario.stack, peak_range(scenario.stack, measured)), 0.0)


def fit_peaks(
    scenario: Scenario,
    figures: Sequence[str],
    peaks: MeasuredPeaks | None = None,
    progress: Callable[[float], None] = no_progress,
) -> PeakFit:
    """The changes of some `figures` (keys of FIGURES) that bring the resonances nearest to the measured peaks.

    Least squares, weighted by the uncertainties where every peak has one, with exact derivatives (`sensitivity.py`).
    Standard errors from the curvature at the minimum; without uncertainties they are scaled by the scatter left.
    Raises ScenarioError for unknown figures, for more of them than there are peaks, and for other figures than the
    shift where a layer's band edge runs.
    """
    from scipy.optimize import least_squares

    measured = _known(scenario, peaks)
    _check_figures(figures, measured)
    if tuple(figures) != ("shift",):
        _refuse_variations(scenario)
    before = compare_peaks(scenario, measured)
    model = _Model(scenario.stack.lossless(), measured, tuple(figures))
    steps = 0

    def residual(values: Floats) -> Floats:
        nonlocal steps
        steps += 1
        progress(min(0.95, steps / 20))
        return model.residual(values)

    found = least_squares(residual, np.zeros(len(figures)), jac=model.jacobian, method="trf", x_scale=0.1,
                          xtol=1e-12, ftol=1e-12, gtol=1e-12, max_nfev=60, bounds=model.bounds)
    values = np.asarray(found.x) * model.scale
    errors, correlation = _uncertainty(np.asarray(found.jac), model.scale, float(2 * found.cost), measured)
    progress(1.0)
    after = _compared(model.stack(values), measured, model.shift(values))
    return PeakFit(tuple(figures), values, errors, correlation, before, after,
                   _warnings(figures, errors, correlation, bool(found.success)), _fitted(scenario, figures, values))


def _known(scenario: Scenario, peaks: MeasuredPeaks | None) -> MeasuredPeaks:
    if peaks is None and scenario.document.measured is not None:
        peaks = measured_peaks(scenario.document.measured)
    if peaks is None or not peaks.energy.size:
        raise ScenarioError("measured.peaks", "is missing or empty; list the measured peaks, or paste a table of them")
    return peaks


def _check_figures(figures: Sequence[str], measured: MeasuredPeaks) -> None:
    for name in figures:
        if name not in FIGURES:
            raise ScenarioError("fit", f"knows no figure {name!r}; {nearest(name, FIGURES)}")
    if not figures or len(set(figures)) < len(figures):
        raise ScenarioError("fit", f"needs figures to choose, each once; known here: {', '.join(FIGURES)}")
    if len(figures) > measured.energy.size:
        raise ScenarioError("fit", f"asks for {len(figures)} figures of {measured.energy.size} peaks; ask for fewer")


def _refuse_variations(scenario: Scenario) -> None:
    """Profiles and graded interfaces are neither barrier nor well: their thicknesses and edges are not fitted."""
    for row in scenario.sheet:
        if row.slices > 1:
            raise ScenarioError(row.key, "has a band edge that runs, which a fit of well, barrier or edge leaves "
                                "alone; fit the shift only")


def _compared(stack: Stack, measured: MeasuredPeaks, shift: float) -> PeakComparison:
    return _paired(measured, resonances(stack, peak_range(stack, measured, shift)), shift)


def _paired(measured: MeasuredPeaks, found: Resonances, shift: float) -> PeakComparison:
    pairs = assigned(measured.energy - shift, found.energy, measured.weight)
    paired = pairs >= 0
    deviation = np.full(measured.energy.size, np.nan)
    deviation[paired] = measured.energy[paired] - shift - found.energy[pairs[paired]]
    return PeakComparison(measured, found, pairs, deviation)


def peak_range(stack: Stack, measured: MeasuredPeaks, shift: float = 0.0) -> tuple[float, float]:
    """Where to look for resonances (eV): around the measured peaks, less their `shift`, with room, above a lead's edge.

    Raises ScenarioError where all lie below both leads.
    """
    energy = measured.energy - shift
    open_from = min(stack.left.band_edge, stack.right.band_edge)
    if float(energy[-1]) <= open_from:
        raise ScenarioError("measured.peaks", f"lie below both leads, whose edges begin at {open_from * 1e3:.6g} meV; "
                            "count them from the left lead's edge")
    room = max(_ROOM * float(np.ptp(energy)), 0.1 * (default_range(stack)[1] - open_from))
    return max(float(energy[0]) - room, open_from), float(energy[-1]) + room


@dataclass(frozen=True)
class _Model:
    """The resonances as functions of the figures, each in units of its own `scale`."""

    origin: Stack
    measured: MeasuredPeaks
    figures: tuple[str, ...]

    @property
    def scale(self) -> Floats:
        """A natural step of each figure: 0.1 nm, 10 meV."""
        return np.array([0.1 if FIGURES[name] == "nm" else 0.01 for name in self.figures])

    @property
    def bounds(self) -> tuple[Floats, Floats]:
        """Thicknesses may not fall to 0; energies are free within what is physical."""
        walls = _walls(self.origin)
        least = {"well": min((e.thickness for e, wall in walls if not wall), default=1.0),
                 "barrier": min((e.thickness for e, wall in walls if wall), default=1.0)}
        low = np.array([-0.9 * least[name] if name in least else -0.2 for name in self.figures]) / self.scale
        return low, -low

    def shift(self, values: Floats) -> float:
        """The fitted offset of the measured energies (eV)."""
        return float(values[self.figures.index("shift")]) if "shift" in self.figures else 0.0

    def stack(self, values: Floats) -> Stack:
        """The stack with its figures changed by `values` (nm, eV)."""
        change = dict(zip(self.figures, (float(v) for v in values), strict=True))
        level = _middle(self.origin)
        entry, cell, exit_ = (tuple(_changed(e, change, level) for e in part)
                              for part in (self.origin.entry, self.origin.cell, self.origin.exit))
        return Stack(self.origin.left, entry, cell, self.origin.periods, exit_, self.origin.right)

    def residual(self, steps: Floats) -> Floats:
        """Weighted deviations; 0 for a peak without a partner."""
        values = steps * self.scale
        found = _compared(self.stack(values), self.measured, self.shift(values))
        return np.nan_to_num(found.deviation * self.measured.weight)

    def jacobian(self, steps: Floats) -> Floats:
        """Derivatives of the residuals, exact."""
        values = steps * self.scale
        stack = self.stack(values)
        found = _compared(stack, self.measured, self.shift(values))
        paired = found.pairs >= 0
        at = found.pairs[paired]
        slopes = pole_slopes(stack, found.resonances.energy[at] - 0.5j * found.resonances.width[at])
        walls = np.array([isinstance(e, Layer) and e.band_edge > _middle(stack) for e in stack.elements])
        layers = np.array([isinstance(e, Layer) for e in stack.elements])
        columns = {
            "well": slopes.thickness[:, layers & ~walls].sum(axis=1), "edge": slopes.band_edge[:, walls].sum(axis=1),
            "barrier": slopes.thickness[:, walls].sum(axis=1), "shift": np.ones(at.size),
        }
        result = np.zeros((self.measured.energy.size, len(self.figures)))
        result[paired] = np.array([-columns[name].real for name in self.figures]).T
        return np.asarray(result * self.measured.weight[:, None] * self.scale)


def _middle(stack: Stack) -> float:
    """The level that tells barriers from wells: half way between the lowest and the highest edge of the cell."""
    edges = [e.band_edge for e in stack.cell if isinstance(e, Layer)]
    return (min(edges) + max(edges)) / 2


def _walls(stack: Stack) -> list[tuple[Layer, bool]]:
    level = _middle(stack)
    return [(e, e.band_edge > level) for e in stack.elements if isinstance(e, Layer)]


def _changed(element: Element, change: dict[str, float], level: float) -> Element:
    if not isinstance(element, Layer):
        return element
    if element.band_edge <= level:
        return replace(element, thickness=element.thickness + change.get("well", 0.0))
    return replace(element, thickness=element.thickness + change.get("barrier", 0.0),
                   band_edge=element.band_edge + change.get("edge", 0.0))


def _uncertainty(
    jacobian: Floats, scale: Floats, chi_squared: float, measured: MeasuredPeaks
) -> tuple[Floats, Floats]:
    """Standard errors and correlations from the curvature at the minimum."""
    size, free = scale.size, measured.energy.size - scale.size
    curvature = jacobian.T @ jacobian
    if np.linalg.cond(curvature) > 1e14:
        return np.full(size, np.nan), np.ones((size, size))
    covariance = np.linalg.inv(curvature)
    spread = np.sqrt(np.diag(covariance))
    if not np.isfinite(measured.uncertainty).all():
        covariance = covariance * (chi_squared / free if free else np.nan)
    return np.sqrt(np.diag(covariance)) * scale, np.linalg.inv(curvature) / np.outer(spread, spread)


def _warnings(figures: Sequence[str], errors: Floats, correlation: Floats, settled: bool) -> tuple[str, ...]:
    found = [
        f"The peaks hardly tell {figures[i]} and {figures[j]} apart (correlation {correlation[i, j]:+.3f}): "
        "fix one of them, or measure more peaks."
        for i in range(len(figures)) for j in range(i) if abs(correlation[i, j]) > _UNTOLD
    ]
    if not found and not np.isfinite(errors).all():
        found.append("As many figures as peaks and no uncertainties: the fit leaves no scatter to judge its errors by.")
    if not settled:
        found.append("The fit did not settle; its last values are shown.")
    return tuple(found)


def _fitted(scenario: Scenario, figures: Sequence[str], values: Floats) -> Scenario | None:
    """The scenario with the fitted figures; None where the file has no place for one of them."""
    change = dict(zip(figures, (float(v) for v in values), strict=True))
    level, rows = _middle(scenario.stack), {row.key: row for row in scenario.sheet}
    zero = scenario.document.leads.left.band_edge_eV or 0.0
    if scenario.document.stack.ends is not None:
        return None
    parts = {}
    for part in ("entry", "cell", "exit"):
        records = getattr(scenario.document.stack, part)
        found = [_refitted(record, rows.get(f"stack.{part}[{i}]"), change, level, zero)
                 for i, record in enumerate(records)]
        if any(record is None for record in found):
            return None
        parts[part] = tuple(found)
    stack = msgspec.structs.replace(scenario.document.stack, **parts)
    return scenario_from_document(msgspec.structs.replace(scenario.document, stack=stack))


def _refitted(
    record: LayerRecord, row: SheetRow | None, change: dict[str, float], level: float, zero: float
) -> LayerRecord | None:
    """A layer's record with the fitted figures; None for a group. `zero`: the left lead's edge on the file's scale."""
    if record.kind == "delta":
        return record
    if row is None or row.thickness is None or row.band_edge is None:
        return None
    wall = row.band_edge > level
    thicker = change.get("barrier" if wall else "well", 0.0)
    if wall and "edge" in change:
        # A material's edge stands in its table: the layer is written by its own edge and mass instead.
        return LayerRecord(band_edge_eV=row.band_edge + zero + change["edge"], mass=row.mass,
                           nonparabolicity_per_eV=row.nonparabolicity or None, thickness_nm=row.thickness + thicker)
    if record.monolayers is not None:
        return msgspec.structs.replace(record, monolayers=record.monolayers * (1 + thicker / row.thickness))
    return msgspec.structs.replace(record, thickness_nm=row.thickness + thicker)
