"""Layers, leads, stacks and targets check themselves; a stack can be turned, lengthened and drawn."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import pytest

from transport import Delta, Layer, Lead, Stack, Target, Window, band_profile

WELL, BARRIER = Layer(6.0, 0.0, 0.067), Layer(2.0, 0.3, 0.09)
LEFT, RIGHT = Lead(0.0, 0.067), Lead(-0.1, 0.05)
STACK = Stack(LEFT, (Delta(0.2), WELL), (BARRIER, WELL), 2, (BARRIER,), RIGHT, dephasing=1e-3)


def test_a_stack_with_other_periods_differs_in_nothing_else() -> None:
    other = STACK.with_periods(7)
    assert other.periods == 7
    assert other.with_periods(2) == STACK
    assert hash(other.with_periods(2)) == hash(STACK)


def test_the_period_is_as_long_as_its_layers() -> None:
    assert STACK.period_length == 8.0


def test_a_stack_turned_twice_is_the_same() -> None:
    twice = STACK.reversed().reversed()
    assert twice.entry == STACK.entry
    assert [lead.band_edge for lead in (twice.left, twice.right)] == pytest.approx([0.0, -0.1])


def test_a_turned_stack_counts_energies_from_the_other_lead() -> None:
    turned = STACK.reversed()
    assert turned.left == Lead(0.0, 0.05)
    assert turned.right == Lead(0.1, 0.067)
    assert turned.entry == (Layer(2.0, 0.4, 0.09),)
    assert turned.exit == (Layer(6.0, 0.1, 0.067), Delta(0.2))


def test_lists_of_layers_become_tuples() -> None:
    stack = Stack(LEFT, [], [WELL], 1, [], RIGHT)  # type: ignore[arg-type]
    assert stack.cell == (WELL,)
    assert hash(stack) == hash(Stack(LEFT, (), (WELL,), 1, (), RIGHT))


def test_the_profile_is_a_step_line_from_lead_to_lead() -> None:
    profile = band_profile(STACK)
    assert profile.position[0] == -8.0
    assert profile.position[-1] == 6.0 + 16.0 + 2.0 + 8.0
    assert np.all(np.diff(profile.position) >= 0)
    assert profile.potential[[0, 1, -2, -1]].tolist() == [0.0, 0.0, -0.1, -0.1]
    assert profile.deltas == ((0.0, 0.2),)


def test_the_profile_encloses_the_area_of_its_layers() -> None:
    profile = band_profile(STACK.with_periods(5))
    area = np.trapezoid(profile.potential, profile.position)
    assert area == pytest.approx(6 * 2.0 * 0.3 - 0.1 * 8.0, abs=1e-12)


@pytest.mark.parametrize(("make", "sentence"), [
    (lambda: Layer(0.0, 0.1, 0.07), r"^thickness is 0.0: give a length above 0 nm$"),
    (lambda: Layer(math.inf, 0.1, 0.07), r"^thickness is inf: give a length above 0 nm$"),
    (lambda: Layer(1.0, math.nan, 0.07), r"^band_edge is nan: give a finite energy in eV$"),
    (lambda: Layer(1.0, 0.1, -0.07), r"^mass is -0.07: give a mass above 0 \(m0\)$"),
    (lambda: Layer(1.0, 0.1, 0.07, -1.0), r"^nonparabolicity is -1.0: give 0 or more \(1/eV\)$"),
    (lambda: Lead(math.inf, 0.07), r"^band_edge is inf: give a finite energy in eV$"),
    (lambda: Delta(math.nan), r"^strength is nan: give a finite strength in eV nm$"),
    (lambda: Stack(RIGHT, (), (WELL,), 1, (), LEFT), r"^left.band_edge is -0.1: energies count from"),
    (lambda: Stack(LEFT, (), (WELL,), 0, (), LEFT), r"^periods is 0: give a whole number of 1 or more$"),
    (lambda: Stack(LEFT, (), (WELL,), 1.5, (), LEFT), r"^periods is 1.5: give a whole number"),  # type: ignore[arg-type]
    (lambda: Stack(LEFT, (), (Delta(1.0),), 1, (), LEFT), r"^cell is \(Delta.*at least one layer of finite"),
    (lambda: Stack(LEFT, (), (WELL,), 1, (), LEFT, -1.0), r"^dephasing is -1.0: give a width of 0 eV or more$"),
    (lambda: Window("pass", 0.2, 0.1, 0.5, "mean"), r"^top is 0.1: give an energy above the bottom, 0.2$"),
    (lambda: Window("pass", 0.1, 0.2, 0.0, "mean"), r"^transmission is 0.0: give a value above 0, up to 1$"),
    (lambda: Window("pass", 0.1, 0.2, 0.5, "maximum"), r"^measure is 'maximum': a pass window is measured by"),
    (lambda: Window("block", 0.1, 0.2, 0.5, "minimum"), r"^measure is 'minimum': a block window is measured by"),
])
def test_values_that_make_no_sense_are_refused_by_name(make: Callable[[], object], sentence: str) -> None:
    with pytest.raises(ValueError, match=sentence):
        make()


def test_a_target_is_a_value() -> None:
    windows = (Window("pass", 0.1, 0.2, 0.5, "mean"),)
    assert Target(windows, 60) == Target(windows, 60)
    assert hash(Target(windows, 60)) == hash(Target(windows, 60))
