"""The page *Peaks* without a browser: its tables hold the engine's numbers, and measured peaks are edits too."""

from __future__ import annotations

import json
from pathlib import Path

import msgspec
import numpy as np
import pytest

from transport import compare_peaks, fit_peaks, resonances, scenario_from_document
from transport.scenario import Scenario
from webapp.bench import Bench
from webapp.files import Folder
from webapp.latest import Stop, Stopped
from webapp.ledger import Fitting, Listing, Traced, density, fit, ledger, trace
from webapp.pages.peaks import fit_view, ledger_view, number, resonance_view

SPAN = (0.0, 0.3)
MEASURED = "energy_meV,uncertainty_meV\n52.1,0.3\n61.9,0.3\n"


@pytest.fixture
def bench(tmp_path: Path) -> Bench:
    (tmp_path / "heron-gate.toml").write_text(Path("scenarios/heron-gate.toml").read_text())
    return Bench(Folder(tmp_path), "heron-gate.toml")


def measured(bench: Bench) -> Scenario:
    bench.measure(MEASURED, "0.5")
    assert bench.notice is None
    return bench.scenario


@pytest.mark.parametrize(("value", "digits", "sign", "text"), [
    (0.00012, 3, True, "+0.00012"), (-2.5, 3, False, "\u22122.5"), (1.5e-12, 3, False, "1.5\u00d710\u207b\u00b9\u00b2"),
])
def test_numbers_are_written_as_people_write_them(value: float, digits: int, sign: bool, text: str) -> None:
    assert number(value, digits, sign) == text


def test_the_ledger_holds_every_resonance_with_its_certificate(bench: Bench) -> None:
    view = ledger_view(ledger(Listing(bench.scenario, SPAN), Stop()), None)
    known = resonances(bench.scenario.stack, SPAN)
    assert [row[1][0] for row in view["rows"]] == pytest.approx(known.energy * 1e3, abs=1e-12)
    assert view["certificate"] == known.certificate.sentence and view["complete"]
    assert len(view["columns"]) == len(view["rows"][0]) == 7
    json.dumps(view, allow_nan=False)


def test_measured_peaks_stand_beside_their_resonances_and_can_be_undone(bench: Bench) -> None:
    scenario = measured(bench)
    found = ledger(Listing(scenario, SPAN), Stop())
    compared = compare_peaks(scenario, among=found.found)
    rows = ledger_view(found, None)["rows"]
    assert [place for place, row in enumerate(rows) if row[7][1]] == compared.pairs.tolist()
    assert [rows[place][8][0] for place in compared.pairs] == pytest.approx(np.abs(compared.deviation) * 1e3)
    assert bench.undo_step == "measured peaks"
    bench.undo()
    assert bench.document.measured is None


@pytest.mark.parametrize(("text", "arm", "sentence"), [
    ("energy\n1", "0.5", 'peaks, column "energy": is not known here; did you mean energy_meV?'),
    (MEASURED, "half", "measured.lever_arm: must be a number such as 0.25 or 1e-4, but is \"half\""),
    (MEASURED, "2", "measured.lever_arm: must be above 0 and at most 1, but is 2.0"),
])
def test_a_wrong_table_leaves_the_peaks_that_were_there(bench: Bench, text: str, arm: str, sentence: str) -> None:
    before = measured(bench).document.measured
    bench.measure(text, arm)
    assert bench.notice is not None and bench.notice.sentence == sentence
    assert bench.document.measured == before


def test_an_empty_table_takes_the_peaks_away(bench: Bench) -> None:
    measured(bench)
    bench.measure("  \n", "0.5")
    assert bench.document.measured is None


def test_a_resonance_is_traced_with_what_moves_it(bench: Bench) -> None:
    found = ledger(Listing(bench.scenario, SPAN), Stop())
    traced = trace(Traced(bench.scenario, found.found, 2), Stop())
    assert np.trapezoid(traced.density, traced.position) == pytest.approx(1, abs=2e-3)
    view = resonance_view(found, 2, traced)
    assert view["title"] == "Resonance 3: miniband 1, number 3"
    assert [abs(effect["shift"]) for effect in view["effects"]] == sorted(
        (abs(effect["shift"]) for effect in view["effects"]), reverse=True)
    json.dumps(view, allow_nan=False)


def test_no_narrow_peak_is_missed_by_the_picture_of_local_density(bench: Bench) -> None:
    """A peak narrower than a row would vanish if only the rows' middles were looked at."""
    thick = msgspec.structs.replace(bench.document.stack.cell[0], monolayers=45.0)
    stack = msgspec.structs.replace(bench.document.stack, periods=2, cell=(thick, *bench.document.stack.cell[1:]))
    scenario = load_like(bench.scenario, stack)
    found = resonances(scenario.stack, SPAN)
    narrow = int(np.argmin(found.width))
    assert found.width[narrow] < 1e-5
    picture = density((scenario.stack, SPAN), Stop())
    row = int(found.energy[narrow] / SPAN[1] * picture.image.shape[0])
    assert picture.image[row].max() == picture.image.max()


def load_like(scenario: Scenario, stack: msgspec.Struct) -> Scenario:
    return scenario_from_document(msgspec.structs.replace(scenario.document, stack=stack))


def test_more_periods_than_the_ledger_lists_are_one_sentence(bench: Bench) -> None:
    bench.set("stack.periods", "800")
    with pytest.raises(ValueError, match="lists the resonances of up to 500 periods, and this stack has 800"):
        ledger(Listing(bench.scenario, SPAN), Stop())


def test_a_fit_is_the_engines_and_stops_when_told(bench: Bench) -> None:
    scenario = measured(bench)
    found = fit(Fitting(scenario, ("well",)), Stop(), lambda share: None)
    expected = fit_peaks(scenario, ("well",))
    view = fit_view("known", "", 1.0, found)
    assert found.values == pytest.approx(expected.values) and view["takes"]
    assert view["rows"][0]["name"] == "thickness of the wells"
    stop = Stop()
    stop.set()
    with pytest.raises(Stopped):
        fit(Fitting(scenario, ("well",)), stop, lambda share: None)
