"""The infinite lattice: every band, however narrow or close, and a certificate that can fail."""

import numpy as np
import pytest

from tests.transport.stacks import ALL, CLOSED_OFF, FREE, KANE, LEAD, LOSSY, OPAQUE, PLAIN, barrier, well
from transport import Delta, Layer, Lead, Stack, bloch, certify, lattice_bands
from transport.constants import HBAR, HBAR2_2M0

UNRESOLVABLE = Stack(LEAD, (), (barrier(300.0), well(5.0)), 3, (), LEAD)


@pytest.mark.parametrize("name", ALL)
def test_the_list_of_bands_is_certified(name: str) -> None:
    bands = lattice_bands(ALL[name], between=(-0.1, 2.0))
    assert bands.certificate.complete, bands.certificate.sentence
    assert [b.index for b in bands.bands] == list(range(1, len(bands.bands) + 1))


@pytest.mark.parametrize("name", ALL)
@pytest.mark.parametrize("dropped", [0, 1, -1])
def test_a_dropped_band_costs_the_certificate(name: str, dropped: int) -> None:
    found = lattice_bands(ALL[name], between=(-0.1, 2.0))
    kept = list(found.bands)
    del kept[dropped]
    certificate = certify(found.stack, tuple(kept), found.between)
    assert not certificate.complete
    assert certificate.counted == certificate.found + 1
    assert certificate.sentence.startswith("not certified")


def test_a_band_put_in_the_wrong_place_costs_the_certificate() -> None:
    from dataclasses import replace

    found = lattice_bands(PLAIN, between=(0.0, 1.0))
    moved = (replace(found.bands[0], bottom=0.2, top=0.22), *found.bands[1:])
    assert not certify(PLAIN, moved, found.between).complete


def test_without_potential_neighbouring_bands_touch_and_stay_two() -> None:
    """Free electrons folded into the zone: edges (hbar^2/2m)(j pi/d)^2, common practice."""
    bands = lattice_bands(FREE, between=(0.0, 1.0)).bands
    edges = [HBAR2_2M0 / 0.067 * (j * np.pi / 8.0) ** 2 for j in range(5)]
    assert [b.top for b in bands] == pytest.approx(edges[1:], rel=1e-14)
    assert [b.bottom for b in bands] == pytest.approx(edges[:-1], rel=1e-14, abs=1e-16)
    assert bands[1].bottom == bands[0].top
    assert bands[1].bottom_mass == 0


def test_a_band_narrower_than_a_double_is_listed() -> None:
    bands = lattice_bands(UNRESOLVABLE, between=(0.0, 0.3))
    assert bands.certificate.complete
    assert bands.bands[0].top - bands.bands[0].bottom < 1e-15
    assert bands.bands[0].bottom == pytest.approx(lattice_bands(OPAQUE, between=(0.0, 0.3)).bands[0].bottom, abs=1e-8)


def test_a_band_across_the_end_of_the_range_is_listed_whole() -> None:
    whole = lattice_bands(PLAIN, between=(0.0, 1.0)).bands[1]
    cut = lattice_bands(PLAIN, between=(0.3, 0.31)).bands
    assert len(cut) == 1 and cut[0].index == 2
    assert (cut[0].bottom, cut[0].top) == pytest.approx((whole.bottom, whole.top), abs=1e-14)


@pytest.mark.parametrize("stack", [PLAIN, KANE], ids=["plain", "Kane"])
def test_dispersion_runs_from_edge_to_edge_and_back(stack: Stack) -> None:
    bands = lattice_bands(stack, between=(0.0, 1.0))
    phase = np.linspace(0, np.pi, 9)
    for band, energies in zip(bands.bands, bands.energies(phase), strict=True):
        ends = (band.bottom, band.top) if band.index % 2 else (band.top, band.bottom)
        assert (energies[0], energies[-1]) == pytest.approx(ends, abs=1e-13)
        assert bloch(stack, energies[1:-1]).phase == pytest.approx(phase[1:-1], abs=1e-9)


def test_velocity_and_masses_are_the_slopes_of_the_dispersion() -> None:
    """v = dE/dK / hbar and 1/m = d2E/dK2 / hbar^2 by finite differences of E(K)."""
    bands, d = lattice_bands(PLAIN, between=(0.0, 0.5)), PLAIN.period_length
    step = 1e-3
    for band, row in zip(bands.bands, bands.energies(np.array([0.0, step, 1.0 - step, 1.0, 1.0 + step])), strict=True):
        slope = abs(row[4] - row[2]) / (2 * step / d) / HBAR
        assert bloch(PLAIN, [row[3]]).velocity[0] == pytest.approx(slope, rel=1e-5)
        mass = HBAR2_2M0 * 2 / (2 * (row[1] - row[0]) / (step / d) ** 2)
        at_centre = band.bottom_mass if band.index % 2 else band.top_mass
        assert at_centre == pytest.approx(mass, rel=1e-4)


def test_the_density_of_states_holds_one_state_per_band_and_cell() -> None:
    band = lattice_bands(PLAIN, between=(0.0, 0.2)).bands[0]
    share = (np.arange(4000) + 0.5) / 4000
    energy = band.bottom + (band.top - band.bottom) * np.sin(np.pi * share / 2) ** 2
    weight = (band.top - band.bottom) * np.pi / 2 * np.sin(np.pi * share) / 4000
    assert weight @ bloch(PLAIN, energy).density_of_states == pytest.approx(1.0, rel=1e-6)


def test_the_decay_is_what_a_period_costs_deep_in_a_gap() -> None:
    from transport import spectrum

    energy = np.array([0.15, 0.2])
    fifty, sixty = (spectrum(PLAIN.with_periods(n), energy).log10_transmission for n in (50, 60))
    per_period = (fifty - sixty) / 10 * np.log(10) / 2
    assert bloch(PLAIN, energy).decay == pytest.approx(per_period, rel=1e-9)
    assert bloch(PLAIN, energy).rejection_dB == pytest.approx(fifty - sixty, rel=1e-9)  # ten periods of log10 T


def test_bands_are_those_of_the_lossless_lattice() -> None:
    assert lattice_bands(LOSSY).bands == lattice_bands(CLOSED_OFF).bands


def test_a_reversed_range_and_a_crowd_of_bands_are_refused() -> None:
    with pytest.raises(ValueError, match=r"between is \(1, 0\): give two finite energies in eV, the lower one first"):
        lattice_bands(PLAIN, between=(1, 0))
    with pytest.raises(ValueError, match=r"more than the 20,000 that are listed: narrow the range"):
        lattice_bands(Stack(LEAD, (), (well(10_000.0),), 1, (), LEAD), between=(0.0, 900.0))


def test_end_layers_do_not_end_the_lattices_model() -> None:
    """A deep delta pulls the band below the energy at which the mass of an end layer would vanish."""
    deep = (Layer(1.0, 0.0, 0.25), Delta(-0.25))
    ended = Stack(LEAD, (), deep, 1, (Layer(1.0, 0.5, 0.25, 0.6),), LEAD)
    assert lattice_bands(ended, between=(0.0, 1.5)).bands == lattice_bands(
        Stack(LEAD, (), deep, 1, (), LEAD), between=(0.0, 1.5)
    ).bands


def test_a_band_astride_a_range_is_found_above_the_end_of_the_model() -> None:
    """The range begins inside a band, and not far below it the masses would vanish."""
    stack = Stack(Lead(0.0, 0.067), (), (Layer(2.0, 0.3, 0.09, 3.0), Layer(6.0, 0.0, 0.067, 0.64)), 5, (),
                  Lead(0.0, 0.067))
    whole = lattice_bands(stack, (0.0, 0.25)).bands
    found = lattice_bands(stack, (0.06, 0.2)).bands
    assert [(b.bottom, b.top) for b in found] == [pytest.approx((b.bottom, b.top), abs=1e-12) for b in whole[:2]]
