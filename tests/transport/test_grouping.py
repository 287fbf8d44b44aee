"""Edits of many layers at once reach every barrier, or every well, and nothing else."""

from __future__ import annotations

import pytest

from transport import ScenarioError, load_scenario, parse_scenario
from transport.grouping import thickened

HERON = load_scenario("scenarios/heron-gate.toml")


@pytest.mark.parametrize(("kind", "step"), [("barriers", 1), ("barriers", -2), ("wells", 1.5)])
def test_every_layer_of_a_kind_changes_by_so_many_monolayers(kind: str, step: float) -> None:
    """Barriers of the demo are its AlGaAs layers, wells its GaAs layers."""
    changed = thickened(HERON, kind, step)  # type: ignore[arg-type]
    for old, new in zip(HERON.sheet, changed.sheet, strict=True):
        if old.thickness is not None:
            is_barrier = old.material == "AlGaAs"
            assert (new.monolayers or 0) - (old.monolayers or 0) == pytest.approx(
                step if is_barrier == (kind == "barriers") else 0)


def test_a_layer_given_in_nm_changes_by_its_materials_monolayer() -> None:
    """GaAs at 300 K: half the lattice constant 0.565325 nm (Vurgaftman et al. 2001, table I)."""
    scenario = parse_scenario("""
        format = 1
        leads = { left = { material = "GaAs" }, right = { material = "GaAs" } }
        [stack]
        periods = 3
        entry = [ { repeat = 2, layers = [ { material = "GaAs", thickness_nm = 4.0 } ] } ]
        cell = [ { material = "AlGaAs", x = 0.3, thickness_nm = 2.5 }, { material = "GaAs", thickness_nm = 6.0 } ]
    """)
    changed = thickened(scenario, "wells", 1).document.stack
    assert changed.cell[1].thickness_nm == pytest.approx(6.0 + 0.565325 / 2, abs=1e-6)
    assert changed.cell[0].thickness_nm == 2.5
    assert changed.entry[0].layers is not None
    assert changed.entry[0].layers[0].thickness_nm == pytest.approx(4.0 + 0.565325 / 2, abs=1e-6)


def test_nothing_left_of_a_layer_and_a_flat_cell_are_one_sentence_each() -> None:
    with pytest.raises(ScenarioError, match=r"stack\.cell\[0\]\.monolayers: would be 0, and must stay above 0"):
        thickened(HERON, "barriers", -7)
    flat = parse_scenario("""
        format = 1
        leads = { left = { band_edge_eV = 0, mass = 1 }, right = { band_edge_eV = 0, mass = 1 } }
        [stack]
        periods = 3
        cell = [ { delta_eV_nm = 0.1 }, { band_edge_eV = 0, mass = 1, thickness_nm = 1 } ]
    """)
    with pytest.raises(ScenarioError, match="has layers of one band edge only"):
        thickened(flat, "wells", 1)
