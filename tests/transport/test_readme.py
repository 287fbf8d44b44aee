"""The README is true: its scenario loads, its program runs, its commands answer, its limits are the code's."""

from __future__ import annotations

import contextlib
import io
import re
import shlex
from pathlib import Path

import pytest

from transport import parse_scenario, period_verdict
from transport.__main__ import main
from transport.limits import GROWTH, LIMITS
from transport.parameters import PARAMETERS

CHECKOUT = Path(__file__).parents[2]
README = (CHECKOUT / "README.md").read_text()


def blocks(language: str) -> list[str]:
    return re.findall(rf"```{language}\n(.*?)```", README, re.DOTALL)


def limits() -> str:
    """The table of limits as the README has it."""
    rows = ["| key | unit | default | limits | what it is |", "| --- | --- | --- | --- | --- |"]
    for p in PARAMETERS.values():
        default = "" if p.default is None else f"{p.default:g}"
        limit = p.requirement.removeprefix("must be ")
        rows.append(f"| `{p.name}` | {p.unit} | {default} | {limit} | {p.help} |")
    return "\n".join(rows)


def test_the_scenario_is_met() -> None:
    text, _ = blocks("toml")
    assert period_verdict(parse_scenario(text)).fewest is not None


def test_the_optional_tables_are_read() -> None:
    scenario = parse_scenario("\n".join(blocks("toml")))
    assert scenario.document.stack.ends is not None and scenario.document.growth is not None
    assert len(scenario.stack.entry) == 2


def test_the_program_runs(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(CHECKOUT)
    (program,) = blocks("python")
    with contextlib.redirect_stdout(io.StringIO()) as printed:
        exec(compile(program, "README.md", "exec"), {})
    assert printed.getvalue().startswith("Fewest periods: 10.")


@pytest.mark.parametrize("command", blocks("console")[0].splitlines())
def test_every_command_answers(
    command: str, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(CHECKOUT)
    words = shlex.split(command)
    assert words[:3] == ["python3", "-m", "transport"]
    assert main(words[3:]) == 0
    assert capsys.readouterr().out


def test_the_models_limits_are_those_that_reports_carry() -> None:
    text = " ".join((CHECKOUT / "README.md").read_text().split())
    for head, rest in LIMITS:
        assert f"**{head}** {rest}" in text or f"{head} {rest}" in text
    assert GROWTH.removeprefix("Growth") in text


def test_the_limits_are_those_of_the_code() -> None:
    between = re.search(r"<!-- limits: begin -->\n(.*)\n<!-- limits: end -->", README, re.DOTALL)
    assert between is not None and between[1] == limits()


def test_the_picture_is_there() -> None:
    for place in re.findall(r"!\[[^]]*\]\(([^)]+)\)", README):
        assert (CHECKOUT / place).is_file()
