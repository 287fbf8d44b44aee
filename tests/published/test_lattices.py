"""The infinite lattice and N periods of it against published forms and 50-digit arithmetic."""

from itertools import pairwise

import mpmath as mp
import numpy as np
import pytest

from tests.reference import band_edge, discriminant
from tests.transport.stacks import ALL, LEAD, PLAIN, barrier, well
from transport import Delta, Layer, Lead, Stack, bloch, lattice_bands, spectrum
from transport.constants import HBAR2_2M0

ELECTRON = Lead(0.0, 1.0)


@pytest.mark.parametrize("energy", [0.05, 0.2, 0.31, 0.7, 1.9])
def test_square_lattice_of_kronig_and_penney(energy: float) -> None:
    """Proc. R. Soc. A 130, 499 (1931), equation for one mass (from memory):
    cos Kd = cosh(beta b) cos(alpha a) + (beta^2 - alpha^2)/(2 alpha beta) sinh(beta b) sin(alpha a).
    """
    a, b, v, m = 2.0, 0.7, 0.9, 0.5
    alpha = np.sqrt(energy * m / HBAR2_2M0)
    beta = np.sqrt((v - energy) * m / HBAR2_2M0 + 0j)
    expected = np.cosh(beta * b) * np.cos(alpha * a)
    expected += (beta**2 - alpha**2) / (2 * alpha * beta) * np.sinh(beta * b) * np.sin(alpha * a)
    stack = Stack(Lead(0.0, m), (), (Layer(b, v, m), Layer(a, 0.0, m)), 1, (), Lead(0.0, m))
    found = bloch(stack, energy)
    sign = 1.0 if found.phase[0] < np.pi / 2 else -1.0
    value = np.cos(found.phase[0]) if found.decay[0] == 0 else sign * np.cosh(found.decay[0])
    assert value == pytest.approx(expected.real, rel=1e-11, abs=1e-12)


def test_delta_lattice() -> None:
    """cos Kd = cos kd + (m s / 2 C k) sin kd: the limit of the same paper; band tops at kd = j pi."""
    d, s = 0.9, 0.5
    stack = Stack(ELECTRON, (), (Delta(s), Layer(d, 0.0, 1.0)), 1, (), ELECTRON)
    bands = lattice_bands(stack, between=(0.0, 5.0)).bands
    tops = [HBAR2_2M0 * (j * np.pi / d) ** 2 for j in range(1, len(bands) + 1)]
    assert [b.top for b in bands] == pytest.approx(tops, rel=1e-13)
    k = np.sqrt(np.array([b.bottom for b in bands]) / HBAR2_2M0)
    edge = np.cos(k * d) + s / (2 * HBAR2_2M0 * k) * np.sin(k * d)
    assert edge == pytest.approx([(-1.0) ** (b.index - 1) for b in bands], abs=1e-11)


def test_a_gap_closes_exactly_where_barrier_and_well_hold_whole_half_waves() -> None:
    """Where both layers hold whole half wavelengths the cell matrix is +-1 and the gap closes (common practice).

    Masses chosen so that it happens at 0.5 eV in both layers at once.
    """
    e = 0.5
    m1, m2 = 0.09, 0.067
    t1 = np.pi / np.sqrt((e - 0.3) * m1 / HBAR2_2M0)
    t2 = 2 * np.pi / np.sqrt(e * m2 / HBAR2_2M0)
    stack = Stack(Lead(0.0, m2), (), (Layer(t1, 0.3, m1), Layer(t2, 0.0, m2)), 1, (), Lead(0.0, m2))
    bands = lattice_bands(stack, between=(0.0, 0.8))
    assert bands.certificate.complete
    touching = [(lower, upper) for lower, upper in pairwise(bands.bands)
                if abs(lower.top - e) < 1e-6]
    assert len(touching) == 1
    lower, upper = touching[0]
    assert (lower.top, upper.bottom) == pytest.approx((e, e), abs=1e-13)
    others = [upper.bottom - lower.top for lower, upper in pairwise(bands.bands)]
    assert sum(gap > 1e-3 for gap in others) == len(others) - 1


@pytest.mark.parametrize("name", ["plain", "unequal", "opaque", "deltas", "Kane"])
def test_band_edges_agree_with_50_digits(name: str) -> None:
    stack = ALL[name]
    for band in lattice_bands(stack, between=(0.0, 0.6)).bands:
        for edge, value in ((band.bottom, 2 * (-1) ** (band.index - 1)), (band.top, 2 * (-1) ** band.index)):
            exact = float(band_edge(stack, edge, value))
            assert edge == pytest.approx(exact, abs=1e-13)


def test_a_narrow_band_has_its_width_to_a_millionth() -> None:
    thick = Stack(LEAD, (), (barrier(25.0), well(5.0)), 1, (), LEAD)
    band = lattice_bands(thick, between=(0.0, 0.2)).bands[0]
    bottom, top = band_edge(thick, band.bottom, 2), band_edge(thick, band.top, -2)
    assert float(top - bottom) < 1e-8
    assert band.top - band.bottom == pytest.approx(float(top - bottom), rel=1e-6)


def test_no_band_is_missed_against_a_count_of_sign_changes_in_50_digits() -> None:
    """The discriminant passes between -2 and +2 once in each band: counted on a grid finer than any band here."""
    grid = np.linspace(0.0501, 3.0, 1500)
    values = [discriminant(PLAIN, mp.mpf(e)) for e in grid]
    crossings = sum((x < 0) != (y < 0) for x, y in pairwise(values))
    assert len(lattice_bands(PLAIN, between=(0.0501, 3.0)).bands) in (crossings, crossings + 1)


@pytest.mark.parametrize("periods", [2, 5, 30])
def test_n_bare_periods_follow_the_published_form(periods: int) -> None:
    """1/T_N = 1 + (sin N phi/sin phi)^2 (1/T_1 - 1): Sprung, Wu and Martorell, Am. J. Phys. 61, 1118 (1993);
    Vezzetti and Cahay, J. Phys. D 19, L53 (1986).
    """
    energy = np.linspace(0.0723, 0.0931, 200)
    phi = bloch(PLAIN, energy).phase
    first = spectrum(PLAIN.with_periods(1), energy).transmission
    expected = 1 / (1 + (np.sin(periods * phi) / np.sin(phi)) ** 2 * (1 / first - 1))
    assert spectrum(PLAIN.with_periods(periods), energy).transmission == pytest.approx(expected, rel=1e-9)


@pytest.mark.parametrize("periods", [2, 9, 100])
def test_unit_maxima_stand_at_phi_j_pi_over_n(periods: int) -> None:
    """N - 1 unit maxima in each miniband (Vezzetti and Cahay 1986), also where the peaks are narrow."""
    inner = np.arange(1, periods) * np.pi / periods
    energies = lattice_bands(PLAIN, between=(0.0, 0.4)).energies(inner)
    assert spectrum(PLAIN.with_periods(periods), energies).transmission == pytest.approx(1.0, abs=1e-9)


def test_t_never_undercuts_the_envelope() -> None:
    """1/(1 + (1/T_1 - 1)/sin^2 phi) bounds every N from below (same papers)."""
    energy = np.linspace(0.0717, 0.0937, 4001)
    first = spectrum(PLAIN.with_periods(1), energy).transmission
    floor = 1 / (1 + (1 / first - 1) / np.sin(bloch(PLAIN, energy).phase) ** 2)
    lowest = np.min([spectrum(PLAIN.with_periods(n), energy).transmission for n in range(2, 60)], axis=0)
    assert (lowest >= floor * (1 - 1e-9)).all()
    assert np.median(lowest / floor) < 1.01  # and is touched


def test_dirac_comb_of_n_teeth() -> None:
    """For N equal deltas a distance d apart the same form holds with T_1 = 1/(1 + b^2), cos phi = cos kd + b sin kd."""
    s, d, n = 0.4, 1.1, 12
    energy = np.linspace(0.05, 3.0, 501)
    k = np.sqrt(energy / HBAR2_2M0)
    b = s / (2 * HBAR2_2M0 * k)
    phi = np.arccos(np.cos(k * d) + b * np.sin(k * d) + 0j)
    expected = 1 / (1 + (np.sin(n * phi) / np.sin(phi)) ** 2 * b**2)
    comb = Stack(ELECTRON, (), (Delta(s), Layer(d, 0.0, 1.0)), n, (), ELECTRON)
    assert spectrum(comb, energy).transmission == pytest.approx(expected.real, rel=1e-9)


def test_the_first_gap_opens_at_the_zone_edge_and_the_second_at_the_centre() -> None:
    """Facts of the trade (common practice), and gaps that close with the potential."""
    weak = [Stack(LEAD, (), (Layer(3.0, v, 0.067), well(5.0)), 1, (), LEAD) for v in (0.02, 0.002)]
    gaps = []
    for stack in weak:
        first, second, third = lattice_bands(stack, between=(0.0, 0.8)).bands[:3]
        middles = [(first.top + second.bottom) / 2, (second.top + third.bottom) / 2]
        assert bloch(stack, middles).phase == pytest.approx([np.pi, 0.0])
        gaps.append(second.bottom - first.top)
    assert gaps[1] == pytest.approx(gaps[0] / 10, rel=0.05)
