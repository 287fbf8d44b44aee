"""The report: whole, self-contained, deaf to markup in what users wrote, and a scenario that opens again."""

from __future__ import annotations

import base64
import json
import re
import subprocess
import sys
from importlib.metadata import EntryPoint
from pathlib import Path

import msgspec
import pytest

import transport.__main__ as command_line
from transport import ScenarioError, load_scenario, period_verdict, scenario_from_document
from transport.handoff import scenario_hash
from transport.limits import GROWTH
from webapp.enclosed import scenario_from_report
from webapp.report import SECTIONS, Matter, report_html

HERON = load_scenario("scenarios/heron-gate.toml")
HOSTILE = "</script><script>window.XSS = 1</script><img src=x onerror='window.XSS = 1'>"


@pytest.fixture(scope="module")
def heron() -> str:
    return report_html(HERON)


def test_a_report_holds_verdict_figures_ledger_limits_and_the_scenario(heron: str) -> None:
    assert len(heron.encode()) < 6_000_000
    for wanted in (period_verdict(HERON).sentence, scenario_hash(HERON), GROWTH, "certified: 13 counted, 13 found",
                   "6.62607015e-34", "colonnade 0."):
        assert wanted in heron
    assert len(re.findall("class='canvas'", heron)) == 5
    assert scenario_from_report(heron).document == HERON.document


def test_a_report_asks_no_other_server_for_anything(heron: str) -> None:
    markup = re.sub(r"<script.*?</script>|<style.*?</style>", "", heron, flags=re.DOTALL)
    assert not re.search(r"(src|href)=", markup)
    assert not re.search(r"@import|url\(\s*['\"]?http", heron)


@pytest.mark.parametrize("file", sorted(Path("scenarios").glob("*.toml")), ids=lambda file: file.stem)
def test_every_section_of_every_demo_can_be_written(file: Path) -> None:
    matter = Matter(load_scenario(file))
    for section in SECTIONS:
        assert section(matter).startswith("<section")


def test_what_users_wrote_stays_text() -> None:
    evil = scenario_from_document(msgspec.structs.replace(HERON.document, title=HOSTILE, note=HOSTILE))
    text = report_html(evil)
    assert "<script>window.XSS" not in text and "<img src=x" not in text
    assert scenario_from_report(text).title == HOSTILE


@pytest.mark.parametrize(("text", "sentence"), [
    ("", "report: holds no scenario"), ("<html>", "report: holds no scenario"),
    ('<script type="text/plain" id="scenario-toml">!!</script>', "report: holds no scenario"),
    ('<script type="text/plain" id="scenario-toml">abc</script>', "report: holds a scenario that was altered"),
    (f'<script type="text/plain" id="scenario-toml">{base64.b64encode(b"format = 2").decode()}</script>',
     "format: is 2, but this version reads format = 1 only"),
    ("x" * 8_000_001, "report: is larger than 8,000,000 bytes"),
])
def test_what_is_no_report_is_refused_in_one_sentence(text: str, sentence: str) -> None:
    with pytest.raises(ScenarioError, match=re.escape(sentence)):
        scenario_from_report(text)


def test_the_command_line_writes_a_report_and_overwrites_nothing(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    place = tmp_path / "heron.html"
    command = ["report", "scenarios/heron-gate.toml", "--save", str(place), "--json"]
    assert command_line.main(command) == 0
    assert json.loads(capsys.readouterr().out) == {"file": str(place), "bytes": place.stat().st_size}
    assert scenario_from_report(place.read_text()).document == HERON.document
    assert command_line.main(command) == 2
    assert "is there already" in capsys.readouterr().err


def test_an_installation_that_makes_no_reports_says_so(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setattr(command_line, "entry_points", lambda **wanted: ())
    assert command_line.main(["report", "scenarios/heron-gate.toml", "--save", str(tmp_path / "a.html")]) == 2
    assert capsys.readouterr().err.startswith("report: this installation has no part that makes reports")


def test_an_installation_whose_reports_lack_a_library_says_which(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    lacking = EntryPoint("html", "a_library_nobody_has:report_html", "colonnade.reports")
    monkeypatch.setattr(command_line, "entry_points", lambda **wanted: (lacking,))
    assert command_line.main(["report", "scenarios/heron-gate.toml", "--save", str(tmp_path / "a.html")]) == 2
    assert "No module named 'a_library_nobody_has'" in capsys.readouterr().err
    assert not list(tmp_path.iterdir())


@pytest.mark.parametrize("module", ["panel", "bokeh", "webapp"])
def test_the_command_line_alone_does_not_bring(module: str) -> None:
    program = f"import sys, transport.__main__; sys.exit(any(m.split('.')[0] == {module!r} for m in sys.modules))"
    assert subprocess.run([sys.executable, "-c", program], check=False).returncode == 0
