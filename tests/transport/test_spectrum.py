"""Spectra: chosen energies miss nothing, closed leads, shapes, and misuse."""

import math
from itertools import pairwise

import mpmath
import numpy as np
import pytest
from scipy.integrate import quad

from tests.reference import scattered
from tests.transport.stacks import ALL, END_WELLS, LEAD, LOSSY, OPAQUE, PLAIN, UNEQUAL, barrier, well
from transport import Layer, Lead, Stack, measured_transmission, spectrum, transmission_map
from transport.spectrum import MOST_PEAKS

NARROW = Stack(LEAD, (barrier(12.0), well(5.0), barrier(12.0)), (well(5.0),), 1, (), LEAD)


@pytest.mark.parametrize("stack", [*ALL.values(), LOSSY, NARROW, PLAIN.with_periods(50)], ids=repr)
def test_straight_lines_between_chosen_energies_stay_within_a_thousandth(stack: Stack) -> None:
    curve = spectrum(stack, between=(0.0, 0.5))
    draw = np.random.default_rng(5)
    where = draw.integers(0, curve.energy.size - 1, 40_000)
    inside = curve.energy[where] + np.diff(curve.energy)[where] * draw.uniform(0, 1, where.size)
    energy = np.concatenate([inside, draw.uniform(0.0, 0.5, 20_000)])
    if curve.narrow is not None:
        # There T sampled at doubles is no truth: test_narrow.py has 50 digits.
        off = abs(energy[:, None] - curve.narrow.energy).min(axis=1)
        energy = energy[off > 20 * curve.narrow.width.max() + 1e-15]
    error = abs(np.interp(energy, curve.energy, curve.transmission) - spectrum(stack, energy).transmission)
    assert error.max() < 1e-3


def test_a_peak_of_a_hundred_millionth_eV_reaches_its_height() -> None:
    curve = spectrum(NARROW, between=(0.0, 0.2))
    assert curve.transmission.max() > 0.999
    half = curve.energy[curve.transmission > 0.5]
    assert 0 < np.ptp(half[:2]) < 1e-6


@pytest.mark.parametrize("stack", [
    Stack(LEAD, (), (Layer(9000.0, 0.1, 0.067),), 1, (), LEAD, dephasing=0.02),
    Stack(LEAD, (), (Layer(300.0, 0.1, 0.067), well(200.0)), 12, (Layer(300.0, 0.2, 0.067),), LEAD, dephasing=0.3),
    Stack(LEAD, (), (barrier(3.0), well(5.0)), 1000, (), LEAD, dephasing=0.1),
], ids=["one thick layer", "many layers", "many periods"])
def test_losses_in_thick_layers_and_many_periods_do_not_overflow_in_bands(stack: Stack) -> None:
    """Against plane waves in 50 digits."""
    energy = [0.05, 0.15, 0.32, 0.9]
    found = spectrum(stack, energy)
    for place, at in enumerate(energy):
        expected = scattered(stack, at)
        assert found.log10_transmission[place] == pytest.approx(float(mpmath.log10(expected.transmission)), rel=1e-9)
        assert found.reflection[place] == pytest.approx(float(expected.reflection), rel=1e-9)


def test_every_peak_of_every_miniband_is_sampled() -> None:
    curve = spectrum(PLAIN.with_periods(40), between=(0.0, 0.5))
    value = curve.transmission
    peaks = (value[1:-1] > value[:-2]) & (value[1:-1] >= value[2:]) & (value[1:-1] > 0.999)
    assert peaks.sum() == 2 * 39  # N - 1 unit maxima in each of two minibands


def test_below_either_lead_nothing_passes_and_all_is_reflected() -> None:
    curve = spectrum(UNEQUAL, [-0.1, 0.0, 0.02, 0.03])
    assert curve.transmission.tolist() == [0, 0, 0, 0]
    assert curve.reflection == pytest.approx([1, 1, 1, 1])
    assert np.isneginf(curve.log10_transmission).all()
    assert np.isnan(curve.phase).all()


def test_results_have_the_shape_of_the_energies() -> None:
    assert spectrum(PLAIN, 0.1).transmission.shape == ()
    assert spectrum(PLAIN, []).transmission.shape == (0,)
    assert spectrum(PLAIN, [[0.1, 0.2, 0.3]]).phase.shape == (1, 3)


def test_the_order_of_energies_does_not_matter() -> None:
    energy = np.random.default_rng(0).permutation(np.linspace(0, 0.5, 101))
    direct = spectrum(PLAIN, energy)
    order = np.argsort(energy)
    ascending = spectrum(PLAIN, energy[order])
    assert direct.transmission[order] == pytest.approx(ascending.transmission, rel=1e-12)
    assert direct.phase[order][1:] == pytest.approx(ascending.phase[1:], abs=1e-9)


def test_results_cannot_be_written_over() -> None:
    with pytest.raises(ValueError, match="read-only"):
        spectrum(PLAIN, [0.1]).transmission[0] = 2


def test_the_phase_is_absolute_and_gains_half_a_turn_per_resonance() -> None:
    curve = spectrum(END_WELLS, between=(0.01, 0.5))
    assert abs(np.diff(curve.phase)).max() < np.pi / 4
    sparse = spectrum(END_WELLS, curve.energy[::1000]).phase  # no neighbours to unwrap by
    assert sparse == pytest.approx(curve.phase[::1000], abs=1e-9)


def test_too_many_peaks_give_the_envelope_and_say_so() -> None:
    curve = spectrum(PLAIN.with_periods(1_000_000), between=(0.0, 0.4))
    assert f"more than the {MOST_PEAKS:,}" in curve.note
    assert curve.envelope is not None
    passing = curve.envelope.passing
    assert (curve.envelope.lower <= curve.transmission + 1e-7)[passing].all()
    assert (curve.envelope.upper >= curve.transmission - 1e-7)[passing].all()


def test_the_map_over_periods_is_the_spectrum_of_each() -> None:
    energy = np.linspace(0.0, 0.5, 61)
    table = transmission_map(END_WELLS, energy, [1, 5, 1000])
    for row, periods in zip(table, [1, 5, 1000], strict=True):
        assert row == pytest.approx(spectrum(END_WELLS.with_periods(periods), energy).log10_transmission, abs=1e-9)


def test_a_measured_spectrum_is_the_convolution_with_the_beam() -> None:
    """Against a plain sum on a fine grid."""
    energy, width = np.array([0.05, 0.08, 0.3]), 0.01
    sigma = width / 2.3548200450309493  # 2 sqrt(2 ln 2), from memory
    grid = np.linspace(1e-9, 0.5, 400_001)
    value = spectrum(PLAIN, grid).transmission
    kernel = np.exp(-0.5 * ((energy[:, None] - grid) / sigma) ** 2) / (sigma * np.sqrt(2 * np.pi))
    expected = np.trapezoid(kernel * value, grid)
    assert measured_transmission(PLAIN, energy, width) == pytest.approx(expected, rel=1e-6)
    assert measured_transmission(PLAIN, energy, 0.0) == pytest.approx(spectrum(PLAIN, energy).transmission)


@pytest.mark.parametrize("right", [0.05, 1e-4, 1e-7, 0.0, -0.05])
def test_a_beam_across_the_edge_of_a_lead_is_measured_to_a_billionth(right: float) -> None:
    """Against scipy.integrate.quad with the edges as break points."""
    thin = Stack(LEAD, (), (barrier(1.0), well(4.0)), 2, (barrier(1.0),), Lead(right, 0.067))
    edge, width = max(0.0, right), 0.01
    energy = edge + np.array([-0.02, 0.0, 0.01, 0.07])
    sigma = width / 2.3548200450309493  # 2 sqrt(2 ln 2), from memory
    for at, found in zip(energy, measured_transmission(thin, energy, width), strict=True):
        def beam(u: float, at: float = float(at)) -> float:
            e = edge + u * u
            return float(spectrum(thin, e).transmission) * math.exp(-0.5 * ((e - at) / sigma) ** 2) * 2 * u

        breaks = [0.0, 3e-4, 1e-3, 1e-2, 0.05, 0.1, 0.15, 0.2, 0.25, 0.3, 0.36]
        pieces = [quad(beam, *piece, epsabs=1e-15, epsrel=1e-11)[0] for piece in pairwise(breaks)]
        assert found == pytest.approx(sum(pieces) / (sigma * math.sqrt(2 * math.pi)), abs=1e-9)


@pytest.mark.parametrize("arguments, sentence", [
    ({}, r"energies, between: give exactly one of the two"),
    ({"energies": [0.1], "between": (0.0, 1.0)}, r"energies, between: give exactly one of the two"),
    ({"energies": [np.nan]}, r"energies: every one must be a finite number of eV"),
    ({"between": (1.0, 0.0)}, r"between is \(1.0, 0.0\): give two finite energies in eV, the lower one first"),
    ({"between": (0.0, np.inf)}, r"between is \(0.0, inf\): give two finite energies in eV, the lower one first"),
])
def test_misuse_is_refused_in_a_sentence(arguments: dict[str, object], sentence: str) -> None:
    with pytest.raises(ValueError, match=sentence):
        spectrum(PLAIN, **arguments)  # type: ignore[arg-type]


def test_where_the_mass_would_vanish_the_model_ends() -> None:
    from transport import Layer

    heavy = Stack(LEAD, (), (Layer(3.0, 0.3, 0.092, 6.0), well(5.0)), 3, (), LEAD)
    with pytest.raises(ValueError, match=r"the one-band model ends at 133.333 meV"):
        spectrum(heavy, [0.1])
    assert spectrum(heavy, [0.2]).transmission[0] > 0


def test_opaque_layers_do_not_overflow() -> None:
    thick = Stack(LEAD, (), (barrier(9000.0), well(5.0)), 1000, (), LEAD)
    assert spectrum(thick, [0.1]).log10_transmission == pytest.approx(-5.4e6, rel=0.1)
    assert spectrum(OPAQUE, [0.3]).transmission[0] > 0  # E = V exactly
