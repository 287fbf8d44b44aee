"""Resonances against published values and closed forms of their poles."""

from __future__ import annotations

import cmath

import mpmath as mp
import numpy as np
import pytest

from tests.transport.stacks import LEAD, PLAIN
from transport import Delta, Layer, Lead, Stack, lattice_bands, spectrum
from transport.constants import HBAR, HBAR2_2M0
from transport.resonance import resonances

BARRIER, WELL = Layer(5.0, 0.23, 0.067), Layer(5.0, 0.0, 0.067)
DOUBLE_BARRIER = Stack(LEAD, (), (BARRIER, WELL), 1, (BARRIER,), LEAD)
PLAIN_MASS = Lead(0.0, 1.0)


def test_the_double_barrier_of_the_literature() -> None:
    """80.05 meV and 1.028 meV; published as about 80.1 and 1.03 meV by Garcia-Calderon and co-workers (from memory)."""
    found = resonances(DOUBLE_BARRIER, (0.0, 0.2))
    assert found.energy[0] * 1e3 == pytest.approx(80.05, abs=0.01)
    assert found.width[0] * 1e3 == pytest.approx(1.028, abs=0.001)
    assert found.lifetime[0] == pytest.approx(HBAR / found.width[0], rel=1e-15, abs=0)


def test_near_a_narrow_resonance_the_transmission_is_that_of_breit_and_wigner() -> None:
    """T = G_L G_R / ((E - E_r)^2 + G^2/4), Breit and Wigner, Phys. Rev. 49, 519 (1936), formula."""
    stack = Stack(LEAD, (), (Layer(13.0, 0.23, 0.067), WELL), 1, (Layer(12.0, 0.23, 0.067),), LEAD)
    found = resonances(stack, (0.0, 0.2))
    energy, width = found.energy[0], found.width[0]
    offsets = np.linspace(-3, 3, 25) * width
    shape = found.width_left[0] * found.width_right[0] / (offsets**2 + width**2 / 4)
    assert spectrum(stack, energy + offsets).transmission == pytest.approx(shape, rel=1e-3, abs=0)
    assert width < 1e-6


@pytest.mark.parametrize(("left", "right"), [(8.0, 8.0), (8.0, 9.0), (10.0, 8.0), (12.0, 8.0)])
def test_an_isolated_peak_is_as_high_as_its_partial_widths_say(left: float, right: float) -> None:
    """4 G_L G_R / (G_L + G_R)^2: Ricco and Azbel, Phys. Rev. B 29, 1970 (1984), formula."""
    stack = Stack(LEAD, (), (Layer(left, 0.23, 0.067), WELL), 1, (Layer(right, 0.23, 0.067),), LEAD)
    found = resonances(stack, (0.0, 0.2))
    one, two = found.width_left[0], found.width_right[0]
    assert found.peak_transmission[0] == pytest.approx(4 * one * two / (one + two) ** 2, rel=1e-3, abs=0)
    assert one + two == pytest.approx(found.width[0], rel=1e-9, abs=0)
    assert (one > two) == (left < right) or left == right


@pytest.mark.parametrize("periods", [2, 3, 8, 21])
def test_a_bare_stack_has_one_pole_less_than_periods_in_each_miniband_below_the_barrier_top(periods: int) -> None:
    """N periods have N - 1 wells between barriers (common practice)."""
    stack = PLAIN.with_periods(periods)
    bands = [band for band in lattice_bands(stack, (0.0, 0.3)).bands if band.top < 0.3]
    found = resonances(stack, (0.0, 0.3))
    assert bands and found.certificate.complete
    for band in bands:
        assert list(found.number[found.miniband == band.index]) == list(range(1, periods))


def test_two_delta_barriers_have_the_poles_of_their_transcendental_equation() -> None:
    """(1 + 2ik/g)^2 = exp(2ikL) up to sign of the reflection, g = strength m / C: formula (multiple reflection)."""
    strength, length = 0.35, 3.0
    half = Layer(length / 2, 0.0, 1.0)
    stack = Stack(PLAIN_MASS, (Delta(strength),), (half,), 2, (Delta(strength),), PLAIN_MASS)
    found = resonances(stack, (0.0, 0.6))
    g = strength / HBAR2_2M0
    assert found.certificate.complete and found.energy.size >= 3
    for energy, width in zip(found.energy, found.width, strict=True):
        k = cmath.sqrt((energy - 0.5j * width) / HBAR2_2M0)
        reflected = g / (2j * k - g)  # of one delta
        assert reflected**2 * cmath.exp(2j * k * length) == pytest.approx(1.0, abs=1e-10)


def test_a_dirac_comb_of_n_deltas_has_n_minus_one_resonances_in_each_band() -> None:
    """Poles of N deltas solve F = 0 with the comb's Bloch phase (Kronig and Penney (1931)); here in 50 digits."""
    strength, period, count = 0.5, 0.8, 6
    stack = Stack(PLAIN_MASS, (), (Delta(strength), Layer(period, 0.0, 1.0)), count - 1, (Delta(strength),), PLAIN_MASS)
    first = lattice_bands(stack, (0.0, 2.0)).bands[0]
    found = resonances(stack, (first.bottom - 0.02, first.top + 0.02))
    assert found.certificate.complete and found.energy.size == count - 1
    with mp.workdps(50):
        for energy, width in zip(found.energy, found.width, strict=True):
            root = mp.findroot(lambda e: _comb(e, strength, period, count),
                               mp.mpc(float(energy), -float(width) / 2), tol=1e-30)
            assert float(energy) == pytest.approx(float(root.real), rel=1e-12, abs=0)
            assert float(width) == pytest.approx(float(-2 * root.imag), rel=1e-9, abs=0)


def _comb(energy: mp.mpc, strength: float, period: float, count: int) -> mp.mpc:
    """What comes in from the right of N deltas when the wave goes out only on the left: textbook matrices."""
    k = mp.sqrt(energy / mp.mpf(HBAR2_2M0))
    beta = mp.mpf(strength) / mp.mpf(HBAR2_2M0) / (2 * k)
    kick = mp.matrix([[1 - 1j * beta, -1j * beta], [1j * beta, 1 + 1j * beta]])
    step = mp.matrix([[mp.expj(k * mp.mpf(period)), 0], [0, mp.expj(-k * mp.mpf(period))]])
    return (kick * (step * kick) ** (count - 1))[1, 1]


def test_resonances_of_a_well_below_the_edges_are_its_bound_states() -> None:
    """tan(ka/2) = kappa/k and -cot(ka/2) = kappa/k for a square well: textbook formula."""
    depth, width = 0.4, 6.0
    stack = Stack(LEAD, (), (Layer(width, -depth, 0.067),), 1, (), LEAD)
    found = resonances(stack, (-depth, 0.0))
    assert found.energy.size == 0 and found.certificate.complete
    unit = 0.067 / HBAR2_2M0
    k = np.sqrt((found.bound + depth) * unit)
    kappa = np.sqrt(-found.bound * unit)
    even, odd = k * np.tan(k * width / 2) - kappa, -k / np.tan(k * width / 2) - kappa
    assert found.bound.size == int(np.sqrt(depth * unit) * width / np.pi) + 1
    assert np.minimum(abs(even), abs(odd)) == pytest.approx(0.0, abs=1e-9)


def test_two_delta_wells_bind_an_even_and_an_odd_state() -> None:
    """kappa = g/2 (1 +- exp(-kappa L)), g = strength m / C: textbook formula."""
    strength, length = 0.3, 2.0
    stack = Stack(PLAIN_MASS, (Delta(-strength),), (Layer(length / 2, 0.0, 1.0),), 2, (Delta(-strength),), PLAIN_MASS)
    found = resonances(stack, (-3.0, 0.0))
    g = strength / HBAR2_2M0
    kappa = np.sqrt(-found.bound / HBAR2_2M0)
    assert found.bound.size == 2
    assert kappa == pytest.approx(g / 2 * (1 + np.array([1, -1]) * np.exp(-kappa * length)), rel=1e-12, abs=0)
