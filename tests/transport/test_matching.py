"""Matched ends: what is proposed is what it says, and never worse than what was there."""

from __future__ import annotations

from dataclasses import replace

import pytest

from transport import ScenarioError, Target, Window, load_scenario, matched_ends, period_verdict, with_ends
from transport.document import EndCellRecord, EndsRecord

HERON = load_scenario("scenarios/heron-gate.toml")
SILL = load_scenario("scenarios/reed-sill-bare.toml")
LANTERN = load_scenario("scenarios/lantern-slope.toml")


@pytest.mark.parametrize("whole", [False, True])
def test_the_limits_of_a_proposal_are_those_of_its_own_verdict(whole: bool) -> None:
    for scenario in (HERON, SILL):
        found = matched_ends(scenario, whole)
        for proposal in found.proposals:
            verdict = period_verdict(proposal.scenario, 2)
            limit = verdict.mean_limit if verdict.mean_limit is not None else verdict.ripple_floor
            assert proposal.limits[0] == pytest.approx(limit, rel=1e-9)
            assert proposal.limits[0] > found.before[0] and proposal.gain_dB > 0


def test_the_best_ends_come_first_and_no_half_barrier_beats_free_cells() -> None:
    found = matched_ends(SILL)
    limits = [proposal.limits[0] for proposal in found.proposals]
    assert limits == sorted(limits, reverse=True)
    one_cell = next(p for p in found.proposals if p.ends.left_cells and len(p.ends.left_cells) == 1)
    half = next(p for p in found.proposals if p.ends.kind == "half")
    assert one_cell.limits[0] >= half.limits[0]


def test_one_end_cell_is_the_best_of_a_fine_grid() -> None:
    """Brute force over thicknesses in steps of 5 %."""
    found = matched_ends(SILL)
    one_cell = next(p for p in found.proposals if p.ends.left_cells and len(p.ends.left_cells) == 1)
    best = 0.0
    for barrier in range(6, 17):
        for well in range(16, 24):
            ends = EndsRecord("cells", left_cells=(EndCellRecord(barrier / 20, well / 20),))
            best = max(best, period_verdict(with_ends(SILL, ends), 1).ripple_floor or 0.0)
    assert one_cell.limits[0] >= best - 1e-3


def test_whole_monolayers_make_a_sheet_of_whole_monolayers() -> None:
    for proposal in matched_ends(HERON, whole_monolayers=True).proposals:
        counts = [row.monolayers for row in proposal.scenario.sheet if row.key == "stack.ends"]
        assert all(count is not None and abs(count - round(count)) < 1e-9 for count in counts)


def test_unequal_leads_are_matched_each_on_its_own_side() -> None:
    found = matched_ends(LANTERN)
    best = found.proposals[0]
    assert best.ends.right_cells is not None and best.ends.right_cells != best.ends.left_cells
    assert best.limits[0] > 0.9 > found.before[0]


def test_progress_ends_with_the_work_and_stops_it_by_raising() -> None:
    told: list[float] = []
    matched_ends(HERON, progress=told.append)
    assert told == sorted(told) and told[-1] == 1.0

    def stop(share: float) -> None:
        raise InterruptedError
    with pytest.raises(InterruptedError):
        matched_ends(HERON, progress=stop)


def test_a_window_across_a_miniband_edge_is_named_instead_of_treated() -> None:
    window = Window("pass", 0.060, 0.120, 0.5, "minimum")
    found = matched_ends(replace(SILL, target=Target((window,), 20)))
    assert not found.proposals
    assert "crosses the top of miniband 1" in found.sentence


def test_without_a_pass_window_ends_have_nothing_to_raise() -> None:
    mill = load_scenario("scenarios/mill-race.toml")
    with pytest.raises(ScenarioError, match=r"^target\.windows: holds no pass window, so ends have nothing to raise"):
        matched_ends(mill)


def test_a_taper_longer_than_the_stack_is_refused() -> None:
    with pytest.raises(ScenarioError, match=r"^cells: is 9, a taper longer than the stack of 8 periods; ask for at "):
        matched_ends(HERON, cells=9)
