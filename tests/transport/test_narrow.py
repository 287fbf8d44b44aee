"""Peaks of any width reach their height and keep their shape: against plane waves in 50 digits."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest

from tests.reference import scattered
from transport import Layer, Lead, Stack, resonances, spectrum

LEAD = Lead(0.0, 0.067)
WELL = Layer(5.0, 0.0, 0.067)


def double_barrier(thickness: float, right: float | None = None) -> Stack:
    wall = Layer(thickness, 0.3, 0.067)
    return Stack(LEAD, (), (wall, WELL, Layer(right or thickness, 0.3, 0.067)), 1, (), LEAD)


NINE = Stack(LEAD, (), (Layer(14.0, 0.3, 0.067), WELL), 9, (Layer(14.0, 0.3, 0.067),), LEAD)


def parabola(stack: Stack, energy: float, width: float) -> tuple[mp.mpf, mp.mpf]:
    """Place and height of a peak in 50 digits: 1/T is a parabola near its pole, here through three points."""
    e, h = mp.mpf(energy), mp.mpf(width) / 2
    left, middle, right = (1 / scattered(stack, place).transmission for place in (e - h, e, e + h))
    off = h * (left - right) / (2 * (left - 2 * middle + right))
    return e + off, 1 / scattered(stack, e + off).transmission


@pytest.mark.parametrize(("stack", "width"), [
    (double_barrier(15.5), 1e-9), (double_barrier(21.2), 1e-12), (double_barrier(25.0), 1e-14),
    (double_barrier(21.0, 22.0), 1e-12), (double_barrier(28.0), 1e-15),
])
def test_a_peak_of_any_width_reaches_its_true_height_where_it_is(stack: Stack, width: float) -> None:
    found = spectrum(stack, between=(0.0, 0.2))
    top = int(np.argmax(found.transmission))
    known = resonances(stack, (0.0, 0.2))
    assert known.width[0] == pytest.approx(width, rel=3)
    place, inverse = parabola(stack, float(known.energy[0]), float(known.width[0]))
    assert found.transmission[top] == pytest.approx(float(1 / inverse), abs=1e-6)
    assert abs(found.energy[top] - float(place)) < max(1e-3 * width, 3e-16)
    assert found.from_pole.any() == (known.width[0] < 1e-11)
    assert found.transmission.max() < 1 + 1e-7


@pytest.mark.parametrize("stack", [double_barrier(21.2), double_barrier(25.0), double_barrier(21.0, 22.0)])
def test_straight_lines_between_the_points_of_a_narrow_peak_are_within_a_thousandth_of_t(stack: Stack) -> None:
    """At the same distance from the top: doubles hold the top itself to some 1e-16 eV only."""
    found = spectrum(stack, between=(0.0, 0.2))
    assert found.narrow is not None
    own, width = float(found.narrow.energy[0]), float(found.narrow.width[0])
    place, _ = parabola(stack, own, width)
    offset = np.random.default_rng(1).uniform(-15, 15, 60) * width
    drawn = np.interp(own + offset, found.energy, found.transmission)
    exact = [float(scattered(stack, place + mp.mpf(float(step))).transmission) for step in (own + offset) - own]
    assert drawn == pytest.approx(exact, abs=1.2e-3)


@pytest.mark.parametrize("stack", [double_barrier(12.0), NINE])
def test_wider_peaks_are_sampled_at_their_tops(stack: Stack) -> None:
    found, known = spectrum(stack, between=(0.0, 0.2)), resonances(stack, (0.0, 0.2))
    for energy, width in zip(known.energy, known.width, strict=True):
        near = abs(found.energy - energy) < width
        _, inverse = parabola(stack, float(energy), float(width) / 50)
        assert found.transmission[near].max() == pytest.approx(float(1 / inverse), abs=2e-5)


def test_what_is_drawn_from_a_pole_is_marked_and_adds_up_to_one() -> None:
    found = spectrum(double_barrier(25.0), between=(0.0, 0.2))
    assert found.note == "1 peak is narrower than 1e-11 eV and drawn from the poles"
    marked = found.from_pole
    assert 100 < marked.sum() < 200 and not marked[[0, -1]].any()
    assert found.transmission[marked] + found.reflection[marked] == pytest.approx(1, abs=1e-15)
    assert 10 ** found.log10_transmission[marked] == pytest.approx(found.transmission[marked])


def test_a_peak_that_is_no_wider_than_a_double_is_one_point() -> None:
    found = spectrum(double_barrier(34.0), between=(0.0, 0.2))
    assert found.narrow is not None and found.narrow.width[0] < 1e-17
    assert found.transmission.max() == pytest.approx(1, abs=1e-9)
    assert 1 <= found.from_pole.sum() <= 9


def test_with_dephasing_nothing_is_drawn_from_a_pole() -> None:
    lossy = Stack(LEAD, (), double_barrier(25.0).cell, 1, (), LEAD, dephasing=1e-3)
    found = spectrum(lossy, between=(0.0, 0.2))
    assert found.narrow is None and not found.from_pole.any()
