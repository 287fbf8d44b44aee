"""The report: one HTML file that holds verdict, live figures, tables, cautions and the scenario itself.

It needs neither network nor this program to be read, prints on A4, and gives its scenario back.
"""

from __future__ import annotations

import datetime
from collections.abc import Callable
from pathlib import Path

from bokeh.embed import components
from bokeh.resources import Resources

from transport import Scenario, ScenarioError, format_scenario, parse_scenario
from transport.handoff import scenario_hash
from transport.periods import no_progress
from transport.refusal import refuse_unless
from webapp.figures.frame import MEV, EnergyAxis
from webapp.findings import findings
from webapp.markup import text
from webapp.report_sections import SECTIONS, Card, Row, Section
from webapp.theme import css_variables

LARGEST = 6_000_000
"""Characters of a report that are read."""

_HERE = Path(__file__).parent
_OPENING = '<script type="application/toml" id="scenario">\n'
_CLOSING = "</script>"
# A report asks for nothing; eval is what Bokeh forms its axis labels with.
_POLICY = ("default-src 'none'; script-src 'unsafe-inline' 'unsafe-eval'; style-src 'unsafe-inline'; "
           "img-src data: blob:")
# Figures do not follow the paper's width: they keep the size they have on screen, side by side, and the row is scaled.
_SCRIPT = """
const measure = () => {
  if (matchMedia("print").matches) return
  for (const row of document.querySelectorAll(".row")) {
    const cards = [...row.children]
    for (const card of cards) {
      card.style.setProperty("--wide", card.offsetWidth)
      card.style.setProperty("--tall", card.querySelector(".canvas").offsetHeight)
    }
    const gaps = (cards.length - 1) * parseFloat(getComputedStyle(row).columnGap)
    row.style.setProperty("--wide", cards.reduce((sum, card) => sum + card.offsetWidth, gaps))
  }
}
addEventListener("resize", measure)
measure()
"""


def report_html(
    scenario: Scenario, date: datetime.date | None = None, progress: Callable[[float], None] = no_progress
) -> str:
    """The report on a scenario, dated today unless `date` is given. Raises ValueError where the one-band model ends."""
    found = findings(scenario, progress)
    axis = EnergyAxis(found.span[0] * MEV, found.span[1] * MEV)
    sections = [section for make in SECTIONS if (section := make(found, axis)) is not None]
    return _page(scenario, sections, date or datetime.date.today())


def scenario_from_report(html: str) -> Scenario:
    """The scenario that a report holds. Raises ScenarioError for anything else."""
    refuse_unless(len(html) <= LARGEST, "report", f"is larger than {LARGEST:,} characters; none of ours is")
    start = html.find(_OPENING)
    end = html.find(_CLOSING, start + len(_OPENING)) if start >= 0 else -1
    if end < 0:
        raise ScenarioError("report", "holds no scenario; choose a report that this program has written")
    refuse_unless(html.find(_OPENING, end) < 0, "report", "holds more than one scenario; it is none of ours")
    return parse_scenario(html[start + len(_OPENING):end])


def _page(scenario: Scenario, sections: list[Section], date: datetime.date) -> str:
    cards = [card for section in sections for part in section.parts if isinstance(part, Row) for card in part.cards]
    for card in cards:
        # Sharp on paper; what the toolbar is for shows when the pointer asks for it.
        card.figure.output_backend = "svg"
        card.figure.toolbar.autohide = True
    script, divs = components({card.figure.name: card.figure for card in cards})
    toml = format_scenario(scenario)
    body = "".join(_section(section, divs) for section in sections)
    style = css_variables().split("\n")[0] + (_HERE / "report.css").read_text(encoding="utf-8")
    return f"""<!doctype html>
<html lang="en">
<head>
<meta charset="utf-8">
<meta name="viewport" content="width=device-width, initial-scale=1">
<meta http-equiv="Content-Security-Policy" content="{_POLICY}">
<title>{text(scenario.title)} \N{MIDDLE DOT} Colonnade report</title>
<style>{style}</style>
{_OPENING}{_harmless(toml)}{_CLOSING}
{Resources(mode="inline", components=["bokeh"]).render_js()}
</head>
<body>
<main>
<header>
<p class="brand">{(_HERE / "assets" / "mark.svg").read_text(encoding="utf-8")}<span>Colonnade</span>
<time datetime="{date.isoformat()}">{date.day} {date:%B %Y}</time></p>
<h1>{text(scenario.title)}</h1>
<p class="about">{text(scenario.note)}</p>
</header>
{body}
<section id="file">
<h2>The scenario</h2>
<p class="note">Save it as a .toml file to open it again, or open this report. SHA-256 of its canonical form:
<code>{scenario_hash(scenario)}</code></p>
<pre>{text(toml)}</pre>
</section>
</main>
{script}
<script>{_SCRIPT}</script>
</body>
</html>
"""


def _section(section: Section, divs: dict[str, str]) -> str:
    parts = "".join(part if isinstance(part, str) else _row(part, divs) for part in section.parts)
    return f'<section id="{section.key}">\n<h2>{text(section.title)}</h2>\n{parts}\n</section>\n'


def _row(row: Row, divs: dict[str, str]) -> str:
    return f'<div class="row of-{len(row.cards)}">{"".join(_figure(card, divs) for card in row.cards)}</div>'


def _figure(card: Card, divs: dict[str, str]) -> str:
    name = card.figure.name
    return (f'<figure aria-describedby="words-{name}"><figcaption>{card.caption}</figcaption>'
            f'<div class="canvas">{divs[name]}</div>'
            f'<p id="words-{name}" class="visually-hidden">{text(card.words)}</p></figure>')


def _harmless(toml: str) -> str:
    """TOML that no script block ends early for: `<` stands within strings only, where its escape is the same text."""
    return toml.replace("<", "\\u003C")
