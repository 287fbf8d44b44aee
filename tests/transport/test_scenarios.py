"""The demo scenarios pose the decisions their notes say."""

from pathlib import Path

import pytest

from transport import Verdict, format_scenario, load_scenario, parse_scenario, period_verdict

FOLDER = Path(__file__).parents[2] / "scenarios"
FILES = sorted(FOLDER.glob("*.toml"))


def decided(name: str) -> Verdict:
    return period_verdict(load_scenario(FOLDER / f"{name}.toml"))


@pytest.mark.parametrize("path", FILES, ids=lambda path: path.stem)
def test_every_scenario_is_sound_asks_something_and_survives_saving(path: Path) -> None:
    scenario = load_scenario(path)
    assert scenario.note.strip().endswith((".", "?"))
    assert scenario.target is not None and scenario.target.windows
    assert parse_scenario(format_scenario(scenario)) == scenario


def test_the_gate_is_met_at_a_moderate_number() -> None:
    assert 5 <= (decided("heron-gate").fewest or 0) <= 20


def test_the_bare_sill_is_stopped_by_its_ripple_floor_and_the_matched_one_is_not() -> None:
    bare, matched = decided("reed-sill-bare"), decided("reed-sill-matched")
    assert bare.fewest is None and "ripple floor" in (bare.reason or "")
    assert matched.fewest is not None and (matched.ripple_floor or 0) > 0.6 > (bare.ripple_floor or 1)
    one, other = (load_scenario(FOLDER / f"reed-sill-{ends}.toml").document for ends in ("bare", "matched"))
    assert one.stack.cell == other.stack.cell and one.target == other.target


def test_the_race_asks_to_block_its_own_miniband() -> None:
    verdict = decided("mill-race")
    assert verdict.fewest is None and "overlaps miniband 1" in (verdict.reason or "")


def test_the_comb_has_no_material_and_is_met() -> None:
    assert all(row.material is None for row in load_scenario(FOLDER / "pebble-comb.toml").sheet)
    assert decided("pebble-comb").fewest is not None


def test_on_the_slope_too_many_periods_lose_what_enough_have_won() -> None:
    meeting = decided("lantern-slope").meeting
    assert meeting and meeting[-1] < 40
