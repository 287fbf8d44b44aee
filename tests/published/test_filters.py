"""Filters of the literature: matched ends raise what a miniband passes."""

import pytest

from transport import Layer, Lead, Stack, lattice_bands, matched_ends, material, parse_scenario


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
    scenario = parse_scenario(f"""
        format = 1
        title = "bare superlattice"
        [conditions]
        temperature_K = 4.2
        [leads]
        left = {{ material = "GaAs" }}
        right = {{ material = "GaAs" }}
        [stack]
        periods = 5
        cell = [ {{ material = "AlGaAs", x = 0.3, thickness_nm = 2.5 }}, {{ material = "GaAs", thickness_nm = 6.5 }} ]
        exit = [ {{ material = "AlGaAs", x = 0.3, thickness_nm = 2.5 }} ]
        [target]
        windows = [ {{ kind = "pass", from_meV = {band.bottom * 1e3}, to_meV = {band.top * 1e3}, transmission = 0.5,
                      measure = "mean" }} ]
    """.replace("\n                      ", " "))
    for whole_monolayers in (False, True):
        found = matched_ends(scenario, whole_monolayers)
        assert 0.15 < found.before[0] < 0.35
        one_cell = [p for p in found.proposals if p.ends.left_cells and len(p.ends.left_cells) == 1]
        assert one_cell[0].limits[0] > 0.75


def test_the_conduction_band_step_of_the_usual_barrier() -> None:
    """Al0.3Ga0.7As on GaAs: 0.26 eV at low temperature, mass near 0.09 (common practice)."""
    gaas, alloy = material("GaAs", None, 4.2), material("AlGaAs", 0.3, 4.2)
    assert alloy.band_edge - gaas.band_edge == pytest.approx(0.26, abs=0.01)
    assert alloy.mass == pytest.approx(0.09, abs=0.005)
