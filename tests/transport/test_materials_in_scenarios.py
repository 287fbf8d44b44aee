"""Materials where they meet in a scenario: broken gaps, strain, windows too high for one band, every refusal."""

from __future__ import annotations

import pytest

from transport import Scenario, ScenarioError, material, parse_scenario

INAS, GASB, ALSB = (f'{{ material = "{name}", thickness_nm = 2 }}' for name in ("InAs", "GaSb", "AlSb"))
REMEDY = "and a one-band model does not hold there; take another material, or put a third between them"


def scenario(
    left: str = "AlSb", right: str = "AlSb", entry: str = "", cell: str = ALSB, exit: str = "", conditions: str = "",
    rest: str = "",
) -> Scenario:
    return parse_scenario(f"""
format = 1
[conditions]
temperature_K = 4
{conditions}
[leads]
left = {{ material = "{left}" }}
right = {{ material = "{right}" }}
[stack]
periods = 3
entry = [ {entry} ]
cell = [ {cell} ]
exit = [ {exit} ]
{rest}
""")


@pytest.mark.parametrize(("parts", "where"), [
    ({"cell": f"{INAS}, {GASB}"}, "stack.cell[1]: is GaSb beside InAs (stack.cell[0]), a broken gap: "),
    ({"cell": f"{GASB}, {INAS}"}, "stack.cell[1]: is InAs beside GaSb (stack.cell[0]), a broken gap: "),
    ({"cell": f"{INAS}, {ALSB}, {GASB}"}, "stack.cell[0]: is InAs beside GaSb (stack.cell[2]), a broken gap: "),
    ({"left": "InAs", "cell": GASB}, "stack.cell[0]: is GaSb beside InAs (leads.left), a broken gap: "),
    ({"right": "InAs", "cell": GASB}, "leads.right: is InAs beside GaSb (stack.cell[0]), a broken gap: "),
    ({"entry": GASB, "cell": INAS}, "stack.cell[0]: is InAs beside GaSb (stack.entry[0]), a broken gap: "),
    ({"exit": GASB, "cell": INAS}, "stack.exit[0]: is GaSb beside InAs (stack.cell[0]), a broken gap: "),
    ({"exit": f"{INAS}, {{ delta_eV_nm = 0.1 }}, {GASB}"},
     "stack.exit[2]: is GaSb beside InAs (stack.exit[0]), a broken gap: "),
])
def test_a_broken_gap_is_refused_wherever_it_touches(parts: dict[str, str], where: str) -> None:
    """At 4 K the gap of InAs is 0.417 eV and 4e-5 eV less: edges -0.173 against -0.03 eV, 143 meV apart."""
    with pytest.raises(ScenarioError) as caught:
        scenario(**parts)
    assert str(caught.value) == (f"{where}the conduction edge of InAs lies 143 meV below the valence edge of GaSb, "
                                 f"{REMEDY}")


def test_a_layer_between_parts_a_broken_gap() -> None:
    assert len(scenario(cell=f"{INAS}, {ALSB}, {GASB}, {ALSB}").stack.cell) == 4


@pytest.mark.parametrize("substrate", ["GaAs", "GaSb", "InAs"])
def test_strain_mends_no_broken_gap(substrate: str) -> None:
    """How strain moves a valence edge is not known to the library: the unstrained edges decide."""
    with pytest.raises(ScenarioError, match="a broken gap"):
        scenario(cell=f"{INAS}, {GASB}", conditions=f'substrate = "{substrate}"')


@pytest.mark.parametrize(("x", "broken"), [(0.36, True), (0.39, False)])
def test_an_alloy_is_broken_up_to_the_composition_where_the_edges_meet(x: float, broken: bool) -> None:
    """Formula: the valence edge -0.03 - 0.38 x of AlGaSb falls to -0.173 eV, the edge of InAs, at x = 0.376."""
    cell = f'{INAS}, {{ material = "AlGaSb", x = {x}, thickness_nm = 2 }}'
    if not broken:
        assert len(scenario(cell=cell).stack.cell) == 2
        return
    with pytest.raises(ScenarioError, match=r"^stack.cell\[1\]: is AlGaSb \(x = 0.36\) beside InAs"):
        scenario(cell=cell)


@pytest.mark.parametrize(("x_from", "x_to", "broken"), [(0.0, 1.0, True), (1.0, 0.5, False)])
def test_a_graded_alloy_is_judged_by_the_face_that_touches(x_from: float, x_to: float, broken: bool) -> None:
    cell = f'{INAS}, {{ material = "AlGaSb", x_from = {x_from}, x_to = {x_to}, thickness_nm = 2 }}, {ALSB}'
    if not broken:
        assert len(scenario(cell=cell).sheet) == 5
        return
    with pytest.raises(ScenarioError, match=r"^stack.cell\[1\]: is AlGaSb \(x = 0\) beside InAs"):
        scenario(cell=cell)


def test_a_staggered_pair_is_no_broken_gap() -> None:
    """InAs beside AlSb: the edges overlap by 0.24 eV (common practice: a type II pair, used in one-band models)."""
    assert material("InAs", None, 4.0).band_edge - material("AlSb", None, 4.0).valence_edge > 0.2
    assert len(scenario(cell=f"{INAS}, {ALSB}").stack.cell) == 2


def test_monolayers_of_a_strained_layer_are_those_along_growth() -> None:
    cell = '{ material = "InAs", monolayers = 4 }'
    made = {name: scenario("GaAs", "GaAs", cell=cell, conditions=line).sheet[1].thickness
            for name, line in (("free", ""), ("strained", 'substrate = "GaAs"'))}
    assert made["free"] == pytest.approx(4 * material("InAs", None, 4.0).lattice_constant / 2, rel=1e-14)
    assert made["strained"] == pytest.approx(4 * material("InAs", None, 4.0, "GaAs").monolayer, rel=1e-14)
    assert (made["strained"] or 0) > 1.06 * (made["free"] or 0)


@pytest.mark.parametrize(("x", "warned"), [(0.06, False), (0.08, True)])
def test_strain_is_worth_a_word_above_half_a_per_cent(x: float, warned: bool) -> None:
    """Formula: 0.0716 x of the lattice constant, by the straight line from GaAs to InAs."""
    cell = f'{{ material = "InGaAs", x = {x}, thickness_nm = 2 }}'
    found = scenario("GaAs", "GaAs", cell=cell, conditions='substrate = "GaAs"')
    assert any("its strain is counted" in sentence for sentence in found.warnings) == warned


def windows(*tops: float) -> str:
    rows = ", ".join(f'{{ kind = "pass", from_meV = 10, to_meV = {top}, transmission = 0.5 }}' for top in tops)
    return f"[target]\nwindows = [ {rows} ]"


@pytest.mark.parametrize(("conditions", "top", "sentence"), [
    ("", 300, None),
    ("", 310, "Windows reach 310 meV above the band edge of GaAs, 0.2 of its gap: one band is not enough so high; "
              "conditions.nonparabolic = true takes the masses there for heavier."),
    ("nonparabolic = true", 750, None),
    ("nonparabolic = true", 800, "Windows reach 800 meV above the band edge of GaAs, 0.53 of its gap: one band is not "
                                 "enough so high."),
])
def test_windows_too_high_for_one_band_say_so(conditions: str, top: float, sentence: str | None) -> None:
    """The gap of GaAs is 1.519 eV: a fifth of it is 304 meV, half of it 759 meV."""
    found = scenario("GaAs", "GaAs", cell='{ material = "GaAs", thickness_nm = 2 }', conditions=conditions,
                     rest=windows(20, top))
    assert found.warnings == (() if sentence is None else (sentence,))


def test_the_material_of_the_smallest_gap_is_the_one_that_is_named() -> None:
    found = scenario("GaAs", "GaAs", cell='{ material = "InGaAs", x = 0.05, thickness_nm = 2 }', rest=windows(300))
    (sentence,) = [sentence for sentence in found.warnings if "one band" in sentence]
    assert "the band edge of InGaAs (x = 0.05)," in sentence


@pytest.mark.parametrize(("layer", "sentence"), [
    ('material = "GaSn"', 'stack.cell[0].material: "GaSn" is neither in the library nor in [materials]; '
                          "did you mean GaSb?"),
    ('material = "AlGaSb"', "stack.cell[0].x: is missing; AlGaSb is an alloy, give its share from 0 to 1"),
    ('material = "GaSb", x = 0.2', "stack.cell[0].x: does not belong to GaSb, which is no alloy; take it out"),
    ('material = "GaAsSb", x = 1.2', "stack.cell[0].x: must be from 0 to 1, but is 1.2"),
    ('material = "GaAsSb", x = -0.1', "stack.cell[0].x: must be from 0 to 1, but is -0.1"),
    ('material = "AlAsSb", x = nan', "stack.cell[0].x: must be from 0 to 1, but is nan"),
])
def test_a_material_that_does_not_fit_is_one_sentence(layer: str, sentence: str) -> None:
    with pytest.raises(ScenarioError) as caught:
        scenario(cell=f"{{ {layer}, thickness_nm = 2 }}")
    assert str(caught.value) == sentence


@pytest.mark.parametrize(("name", "remedy"), [
    ("AlGaSb", "did you mean GaSb?"), ("GaSn", "did you mean GaSb?"),
    ("mica", "known here: GaAs, AlAs, InAs, InP, GaSb, AlSb"),
])
def test_a_substrate_is_a_binary_of_the_library(name: str, remedy: str) -> None:
    with pytest.raises(ScenarioError) as caught:
        scenario(conditions=f'substrate = "{name}"')
    assert str(caught.value) == f'conditions.substrate: "{name}" is not a substrate of the library; {remedy}'
