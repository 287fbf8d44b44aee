"""What leaves as data: units in every header, the same numbers as the library's, a script that works them out again."""

from __future__ import annotations

import csv
import io
import json
import subprocess
import sys
from pathlib import Path

import msgspec
import pytest
from hypothesis import given
from hypothesis import strategies as st

from transport import lattice_bands, load_scenario, parse_scenario, period_verdict, resonances, scenario_from_document
from transport.handoff import TABLES, grower_csv, python_script, scenario_hash, table, to_csv, to_json
from transport.lattice import default_range
from transport.limits import GROWTH
from transport.refusal import ScenarioError
from transport.scenario import format_scenario
from transport.sheet import grower_rows, read_layer_sheet

HERON = load_scenario("scenarios/heron-gate.toml")
SPAN = default_range(HERON.stack)


def rows_of(text: str) -> list[dict[str, str]]:
    return list(csv.DictReader(line for line in io.StringIO(text) if not line.startswith("#")))


def test_the_hash_is_that_of_what_the_file_says_and_not_of_its_layout() -> None:
    again = parse_scenario("# a comment\n" + format_scenario(HERON))
    assert scenario_hash(again) == scenario_hash(HERON) and len(scenario_hash(HERON)) == 64
    other = scenario_from_document(msgspec.structs.replace(HERON.document, title="another"))
    assert scenario_hash(other) != scenario_hash(HERON)


@pytest.mark.parametrize("name", TABLES)
def test_every_table_is_csv_with_hash_versions_and_units(name: str) -> None:
    text = to_csv(HERON, table(HERON, name))
    comments = [line for line in text.splitlines() if line.startswith("#")]
    assert f"# sha256: {scenario_hash(HERON)}" in comments and any("numpy" in line for line in comments)
    for header in rows_of(text)[0] if rows_of(text) else ():
        assert not header.startswith(("energy", "width", "bottom", "top", "thickness")) or header.endswith(
            ("_meV", "_nm", "_mass"))


def test_tables_hold_the_librarys_numbers() -> None:
    ledger, bands = resonances(HERON.stack, SPAN), lattice_bands(HERON.stack, SPAN)
    found = rows_of(to_csv(HERON, table(HERON, "resonances")))
    assert [float(row["energy_meV"]) / 1e3 for row in found] == pytest.approx(ledger.energy, rel=1e-15)
    found = rows_of(to_csv(HERON, table(HERON, "bands")))
    bottoms = [float(row["bottom_meV"]) / 1e3 for row in found]
    assert bottoms == pytest.approx([b.bottom for b in bands.bands], rel=1e-15)
    whole = json.loads(to_json(HERON, {name: table(HERON, name) for name in TABLES}))
    margins = [row["margin_dB"] for row in whole["periods"]["rows"]]
    assert margins == [check.margin_dB for check in period_verdict(HERON).per_period]
    assert whole["scenario_sha256"] == scenario_hash(HERON)


def test_a_title_that_a_spreadsheet_would_run_stays_text() -> None:
    user = parse_scenario("""
        format = 1
        leads = { left = { band_edge_eV = 0, mass = 1 }, right = { band_edge_eV = 0, mass = 1 } }
        [materials."=cmd"]
        band_edge_eV = 0.1
        mass = 1
        [stack]
        periods = 1
        cell = [ { material = "=cmd", thickness_nm = 1 } ]
    """)
    assert rows_of(to_csv(user, table(user, "layers")))[1]["material"] == "'=cmd"


def test_a_title_in_a_comment_neither_runs_nor_swallows_the_lines_below() -> None:
    title = 'gate, =HYPERLINK("x");+1,"open'
    other = scenario_from_document(msgspec.structs.replace(HERON.document, title=title))
    text = to_csv(other, table(other, "bands"))
    for separator in ",;":
        for row in csv.reader(io.StringIO(text), delimiter=separator, skipinitialspace=True):
            assert not any(cell.lstrip().startswith(("=", "+", "@")) for cell in row)
    assert len(list(csv.reader(io.StringIO(text)))) == len(text.splitlines())


def test_the_script_holds_any_text_a_title_may_be(tmp_path: Path) -> None:
    title = "gate \N{ROCKET} \N{MATHEMATICAL ITALIC SMALL DELTA} \\ ' \" {x} \"\"\""
    other = scenario_from_document(msgspec.structs.replace(HERON.document, title=title, note=title + "\n" + 3 * "'"))
    names: dict[str, str] = {}
    program = python_script(other, SPAN).partition("scenario = transport")[0]
    exec(compile(program, "again.py", "exec"), names)
    assert names["TITLE"] == title and parse_scenario(names["SCENARIO"]) == other


def test_the_script_works_the_numbers_of_the_screen_out_again(tmp_path: Path) -> None:
    script = tmp_path / "again.py"
    script.write_text(python_script(HERON, SPAN))
    answer = subprocess.run([sys.executable, script], capture_output=True, text=True, check=True, timeout=60)
    found = json.loads(answer.stdout)
    assert found["resonances_eV"] == resonances(HERON.stack, SPAN).energy.tolist()
    assert found["bands_eV"] == [[b.bottom, b.top] for b in lattice_bands(HERON.stack, SPAN).bands]
    assert found["verdict"] == period_verdict(HERON).sentence and found["sha256"] == scenario_hash(HERON)


def test_the_growers_rows_add_up_and_show_their_rounding() -> None:
    soft = scenario_from_document(msgspec.structs.replace(HERON.document, stack=msgspec.structs.replace(
        HERON.document.stack, cell=(msgspec.structs.replace(HERON.document.stack.cell[0], monolayers=7.4),
                                    HERON.document.stack.cell[1]))))
    rows = grower_rows(soft, {"": 0.5, "GaAs": 2.0})
    assert len(rows) == 2 * soft.stack.periods + 1
    assert rows[-1].height == pytest.approx(soft.stack.length)
    assert (rows[0].monolayers, rows[0].whole) == (7.4, 7)
    assert rows[0].rounding == pytest.approx(-0.4 * rows[0].thickness / 7.4)
    assert rows[0].seconds == pytest.approx(7.4 / 0.5) and rows[1].seconds == pytest.approx(20 / 2.0)
    assert GROWTH in grower_csv(soft)


def test_the_growers_sheet_is_read_back_as_the_same_layers() -> None:
    read = read_layer_sheet(grower_csv(HERON))
    assert not read.faults
    assert [layer.thickness_nm for layer in read.layers] == [row.thickness for row in grower_rows(HERON)]
    assert {layer.material for layer in read.layers} == {"AlGaAs", "GaAs"}


def test_layers_by_their_edge_and_shares_of_many_digits_come_back_to_the_last_digit() -> None:
    scenario = parse_scenario("""
        format = 1
        leads = { left = { material = "GaAs" }, right = { material = "GaAs" } }
        [stack]
        periods = 2
        [[stack.cell]]
        band_edge_eV = 0.271828182845904
        mass = 0.0912345678901
        thickness_nm = 2.7182818284590452
        nonparabolicity_per_eV = 0.31
        [[stack.cell]]
        material = "AlGaAs"
        x = 0.12345678901234
        thickness_nm = 5.1234567890123456
    """)
    read = read_layer_sheet(grower_csv(scenario))
    assert (read.layers, read.faults) == (scenario.document.stack.cell * 2, ())


def test_a_sheet_without_the_deltas_says_so() -> None:
    comb = load_scenario("scenarios/pebble-comb.toml")
    deltas = any(row.strength is not None for row in comb.sheet)
    assert deltas and "Deltas have no thickness" in grower_csv(comb)
    assert "Deltas" not in grower_csv(HERON)


def test_a_rate_of_what_is_not_grown_is_refused() -> None:
    with pytest.raises(ScenarioError, match="rate: names \"Gaas\", which is not grown here; did you mean GaAs"):
        grower_rows(HERON, {"Gaas": 0.5})


@pytest.mark.parametrize(("text", "unit", "thickness"), [
    ("thickness (nm),material,x\n2.5,AlGaAs,0.3", None, 2.5), ("Material;d [\u00c5];Al\nAlGaAs;25;0.3", None, 2.5),
    ("layer\tthick\tcomposition\nalgaas\t25\t30%", "angstrom", 2.5), ("ML,mat,x\n9,AlGaAs,0.3", None, 9.0),
    ("# grown twice\nlayer, thickness/A\n\nAl0.3Ga0.7As, 25\n", None, 2.5),
    ("thickness_nm,monolayers,material,x\n2.5,8.8,AlGaAs,0.3", None, 2.5),
    ("Material;x;thickness (nm)\nAlGaAs;0,3;2,5", None, 2.5), ("material\tAl (%)\tnm\nAlGaAs\t30\t2,5", None, 2.5),
    ("#,material,nm\n1,Ga0.7Al0.3As,2.5", None, 2.5), ("material,x,nm\nAl(0.3)Ga(0.7)As,0.3,2.5", None, 2.5),
])
def test_sheets_are_read_in_several_spellings_and_units(text: str, unit: str | None, thickness: float) -> None:
    (layer,) = read_layer_sheet(text, unit).layers
    assert (layer.material, layer.x) == ("AlGaAs", 0.3)
    assert (layer.thickness_nm or layer.monolayers) == pytest.approx(thickness)


@pytest.mark.parametrize(("formula", "name", "x"), [
    ("In0.53Ga0.47As", "InGaAs", 0.53), ("Ga0.47In0.53As", "InGaAs", 0.53), ("GaAs0.51Sb0.49", "GaAsSb", 0.49),
    ("AlAs.56Sb.44", "AlAsSb", 0.44), ("Ga0.48AlSb", "AlGaSb", 0.52)])
def test_a_formula_is_the_librarys_alloy_in_whatever_order_it_is_written(formula: str, name: str, x: float) -> None:
    (layer,) = read_layer_sheet(f"material,nm\n{formula},3").layers
    assert (layer.material, layer.x) == (name, x)


@pytest.mark.parametrize("blank", ["", "0", "0.0", "-"])
def test_a_binary_may_say_that_it_has_no_composition(blank: str) -> None:
    (layer,) = read_layer_sheet(f"material,x,nm\nGaAs,{blank},3").layers
    assert layer.x is None


cells = st.text("AlGaInAsSb0123456789.()%+-=eE#\"' \u00c5\u2212x", max_size=12)


@given(st.lists(st.tuples(cells, cells, cells), max_size=4), st.sampled_from(",;\t"), st.text(max_size=20))
def test_any_table_is_layers_or_sentences(rows: list[tuple[str, str, str]], separator: str, header: str) -> None:
    lines = (separator.join(cells) for cells in (("material", "x", "nm"), *rows))
    for text in ("\n".join(lines), header, f"{header}{separator}material{separator}nm\n1{separator}GaAs{separator}2"):
        try:
            read = read_layer_sheet(text)
        except ScenarioError as error:
            assert "\n" not in str(error)
        else:
            assert all(layer.thickness_nm or layer.monolayers for layer in read.layers)


@pytest.mark.parametrize(("row", "sentence"), [
    ("Al0.3Ga0.6As,,3", "line 2, material: \"Al0.3Ga0.6As\" has shares that do not add up to 1; mend them"),
    ("Al0.3Ga0.7As,0.4,3", "line 2, x: is not that of \"Al0.3Ga0.7As\" as it is written; keep one of them"),
    ("GaAs,,1_0", 'line 2, thickness: must be a number, but is "1_0"'),
    ("GaAs,,inf", 'line 2, thickness: must be a number, but is "inf"')])
def test_a_row_that_contradicts_itself_is_one_sentence(row: str, sentence: str) -> None:
    assert read_layer_sheet(f"material,x,nm\n{row}").faults == (sentence,)


@pytest.mark.parametrize(("text", "sentence"), [
    ("", "sheet: is empty; begin it with headers such as thickness (nm), material, x"),
    ("thickness,material\n2,GaAs", "sheet: does not say in what its thicknesses are; write thickness (nm), "
     "thickness (A) or thickness (ML), or choose the unit"),
    ("nm,x\n2,0.3", 'sheet: has no column material; its headers are "nm, x"'),
    ("nm,material\n", "sheet: has headers but no layer; add a line for each"),
    ("nm,material\n" + "2,GaAs\n" * 2001, "sheet: lists 2,001 layers; at most 2,000 are read"),
    ("nm,material\n" + "2,GaAs\n" * 200_000, "sheet: is larger than 1,000,000 bytes; cut it to its layers"),
])
def test_a_wrong_sheet_is_one_sentence(text: str, sentence: str) -> None:
    with pytest.raises(ScenarioError) as refused:
        read_layer_sheet(text)
    assert str(refused.value) == sentence


def test_every_wrong_line_of_a_sheet_has_its_sentence_and_the_others_are_read() -> None:
    read = read_layer_sheet("nm,material,x\n2,GaAs,\nthin,GaAs,\n2,AlGaA,\n2,AlGaAs,\n2,AlGaAs,1.3\n-1,GaAs,\n"
                            "2,GaAs,0.1\n2,,")
    assert [layer.material for layer in read.layers] == ["GaAs"]
    assert read.faults == (
        'line 3, thickness: must be a number, but is "thin"',
        'line 4, material: "AlGaA" is not known here; did you mean AlGaAs?',
        "line 5, x: is missing; AlGaAs needs a composition from 0 to 1",
        "line 6, x: must be from 0 to 1, but is 1.3",
        "line 7, thickness: must be above 0 and at most 10,000 nm, but is -1",
        "line 8, x: stands beside GaAs, which is no alloy; leave it empty",
        "line 9, material: is missing; name it, as in GaAs or AlGaAs",
    )


@pytest.mark.parametrize("rates", [{"": 0.0}, {"GaAs": -1.0}, {"": float("nan")}])
def test_a_rate_that_grows_nothing_is_refused(rates: dict[str, float]) -> None:
    with pytest.raises(ScenarioError, match="give monolayers a second, above 0"):
        grower_rows(HERON, rates)


def test_the_command_line_writes_the_growers_sheet() -> None:
    command = [sys.executable, "-m", "transport", "layers", "scenarios/heron-gate.toml", "--csv", "--rate"]
    answer = subprocess.run([*command, "GaAs=0.8,AlGaAs=1.1"], capture_output=True, text=True, check=True)
    assert rows_of(answer.stdout) == rows_of(grower_csv(HERON, {"GaAs": 0.8, "AlGaAs": 1.1}))
    wrong = subprocess.run([*command, "fast"], capture_output=True, text=True, check=False)
    assert wrong.returncode == 2 and 'rate: "fast" is none' in wrong.stderr
