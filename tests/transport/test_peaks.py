"""Peaks against measurement: pairing never crosses, tables are read or refused, planted figures are recovered."""

from __future__ import annotations

from dataclasses import replace
from itertools import combinations

import msgspec
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from transport import (
    Layer,
    MeasuredPeaks,
    ScenarioError,
    Stack,
    compare_peaks,
    fit_peaks,
    load_scenario,
    measured_peaks,
    read_peaks,
    resonances,
    scenario_from_document,
)
from transport.document import MeasuredRecord, PeakRecord
from transport.measured import assigned, format_peaks
from transport.scenario import Scenario

HERON = load_scenario("scenarios/heron-gate.toml")
SHORT = scenario_from_document(msgspec.structs.replace(
    HERON.document, stack=msgspec.structs.replace(HERON.document.stack, periods=3)))

energies = st.lists(st.floats(0, 1), max_size=5).map(lambda values: np.array(sorted(values)))


@given(energies, energies, st.integers(0, 9))
def test_the_pairing_is_the_best_that_does_not_cross(measured: np.ndarray, computed: np.ndarray, seed: int) -> None:
    """Brute force over all pairings of ascending peaks."""
    weight = np.random.default_rng(seed).uniform(0.5, 2.0, measured.size)
    found = assigned(measured, computed, weight)
    paired = np.flatnonzero(found >= 0)
    size = min(measured.size, computed.size)
    assert paired.size == size and np.all(np.diff(found[paired]) > 0)
    best = min(sum((weight[i] * (measured[i] - computed[j])) ** 2 for i, j in zip(rows, columns, strict=True))
               for rows in combinations(range(measured.size), size)
               for columns in combinations(range(computed.size), size))
    mine = np.sum((weight[paired] * (measured[paired] - computed[found[paired]])) ** 2)
    assert mine == pytest.approx(best, abs=1e-9)


def test_a_bias_marks_a_resonance_by_its_lever_arm() -> None:
    record = MeasuredRecord((PeakRecord(bias_V=0.2, width_meV=2.0), PeakRecord(energy_meV=40.0)), 0.4)
    peaks = measured_peaks(record)
    assert peaks.energy == pytest.approx([0.04, 0.08])
    assert np.isnan(peaks.width[0]) and peaks.width[1] == pytest.approx(0.002)


@pytest.mark.parametrize("text", ["energy_meV,width_meV\n60,1.5\n70,\n", "\ufeffenergy_meV;width_meV\n60; 1.5\n\n70;",
                                  "width_meV\tenergy_meV\n1.5\t60\n\t70"])
def test_a_table_is_read_whatever_its_separator(text: str) -> None:
    record = read_peaks(text)
    assert [(p.energy_meV, p.width_meV) for p in record.peaks] == [(60.0, 1.5), (70.0, None)]


@pytest.mark.parametrize(("text", "sentence"), [
    ("", "peaks: is empty; begin it with a line of headers such as energy_meV, width_meV"),
    ("energy_meV\n", "peaks: has headers but no peak; add a line for each"),
    ("energy\n1", 'peaks, column "energy": is not known here; did you mean energy_meV?'),
    ("width_meV\n1", "peaks: has no column energy_meV or bias_V; add one"),
    ("energy_meV,energy_meV\n1,2", "peaks, column energy_meV: stands twice; keep one of them"),
    ("energy_meV\n60\nabc", 'peaks, line 3, energy_meV: must be a number such as 61.5, but is "abc"'),
    ("energy_meV\nnan", 'peaks, line 2, energy_meV: must be from -1,000,000 to 1,000,000 meV, but is "nan"'),
    ("energy_meV,width_meV\n60", "peaks, line 2: has 1 values for 2 columns; mend it"),
    ("energy_meV,width_meV\n,1", "measured.peaks[0]: has no place; give energy_meV, or bias_V"),
    ("energy_meV\n" + "1\n" * 501, "peaks: lists 501 peaks; at most 500 are read"),
    ("energy_meV\n" + "1\n" * 1_000_000, "peaks: is larger than 1,000,000 bytes; cut the table to its peaks"),
])
def test_a_wrong_table_is_one_sentence(text: str, sentence: str) -> None:
    with pytest.raises(ScenarioError) as refused:
        read_peaks(text)
    assert str(refused.value) == sentence


def test_peaks_that_are_the_resonances_deviate_by_nothing() -> None:
    found = resonances(SHORT.stack, (0.03, 0.1))
    compared = compare_peaks(SHORT, peaks_at(found.energy[[0, 2]]))
    assert compared.deviation == pytest.approx([0, 0], abs=1e-12)
    assert compared.resonances.certificate.complete and compared.rms < 1e-12


def peaks_at(energy: np.ndarray, uncertainty: float = np.nan) -> MeasuredPeaks:
    return MeasuredPeaks(energy, np.full(energy.size, np.nan), np.full(energy.size, uncertainty))


def planted(well: float, barrier: float) -> Stack:
    """Three periods with wells and barriers thicker by so many nm, written out by hand."""
    wall, hollow = SHORT.stack.cell
    assert isinstance(wall, Layer) and isinstance(hollow, Layer)
    wall, hollow = replace(wall, thickness=wall.thickness + barrier), replace(hollow, thickness=hollow.thickness + well)
    return Stack(SHORT.stack.left, (), (wall, hollow), 3, (wall,), SHORT.stack.right)


def test_planted_figures_come_back_exactly_without_noise() -> None:
    energy = resonances(planted(0.21, -0.13), (0.02, 0.3)).energy
    fit = fit_peaks(SHORT, ["well", "barrier"], peaks_at(energy, 1e-4))
    assert fit.values == pytest.approx([0.21, -0.13], abs=1e-6)
    assert fit.scenario is not None
    assert fit.scenario.stack.cell[1].thickness == pytest.approx(  # type: ignore[union-attr]
        SHORT.stack.cell[1].thickness + 0.21, abs=1e-6)  # type: ignore[union-attr]


def test_a_fitted_edge_of_a_material_is_written_as_an_explicit_layer() -> None:
    """The fitted stack and the stack of the fitted file are one and the same."""
    energy = resonances(planted(0.1, 0.0), (0.02, 0.3)).energy
    fit = fit_peaks(SHORT, ["well", "edge"], peaks_at(energy, 1e-4))
    assert fit.scenario is not None and fit.scenario.document.stack.cell[0].material is None
    assert fit.after.resonances.energy == pytest.approx(
        resonances(fit.scenario.stack, fit.after.resonances.between).energy, abs=1e-12)


def test_peaks_written_as_a_table_are_read_back() -> None:
    record = MeasuredRecord((PeakRecord(bias_V=0.2, width_meV=2.0), PeakRecord(energy_meV=40.0)))
    assert read_peaks(format_peaks(record)) == record
    assert format_peaks(MeasuredRecord()) == ""


def test_peaks_are_paired_among_resonances_already_known() -> None:
    found = resonances(SHORT.stack, (0.03, 0.1))
    compared = compare_peaks(SHORT, peaks_at(found.energy[[1]] + 1e-4), among=found)
    assert compared.resonances is found and compared.pairs.tolist() == [1]


def test_planted_figures_are_recovered_within_two_standard_errors_in_95_of_100_noisy_trials() -> None:
    """Gaussian noise of the stated uncertainty: two standard errors hold 95.4 % of trials."""
    energy = resonances(planted(0.2, 0.0), (0.02, 0.3)).energy
    draw = np.random.default_rng(2)
    fits = [fit_peaks(SHORT, ["well"], peaks_at(np.sort(energy + draw.normal(0, 3e-4, energy.size)), 3e-4))
            for _ in range(100)]
    assert sum(abs(fit.values[0] - 0.2) < 2 * fit.errors[0] for fit in fits) >= 93


def test_figures_that_the_peaks_cannot_tell_apart_are_warned_of() -> None:
    energy = resonances(SHORT.stack, (0.03, 0.1)).energy[:2]
    fit = fit_peaks(SHORT, ["well", "shift"], peaks_at(energy, 1e-4))
    assert any("hardly tell shift and well apart" in warning for warning in fit.warnings)


@pytest.mark.parametrize(("figures", "sentence"), [
    (["wel"], "fit: knows no figure 'wel'; did you mean well?"),
    ([], "fit: needs figures to choose, each once; known here: well, barrier, edge, shift"),
    (["well", "well"], "fit: needs figures to choose, each once; known here: well, barrier, edge, shift"),
    (["well", "barrier", "shift"], "fit: asks for 3 figures of 2 peaks; ask for fewer"),
])
def test_a_fit_that_cannot_be_is_one_sentence(figures: list[str], sentence: str) -> None:
    with pytest.raises(ScenarioError) as refused:
        fit_peaks(SHORT, figures, peaks_at(np.array([0.05, 0.06])))
    assert str(refused.value) == sentence


def test_without_measured_peaks_there_is_nothing_to_compare() -> None:
    with pytest.raises(ScenarioError, match=r"^measured\.peaks: is missing or empty; list the measured peaks"):
        compare_peaks(SHORT)


def test_peaks_below_both_leads_are_refused() -> None:
    with pytest.raises(ScenarioError, match=r"^measured\.peaks: lie below both leads"):
        compare_peaks(SHORT, peaks_at(np.array([-0.2, -0.1])))


def test_a_scenario_keeps_its_measured_peaks() -> None:
    document = msgspec.structs.replace(
        SHORT.document, measured=MeasuredRecord((PeakRecord(energy_meV=52.0),)))
    scenario: Scenario = scenario_from_document(document)
    assert compare_peaks(scenario).pairs[0] >= 0
