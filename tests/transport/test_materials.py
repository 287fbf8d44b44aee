"""The library of materials: ends of an alloy, temperature, strain, and what it warns of."""

from __future__ import annotations

import pytest

from transport import material
from transport.materials import GapClosedError, is_alloy, material_names, mismatch, substrate_names


def test_the_library_holds_four_binaries_and_three_alloys() -> None:
    assert material_names() == ("GaAs", "AlAs", "InAs", "InP", "AlGaAs", "InGaAs", "InAlAs")
    assert substrate_names() == ("GaAs", "AlAs", "InAs", "InP")
    assert [name for name in material_names() if is_alloy(name)] == ["AlGaAs", "InGaAs", "InAlAs"]


@pytest.mark.parametrize(("alloy", "first", "second"),
                         [("AlGaAs", "AlAs", "GaAs"), ("InGaAs", "InAs", "GaAs"), ("InAlAs", "InAs", "AlAs")])
@pytest.mark.parametrize("quantity", ["band_edge", "gap", "mass", "lattice_constant", "monolayer"])
@pytest.mark.parametrize("substrate", [None, "InP"])
def test_x_counts_the_first_named_cation(
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


@pytest.mark.parametrize("name", ["GaAs", "AlAs", "InAs", "InP"])
def test_a_material_on_itself_is_not_strained(name: str) -> None:
    assert material(name, None, 200.0, name) == material(name, None, 200.0)


@pytest.mark.parametrize(("name", "x", "indirect"), [
    ("AlAs", None, True), ("GaAs", None, False), ("AlGaAs", 0.44, False), ("AlGaAs", 0.46, True),
    ("InAlAs", 0.52, False), ("InAlAs", 0.2, True), ("InGaAs", 0.0, False), ("InGaAs", 1.0, False),
])
def test_an_indirect_material_says_so(name: str, x: float | None, indirect: bool) -> None:
    assert any("is indirect" in sentence for sentence in material(name, x, 300.0).warnings) == indirect


def test_an_extrapolated_gap_says_so() -> None:
    assert material("GaAs", None, 600.0).warnings == ()
    assert material("GaAs", None, 700.0).warnings == ("The gap of GaAs at 700 K is extrapolated beyond 600 K.",)


def test_a_closed_gap_is_refused() -> None:
    with pytest.raises(GapClosedError, match=r"^is 1900 K, where the gap of InAs has closed; lower it$"):
        material("InAs", None, 1900.0)


@pytest.mark.parametrize(("name", "x", "substrate", "sentence"), [
    ("GaSb", None, None, r"^name is 'GaSb': give one of GaAs, AlAs"),
    ("AlGaAs", None, None, r"^x is None: give an alloy a composition from 0 to 1, a binary none$"),
    ("GaAs", 0.5, None, r"^x is 0.5: give"),
    ("AlGaAs", 1.5, None, r"^x is 1.5: give"),
    ("AlGaAs", float("nan"), None, r"^x is nan: give"),
    ("GaAs", None, "AlGaAs", r"^substrate is 'AlGaAs': give one of GaAs"),
])
def test_misuse_is_named(name: str, x: float | None, substrate: str | None, sentence: str) -> None:
    with pytest.raises(ValueError, match=sentence):
        material(name, x, 300.0, substrate)
