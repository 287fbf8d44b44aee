"""The library of materials against outside tables and round numbers of the trade.

openbandparams 1.0 (PyPI) is an open table after the same paper, Vurgaftman, Meyer and Ram-Mohan, J. Appl. Phys. 89,
5815 (2001). It differs on purpose in three points, which are compared at 0 K or left out:

* masses of binaries: it computes them from the gap at temperature by k.p, here they are the paper's low-temperature
  values at every temperature; at 0 K both agree;
* masses of alloys: it interpolates the k.p parameters; here the paper's bowing of the mass itself is used for InGaAs
  and InAlAs, and the straight line between the ends for the others;
* the valence edge of AlAsSb: it bows by -0.14 eV, with the paper's -1.71 eV beside it but switched off; here the
  paper's stands.
"""

from __future__ import annotations

import math
from typing import Any

import openbandparams
import pytest

from transport import material

BINARIES = ("GaAs", "AlAs", "InAs", "InP", "GaSb", "AlSb")
# our name: (its name, its x from ours)
ALLOYS = {"AlGaAs": ("AlGaAs", False), "InGaAs": ("GaInAs", True), "InAlAs": ("AlInAs", True),
          "GaAsSb": ("GaAsSb", True), "AlGaSb": ("AlGaSb", False), "AlAsSb": ("AlAsSb", True)}
TEMPERATURES = (0.0, 77.0, 300.0, 500.0)
# the open table's bowing of a valence edge less the paper's, eV
SWITCHED_OFF = {"AlAsSb": -0.14 + 1.71}


def theirs(name: str, x: float | None) -> Any:
    """The same material in the open table, which counts x for the other element where it names that one first."""
    if x is None:
        return getattr(openbandparams, name)
    its_name, swapped = ALLOYS[name]
    return getattr(openbandparams, its_name)(x=1 - x if swapped else x)


CASES = [(name, None) for name in BINARIES] + [(name, x) for name in ALLOYS for x in (0.0, 0.25, 0.53, 1.0)]


@pytest.mark.parametrize("temperature", TEMPERATURES)
@pytest.mark.parametrize(("name", "x"), CASES)
def test_gap_edge_and_lattice_constant_are_those_of_the_open_table(
    name: str, x: float | None, temperature: float
) -> None:
    found, other = material(name, x, temperature), theirs(name, x)
    assert found.gap == pytest.approx(other.Eg_Gamma(T=temperature), abs=1e-12)
    bowing = SWITCHED_OFF.get(name, 0.0) * ((x or 0.0) * (1 - (x or 0.0)))
    assert found.valence_edge == pytest.approx(other.VBO(T=temperature) + bowing, abs=1e-12)
    assert found.band_edge == pytest.approx(other.CBO_Gamma(T=temperature) + bowing, abs=1e-12)
    assert found.lattice_constant * 10 == pytest.approx(other.a(T=temperature), abs=1e-12)


@pytest.mark.parametrize("name", BINARIES)
def test_masses_of_binaries_are_those_of_the_open_table_at_low_temperature(name: str) -> None:
    assert material(name, None, 4.0).mass == pytest.approx(theirs(name, None).meff_e_Gamma_0(), abs=1e-12)


@pytest.mark.parametrize("substrate", BINARIES)
@pytest.mark.parametrize(("name", "x"), CASES)
def test_the_strained_edge_follows_from_the_open_table(name: str, x: float | None, substrate: str) -> None:
    """a_c tr(eps) with the open table's a_c, C11, C12 (formula: Van de Walle, Phys. Rev. B 39, 1871 (1989)).

    A monolayer of such a layer is half the lattice constant along growth (common practice).
    """
    other, base = theirs(name, x), theirs(substrate, None)
    in_plane = base.a(T=300) / other.a(T=300) - 1
    along_growth = -2 * other.c12(T=300) / other.c11(T=300) * in_plane
    shift = other.a_c(T=300) * (2 * in_plane + along_growth)
    strained = material(name, x, 300.0, substrate)
    assert strained.band_edge - material(name, x, 300.0).band_edge == pytest.approx(shift, abs=1e-12)
    assert strained.monolayer * 20 == pytest.approx(other.a(T=300) * (1 + along_growth), abs=1e-12)


def lowest_valley_is_gamma(name: str, x: float, temperature: float) -> bool:
    other = theirs(name, x)
    return bool(other.Eg_Gamma(T=temperature) < min(other.Eg_X(T=temperature), other.Eg_L(T=temperature)))


@pytest.mark.parametrize(("name", "direct", "indirect"), [
    ("AlGaAs", 0.40, 0.45), ("InAlAs", 0.38, 0.35), ("AlGaSb", 0.39, 0.41),
])
@pytest.mark.parametrize("temperature", [300.0])
def test_an_alloy_turns_indirect_where_the_open_table_says(
    name: str, direct: float, indirect: float, temperature: float
) -> None:
    """The crossing of the open table lies between the two; it has AlGaAs at 0.41, where 0.45 is common practice."""
    assert lowest_valley_is_gamma(name, direct, temperature)
    assert not lowest_valley_is_gamma(name, indirect, temperature)
    assert not any("is indirect" in sentence for sentence in material(name, direct, temperature).warnings)
    further = indirect + math.copysign(0.01, indirect - direct)
    assert any("is indirect" in sentence for sentence in material(name, further, temperature).warnings)


@pytest.mark.parametrize(("name", "gamma"), [("GaAsSb", True), ("InGaAs", True), ("AlAsSb", False)])
@pytest.mark.parametrize("x", [0.0, 0.25, 0.5, 0.75, 1.0])
def test_an_alloy_without_a_crossing_is_one_or_the_other_throughout(name: str, gamma: bool, x: float) -> None:
    assert lowest_valley_is_gamma(name, x, 300.0) == gamma
    assert any("is indirect" in sentence for sentence in material(name, x, 300.0).warnings) != gamma


def test_indium_arsenide_beside_gallium_antimonide_has_a_broken_gap() -> None:
    """The conduction edge of InAs lies about 0.15 eV below the valence edge of GaSb (common practice)."""
    inside = material("GaSb", None, 4.0).valence_edge - material("InAs", None, 4.0).band_edge
    assert inside == pytest.approx(0.15, abs=0.02)


def test_the_step_of_a_common_barrier_is_a_quarter_of_an_electronvolt() -> None:
    """Al0.3Ga0.7As on GaAs: 0.26 eV at low temperature, mass near 0.09 (common practice)."""
    barrier, well = material("AlGaAs", 0.3, 4.0), material("GaAs", None, 4.0)
    assert barrier.band_edge - well.band_edge == pytest.approx(0.26, abs=0.005)
    assert barrier.mass == pytest.approx(0.09, abs=0.003)


def test_gallium_arsenide_at_room_temperature() -> None:
    """Gap 1.42 eV, mass 0.067, monolayer 0.283 nm (common practice)."""
    found = material("GaAs", None, 300.0)
    assert found.gap == pytest.approx(1.424, abs=0.005)
    assert found.mass == 0.067
    assert found.monolayer == pytest.approx(0.28266, abs=5e-5)


def test_the_alloys_grown_on_indium_phosphide_match_it() -> None:
    """In0.53Ga0.47As and In0.52Al0.48As match InP; gap 0.74 to 0.76 eV, step about 0.5 eV (common practice)."""
    base = material("InP", None, 300.0)
    well, barrier = material("InGaAs", 0.53, 300.0), material("InAlAs", 0.52, 300.0)
    assert well.lattice_constant == pytest.approx(base.lattice_constant, rel=1e-3)
    assert barrier.lattice_constant == pytest.approx(base.lattice_constant, rel=1e-3)
    assert well.gap == pytest.approx(0.74, abs=0.01)
    assert well.mass == pytest.approx(0.043, abs=0.001)
    assert barrier.band_edge - well.band_edge == pytest.approx(0.5, abs=0.03)
