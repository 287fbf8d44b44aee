"""What must hold for any stack at all, tried on stacks nobody thought of (Hypothesis, the same ones every run)."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.transport.test_periods import Asked
from transport import Delta, Layer, Lead, Stack, Target, Window, certify, lattice_bands, period_verdict, spectrum
from transport.structure import Element

LAYERS = st.builds(
    Layer, st.floats(0.3, 6.0), st.sampled_from([0.0, 0.3]) | st.floats(-0.2, 0.5), st.floats(0.03, 0.3),
    st.sampled_from([0.0, 0.0, 0.6]),
)
ELEMENTS: st.SearchStrategy[Element] = LAYERS | st.builds(Delta, st.floats(-0.3, 0.5))
LEADS = st.builds(Lead, st.floats(-0.1, 0.08), st.floats(0.03, 0.2), st.sampled_from([0.0, 0.5]))
STACKS = st.builds(
    Stack,
    st.builds(Lead, st.just(0.0), st.floats(0.03, 0.2)),
    st.lists(ELEMENTS, max_size=3).map(tuple),
    st.tuples(LAYERS, ELEMENTS) | st.tuples(LAYERS, ELEMENTS, LAYERS),
    st.integers(1, 12),
    st.lists(ELEMENTS, max_size=3).map(tuple),
    LEADS,
)
ENERGIES = np.linspace(0.0811, 0.9, 53)


@given(STACKS)
def test_transmission_and_reflection_add_up(stack: Stack) -> None:
    curve = spectrum(stack, ENERGIES)
    assert curve.transmission + curve.reflection == pytest.approx(1.0, abs=1e-8)
    assert (curve.transmission >= 0).all() and (curve.reflection >= 0).all()


@given(STACKS, st.floats(1e-4, 0.05))
def test_with_dephasing_something_is_lost_and_nothing_gained(stack: Stack, loss: float) -> None:
    curve = spectrum(replace(stack, dephasing=loss), ENERGIES)
    total = curve.transmission + curve.reflection
    assert total.max() < 1
    assert total.min() > 0


@given(STACKS)
def test_a_stack_passes_the_same_from_either_side(stack: Stack) -> None:
    there = spectrum(stack, ENERGIES).log10_transmission
    back = spectrum(stack.reversed(), ENERGIES - stack.right.band_edge).log10_transmission
    assert back == pytest.approx(there, rel=1e-8, abs=1e-8)


@given(STACKS)
def test_n_periods_equal_n_cells_written_out(stack: Stack) -> None:
    written = Stack(
        stack.left, stack.entry + stack.cell * (stack.periods - 1), stack.cell, 1, stack.exit, stack.right
    )
    one, other = spectrum(stack, ENERGIES), spectrum(written, ENERGIES)
    assert one.log10_transmission == pytest.approx(other.log10_transmission, rel=1e-8, abs=1e-8)
    assert one.phase == pytest.approx(other.phase, abs=1e-6)


@given(STACKS)
def test_every_list_of_bands_is_certified_and_a_shorter_one_is_not(stack: Stack) -> None:
    found = lattice_bands(stack, between=(0.0, 1.5))
    assert found.certificate.complete
    for dropped in range(len(found.bands)):
        kept = found.bands[:dropped] + found.bands[dropped + 1 :]
        assert not certify(found.stack, kept, found.between).complete


@settings(max_examples=20)
@given(STACKS)
def test_chosen_energies_hide_nothing(stack: Stack) -> None:
    curve = spectrum(stack, between=(0.0, 0.9))
    energy = np.random.default_rng(2).uniform(0.0, 0.9, 5000)
    error = abs(np.interp(energy, curve.energy, curve.transmission) - spectrum(stack, energy).transmission)
    assert error.max() < 1e-3


@settings(max_examples=20)
@given(STACKS, st.floats(0.09, 0.5), st.floats(0.005, 0.2))
def test_no_sampled_value_beats_a_windows_extremum(stack: Stack, bottom: float, span: float) -> None:
    top = bottom + span
    windows = (Window("pass", bottom, top, 0.5, "minimum"), Window("block", bottom, top, 0.5, "maximum"),
               Window("pass", bottom, top, 0.5, "mean"))
    verdict = period_verdict(Asked(stack, Target(windows, 3)))
    energy = np.linspace(bottom, top, 4001)
    for check in verdict.per_period:
        value = spectrum(stack.with_periods(check.periods), energy).transmission
        low, high, mean = check.values
        assert low <= value.min() * (1 + 1e-9)
        assert high >= value.max() * (1 - 1e-9)
        assert low <= mean <= high
