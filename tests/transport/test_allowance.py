"""The range of a verdict: each case is the verdict of the stack it stands for."""

from __future__ import annotations

from dataclasses import replace
from itertools import product

import msgspec
import numpy as np
import pytest

from transport import (
    Layer,
    Lead,
    ScenarioError,
    Stack,
    Target,
    load_scenario,
    margin_range,
    parse_scenario,
    period_verdict,
    scenario_from_document,
    verdict_range,
)
from transport.document import GrowthRecord
from transport.scenario import Scenario, format_scenario

HERON = load_scenario("scenarios/heron-gate.toml")
COUNTS = 24


def with_growth(growth: GrowthRecord, most: int = COUNTS) -> Scenario:
    target = HERON.document.target
    assert target is not None
    return scenario_from_document(msgspec.structs.replace(
        HERON.document, growth=growth, target=msgspec.structs.replace(target, most_periods=most)))


def changed(offset: float, mass: float, barrier: int, well: int) -> Stack:
    """Heron gate with offset and mass scaled and whole monolayers added, written out by hand."""
    stack = HERON.stack
    wall, hollow = stack.cell
    assert isinstance(wall, Layer) and isinstance(hollow, Layer)
    new_wall = Layer(wall.thickness * (7 + barrier) / 7, wall.band_edge * offset, wall.mass * mass)
    new_hollow = Layer(hollow.thickness * (20 + well) / 20, 0.0, hollow.mass * mass)
    lead = Lead(0.0, stack.left.mass * mass)
    return Stack(lead, (), (new_wall, new_hollow), 1, (new_wall,), lead)


def test_every_case_is_the_verdict_of_the_stack_it_stands_for() -> None:
    """Corners and single figures against full verdicts of stacks written out by hand."""
    scenario = with_growth(GrowthRecord(offset_percent=4.0, mass_percent=3.0, monolayer_error=1))
    found = verdict_range(scenario)
    signs = {case.signs for case in found.cases}
    assert signs == {(0, 0, 0, 0), *product((-1, 1), repeat=4), *(
        tuple(s if i == place else 0 for i in range(4)) for place in range(4) for s in (-1, 1))}
    for case in found.cases:
        offset, mass, barrier, well = case.signs
        stack = changed(1 + 0.04 * offset, 1 + 0.03 * mass, barrier, well)
        assert case.fewest == period_verdict(replace(scenario, stack=stack)).fewest


def test_the_range_spans_its_cases_and_counts_those_without_an_answer() -> None:
    found = verdict_range(HERON)
    known = [case.fewest for case in found.cases if case.fewest is not None]
    assert (found.nominal, found.low, found.high) == (period_verdict(HERON).fewest, min(known), max(known))
    assert found.unanswered == len(found.cases) - len(known) > 0
    assert found.sentence == (f"Fewest 10 ({found.low}–{found.high}, none in {found.unanswered} of {len(found.cases)} "
                              "cases); the barrier's monolayer matters most.")


def test_the_margins_of_a_range_enclose_those_of_the_stack_as_written() -> None:
    scenario = with_growth(GrowthRecord(), most=14)
    low, high = margin_range(scenario, verdict_range(scenario), np.arange(1, 15))
    margins = np.array([check.margin_dB for check in period_verdict(HERON, 14).per_period])
    assert np.all((low <= margins) & (margins <= high)) and np.any(high > margins + 1)


def test_a_figure_of_zero_is_left_alone() -> None:
    found = verdict_range(with_growth(GrowthRecord(offset_percent=0.0, mass_percent=2.0, monolayer_error=0)))
    assert [figure.name for figure in found.figures] == ["mass ±2 %"]
    assert len(found.cases) == 3


def test_growth_figures_are_read_written_and_refused_where_they_leave_no_range() -> None:
    scenario = with_growth(GrowthRecord(offset_percent=7.5))
    assert parse_scenario(format_scenario(scenario)) == scenario
    text = format_scenario(scenario).replace("offset_percent = 7.5", "offset_percent = 0")
    text = text.replace("mass_percent = 5.0", "mass_percent = 0").replace("monolayer_error = 1", "monolayer_error = 0")
    with pytest.raises(ScenarioError, match=r"^growth: leaves no range, all its figures are 0; give offset_percent"):
        parse_scenario(text)


def test_an_error_that_takes_a_whole_layer_away_is_refused() -> None:
    with pytest.raises(ScenarioError, match=r"^growth\.monolayer_error: would leave nothing of stack\.cell\[0\]; "):
        verdict_range(with_growth(GrowthRecord(monolayer_error=7)))


def test_a_target_without_windows_has_no_range() -> None:
    with pytest.raises(ValueError, match=r"^target\.windows: give at least one"):
        verdict_range(replace(HERON, target=Target((), 10)))
