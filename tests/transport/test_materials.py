"""The library of materials: ends of an alloy, temperature, strain, and what it warns of."""

from __future__ import annotations

import pytest

from transport import material
from transport.materials import GapClosedError, is_alloy, material_names, mismatch, substrate_names

BINARIES = ("GaAs", "AlAs", "InAs", "InP", "GaSb", "AlSb")
ALLOYS = ("AlGaAs", "InGaAs", "InAlAs", "GaAsSb", "AlGaSb", "AlAsSb")


def test_the_library_holds_six_binaries_and_six_alloys() -> None:
    assert material_names() == BINARIES + ALLOYS
    assert substrate_names() == BINARIES
    assert tuple(name for name in material_names() if is_alloy(name)) == ALLOYS


@pytest.mark.parametrize(("alloy", "first", "second"),
                         [("AlGaAs", "AlAs", "GaAs"), ("InGaAs", "InAs", "GaAs"), ("InAlAs", "InAs", "AlAs"),
                          ("AlGaSb", "AlSb", "GaSb"), ("GaAsSb", "GaSb", "GaAs"), ("AlAsSb", "AlSb", "AlAs")])
@pytest.mark.parametrize("quantity", ["band_edge", "valence_edge", "gap", "mass", "lattice_constant", "monolayer"])
@pytest.mark.parametrize("substrate", [None, "InP"])
def test_x_counts_the_first_named_cation_or_antimony(
    alloy: str, first: str, second: str, quantity: str, substrate: str | None
) -> None:
    for x, end in ((1.0, first), (0.0, second)):
        found = getattr(material(alloy, x, 120.0, substrate), quantity)
        assert found == pytest.approx(getattr(material(end, None, 120.0, substrate), quantity), rel=1e-14)


def test_bowing_pulls_the_gap_below_the_straight_line() -> None:
    """Formula: x (1 - x) times the bowing, 0.477 eV for InGaAs."""
    straight = (material("InAs", None, 4.0).gap + material("GaAs", None, 4.0).gap) / 2
    assert straight - material("InGaAs", 0.5, 4.0).gap == pytest.approx(0.477 / 4, abs=1e-12)


def test_the_gap_shrinks_and_the_lattice_grows_with_temperature() -> None:
    cold, warm = material("GaAs", None, 4.0), material("GaAs", None, 300.0)
    assert warm.gap < cold.gap
    assert warm.band_edge - cold.band_edge == pytest.approx(warm.gap - cold.gap, abs=1e-14)
    assert warm.monolayer > cold.monolayer


def test_compression_raises_the_edge_and_tension_lowers_it() -> None:
    assert mismatch(material("InAs", None, 300.0), material("GaAs", None, 300.0)) > 0
    assert material("InAs", None, 300.0, "GaAs").band_edge > material("InAs", None, 300.0).band_edge
    assert material("GaAs", None, 300.0, "InP").band_edge < material("GaAs", None, 300.0).band_edge


def test_indium_arsenide_on_gallium_arsenide_is_shifted_by_the_hand_worked_amount() -> None:
    """At 300 K, by hand from the paper's values: the formula of the module's strain, every step written out."""
    in_plane = 5.65325 / 6.0583 - 1  # -0.066859
    along = -2 * 45.26 / 83.29 * in_plane  # +0.072663
    found, free = material("InAs", None, 300.0, "GaAs"), material("InAs", None, 300.0)
    assert found.band_edge - free.band_edge == pytest.approx(-5.08 * (2 * in_plane + along), rel=1e-12)
    assert found.band_edge - free.band_edge == pytest.approx(0.31017, abs=2e-5)
    assert found.monolayer == pytest.approx(0.605830 / 2 * (1 + along), rel=1e-12)
    assert found.monolayer == pytest.approx(0.32492, abs=2e-5)
    assert (found.gap, found.mass, found.valence_edge) == (free.gap, free.mass, free.valence_edge)


def test_indium_gallium_arsenide_on_gallium_arsenide_is_shifted_by_the_hand_worked_amount() -> None:
    """x = 0.2 at 300 K: lattice, C11, C12 on the straight line, a_c bowed by 2.61 eV."""
    lattice = 0.2 * 6.0583 + 0.8 * 5.65325  # 5.73426
    in_plane = 5.65325 / lattice - 1  # -0.014127
    along = -2 * (0.2 * 45.26 + 0.8 * 56.6) / (0.2 * 83.29 + 0.8 * 122.1) * in_plane
    a_c = 0.2 * -5.08 + 0.8 * -7.17 - 0.2 * 0.8 * 2.61  # -7.1696
    found, free = material("InGaAs", 0.2, 300.0, "GaAs"), material("InGaAs", 0.2, 300.0)
    assert found.band_edge - free.band_edge == pytest.approx(a_c * (2 * in_plane + along), rel=1e-12)
    assert found.band_edge - free.band_edge == pytest.approx(0.1065, abs=2e-4)
    assert found.monolayer == pytest.approx(lattice / 20 * (1 + along), rel=1e-12)


@pytest.mark.parametrize("name", BINARIES)
def test_a_material_on_itself_is_not_strained(name: str) -> None:
    assert material(name, None, 200.0, name) == material(name, None, 200.0)


@pytest.mark.parametrize(("name", "x", "indirect"), [
    ("AlAs", None, True), ("GaAs", None, False), ("AlGaAs", 0.44, False), ("AlGaAs", 0.46, True),
    ("InAlAs", 0.52, False), ("InAlAs", 0.2, True), ("InGaAs", 0.0, False), ("InGaAs", 1.0, False),
    ("GaSb", None, False), ("AlSb", None, True), ("AlGaSb", 0.38, False), ("AlGaSb", 0.42, True),
])
def test_an_indirect_material_says_so(name: str, x: float | None, indirect: bool) -> None:
    assert any("is indirect" in sentence for sentence in material(name, x, 300.0).warnings) == indirect


@pytest.mark.parametrize(("name", "x", "sentence"), [
    ("AlSb", None, "AlSb is indirect: its lowest valley is not Gamma, and only Gamma is counted."),
    ("AlAsSb", 0.5, "AlAsSb (x = 0.5) is indirect: its lowest valley is not Gamma, and only Gamma is counted."),
    ("AlGaAs", 0.6, "AlGaAs (x = 0.6) is indirect: its lowest valley is not Gamma (the crossover is near x = 0.45), "
                    "and only Gamma is counted."),
    ("InAlAs", 0.3, "InAlAs (x = 0.3) is indirect: its lowest valley is not Gamma (the crossover is near x = 0.36), "
                    "and only Gamma is counted."),
])
def test_the_sentence_on_an_indirect_material_names_the_crossover(name: str, x: float | None, sentence: str) -> None:
    assert [told for told in material(name, x, 300.0).warnings if "indirect" in told] == [sentence]


def test_an_extrapolated_gap_says_so() -> None:
    assert material("GaAs", None, 600.0).warnings == ()
    assert material("GaAs", None, 700.0).warnings == ("The gap of GaAs at 700 K is extrapolated beyond 600 K.",)


def test_a_closed_gap_is_refused() -> None:
    with pytest.raises(GapClosedError, match=r"^is 1900 K, where the gap of InAs has closed; lower it$"):
        material("InAs", None, 1900.0)


@pytest.mark.parametrize(("name", "x", "substrate", "sentence"), [
    ("GaSn", None, None, r"^name is 'GaSn': did you mean GaSb\?$"),
    ("quartz", None, None, r"^name is 'quartz': known here: GaAs, AlAs"),
    ("AlGaAs", None, None, r"^x is None: give an alloy a composition from 0 to 1, a binary none$"),
    ("GaAs", 0.5, None, r"^x is 0.5: give"),
    ("AlGaAs", 1.5, None, r"^x is 1.5: give"),
    ("AlGaAs", float("nan"), None, r"^x is nan: give"),
    ("GaAs", None, "AlGaAs", r"^substrate is 'AlGaAs': give one of GaAs"),
])
def test_misuse_is_named(name: str, x: float | None, substrate: str | None, sentence: str) -> None:
    with pytest.raises(ValueError, match=sentence):
        material(name, x, 300.0, substrate)


@pytest.mark.parametrize("temperature", [-1.0, float("nan"), float("inf")])
def test_a_temperature_that_is_none_is_refused(temperature: float) -> None:
    with pytest.raises(ValueError, match=r"^temperature is .*: give kelvin, 0 or above and finite$"):
        material("GaAs", None, temperature)


def test_an_alloy_whose_sources_differ_says_by_how_much() -> None:
    assert any("sources differ by up to 0.4 eV" in sentence for sentence in material("AlAsSb", 0.5, 300.0).warnings)
    assert not any("sources differ" in sentence for sentence in material("AlGaAs", 0.3, 300.0).warnings)
