"""A scenario is read, resolved to a stack on one energy scale, written back and saved."""

from __future__ import annotations

import stat
from pathlib import Path

import msgspec
import pytest

from transport import (
    Delta,
    Layer,
    Lead,
    Scenario,
    ScenarioError,
    Window,
    format_scenario,
    load_scenario,
    material,
    parse_scenario,
    save_scenario,
    scenario_from_document,
)
from transport.scenario import has_comments

HARROW = """\
format = 1
title  = "Harrow window, first cut"
note   = "free text, shown as text and never as markup"

[conditions]
temperature_K  = 77        # default 300
dephasing_meV  = 2.0
resolution_meV = 3.0
substrate      = "GaAs"

[leads.left]
material = "GaAs"
donors_cm3 = 1e18
[leads.right]
material = "GaAs"

[stack]
periods = 8
bias_V  = 0.0
entry = []
cell  = [ { material = "AlGaAs", x = 0.30, monolayers = 9 },
          { material = "GaAs", thickness_nm = 6.5 } ]
exit  = [ { material = "AlGaAs", x = 0.30, monolayers = 9 } ]

[target]
most_periods = 40
windows = [ { kind = "pass",  from_meV = 45, to_meV = 60, transmission = 0.3, measure = "mean" },
            { kind = "block", from_meV = 80, to_meV = 140, transmission = 1e-4 } ]
"""


GAAS = 'material = "GaAs"'


def scenario(
    left: str = GAAS, right: str = GAAS, cell: str = f"{GAAS}, thickness_nm = 1", conditions: str = "",
    stack: str = "", materials: str = "",
) -> Scenario:
    """A scenario of few lines: leads, the cell's only layer, and what else is added to its sections."""
    return parse_scenario(
        f"format = 1\n[leads]\nleft = {{ {left} }}\nright = {{ {right} }}\n[conditions]\n{conditions}\n"
        f"[stack]\nperiods = 1\ncell = [ {{ {cell} }} ]\n{stack}\n{materials}\n"
    )


def only_layer(found: Scenario) -> Layer:
    (layer,) = found.stack.cell
    assert isinstance(layer, Layer)
    return layer


def test_the_specimen_resolves_to_its_stack() -> None:
    found = parse_scenario(HARROW)
    barrier, well = material("AlGaAs", 0.3, 77.0, "GaAs"), material("GaAs", None, 77.0, "GaAs")
    layer = Layer(9 * barrier.monolayer, barrier.band_edge - well.band_edge, barrier.mass)
    assert found.stack.left == found.stack.right == Lead(0.0, 0.067)
    assert found.stack.entry == ()
    assert found.stack.cell == (layer, Layer(6.5, 0.0, 0.067))
    assert found.stack.exit == (layer,)
    assert (found.stack.periods, found.stack.dephasing, found.resolution) == (8, 0.002, 0.003)
    assert found.target is not None
    assert found.target.most_periods == 40
    assert found.target.windows == (
        Window("pass", 0.045, 0.060, 0.3, "mean"), Window("block", 0.080, 0.140, 1e-4, "maximum")
    )


def test_the_sheet_lists_every_layer_from_the_left_lead() -> None:
    sheet = parse_scenario(HARROW).sheet
    assert [row.where for row in sheet] == ["left lead", "cell", "cell", "exit", "right lead"]
    assert [row.key for row in sheet][1:3] == ["stack.cell[0]", "stack.cell[1]"]
    assert sheet[1].monolayers == 9
    assert sheet[2].monolayers == pytest.approx(6.5 / material("GaAs", None, 77.0).monolayer)
    assert (sheet[0].thickness, sheet[0].mass, sheet[1].x) == (None, 0.067, 0.3)


def test_everything_left_out_has_its_stated_default() -> None:
    found = scenario()
    conditions = found.document.conditions
    assert (found.title, found.note, found.target, found.resolution) == ("untitled", "", None, 0.0)
    assert (conditions.temperature_K, conditions.nonparabolic, conditions.substrate) == (300.0, False, None)
    assert (found.document.stack.bias_V, found.document.stack.drop_V) == (0.0, None)


def test_a_target_without_windows_asks_nothing_of_up_to_sixty_periods() -> None:
    found = parse_scenario(HARROW[: HARROW.index("most_periods")])
    assert found.target is not None
    assert (found.target.windows, found.target.most_periods) == ((), 60)


def test_equal_documents_make_equal_scenarios() -> None:
    assert parse_scenario(HARROW) == parse_scenario(HARROW.replace("# default 300", ""))
    assert hash(parse_scenario(HARROW)) == hash(parse_scenario(HARROW))
    assert parse_scenario(HARROW) != parse_scenario(HARROW.replace("periods = 8", "periods = 9"))


def test_a_changed_record_makes_another_scenario() -> None:
    found = parse_scenario(HARROW)
    stack = msgspec.structs.replace(found.document.stack, periods=12)
    other = scenario_from_document(msgspec.structs.replace(found.document, stack=stack))
    assert other.stack == found.stack.with_periods(12)


# one energy scale

EXPLICIT = "band_edge_eV = 0.4, mass = 0.067"


def test_explicit_edges_count_from_the_left_leads() -> None:
    right, cell = "band_edge_eV = 0.1, mass = 0.05", "band_edge_eV = 0.65, mass = 0.09, thickness_nm = 2"
    stack = scenario(EXPLICIT, right, cell).stack
    assert stack.left == Lead(0.0, 0.067)
    assert stack.right == Lead(0.1 - 0.4, 0.05)
    assert stack.cell == (Layer(2.0, 0.65 - 0.4, 0.09),)


def test_a_library_lead_is_the_zero_of_explicit_edges() -> None:
    found = scenario(cell="band_edge_eV = 0.3, mass = 0.09, thickness_nm = 2", conditions="temperature_K = 10")
    assert only_layer(found) == Layer(2.0, 0.3, 0.09)


def test_a_library_right_lead_keeps_its_offset() -> None:
    right = scenario('material = "AlGaAs", x = 0.3').stack.right
    step = material("AlGaAs", 0.3, 300.0).band_edge - material("GaAs", None, 300.0).band_edge
    assert right == Lead(-step, 0.067)


def test_a_library_layer_beside_an_explicit_lead_needs_an_edge_of_its_own() -> None:
    with pytest.raises(ScenarioError, match=r"^leads.right.material: GaAs has no known offset from a left lead"):
        scenario(EXPLICIT, cell="band_edge_eV = 0, mass = 1, thickness_nm = 1")
    given = '[materials.GaAs]\nband_edge_eV = 0.5\nmass = 0.07'
    stack = scenario(EXPLICIT, materials=given).stack
    assert stack.right == Lead(0.5 - 0.4, 0.07)
    assert stack.cell == (Layer(1.0, 0.5 - 0.4, 0.07),)


def test_a_material_of_the_scenario_shares_the_scale_of_a_library_lead() -> None:
    given = "[materials.mine]\nband_edge_eV = 0.2\nmass = 0.1\nmonolayer_nm = 0.25"
    found = scenario(cell='material = "mine", monolayers = 8', materials=given)
    assert found.stack.cell == (Layer(2.0, 0.2, 0.1),)
    assert found.sheet[1].monolayers == 8


def test_an_alloy_the_scenario_defines_takes_its_x_as_a_label() -> None:
    given = "[materials.AlGaAs]\nband_edge_eV = 0.26\nmass = 0.092"
    found = scenario(cell='material = "AlGaAs", x = 0.3, thickness_nm = 2', materials=given)
    assert found.stack.cell == (Layer(2.0, 0.26, 0.092),)
    assert found.sheet[1].x == 0.3
    assert found.warnings == ("AlGaAs is as [materials.AlGaAs] says, whatever its x.",)


def test_strain_shifts_layers_and_leads_alike() -> None:
    def shift(name: str) -> float:
        return material(name, None, 300.0, "AlAs").band_edge - material(name, None, 300.0).band_edge

    layer = 'material = "InAs", thickness_nm = 1'
    plain = scenario(right='material = "InP"', cell=layer)
    strained = scenario(right='material = "InP"', cell=layer, conditions='substrate = "AlAs"')
    assert strained.stack.left.band_edge == 0
    lead = strained.stack.right.band_edge - plain.stack.right.band_edge
    assert lead == pytest.approx(shift("InP") - shift("GaAs"), abs=1e-12)
    inside = only_layer(strained).band_edge - only_layer(plain).band_edge
    assert inside == pytest.approx(shift("InAs") - shift("GaAs"), abs=1e-12)


# layers

def test_a_group_stands_for_its_layers_written_out() -> None:
    group = 'exit = [ { repeat = 3, layers = [ { delta_eV_nm = 0.1 }, { material = "GaAs", thickness_nm = 2 } ] } ]'
    found = scenario(stack=group)
    assert found.stack.exit == (Delta(0.1), Layer(2.0, 0.0, 0.067)) * 3
    assert [row.key for row in found.sheet if row.where == "exit"][:2] == [
        "stack.exit[0].layers[0]", "stack.exit[0].layers[1]"
    ]


def test_a_delta_has_a_strength_and_no_thickness() -> None:
    row = scenario(stack="entry = [ { delta_eV_nm = -0.1 } ]").sheet[1]
    assert (row.where, row.strength, row.thickness, row.band_edge, row.mass) == ("entry", -0.1, 0.0, None, None)


def test_monolayers_may_be_fractional() -> None:
    layer = only_layer(scenario(cell='material = "GaAs", monolayers = 7.5'))
    assert layer.thickness == pytest.approx(7.5 * 0.565325 / 2)


def test_monolayers_that_come_to_too_thick_a_layer_are_refused() -> None:
    given = "[materials.mine]\nband_edge_eV = 0.2\nmass = 0.1\nmonolayer_nm = 5"
    with pytest.raises(ScenarioError, match=r"^stack.cell\[0\].monolayers: come to 15000 nm, but .* give fewer$"):
        scenario(cell='material = "mine", monolayers = 3000', materials=given)


@pytest.mark.parametrize(("layer", "materials", "parabolic", "kane"), [
    ('material = "GaAs", thickness_nm = 1', "", 0.0, 1 / material("GaAs", None, 300.0).gap),
    ("band_edge_eV = 0, mass = 1, thickness_nm = 1, nonparabolicity_per_eV = 0.5", "", 0.5, 0.5),
    ("band_edge_eV = 0, mass = 1, thickness_nm = 1", "", 0.0, 0.0),
    ('material = "mine", thickness_nm = 1', "gap_eV = 2", 0.0, 0.5),
    ('material = "mine", thickness_nm = 1', "gap_eV = 2\nnonparabolicity_per_eV = 0.7", 0.0, 0.7),
    ('material = "mine", thickness_nm = 1', "", 0.0, 0.0),
])
def test_masses_bend_where_the_layer_or_the_conditions_say_so(
    layer: str, materials: str, parabolic: float, kane: float
) -> None:
    given = f"[materials.mine]\nband_edge_eV = 0.2\nmass = 0.1\n{materials}"
    for nonparabolic, expected in (("false", parabolic), ("true", kane)):
        found = scenario(cell=layer, materials=given, conditions=f"nonparabolic = {nonparabolic}")
        assert only_layer(found).nonparabolicity == expected


# the voltage drop

@pytest.mark.parametrize(("left", "right", "stack"), [
    (", donors_cm3 = 1e18", ", donors_cm3 = 1e18", ""),
    (", fermi_meV = 40", ", fermi_meV = 40", ""),
    (", donors_cm3 = 1e18", "", ""),
    (", donors_cm3 = 1e18", ", donors_cm3 = 2e18", "drop_V = 0"),
    (", donors_cm3 = 1e18", ", donors_cm3 = 1e18", "bias_V = 0.1\ndrop_V = 0"),
])
def test_level_stacks_are_accepted(left: str, right: str, stack: str) -> None:
    found = scenario(GAAS + left, GAAS + right, stack=stack)
    assert found.stack.right == found.stack.left


# warnings

@pytest.mark.parametrize(("layer", "conditions", "sentence"), [
    ('material = "AlAs", thickness_nm = 1', "", "AlAs is indirect: its lowest valley is not Gamma"),
    ('material = "GaAs", thickness_nm = 1', "temperature_K = 700", "The gap of GaAs at 700 K is extrapolated"),
    ('material = "InGaAs", x = 0.2, thickness_nm = 1', "",
     "The lattice constant of InGaAs (x = 0.2) differs from that of GaAs by 1.4 %: its strain is not counted"),
    ('material = "InGaAs", x = 0.2, thickness_nm = 1', 'substrate = "GaAs"',
     "The lattice constant of InGaAs (x = 0.2) differs from that of GaAs by 1.4 %: its strain is counted"),
    ('material = "mine", thickness_nm = 1', "nonparabolic = true", "mine has neither gap_eV nor"),
])
def test_a_layer_warns_and_so_does_the_scenario(layer: str, conditions: str, sentence: str) -> None:
    given = "[materials.mine]\nband_edge_eV = 0.2\nmass = 0.1"
    found = scenario(cell=layer, conditions=conditions, materials=given)
    assert any(warning.startswith(sentence) for warning in found.sheet[1].warnings)
    assert any(warning.startswith(sentence) for warning in found.warnings)


def test_offsets_between_library_materials_carry_their_uncertainty_once() -> None:
    assert sum("20 meV" in warning for warning in parse_scenario(HARROW).warnings) == 1
    assert scenario().warnings == ()


# writing

def test_written_text_reads_as_an_equal_scenario() -> None:
    found = parse_scenario(HARROW)
    assert parse_scenario(format_scenario(found)) == found
    assert format_scenario(parse_scenario(format_scenario(found))) == format_scenario(found)


def test_saving_replaces_the_file_and_leaves_nothing_else(tmp_path: Path) -> None:
    path = tmp_path / "harrow.toml"
    path.write_text("old")
    path.chmod(0o640)
    save_scenario(parse_scenario(HARROW), path)
    assert load_scenario(path) == parse_scenario(HARROW)
    assert stat.S_IMODE(path.stat().st_mode) == 0o640
    assert list(tmp_path.iterdir()) == [path]


def test_saving_through_a_link_keeps_the_link(tmp_path: Path) -> None:
    (tmp_path / "folder").mkdir()
    link = tmp_path / "link.toml"
    link.symlink_to(tmp_path / "folder" / "real.toml")
    save_scenario(parse_scenario(HARROW), link)
    assert link.is_symlink()
    assert load_scenario(tmp_path / "folder" / "real.toml") == parse_scenario(HARROW)


def test_a_failed_save_leaves_the_old_file_whole(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def fail(descriptor: int) -> None:
        raise OSError(28, "No space left on device")

    path = tmp_path / "harrow.toml"
    path.write_text("old")
    monkeypatch.setattr("os.fsync", fail)
    with pytest.raises(ScenarioError, match=r"harrow.toml: cannot be saved \(No space left on device\)"):
        save_scenario(parse_scenario(HARROW), path)
    assert path.read_text() == "old"
    assert list(tmp_path.iterdir()) == [path]


def test_a_file_that_may_not_be_written_is_not_replaced(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = tmp_path / "harrow.toml"
    path.write_text("old")
    monkeypatch.setattr("os.access", lambda path, mode: False)  # nothing is read-only to the superuser
    with pytest.raises(ScenarioError, match=r"cannot be saved \(Permission denied\)"):
        save_scenario(parse_scenario(HARROW), path)
    assert path.read_text() == "old"


@pytest.mark.parametrize("name", [".", "none/harrow.toml", "a\0b", "a" * 300])
def test_a_place_that_cannot_be_written_is_named(name: str, tmp_path: Path) -> None:
    with pytest.raises(ScenarioError, match="choose another"):
        save_scenario(parse_scenario(HARROW), tmp_path / name)


def test_a_byte_order_mark_and_foreign_line_ends_are_read(tmp_path: Path) -> None:
    path = tmp_path / "harrow.toml"
    path.write_bytes(b"\xef\xbb\xbf" + HARROW.replace("\n", "\r\n").encode())
    assert load_scenario(path) == parse_scenario(HARROW)


@pytest.mark.parametrize(("text", "found"), [
    (HARROW, True),
    ("# at the start", True),
    ('title = "a # b"', False),
    ("title = 'a # b'", False),
    ('note = """\na # "" b\n"""', False),
    ("note = '''\na # '' b'''''", False),
    (r'title = "a \" # b"', False),
    (r'title = "a \\" # b', True),
    ('note = """a""""" # b', True),
    ('title = "open # b', False),
    ("title = 'open\n# b", True),
])
def test_comments_are_told_from_text(text: str, found: bool) -> None:
    assert has_comments(text) == found
