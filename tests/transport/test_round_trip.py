"""Read, written and read again, a scenario is the same: any document, not only a tidy one."""

from __future__ import annotations

import json
import tomllib

from hypothesis import given, settings
from hypothesis import strategies as st

from transport import (
    Document,
    document_from_data,
    document_to_data,
    format_scenario,
    parse_scenario,
    scenario_from_document,
)
from transport.document import (
    Conditions,
    GrowthRecord,
    LayerRecord,
    LeadRecord,
    Leads,
    StackRecord,
    TargetRecord,
    UserMaterial,
    WindowRecord,
)
from transport.materials import is_alloy, material_names, substrate_names
from transport.parameters import PARAMETERS
from transport.refusal import ScenarioError


def numbers(name: str) -> st.SearchStrategy[float]:
    """Every float the table admits."""
    limit = PARAMETERS[name]
    return st.floats(limit.low, limit.high, exclude_min=limit.low_open, exclude_max=limit.high_open)


def text(name: str, also: str = "") -> st.SearchStrategy[str]:
    limit = PARAMETERS[name]
    letters = st.characters(exclude_categories=("Cc", "Cs", "Zl", "Zp"))
    letters = st.one_of(letters, st.sampled_from(also)) if also else letters
    return st.text(letters, min_size=int(limit.low), max_size=min(int(limit.high), 40))


def maybe(strategy: st.SearchStrategy[float]) -> st.SearchStrategy[float | None]:
    return st.none() | strategy


@st.composite
def material_choices(draw: st.DrawFn) -> tuple[str, float | None]:
    name = draw(st.sampled_from(material_names()))
    return name, draw(numbers("x")) if is_alloy(name) else None


@st.composite
def layers(draw: st.DrawFn, users: tuple[str, ...]) -> LayerRecord:
    kind = draw(st.sampled_from(["material", "explicit", "user"] if users else ["material", "explicit"]))
    if kind == "explicit":
        return LayerRecord(band_edge_eV=draw(numbers("band_edge_eV")), mass=draw(numbers("mass")),
                           thickness_nm=draw(numbers("thickness_nm")),
                           nonparabolicity_per_eV=draw(maybe(numbers("nonparabolicity_per_eV"))))
    name, x = draw(material_choices()) if kind == "material" else (draw(st.sampled_from(users)), None)
    if kind == "material" and draw(st.booleans()):
        return LayerRecord(material=name, x=x, monolayers=draw(st.floats(1e-3, 20_000)))
    return LayerRecord(material=name, x=x, thickness_nm=draw(numbers("thickness_nm")))


@st.composite
def parts(draw: st.DrawFn, users: tuple[str, ...]) -> tuple[LayerRecord, ...]:
    """An entry or exit: layers, deltas and groups of them."""
    delta = st.builds(LayerRecord, delta_eV_nm=numbers("delta_eV_nm"))
    plain = layers(users) | delta
    inner = st.lists(plain, min_size=1, max_size=3).map(tuple)
    group = st.builds(LayerRecord, repeat=st.integers(1, 20), layers=inner)
    return tuple(draw(st.lists(plain | group, max_size=3)))


@st.composite
def windows(draw: st.DrawFn) -> WindowRecord:
    kind = draw(st.sampled_from(["pass", "block"]))
    bottom, top = sorted(draw(st.lists(numbers("from_meV"), min_size=2, max_size=2, unique_by=lambda e: e + 0.0)))
    measure = draw(st.sampled_from([None, "mean", "minimum" if kind == "pass" else "maximum"]))
    return WindowRecord(kind, bottom, top, draw(numbers("transmission")), measure)  # type: ignore[arg-type]


def touches_no_broken_gap(document: Document) -> bool:
    try:
        scenario_from_document(document)
    except ScenarioError as error:
        return "a broken gap" not in error.message
    return True


@st.composite
def any_documents(draw: st.DrawFn) -> Document:
    materials = draw(st.lists(
        st.builds(UserMaterial, text("name").map("my {}".format), numbers("band_edge_eV"), numbers("mass"),
                  maybe(numbers("gap_eV")), maybe(numbers("nonparabolicity_per_eV")), maybe(numbers("monolayer_nm"))),
        max_size=2, unique_by=lambda entry: entry.name))
    users = tuple(entry.name for entry in materials)
    leads = [LeadRecord(*draw(material_choices())) for _ in range(2)]
    target = st.builds(TargetRecord, st.integers(1, 2000), st.lists(windows(), max_size=3).map(tuple))
    return Document(
        format=1,
        title=draw(text("title")),
        note=draw(text("note", also="\n\t\"'\\#")),
        conditions=Conditions(draw(st.floats(1e-300, 1000.0)), draw(numbers("dephasing_meV")),
                              draw(numbers("resolution_meV")), draw(st.booleans()),
                              draw(st.none() | st.sampled_from(substrate_names()))),
        leads=Leads(*leads),
        stack=StackRecord(periods=draw(st.integers(1, 1_000_000)), entry=draw(parts(users)),
                          cell=tuple(draw(st.lists(layers(users), min_size=1, max_size=3))), exit=draw(parts(users))),
        target=draw(st.none() | target),
        growth=draw(st.none() | st.builds(GrowthRecord, st.floats(0.01, 50), numbers("mass_percent"),
                                          st.integers(0, 10))),
        materials=tuple(materials),
    )


def documents() -> st.SearchStrategy[Document]:
    return any_documents().filter(touches_no_broken_gap)


@settings(deadline=None, max_examples=150)
@given(documents())
def test_a_written_scenario_reads_as_the_same(document: Document) -> None:
    scenario = scenario_from_document(document)
    again = parse_scenario(format_scenario(scenario))
    assert again.document == document
    assert (again.stack, again.target, again.sheet, again.warnings) == (
        scenario.stack, scenario.target, scenario.sheet, scenario.warnings
    )


@settings(deadline=None, max_examples=50)
@given(documents())
def test_a_document_survives_json_and_toml_alike(document: Document) -> None:
    data = document_to_data(document)
    assert document_from_data(json.loads(json.dumps(data, allow_nan=False))) == document
    assert document_from_data(tomllib.loads(format_scenario(scenario_from_document(document)))) == document
