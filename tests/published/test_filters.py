"""Filters of the literature: matched ends raise what a miniband passes."""

import numpy as np
import pytest

from tests.transport.test_periods import Asked
from transport import Layer, Lead, Stack, Target, Window, lattice_bands, material, period_verdict


def test_quarter_wave_like_ends_raise_a_quarter_to_about_three_quarters() -> None:
    """Pacher et al., Appl. Phys. Lett. 79, 1486 (2001), from memory: extra end cells as an antireflection coating took
    the mean transmission of a GaAs/AlGaAs miniband from about a quarter to about three quarters. The trend, on a
    superlattice of our own.
    """
    gaas, alloy = material("GaAs", None, 4.2), material("AlGaAs", 0.3, 4.2)
    lead = Lead(0.0, gaas.mass)

    def wall(thickness: float) -> Layer:
        return Layer(thickness, alloy.band_edge - gaas.band_edge, alloy.mass)

    def hollow(thickness: float) -> Layer:
        return Layer(thickness, 0.0, gaas.mass)

    bare = Stack(lead, (), (wall(2.5), hollow(6.5)), 5, (wall(2.5),), lead)
    band = lattice_bands(bare, between=(0.0, 0.15)).bands[0]
    window = Window("pass", band.bottom, band.top, 0.5, "mean")

    def limit(stack: Stack) -> float:
        found = period_verdict(Asked(stack, Target((window,), 3))).mean_limit
        assert found is not None
        return found

    assert 0.15 < limit(bare) < 0.35
    thinner = np.linspace(0.6, 1.6, 11)
    best = max(
        limit(Stack(lead, (wall(b), hollow(6.5)), (wall(2.5), hollow(6.5)), 5, (wall(2.5), hollow(6.5), wall(b)), lead))
        for b in thinner
    )
    assert best > 0.7


def test_the_conduction_band_step_of_the_usual_barrier() -> None:
    """Al0.3Ga0.7As on GaAs: 0.26 eV at low temperature, mass near 0.09 (common practice)."""
    gaas, alloy = material("GaAs", None, 4.2), material("AlGaAs", 0.3, 4.2)
    assert alloy.band_edge - gaas.band_edge == pytest.approx(0.26, abs=0.01)
    assert alloy.mass == pytest.approx(0.09, abs=0.005)
