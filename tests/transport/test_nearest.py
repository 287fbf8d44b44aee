"""The nearest stacks: the same as brute force finds, and none that fails the exact verdict."""

from __future__ import annotations

from dataclasses import replace

import msgspec
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from transport import (
    Scenario,
    Target,
    Window,
    load_scenario,
    nearest_stacks,
    period_verdict,
    scenario_from_document,
)

HERON = load_scenario("scenarios/heron-gate.toml")
MILL = load_scenario("scenarios/mill-race.toml")
SILL = load_scenario("scenarios/reed-sill-bare.toml")


def asked(scenario: Scenario, *windows: Window, most: int = 30) -> Scenario:
    """The scenario with another target, in its document too."""
    from transport.document import TargetRecord, WindowRecord
    records = tuple(WindowRecord(w.kind, w.bottom * 1e3, w.top * 1e3, w.transmission, w.measure) for w in windows)
    target = TargetRecord(most, records)
    return scenario_from_document(msgspec.structs.replace(scenario.document, target=target))


def grown(scenario: Scenario, barrier: int, well: int) -> Scenario:
    """Heron gate, or one like it, with other whole monolayers; the closing barrier goes with the barrier."""
    stack = scenario.document.stack
    wall, hollow = stack.cell
    new = msgspec.structs.replace(wall, monolayers=(wall.monolayers or 0) + barrier)
    other = msgspec.structs.replace(hollow, monolayers=(hollow.monolayers or 0) + well)
    stack = msgspec.structs.replace(stack, cell=(new, other), exit=(new,))
    return scenario_from_document(msgspec.structs.replace(scenario.document, stack=stack))


def test_brute_force_over_the_neighbourhood_gives_the_same_list() -> None:
    """Every stack within two monolayers, each with its full verdict; no pass window, so ends are left alone."""
    windows = Window("block", 0.095, 0.17, 1e-5, "maximum"), Window("block", 0.02, 0.05, 3e-4, "maximum")
    scenario = asked(HERON, *windows)
    expected = []
    for barrier in range(-2, 3):
        for well in range(-2, 3):
            other = grown(scenario, barrier, well)
            fewest = period_verdict(other).fewest
            if fewest is not None:
                length = other.stack.with_periods(fewest).length
                expected.append(((barrier != 0) + (well != 0), length, fewest))
    expected.sort()
    found = nearest_stacks(scenario, monolayers=2)
    mine = [(len(p.changes), p.length, p.check.periods) for p in found.proposals]
    assert len(mine) >= 5
    assert np.array(mine) == pytest.approx(np.array(expected[:8]))


@settings(max_examples=12, deadline=None)
@given(st.floats(0.045, 0.08), st.floats(0.004, 0.02), st.floats(0.05, 0.9), st.sampled_from(["minimum", "mean"]),
       st.floats(0.09, 0.12), st.floats(-6, -2))
def test_no_proposal_fails_the_exact_verdict(
    bottom: float, width: float, passed: float, measure: str, blocked: float, decades: float
) -> None:
    scenario = asked(
        HERON, Window("pass", bottom, bottom + width, passed, measure),  # type: ignore[arg-type]
        Window("block", blocked, 0.16, 10**decades, "maximum"), most=24)
    found = nearest_stacks(scenario, monolayers=1)
    for proposal in found.proposals:
        verdict = period_verdict(proposal.scenario)
        assert verdict.per_period[proposal.check.periods - 1].meets
        assert proposal.scenario.stack.periods == proposal.check.periods
    if period_verdict(scenario).fewest is not None:
        assert found.proposals[0].words == "as it is"
    if not found.proposals:
        assert found.miss is None or (found.miss.check.margin_dB is not None and found.miss.check.margin_dB < 0)


def test_a_ripple_floor_is_mended_by_ends_alone() -> None:
    found = nearest_stacks(SILL)
    best = found.proposals[0]
    assert best.changes == () and best.ends is not None
    assert period_verdict(best.scenario).fewest == best.check.periods
    assert [len(p.changes) + (p.ends is not None) for p in found.proposals] == sorted(
        len(p.changes) + (p.ends is not None) for p in found.proposals)


def test_where_nothing_near_will_do_the_nearest_miss_is_named_and_is_the_nearest() -> None:
    """The largest margin of every stack within one monolayer, from full verdicts."""
    scenario = asked(HERON, Window("block", 0.075, 0.17, 1e-5, "maximum"), most=20)
    found = nearest_stacks(scenario, monolayers=1)
    best = max(
        check.margin_dB
        for barrier in (-1, 0, 1) for well in (-1, 0, 1)
        for check in period_verdict(grown(scenario, barrier, well)).per_period if check.margin_dB is not None
    )
    assert found.proposals == () and found.miss is not None
    assert found.miss.check.margin_dB == pytest.approx(best, rel=1e-9)
    assert f"None within ±1 monolayers; the nearest misses by {-best:.1f} dB in the block window" in found.sentence


def test_equal_layers_of_the_ends_follow_the_cell() -> None:
    best = next(p for p in nearest_stacks(MILL).proposals if any(c.name == "barrier" for c in p.changes))
    assert best.scenario.stack.exit[0] == best.scenario.stack.cell[0]


def test_a_target_without_windows_is_refused() -> None:
    with pytest.raises(ValueError, match=r"^target\.windows: give at least one pass or block window to decide by$"):
        nearest_stacks(replace(HERON, target=Target((), 10)))
