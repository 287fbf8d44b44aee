"""End treatments: what [stack.ends] grows, how it mirrors, and how it is refused."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from transport import (
    Layer,
    Scenario,
    ScenarioError,
    document_from_data,
    document_to_data,
    format_scenario,
    load_scenario,
    parse_scenario,
    scenario_from_document,
    spectrum,
)
from transport.ends import taper

HERON = load_scenario("scenarios/heron-gate.toml")


def treated(ends: dict[str, Any], scenario: Scenario = HERON, **stack: Any) -> Scenario:
    data = document_to_data(scenario.document)
    data["stack"] |= {"exit": [], **stack, "ends": ends}
    return scenario_from_document(document_from_data(data))


def thicknesses(elements: tuple[Any, ...]) -> list[float]:
    return [round(element.thickness, 6) for element in elements]


def test_half_ends_are_half_a_barrier_and_a_well_and_the_last_cell_is_closed() -> None:
    stack = treated({"kind": "half"}).stack
    wall, hollow = (layer.thickness for layer in HERON.stack.cell if isinstance(layer, Layer))
    assert thicknesses(stack.entry) == thicknesses((Layer(wall / 2, 0, 1), Layer(hollow, 0, 1)))
    assert thicknesses(stack.exit) == thicknesses((Layer(wall, 0, 1), Layer(hollow, 0, 1), Layer(wall / 2, 0, 1)))


@pytest.mark.parametrize("ends", [
    {"kind": "half"}, {"kind": "cells", "left_cells": [{"barrier_share": 0.3, "well_share": 0.9}]},
    {"kind": "linear", "cells": 3}, {"kind": "poisson", "cells": 2, "of": "height"},
], ids=str)
@pytest.mark.parametrize("order", ["barrier first", "well first", "half wells"])
def test_a_treated_stack_between_equal_leads_is_its_own_mirror(ends: dict[str, Any], order: str) -> None:
    wall, hollow = document_to_data(HERON.document)["stack"]["cell"]
    half = {**hollow, "monolayers": hollow["monolayers"] / 2}
    cell = {"barrier first": [wall, hollow], "well first": [hollow, wall], "half wells": [half, wall, half]}[order]
    stack = treated(ends, cell=cell).stack
    layers = stack.entry + stack.cell * stack.periods + stack.exit
    assert layers == layers[::-1]


def test_ends_of_their_own_on_the_right_are_mirrored_from_the_right_lead() -> None:
    stack = treated({"kind": "cells", "left_cells": [{"barrier_share": 0.5}],
                     "right_cells": [{"barrier_share": 0.25, "well_share": 2.0}]}).stack
    wall, hollow = (layer.thickness for layer in HERON.stack.cell if isinstance(layer, Layer))
    assert [layer.thickness for layer in stack.exit if isinstance(layer, Layer)] == pytest.approx(
        [wall, 2 * hollow, wall / 4])


def test_entry_and_exit_layers_stay_outermost() -> None:
    spacer = {"material": "GaAs", "monolayers": 3.0}
    scenario = treated({"kind": "half"}, entry=[spacer], exit=[spacer])
    assert [row.key for row in scenario.sheet if row.where == "entry"] == ["stack.entry[0]", "stack.ends", "stack.ends"]
    assert [row.key for row in scenario.sheet if row.where == "exit"][-1] == "stack.exit[0]"


def test_tapers_rise_to_a_full_barrier_as_their_formulas_say() -> None:
    """The formulas of `ends.taper`'s docstring, worked out by hand for three cells."""
    assert taper("linear", 3) == pytest.approx((1 / 4, 2 / 4, 3 / 4))
    assert taper("gaussian", 3) == pytest.approx(np.exp([-9 / 8, -1 / 2, -1 / 8]))
    assert taper("poisson", 3) == pytest.approx((24 / 4.5**3, 12 / 4.5**2, 4 / 4.5))  # P(k; 4.5) / P(4; 4.5)


def test_whole_monolayers_are_whole_and_never_none() -> None:
    for scale in ({"monolayers": 7.0}, {"thickness_nm": 1.9}):
        wall = {"material": "AlGaAs", "x": 0.3, **scale}
        scenario = treated({"kind": "linear", "cells": 6, "whole_monolayers": True},
                           cell=[wall, {"material": "GaAs", "monolayers": 20.4}])
        counts = [row.monolayers for row in scenario.sheet if row.key == "stack.ends" and row.where == "entry"]
        assert all(count is not None and count == round(count) >= 1 for count in counts)


def test_a_height_taper_lowers_the_edge_and_a_delta_its_strength() -> None:
    lowered = treated({"kind": "linear", "cells": 1, "of": "height"}).stack.entry[0]
    full = HERON.stack.cell[0]
    assert isinstance(lowered, Layer) and isinstance(full, Layer)
    assert lowered.thickness == pytest.approx(full.thickness, rel=1e-3)  # Vegard: the monolayer depends on x
    assert 0.4 < lowered.band_edge / full.band_edge < 0.6
    comb = load_scenario("scenarios/pebble-comb.toml")
    delta = treated({"kind": "linear", "cells": 1, "of": "height"}, comb).stack.entry[0]
    assert delta.strength == pytest.approx(0.04)  # type: ignore[union-attr]


def test_written_and_read_again_a_treatment_is_the_same_and_so_is_its_spectrum() -> None:
    scenario = treated({"kind": "cells", "left_cells": [{"barrier_share": 0.4, "well_share": 1.1}]})
    again = parse_scenario(format_scenario(scenario))
    assert again == scenario and again.stack == scenario.stack
    assert spectrum(again.stack, [0.06]).transmission == spectrum(scenario.stack, [0.06]).transmission


@pytest.mark.parametrize(("ends", "sentence"), [
    ({"kind": "linear", "cells": 9}, r"stack\.ends\.cells: is 9: a taper longer than the stack of 8 periods; give at "),
    ({"kind": "linear", "cells": 0}, r"stack\.ends\.cells: must be a whole number from 1 to 20, but is 0"),
    ({"kind": "half", "cells": 2}, r"stack\.ends\.cells: does not belong to ends of kind half, which takes "),
    ({"kind": "half", "of": "width"}, r"stack\.ends\.of: does not belong to ends of kind half"),
    ({"kind": "cells"}, r"stack\.ends\.left_cells: is missing or empty; list the end cells"),
    ({"kind": "cells", "left_cells": [{"barrier_share": 0.5}], "right_cells": []}, r"right_cells: is empty; list "),
    ({"kind": "cells", "left_cells": [{"barrier_share": 0}]}, r"left_cells\[0\]\.barrier_share: must be above 0"),
    ({"kind": "cells", "left_cells": [{"well": 1}]}, r"left_cells\[0\]\.(well|barrier_share): is "),
    ({"kind": "cells", "left_cells": [{"barrier_share": 1}] * 21}, r"left_cells: lists 21 end cells; at most 20 are "),
    ({"kind": "cosine"}, r'stack\.ends\.kind: must be one of half, cells, linear, gaussian, poisson, but is "cosine"'),
    ({"kind": "linear", "of": "mass"}, r'stack\.ends\.of: must be one of width, height, but is "mass"'),
    ({}, r"stack\.ends\.kind: is missing; \[stack\.ends\] needs it"),
], ids=str)
def test_a_wrong_treatment_is_one_sentence(ends: dict[str, Any], sentence: str) -> None:
    with pytest.raises(ScenarioError, match=sentence):
        treated(ends)


def test_a_barrier_that_cannot_be_lowered_is_refused() -> None:
    mill = load_scenario("scenarios/mill-race.toml")
    with pytest.raises(ScenarioError, match=r"stack\.ends\.of: is height, but InAlAs does not turn into InGaAs as x "):
        treated({"kind": "linear", "of": "height"}, mill)


def test_a_cell_without_barriers_cannot_be_treated() -> None:
    with pytest.raises(ScenarioError, match=r"stack\.ends: treats the barriers of the cell, but the cell has none"):
        treated({"kind": "half"}, cell=[{"material": "GaAs", "monolayers": 5.0}])
