"""The command line as a user meets it: keys, exit statuses, one sentence for each mistake."""

import contextlib
import json
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest

from transport.__main__ import main

SCENARIO = """
format = 1
title = "Quay gate"
[leads.left]
band_edge_eV = 0.0
mass = 0.067
[leads.right]
band_edge_eV = 0.01
mass = 0.07
[stack]
periods = 4
cell = [ { band_edge_eV = 0.3, mass = 0.092, thickness_nm = 3.0 },
         { band_edge_eV = 0.0, mass = 0.067, thickness_nm = 5.0 } ]
exit = [ { band_edge_eV = 0.3, mass = 0.092, thickness_nm = 3.0 } ]
[target]
most_periods = 12
windows = [ { kind = "block", from_meV = 120, to_meV = 220, transmission = 1e-4 } ]
"""


@pytest.fixture
def scenario(tmp_path: Path) -> str:
    path = tmp_path / "quay.toml"
    path.write_text(SCENARIO)
    return str(path)


def answer(capsys: pytest.CaptureFixture[str], *arguments: str) -> dict[str, Any]:
    assert main([*arguments, "--json"]) == 0
    def refuse(name: str) -> None:
        raise AssertionError(f"{name} is not strict JSON")
    result = json.loads(capsys.readouterr().out, parse_constant=refuse)
    assert isinstance(result, dict)
    return result


def test_spectrum_answers_at_the_energies_asked_for(scenario: str, capsys: pytest.CaptureFixture[str]) -> None:
    found = answer(capsys, "spectrum", scenario, "--energies-meV=-50,10,82.5")
    assert found["energy_meV"] == pytest.approx([-50, 10, 82.5])
    assert found["transmission"][:2] == [0, 0] and found["transmission"][2] > 0
    assert found["reflection"][:2] == [1, 1]
    assert found["log10_transmission"][:2] == [None, None]


def test_spectrum_without_points_chooses_its_own_energies(scenario: str, capsys: pytest.CaptureFixture[str]) -> None:
    found = answer(capsys, "spectrum", scenario, "--from-meV", "60", "--to-meV", "100", "--periods", "30")
    assert len(found["energy_meV"]) > 300
    assert max(found["transmission"]) > 0.9


def test_spectrum_with_points_spaces_them_evenly(scenario: str, capsys: pytest.CaptureFixture[str]) -> None:
    found = answer(capsys, "spectrum", scenario, "--from-meV", "60", "--to-meV", "100", "--points", "5")
    assert found["energy_meV"] == pytest.approx([60, 70, 80, 90, 100])


def test_bands_come_with_their_certificate(scenario: str, capsys: pytest.CaptureFixture[str]) -> None:
    found = answer(capsys, "bands", scenario, "--to-meV", "1000")
    assert [band["index"] for band in found["bands"]] == [1, 2, 3, 4]
    assert found["bands"][0]["bottom_meV"] == pytest.approx(71.6127237728659, abs=1e-7)
    assert found["certificate"]["complete"] is True and found["certificate"]["counted"] == 4


def test_periods_lists_every_count(scenario: str, capsys: pytest.CaptureFixture[str]) -> None:
    found = answer(capsys, "periods", scenario, "--most", "9")
    assert {"fewest_periods", "reason", "ripple_floor", "ripple_floor_meV", "mean_limit", "per_period"} <= set(found)
    assert [row["periods"] for row in found["per_period"]] == list(range(1, 10))
    assert set(found["per_period"][0]) == {"periods", "meets", "margin_dB", "limiting_window"}
    assert found["fewest_periods"] == min(row["periods"] for row in found["per_period"] if row["meets"])
    assert found["reason"] is None


def test_layers_run_from_the_left_lead_to_the_right(scenario: str, capsys: pytest.CaptureFixture[str]) -> None:
    found = answer(capsys, "layers", scenario)
    assert len(found["layers"]) == 5
    assert {"material", "x", "thickness_nm", "monolayers", "band_edge_eV", "mass"} <= set(found["layers"][0])
    assert found["layers"][-1]["band_edge_eV"] == pytest.approx(0.01)


@pytest.mark.parametrize("command", ["check", "spectrum", "bands", "periods", "layers"])
def test_every_command_speaks_plain_text_too(
    command: str, scenario: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main([command, scenario]) == 0
    text = capsys.readouterr().out
    assert text.strip() and "{" not in text and "nan" not in text


def test_plain_bands_end_with_the_certificate_in_words(scenario: str, capsys: pytest.CaptureFixture[str]) -> None:
    main(["bands", scenario])
    assert capsys.readouterr().out.endswith("certified: 2 counted, 2 found\n")


@pytest.mark.parametrize("arguments, sentence", [
    (["spectrum", "SCENARIO", "--points", "0"], "'0' must be a whole number from 1 to 1,000,000"),
    (["spectrum", "SCENARIO", "--from-meV", "9", "--to-meV", "1"], "9 to 1 is no range, give the lower end first"),
    (["spectrum", "SCENARIO", "--energies-meV", "1,x"], "'x' must be a number of meV"),
    (["spectrum", "SCENARIO", "--energies-meV", "1", "--points", "3"], "give either a list, or a range"),
    (["spectrum", "SCENARIO", "--periods", "2000000"], "must be a whole number from 1 to 1,000,000"),
    (["bands", "SCENARIO", "--to-meV", "nan"], "'nan' must be a number of meV"),
    (["periods", "SCENARIO", "--most", "3000"], "must be a whole number from 1 to 2,000"),
    (["periods"], "the following arguments are required: SCENARIO"),
    (["polish", "SCENARIO"], "invalid choice: 'polish'"),
    (["check", "absent.toml"], "absent.toml: cannot be read"),
    ([], "the following arguments are required: COMMAND"),
])
def test_a_mistake_is_one_sentence_and_status_2(
    arguments: list[str], sentence: str, scenario: str, capsys: pytest.CaptureFixture[str]
) -> None:
    words = [scenario if word == "SCENARIO" else word for word in arguments]
    try:
        status = main(words)
    except SystemExit as left:
        status = int(str(left.code))
    captured = capsys.readouterr()
    assert status == 2
    assert sentence in captured.err
    assert captured.err.count("\n") == 1 and captured.out == ""


def test_a_scenario_without_target_is_told_what_a_verdict_needs(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = tmp_path / "open.toml"
    path.write_text(SCENARIO.split("[target]")[0])
    assert main(["periods", str(path)]) == 2
    assert capsys.readouterr().err.startswith("target.windows: give at least one pass or block window")


def test_a_reader_that_stops_early_leaves_no_traceback(scenario: str) -> None:
    command = f"{sys.executable} -m transport spectrum {scenario} | head -n 1"
    done = subprocess.run(command, shell=True, capture_output=True, text=True, check=False)
    assert done.stdout.split()[0] == "energy_meV"
    assert done.stderr == ""


PASSING = SCENARIO.replace("windows = [ ", """windows = [
    { kind = "pass", from_meV = 76, to_meV = 84, transmission = 0.5, measure = "mean" }, """)


@pytest.fixture
def passing(tmp_path: Path) -> str:
    path = tmp_path / "passing.toml"
    path.write_text(PASSING)
    return str(path)


def test_ends_lists_what_raises_the_pass_windows(passing: str, capsys: pytest.CaptureFixture[str]) -> None:
    found = answer(capsys, "ends", passing)
    assert set(found) == {"sentence", "windows", "before", "proposals"}
    assert found["windows"] == [0]
    assert found["proposals"][0]["limits"][0] > found["before"][0]


def test_a_saved_remedy_meets_the_target(passing: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    new = str(tmp_path / "mended.toml")
    found = answer(capsys, "remedy", passing, "--save", new)
    first = found["proposals"][0]
    assert answer(capsys, "periods", new)["per_period"][first["periods"] - 1]["meets"] is True
    assert main(["remedy", passing, "--save", new]) == 2
    assert capsys.readouterr().err == f"--save: {new} is there already, choose another name\n"


def test_periods_gives_the_range_where_it_is_asked_for(passing: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert "range" not in answer(capsys, "periods", passing)
    found = answer(capsys, "periods", passing, "--range", "--most", "15")
    assert found["range"]["fewest_periods"] == found["fewest_periods"]
    assert found["range"]["sentence"].endswith(".")


@pytest.mark.parametrize(("arguments", "sentence"), [
    (["ends", "--cells", "5"], "cells: is 5, a taper longer than the stack of 4 periods; ask for at most 4\n"),
    (["ends", "--cells", "0"], "argument --cells: '0' must be a whole number from 1 to 20"),
    (["remedy", "--monolayers", "11"], "argument --monolayers: '11' must be a whole number from 1 to 10"),
])
def test_wrong_options_of_the_remedies_are_one_sentence(
    arguments: list[str], sentence: str, passing: str, capsys: pytest.CaptureFixture[str]
) -> None:
    command, *rest = arguments
    with contextlib.suppress(SystemExit):
        assert main([command, passing, *rest]) == 2
    assert capsys.readouterr().err.startswith(sentence)


def test_resonances_come_with_their_certificate(scenario: str, capsys: pytest.CaptureFixture[str]) -> None:
    found = answer(capsys, "resonances", scenario, "--to-meV", "150", "--periods", "6")
    assert {"energy_meV", "width_meV", "lifetime_ps", "peak_transmission"} <= set(found["resonances"][0])
    assert found["certificate"]["complete"] is True
    assert found["certificate"]["counted"] == len(found["resonances"]) == 6


def test_measured_peaks_are_paired_and_fitted(
    scenario: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    table = tmp_path / "peaks.csv"
    table.write_text("energy_meV,uncertainty_meV\n74.2,0.2\n79.0,0.2\n")
    found = answer(capsys, "peaks", scenario, "--measured", str(table), "--fit", "shift")
    assert [row["resonance"] for row in found["peaks"]] == sorted(row["resonance"] for row in found["peaks"])
    assert found["fit"]["rms_after_meV"] <= found["rms_meV"]
    assert set(found["fit"]["figures"]) == {"shift_meV"}
    assert main(["peaks", scenario]) == 2
    assert capsys.readouterr().err.startswith("measured.peaks: is missing or empty")


def test_an_answer_that_cannot_be_written_is_one_sentence() -> None:
    command = [sys.executable, "-m", "transport", "bands", "scenarios/heron-gate.toml"]
    with open("/dev/full", "w") as full:
        run = subprocess.run(command, stdout=full, stderr=subprocess.PIPE, text=True, check=False)
    assert run.returncode == 1
    assert run.stderr.startswith("the answer cannot be written") and run.stderr.count("\n") == 1


def test_a_terminal_without_the_letters_still_gets_an_answer() -> None:
    command = [sys.executable, "-m", "transport", "periods", "scenarios/heron-gate.toml"]
    run = subprocess.run(command, capture_output=True, text=True, env={"PYTHONIOENCODING": "ascii"}, check=True)
    assert run.stdout.startswith("Fewest periods: 10. Limiting: block 95\\u2013170 meV")


def test_a_model_that_ends_above_the_lead_is_a_warning_and_bands_above_it_are_listed(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """m(E) = m (1 + a (E - V)) falls to 0 at V - 1/a = 50 meV (by hand)."""
    file = tmp_path / "kane.toml"
    file.write_text("""
        format = 1
        leads = { left = { band_edge_eV = 0, mass = 0.067 }, right = { band_edge_eV = 0, mass = 0.067 } }
        [stack]
        periods = 3
        cell = [ { band_edge_eV = 0.3, mass = 0.067, nonparabolicity_per_eV = 4.0, thickness_nm = 3 },
                 { band_edge_eV = 0, mass = 0.067, thickness_nm = 5 } ]
    """)
    assert main(["check", str(file)]) == 0
    assert "warning: The one-band model ends at 50 meV" in capsys.readouterr().out
    assert main(["bands", str(file)]) == 2
    assert "ends at 50 meV" in capsys.readouterr().err
    assert main(["bands", str(file), "--from-meV", "51", "--to-meV", "400"]) == 0
