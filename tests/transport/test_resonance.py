"""Every resonance, however narrow, and a certificate that can fail: against 50-digit arithmetic and matrix solvers."""

from __future__ import annotations

import itertools
from dataclasses import replace

import mpmath as mp
import numpy as np
import pytest
from hypothesis import given, settings
from scipy.linalg import eigh_tridiagonal

import transport.resonance as finder
from tests.transport.stacks import (
    ALL,
    DELTAS,
    END_WELLS,
    FREE,
    LEAD,
    LOSSY,
    OPAQUE,
    PLAIN,
    UNEQUAL,
    barrier,
    well,
)
from tests.transport.test_properties import STACKS
from transport import Delta, Layer, Lead, Stack, lattice_bands, spectrum
from transport.constants import HBAR, HBAR2_2M0
from transport.determinant import Complexes, strips
from transport.leaks import log_widths
from transport.levels import bound_count
from transport.resonance import Resonances, resonances
from transport.winding import Box, poles_within

ASYMMETRIC = Stack(LEAD, (barrier(2.0),), (well(6.0),), 1, (barrier(3.0),), LEAD)
CLOSED_RIGHT = Stack(LEAD, (), (barrier(3.0), well(6.0)), 2, (barrier(2.0),), Lead(0.2, 0.08, 0.4))


def outgoing(stack: Stack, energy: mp.mpc) -> mp.mpc:
    """The determinant whose zeros are the poles, with lead roots as on the real axis there: written out anew."""
    def mass(medium: Layer | Lead) -> mp.mpc:
        return mp.mpf(medium.mass) * (1 + mp.mpf(medium.nonparabolicity) * (energy - mp.mpf(medium.band_edge)))

    def flux_factor(lead: Lead) -> mp.mpc:
        square = (energy - mp.mpf(lead.band_edge)) / (mp.mpf(HBAR2_2M0) * mass(lead))
        return mp.sqrt(square) if mp.re(energy) > lead.band_edge else 1j * mp.sqrt(-square)

    psi, slope = mp.mpc(1), -1j * flux_factor(stack.left)
    for element in stack.entry + stack.cell * stack.periods + stack.exit:
        if isinstance(element, Delta):
            slope += mp.mpf(element.strength) / mp.mpf(HBAR2_2M0) * psi
            continue
        m = mass(element)
        k = mp.sqrt((energy - mp.mpf(element.band_edge)) * m / mp.mpf(HBAR2_2M0))
        phase = k * mp.mpf(element.thickness)
        psi, slope = (mp.cos(phase) * psi + m * mp.sin(phase) / k * slope,
                      -k / m * mp.sin(phase) * psi + mp.cos(phase) * slope)
    return slope - 1j * flux_factor(stack.right) * psi


def exact(stack: Stack, energy: float, width: float, digits: int = 50) -> mp.mpc:
    """The pole nearest to a guess, by Newton's method in many digits."""
    with mp.workdps(digits):
        z, step = mp.mpc(energy, -width / 2), mp.mpf(10) ** (-digits // 2)
        for _ in range(30):
            f = outgoing(stack, z)
            move = f * step / (outgoing(stack, z + step) - f)
            z -= move
            if abs(move) < mp.mpf(10) ** (-3 * digits // 5):
                return z
    raise AssertionError(f"no pole near {energy}")


def assert_exact(stack: Stack, found: Resonances, width: float = 1e-8) -> None:
    for energy, size in zip(found.energy, found.width, strict=True):
        z = exact(stack, float(energy), float(size))
        assert float(energy) == pytest.approx(float(z.real), abs=1e-12)
        assert float(size) == pytest.approx(float(-2 * z.imag), rel=width, abs=0)


@pytest.mark.parametrize("name", [name for name in ALL if name not in ("opaque", "free")])
def test_every_pole_of_the_shared_stacks_is_one_in_fifty_digits(name: str) -> None:
    found = resonances(ALL[name])
    assert found.certificate.complete and found.energy.size
    assert_exact(ALL[name], found)


def test_a_stack_that_reflects_nothing_has_no_resonance_and_is_certified() -> None:
    found = resonances(FREE)
    assert found.certificate.complete and found.certificate.counted == found.energy.size == 0


@pytest.mark.parametrize(("thickness", "size"), [(18.0, 1e-12), (22.0, 4e-15), (25.0, 4e-17), (40.0, 1e-27)])
def test_narrow_widths_keep_their_digits(thickness: float, size: float) -> None:
    """Against 70-digit arithmetic; the imaginary part itself drowns in rounding below about 1e-14 eV."""
    stack = Stack(LEAD, (), (barrier(thickness), well(5.0)), 1, (barrier(thickness),), LEAD)
    found = resonances(stack, (0.0, 0.2))
    z = exact(stack, float(found.energy[0]), float(found.width[0]), digits=70)
    assert found.certificate.complete and found.energy.size == 1
    assert float(found.width[0]) == pytest.approx(float(-2 * z.imag), rel=1e-7, abs=0)
    assert size / 30 < found.width[0] < size * 30
    assert found.from_pole[0] == (found.width[0] < 1e-11)
    assert found.peak_transmission[0] == pytest.approx(1.0, abs=1e-9)


def test_coupled_narrow_wells_share_their_widths_as_in_fifty_digits() -> None:
    """Three wells behind 30 nm barriers: 2.4e-11 eV apart and about 1e-20 eV wide."""
    found = resonances(OPAQUE, (0.0, 0.2))
    assert found.energy.size == 3 and found.certificate.complete
    for energy, width in zip(found.energy, found.width, strict=True):
        z = exact(OPAQUE, float(energy), float(width), digits=150)
        assert float(width) == pytest.approx(float(-2 * z.imag), rel=1e-5, abs=0)


@pytest.mark.parametrize(("thickness", "periods"), [(40.0, 2), (40.0, 3), (50.0, 3), (100.0, 3)])
def test_wells_closer_in_energy_than_doubles_can_tell_are_all_listed(thickness: float, periods: int) -> None:
    """Equal wells behind such barriers differ by less than 1e-13 eV; the count knows how many they are."""
    stack = Stack(LEAD, (), (barrier(thickness), well(5.0)), periods, (barrier(thickness),), LEAD)
    found = resonances(stack, (0.05, 0.12))
    assert found.certificate.complete and found.energy.size == periods
    assert np.ptp(found.energy) < 1e-13 and (found.log10_width < -25).all()


def test_a_width_below_the_smallest_double_still_has_a_logarithm_and_a_finite_lifetime() -> None:
    walls = tuple(Layer(90.0, 0.3 + 0.05 * (i % 2), 0.092) for i in range(6))
    stack = Stack(LEAD, walls, (well(5.0),), 1, walls[::-1], LEAD)
    found = resonances(stack, (0.07, 0.1))
    z = exact(stack, float(found.energy[0]), 0.0, digits=900)
    assert found.certificate.complete and found.energy.size == 1
    with mp.workdps(900):
        assert found.log10_width[0] == pytest.approx(float(mp.log10(-2 * z.imag)), abs=1e-6)
    assert found.log10_width[0] < -320 and np.isfinite(found.lifetime[0]) and found.width[0] > 0


def test_partial_widths_tell_which_barrier_is_the_thinner() -> None:
    found = resonances(ASYMMETRIC, (0.0, 0.2))
    assert found.width_left[0] > 3 * found.width_right[0]
    turned = resonances(ASYMMETRIC.reversed(), (0.0, 0.2))
    assert turned.width_left[0] == pytest.approx(found.width_right[0], rel=1e-9, abs=0)


@pytest.mark.parametrize("turned", [False, True])
def test_what_leaks_through_a_wall_much_the_thicker_keeps_its_digits(turned: bool) -> None:
    """A width of about 1 meV of which 1e-12 goes one way: |psi|^2 at both faces in 50 digits, at the pole."""
    stack = Stack(LEAD, (barrier(25.0),), (well(5.0),), 1, (barrier(2.5),), LEAD)
    found = resonances(stack.reversed() if turned else stack, (0.05, 0.1))
    less, more = (found.width_right, found.width_left) if turned else (found.width_left, found.width_right)
    z = exact(stack, float(found.energy[0]), float(found.width[0]))
    with mp.workdps(50):
        psi, slope = mp.mpc(1), -1j * mp.sqrt(z / (mp.mpf(HBAR2_2M0) * mp.mpf(0.067)))
        for layer in (barrier(25.0), well(5.0), barrier(2.5)):
            k = mp.sqrt((z - layer.band_edge) * layer.mass / mp.mpf(HBAR2_2M0))
            turn, m = k * layer.thickness, mp.mpf(layer.mass)
            psi, slope = (mp.cos(turn) * psi + m * mp.sin(turn) / k * slope,
                          -k / m * mp.sin(turn) * psi + mp.cos(turn) * slope)
        ratio = float(1 / abs(psi) ** 2)
    assert less[0] / more[0] == pytest.approx(ratio, rel=1e-8, abs=0) and ratio < 1e-10


@pytest.mark.parametrize("thickness", [4.0, 8.0, 14.0])
def test_both_ways_to_a_width_agree_where_both_are_exact(thickness: float) -> None:
    """Flux over norm at the real energy is off by the order of the width alone (physics of narrow resonances)."""
    stack = Stack(LEAD, (barrier(2.0), well(3.0)), (barrier(thickness), well(5.5)), 1, (barrier(thickness + 1),), LEAD)
    (strip,) = strips(stack, 0.03, 0.12)
    found = resonances(stack, (0.03, 0.12))
    narrow = found.width.argmin()
    pole = np.array([found.energy[narrow] + 0j])  # no imaginary part: the norm is asked for
    logs = log_widths(stack, strip, pole)
    assert np.exp(logs[0]) == pytest.approx(found.width_left[narrow], rel=20 * found.width[narrow] + 1e-7, abs=0)
    assert np.exp(logs[1]) == pytest.approx(found.width_right[narrow], rel=20 * found.width[narrow] + 1e-7, abs=0)


def test_below_a_closed_lead_a_resonance_leaks_to_the_open_one_only() -> None:
    found = resonances(CLOSED_RIGHT, (0.0, 0.2))
    assert found.certificate.complete and found.energy.size >= 2
    assert not found.width_right.any() and not found.peak_transmission.any()
    assert found.width_left == pytest.approx(found.width, rel=1e-12, abs=0)
    assert_exact(CLOSED_RIGHT, found)


def test_a_narrow_state_that_reaches_into_a_closed_lead_counts_what_is_there() -> None:
    """The tail beyond a barrier of 0.5 nm holds much of the state, in a lead 20 meV above it; 50 digits."""
    stack = Stack(LEAD, (barrier(30.0),), (well(5.0),), 1, (barrier(0.5),), Lead(0.1, 0.05, 0.4))
    found = resonances(stack, (0.0, 0.0999))
    assert found.energy.size == 1 and found.width[0] < 1e-14
    z = exact(stack, float(found.energy[0]), float(found.width[0]), digits=60)
    assert float(found.width[0]) == pytest.approx(float(-2 * z.imag), rel=1e-7, abs=0)


def test_a_range_across_a_leads_edge_is_certified_on_both_sides_of_it() -> None:
    found = resonances(CLOSED_RIGHT, (0.0, 0.33))
    assert found.certificate.complete
    assert (found.energy < 0.2).any() and (found.energy > 0.2).any()
    assert (found.width_right[found.energy > 0.2] > 0).all()


def test_five_hundred_periods_over_two_minibands_are_complete() -> None:
    stack = PLAIN.with_periods(500)
    first, second = lattice_bands(stack, (0.0, 0.5)).bands[:2]
    found = resonances(stack, (first.bottom - 1e-3, second.top + 1e-3))
    assert found.certificate.complete
    assert list(found.number[found.miniband == 1]) == list(range(1, 500))
    assert (found.miniband == 2).sum() in (499, 500)  # its top is above the barriers
    assert (np.diff(found.energy) > 0).all() and (found.width > 0).all()
    assert_exact(stack, replace(found, energy=found.energy[::300], width=found.width[::300]), width=1e-6)


def test_a_dropped_pole_is_noticed(monkeypatch: pytest.MonkeyPatch) -> None:
    whole = resonances(PLAIN)
    polished = finder._polished

    def forgetful(*args: object) -> Complexes:
        poles = polished(*args)  # type: ignore[arg-type]
        return np.asarray(poles[abs(poles.real - whole.energy[3]) > 1e-9])

    monkeypatch.setattr(finder, "_polished", forgetful)
    found = resonances(PLAIN)
    assert not found.certificate.complete
    assert found.certificate.counted == whole.energy.size == found.certificate.found + 1
    ((low, high),) = found.certificate.open_regions
    assert low < whole.energy[3] < high
    assert found.certificate.sentence.startswith("not certified: 12 counted, 11 found; open: 0.0")


def test_poles_that_the_phase_does_not_tell_are_found_by_splitting(monkeypatch: pytest.MonkeyPatch) -> None:
    whole = resonances(PLAIN)
    monkeypatch.setattr(finder, "seeds", lambda *_: np.zeros(0, complex))
    found = resonances(PLAIN)
    assert found.certificate.complete
    assert found.energy == pytest.approx(whole.energy, abs=1e-12)


def test_counts_of_parts_add_up_to_the_count_of_the_whole() -> None:
    def count(low: float, high: float) -> int | None:
        return poles_within(PLAIN, Box(low, high, 0.15, 0.15, True, True))

    found = resonances(PLAIN, (0.02, 0.32))
    cuts = [0.02, 0.12, 0.2, 0.32]
    parts = [count(a, b) for a, b in itertools.pairwise(cuts)]
    assert None not in parts and sum(filter(None, parts)) == count(0.02, 0.32) == found.energy.size
    assert poles_within(PLAIN, Box(0.02, 0.32, 0.15, -1e-7, True, True)) == found.energy.size


def test_peak_heights_are_those_of_the_spectrum() -> None:
    found = resonances(UNEQUAL)
    seen = spectrum(UNEQUAL, found.energy).transmission
    assert found.peak_transmission == pytest.approx(seen, rel=1e-12, abs=0) and not found.from_pole.any()


def test_numbers_within_a_miniband_do_not_depend_on_where_the_range_begins() -> None:
    whole = resonances(PLAIN, (0.0, 0.3))
    middle = (whole.energy[3] + whole.energy[4]) / 2
    part = resonances(PLAIN, (float(middle), 0.3))
    assert list(part.number) == list(whole.number[4:]) and list(part.miniband) == list(whole.miniband[4:])
    assert list(part.index) == list(range(1, part.energy.size + 1))


def test_end_states_stand_in_a_gap() -> None:
    found = resonances(END_WELLS)
    assert found.certificate.complete
    assert list(found.miniband[:2]) == [0, 0] and list(found.number[:2]) == [0, 0]


def test_dephasing_leaves_the_poles_where_they_are() -> None:
    assert resonances(LOSSY).energy == pytest.approx(resonances(LOSSY.lossless()).energy, abs=0)


def test_arrays_are_read_only_and_of_one_length() -> None:
    found = resonances(DELTAS)
    for name in ("energy", "width", "log10_width", "lifetime", "width_left", "width_right", "peak_transmission",
                 "from_pole", "index", "miniband", "number"):
        values = getattr(found, name)
        assert values.shape == found.energy.shape and not values.flags.writeable
    assert found.lifetime == pytest.approx(HBAR / found.width, rel=1e-14, abs=0) and (np.diff(found.energy) > 0).all()


def test_bound_states_of_wells_are_those_of_a_fine_grid() -> None:
    """scipy.linalg.eigh_tridiagonal on (V - C/m d^2/dx^2), equal masses, with walls far out in the leads."""
    stack = Stack(LEAD, (well(2.0),), (Layer(4.0, -0.25, 0.067), Layer(2.0, 0.1, 0.067)), 3, (), Lead(-0.02, 0.067))
    found = resonances(stack, (-0.25, -0.02))
    step, margin = 0.01, 40.0
    x = np.arange(-margin, stack.length + margin, step) + step / 2
    faces = np.cumsum([0.0] + [e.thickness for e in (*stack.entry, *stack.cell * 3) if isinstance(e, Layer)])
    levels = [0.0, *(e.band_edge for e in (*stack.entry, *stack.cell * 3) if isinstance(e, Layer)), -0.02]
    potential = np.array(levels)[np.searchsorted(faces, x)]
    hop = HBAR2_2M0 / 0.067 / step**2
    grid = eigh_tridiagonal(potential + 2 * hop, np.full(x.size - 1, -hop), select="v", select_range=(-0.25, -0.0201),
                            eigvals_only=True)
    assert found.bound == pytest.approx(grid, abs=2e-6) and found.bound.size >= 3


@given(STACKS)
@settings(max_examples=40)
def test_bound_states_cancel_both_outgoing_tails_in_any_stack(stack: Stack) -> None:
    top = min(stack.left.band_edge, stack.right.band_edge)
    found = resonances(stack, (top - 0.3, top))
    assert found.energy.size == 0 and found.certificate.complete
    assert (np.diff(bound_count(stack, np.linspace(top - 0.3, top - 1e-9, 40))) >= 0).all()
    with mp.workdps(50):
        for level in found.bound:
            shift = mp.mpf("1e-12")
            values = [mp.im(outgoing(stack, mp.mpc(float(level)) + s)) for s in (-shift, shift)]
            assert values[0] * values[1] <= 0


@given(STACKS)
@settings(max_examples=40)
def test_every_random_stack_is_certified_and_each_pole_is_one_in_fifty_digits(stack: Stack) -> None:
    low = max(stack.left.band_edge, stack.right.band_edge)
    found = resonances(stack, (low - 0.05, low + 0.25))
    assert found.certificate.complete, found.certificate.sentence
    with mp.workdps(50):
        for energy, width in list(zip(found.energy, found.width, strict=True))[:8]:
            z, step = mp.mpc(float(energy), -float(width) / 2), mp.mpf("1e-25")
            f = outgoing(stack, z)
            assert abs(f * step / (outgoing(stack, z + step) - f)) < 1e-12


@pytest.mark.parametrize("between", [(0.2, 0.1), (0.1, 0.1), (float("nan"), 0.2), (0.0, float("inf"))])
def test_a_range_that_is_none_is_refused(between: tuple[float, float]) -> None:
    with pytest.raises(ValueError, match=r"between is .*give two finite energies in eV, the lower one first"):
        resonances(PLAIN, between)


def test_too_many_resonances_are_refused() -> None:
    with pytest.raises(ValueError, match=r"more than the 5,000 that are listed: narrow the range"):
        resonances(PLAIN.with_periods(6000), (0.0, 0.2))


def test_a_range_below_both_leads_has_bound_states_only() -> None:
    stack = Stack(LEAD, (), (Layer(5.0, -0.3, 0.067), barrier(2.0)), 3, (), LEAD)
    found = resonances(stack, (-0.3, -0.01))
    assert found.energy.size == 0 and found.bound.size == 3
    assert found.certificate.sentence == "certified: 0 counted, 0 found"
