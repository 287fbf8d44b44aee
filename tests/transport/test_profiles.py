"""Profile layers, graded alloys and graded interfaces: read and written, laid out, refused, varied."""

from __future__ import annotations

import json
import math
import tomllib
from typing import Any

import msgspec
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.transport.test_readme import blocks
from tests.transport.test_sensitivity import pole
from tests.transport.wrong_profiles import BARRIER, COSINE, GAUSSIAN, RAMP, WELL, WRONG
from transport import (
    Lead,
    Scenario,
    ScenarioError,
    Stack,
    document_from_data,
    document_to_data,
    fit_peaks,
    format_scenario,
    lattice_bands,
    nearest_stacks,
    parse_scenario,
    resonances,
    scenario_from_document,
    sensitivities,
    spectrum,
    verdict_range,
    with_ends,
)
from transport.checks import BASED_PROFILES, PROFILE_KEYS
from transport.document import EndsRecord, LayerRecord
from transport.materials import material
from transport.parameters import PARAMETERS
from transport.profiles import MOST_SLICES, TOLERANCE, Curve, Face, Variation, VariationError, flat, on_steps, slices
from transport.propagation import transfer
from transport.report import layers_record, layers_text
from transport.resolve import monolayer_of
from transport.structure import Layer

SOFT = BARRIER + ", grading_nm = 0.6"


def scenario(*cell: str, entry: str = "", exit: str = "", periods: int = 3, more: str = "") -> Scenario:
    layers = ", ".join(f"{{ {layer} }}" for layer in cell)
    return parse_scenario(f"""\
format = 1
conditions = {{ temperature_K = 77 }}
leads = {{ left = {{ material = "GaAs" }}, right = {{ material = "GaAs" }} }}
{more}
[stack]
periods = {periods}
entry = [{f"{{ {entry} }}" if entry else ""}]
cell = [{layers}]
exit = [{f"{{ {exit} }}" if exit else ""}]
[target]
windows = [
    {{ kind = "block", from_meV = 90, to_meV = 140, transmission = 1e-2 }},
    {{ kind = "pass", from_meV = 45, to_meV = 60, transmission = 1e-6 }},
]
""")


def refusal(*cell: str, **rest: Any) -> str:
    with pytest.raises(ScenarioError) as caught:
        scenario(*cell, **rest)
    return str(caught.value)


# Slices.

RUNNING = {
    "cosine": Variation(10.0, Curve("cosine", (0.15, 0.15)), flat(0.067), flat(0.0)),
    "heavy": Variation(10.0, Curve("cosine", (0.15, 0.15)), flat(1.0), flat(0.0)),
    "narrow": Variation(500.0, Curve("gaussian", (0.3, 0.05, 0.0)), flat(0.067), flat(0.0)),
    "opaque": Variation(200.0, Curve("parabola", (5.0, 100.0)), flat(0.2), flat(0.0)),
    "running mass": Variation(10.0, Curve("linear", (0.0, 0.3)), Curve("linear", (0.067, 0.092)), flat(0.0)),
    "non-parabolic": Variation(10.0, Curve("linear", (0.3, 0.0)), Curve("linear", (0.09, 0.067)), flat(0.6)),
    "graded": Variation(3.0, flat(0.3), flat(0.09), flat(0.0), Face(0.6, 0.0, 0.067, 0.0), Face(0.6, 0.0, 0.067, 0.0)),
    "samples": Variation(9.0, Curve("samples", (0.0, 0.3, 0.1, 0.3, 0.0, 0.2)), flat(0.067), flat(0.0)),
}


@pytest.mark.parametrize("name", RUNNING)
def test_slices_are_right_at_every_energy_of_their_range(name: str) -> None:
    """Against four times as many steps, at energies other than those the steps were chosen by."""
    variation, energy = RUNNING[name], np.random.default_rng(3).uniform(0.0, 0.9, 40)
    layers = slices(variation, 0.0, 0.9)
    ends = np.append(0.0, np.cumsum([layer.thickness for layer in layers])[2::3])
    ends[-1] = variation.thickness
    fine = np.append((ends[:-1, None] + np.diff(ends)[:, None] * np.arange(4) / 4).ravel(), ends[-1])
    found, true = (transfer(part, energy).rescaled() for part in (layers, on_steps(variation, fine)))
    scale = np.exp(found.log_scale - true.log_scale)
    unit = np.sqrt(0.9 / 0.0381 / variation.mean()[1])
    for entry, weight in (("a", 1.0), ("b", unit), ("c", 1 / unit), ("d", 1.0)):
        largest = np.max([abs(true.a), abs(true.b) * unit, abs(true.c) / unit, abs(true.d)], axis=0)
        assert (abs(getattr(found, entry) * scale - getattr(true, entry)) * weight / largest).max() < 2 * TOLERANCE


@pytest.mark.parametrize("name", RUNNING)
def test_slices_are_as_thick_as_the_layer_and_follow_it(name: str) -> None:
    variation = RUNNING[name]
    layers = slices(variation, 0.0, 0.9)
    assert math.fsum(layer.thickness for layer in layers) == pytest.approx(variation.thickness, rel=1e-14)
    mean = math.fsum(layer.thickness * layer.band_edge for layer in layers) / variation.thickness
    assert mean == pytest.approx(variation.mean()[0], rel=1e-6, abs=1e-9)


def test_a_flat_variation_is_the_layer_itself() -> None:
    energy = np.linspace(0.01, 0.8, 20)
    variation = Variation(3.0, Curve("samples", (0.3, 0.3, 0.3)), flat(0.09), flat(0.4))
    found, true = (transfer(part, energy) for part in (slices(variation, 0.0, 1.0), (Layer(3.0, 0.3, 0.09, 0.4),)))
    for entry in "abcd":
        assert getattr(found, entry) == pytest.approx(getattr(true, entry), rel=1e-13, abs=1e-13)


def test_a_variation_that_needs_too_many_slices_is_refused() -> None:
    with pytest.raises(VariationError, match=r"^takes more than 20,000 constant layers to be right to 1e-10; make"):
        slices(Variation(10_000.0, Curve("linear", (-1000.0, 1000.0)), flat(1000.0), flat(0.0)), -1000.0, 3000.0)


def test_a_variation_thinner_than_anything_is_refused() -> None:
    assert refusal(COSINE.replace("8.0", "5e-324"), WELL) == (
        "stack.cell[0]: is 4.94066e-324 nm thick, but a layer that runs needs 1e-09 nm; make it thicker")


def test_a_profile_turned_round_lets_as_much_through() -> None:
    """Reciprocity: T from the left is T from the right."""
    one = scenario(RAMP, WELL, entry=GAUSSIAN).stack
    energy = np.linspace(0.02, 0.5, 50)
    assert spectrum(one.reversed(), energy).transmission == pytest.approx(spectrum(one, energy).transmission, rel=1e-11)


def test_dephasing_goes_through_every_slice() -> None:
    lossy = parse_scenario(format_scenario(scenario(COSINE)).replace("dephasing_meV = 0.0", "dephasing_meV = 4.0"))
    curve = spectrum(lossy.stack, np.linspace(0.02, 0.5, 50))
    assert (curve.transmission + curve.reflection < 1).all()


# The file.

def numbers(name: str) -> st.SearchStrategy[float]:
    limit = PARAMETERS[name]
    return st.floats(limit.low, limit.high, exclude_min=limit.low_open, exclude_max=limit.high_open)


@st.composite
def profile_layers(draw: st.DrawFn) -> LayerRecord:
    name = draw(st.sampled_from(list(PROFILE_KEYS)))
    keys = [*PROFILE_KEYS[name], "mass", "thickness_nm"]
    keys += [key for key in ("nonparabolicity_per_eV", *(["base_eV"] if name in BASED_PROFILES else []))
             if draw(st.booleans())]
    values: dict[str, Any] = {key: draw(numbers(key)) for key in keys if key != "potential_eV"}
    if name == "samples":
        values["potential_eV"] = draw(st.lists(numbers("potential_eV"), min_size=2, max_size=9).map(tuple))
    return LayerRecord(profile=name, **values)  # type: ignore[arg-type]


@st.composite
def graded_layers(draw: st.DrawFn) -> LayerRecord:
    graded = draw(st.booleans())
    keys = ("x_from", "x_to") if graded else ("x",)
    x: dict[str, Any] = {key: draw(numbers(key)) for key in keys}
    return LayerRecord(material=draw(st.sampled_from(["AlGaAs", "InGaAs", "InAlAs"])), thickness_nm=draw(
        numbers("thickness_nm")), grading_nm=draw(st.none() | numbers("grading_nm")), **x)


@settings(deadline=None, max_examples=100)
@given(st.lists(profile_layers() | graded_layers(), min_size=1, max_size=4).map(tuple))
def test_read_written_and_read_again_a_layer_is_the_same(layers: tuple[LayerRecord, ...]) -> None:
    document = scenario(WELL).document
    stack = msgspec.structs.replace(document.stack, cell=layers)
    document = msgspec.structs.replace(document, stack=stack)
    assert document_from_data(json.loads(json.dumps(document_to_data(document)))) == document


@pytest.mark.parametrize("layer", [COSINE, GAUSSIAN, RAMP, SOFT])
def test_a_scenario_survives_being_written(layer: str) -> None:
    one = scenario(layer, WELL, exit=layer)
    again = parse_scenario(format_scenario(one))
    assert again == one and again.stack == one.stack


@pytest.mark.parametrize(("layer", "sentence"), WRONG.values(), ids=WRONG)
def test_a_wrong_profile_is_one_sentence(layer: str, sentence: str) -> None:
    assert refusal(layer, WELL) == sentence


def test_a_million_samples_are_refused_at_once() -> None:
    document = scenario(WELL).document
    layer = LayerRecord(profile="samples", mass=0.1, thickness_nm=5.0, potential_eV=(0.1,) * 10**6)
    stack = msgspec.structs.replace(document.stack, cell=(layer,))
    with pytest.raises(ScenarioError, match=r"^stack\.cell\[0\]\.potential_eV: must have 2 to 2,000 values, but"):
        scenario_from_document(msgspec.structs.replace(document, stack=stack))


def test_all_profiles_together_may_not_come_to_too_many_slices() -> None:
    many = ", ".join([f"{{ {COSINE} }}"])
    found = refusal(WELL, exit=f"repeat = 900, layers = [ {many} ]")
    assert found.startswith("stack: comes to ") and f"more than {MOST_SLICES:,}; write fewer" in found


def test_an_alloy_the_scenario_defines_itself_does_not_run() -> None:
    own = "materials = { AlGaAs = { band_edge_eV = 0.2, mass = 0.09, monolayer_nm = 0.28 } }"
    assert refusal(RAMP, WELL, more=own).startswith("stack.cell[0].x_from: does not belong to AlGaAs, which is no")


def test_the_layers_of_the_readme_are_read() -> None:
    (text,) = blocks("TOML")
    layers = tomllib.loads(text)
    assert {*PROFILE_KEYS, "graded_alloy", "soft_barrier"} == {*layers}
    for name, layer in layers.items():
        data = document_to_data(scenario(WELL).document)
        data["stack"]["cell"], data["stack"]["exit"] = [{"material": "GaAs", "thickness_nm": 1.0}, layer], []
        if name == "soft_barrier":
            data["stack"]["cell"].append({"material": "GaAs", "thickness_nm": 1.0})
        assert len(scenario_from_document(document_from_data(data)).stack.cell) > 3


# Graded alloys and interfaces.

def test_a_graded_alloy_follows_the_library_at_every_composition() -> None:
    """Strain included; the library itself at 41 compositions."""
    one = parse_scenario(format_scenario(scenario(
        'material = "InGaAs", x_from = 0.05, x_to = 0.6, thickness_nm = 4.0')).replace(
            "nonparabolic = false", 'nonparabolic = true\nsubstrate = "GaAs"'))
    variation = one.sheet[1].variation
    assert variation is not None
    ground = material("GaAs", None, 77.0, "GaAs")
    for share in np.linspace(0, 1, 41):
        found = variation.at(np.array([4.0 * share]))
        true = material("InGaAs", 0.05 + 0.55 * share, 77.0, "GaAs")
        assert [float(v[0]) for v in found] == pytest.approx(
            [true.band_edge - ground.band_edge, true.mass, 1 / true.gap], rel=1e-12, abs=1e-13)


def test_an_alloy_graded_from_x_to_x_is_the_alloy() -> None:
    energy = np.linspace(0.02, 0.6, 30)
    ramp, plain = (scenario(f'material = "AlGaAs", {x}, monolayers = 9', WELL).stack
                   for x in ("x_from = 0.3, x_to = 0.3", "x = 0.3"))
    assert spectrum(ramp, energy).transmission == pytest.approx(spectrum(plain, energy).transmission, rel=1e-10)


def test_a_grading_of_no_length_tends_to_the_sharp_interface() -> None:
    """To second order in its length: a tenth of the grading changes the transmission a hundred times less."""
    energy = np.linspace(0.02, 0.5, 30)
    sharp = spectrum(scenario(BARRIER, WELL, exit=BARRIER).stack, energy).transmission
    off = []
    for length in (0.1, 0.01):
        soft = f"{BARRIER}, grading_nm = {length}"
        off.append(abs(spectrum(scenario(soft, WELL, exit=soft).stack, energy).transmission - sharp).max())
    assert off[0] / off[1] == pytest.approx(100, rel=0.05)


def test_an_interface_is_half_on_either_side_of_its_face_and_half_way_there() -> None:
    one = scenario(SOFT, WELL, exit=SOFT).stack
    top = material("AlGaAs", 0.3, 77.0).band_edge - material("GaAs", None, 77.0).band_edge
    entry, cell = ([e for e in part if isinstance(e, Layer)] for part in (one.entry, one.cell))
    before = math.fsum(e.thickness for e in entry)
    assert before == pytest.approx(0.3) and one.period_length == pytest.approx(9.0)
    assert max(e.band_edge for e in entry) == pytest.approx(top / 2, rel=0.05)
    assert min(e.band_edge for e in cell) == pytest.approx(0, abs=1e-12)
    assert max(e.band_edge for e in cell) == pytest.approx(top)
    assert one.length == pytest.approx(3 * 9.0 + 2.5 + 2 * 0.3)


def test_a_graded_stack_that_is_its_own_mirror_stays_so() -> None:
    one = scenario(SOFT, WELL, exit=SOFT).stack
    energy = np.linspace(0.02, 0.5, 40)
    assert spectrum(one.reversed(), energy).phase == pytest.approx(spectrum(one, energy).phase, abs=1e-9)


def test_the_longer_of_two_gradings_counts() -> None:
    energy = np.linspace(0.02, 0.5, 30)
    both = scenario(SOFT, WELL + ", grading_nm = 0.3", exit=SOFT).stack
    assert spectrum(both, energy).transmission == pytest.approx(
        spectrum(scenario(SOFT, WELL, exit=SOFT).stack, energy).transmission, rel=1e-12)


def test_a_grading_longer_than_the_layer_is_refused() -> None:
    assert refusal(SOFT.replace("0.6", "2.6"), WELL, exit=SOFT.replace("0.6", "2.6")) == (
        "stack.cell[0].grading_nm: is 2.6: the halves of graded interfaces that lie in the layer take 2.6 nm, but it "
        "is 2.5 nm thick; give a shorter grading")
    thin = 'material = "GaAs", thickness_nm = 0.5'
    assert refusal(SOFT, thin, exit=SOFT) == (
        "stack.cell[0].grading_nm: is 0.6: the halves of graded interfaces that lie in stack.cell[1] take 0.6 nm, but "
        "it is 0.5 nm thick; give a shorter grading")


def test_cells_that_would_not_be_alike_are_refused() -> None:
    """The last cell ends in a well at the well's own lead: no interface there, but one between the cells."""
    assert refusal(SOFT, WELL) == (
        "stack.cell[0].grading_nm: grades the right face of the cell, but what stands behind the last cell is not what "
        "stands between two, and all cells are the same; let the exit begin like the cell, or cut the cell within a "
        "layer, half of it at either end")
    assert refusal(WELL, SOFT).startswith("stack.cell[1].grading_nm: grades the left face of the cell, but what stands")
    half = 'material = "GaAs", thickness_nm = 3.25'
    assert scenario(half, SOFT, half).stack.period_length == pytest.approx(9.0)


# What is made of them.

def test_the_certificate_of_a_lattice_holds_for_profiles() -> None:
    for layers in ((COSINE,), (RAMP, WELL), (SOFT, WELL)):
        one = scenario(*layers, exit=SOFT if layers[0] is SOFT else "")
        assert lattice_bands(one.stack, between=(0.0, 1.0)).certificate.complete


def test_resonances_between_profiles_are_certified() -> None:
    found = resonances(scenario(GAUSSIAN, WELL, exit=GAUSSIAN).stack, between=(0.0, 0.3))
    assert found.certificate.complete and found.energy.size >= 3


def test_the_sheet_has_one_row_for_each_layer_as_written() -> None:
    one = scenario(RAMP, WELL, exit=COSINE)
    assert [row.where for row in one.sheet] == ["left lead", "cell", "cell", "exit", "right lead"]
    assert [row.slices for row in one.sheet] == [0, len(one.stack.cell) - 1, 1, len(one.stack.exit), 0]
    ramp, _, cosine = one.sheet[1:-1]
    assert (ramp.material, ramp.x, ramp.x_ends, ramp.monolayers) == ("AlGaAs", None, (0.0, 0.3), 9)
    assert cosine.band_edge == pytest.approx(0.15) and cosine.profile == "cosine"
    record = layers_record(one)["layers"]
    assert (record[1]["x_from"], record[1]["x_to"], record[3]["profile"]) == (0.0, 0.3, "cosine")
    assert "0 to 0.3" in layers_text(one) and "means over it" in layers_text(one)
    assert json.loads(json.dumps(layers_record(one), allow_nan=False))


def test_ranges_and_remedies_step_the_thickness_of_profile_layers() -> None:
    one = scenario(GAUSSIAN, WELL, exit=GAUSSIAN)
    found = verdict_range(one)
    assert "gaussian" not in found.sentence and found.cases
    thicker = nearest_stacks(one, 1)
    assert thicker.sentence


def test_ends_of_profile_layers_are_shares_of_their_thickness() -> None:
    ended = with_ends(scenario(GAUSSIAN, WELL), EndsRecord("half"))
    first = next(row for row in ended.sheet if row.where == "entry")
    assert first.thickness == pytest.approx(2.5) and first.profile == "gaussian"


def test_ends_that_taper_the_height_leave_profiles_alone() -> None:
    ends = EndsRecord("linear", of="height", cells=2)
    for layer in (GAUSSIAN, RAMP.replace("0.0", "0.1")):
        with pytest.raises(ScenarioError, match=r"^stack\.ends\.of: is height, but .* runs .*taper the width$"):
            with_ends(scenario(layer, WELL), ends)


def test_a_fit_leaves_profiles_alone_and_says_so() -> None:
    one = scenario(GAUSSIAN, WELL, exit=GAUSSIAN, periods=1, more="measured = { peaks = [{ energy_meV = 50 }] }")
    with pytest.raises(ScenarioError, match=r"^stack\.cell\[0\]: has a band edge that runs, which a fit of well, bar"):
        fit_peaks(one, ["well"])
    assert fit_peaks(one, ["shift"]).values.size == 1


@pytest.mark.parametrize(("part", "index", "key", "figure"), [
    ("exit", 0, "thickness_nm", "thickness"), ("exit", 0, "mass", "mass"), ("cell", 0, "thickness_nm", "thickness"),
    ("cell", 1, "thickness_nm", "thickness"),
])
def test_sensitivities_are_those_of_another_file(part: str, index: int, key: str, figure: str) -> None:
    """Profiles and graded interfaces: poles in 50 digits of files with one figure moved either way."""
    periods = 1 if part == "exit" else 2
    one = scenario('material = "GaAs", thickness_nm = 2.0', SOFT, WELL, exit=GAUSSIAN, periods=periods)
    guess = resonances(one.stack, between=(0.02, 0.1))
    at = complex(guess.energy[0], -guess.width[0] / 2)
    record = getattr(one.document.stack, part)[index]
    step = 1e-4 * getattr(record, key)
    poles = []
    for sign in (-1, 1):
        records = list(getattr(one.document.stack, part))
        records[index] = msgspec.structs.replace(record, **{key: getattr(record, key) + sign * step})
        stack = msgspec.structs.replace(one.document.stack, **{part: tuple(records)})
        moved = scenario_from_document(msgspec.structs.replace(one.document, stack=stack))
        poles.append(complex(pole(moved.stack, at)))
    (found,) = (e for e in sensitivities(one, at.real, -2 * at.imag)
                if e.key == f"stack.{part}[{index}]" and e.figure == figure)
    row = next(row for row in one.sheet if row.key == f"stack.{part}[{index}]")
    unit = monolayer_of(row) if figure == "thickness" else 0.01 * (row.mass or 0.0)
    expected = (poles[1] - poles[0]) / (2 * step) * unit
    assert complex(found.energy, -found.width / 2) == pytest.approx(expected, rel=1e-5)


def test_all_band_edges_up_move_a_narrow_state_up_with_them() -> None:
    one = scenario(GAUSSIAN.replace("5.0", "9.0").replace("0.8", "1.6"), WELL,
                   exit=GAUSSIAN.replace("5.0", "9.0").replace("0.8", "1.6"), periods=1)
    found = resonances(one.stack, between=(0.0, 0.1))
    edges = [e.energy for e in sensitivities(one, found.energy[0], found.width[0]) if e.figure == "band edge"]
    assert len(edges) == 3 and sum(edges) == pytest.approx(0.01, rel=2e-2)


def test_a_stack_of_slices_is_a_stack_like_any_other() -> None:
    """Without a file: slices in a cell of one's own."""
    lead = Lead(0.0, 0.067)
    own = Stack(lead, (), slices(RUNNING["cosine"], 0.0, 0.9), 4, (), lead)
    assert spectrum(own, between=(0.0, 0.4)).transmission.max() > 0.99
