"""The report: one HTML file with everything worked out for a scenario, the figures alive, and the scenario itself.

It needs no server and no network, prints on A4, and opens again on the bench. A new capability adds its section to
`SECTIONS`, and nothing else.
"""

from __future__ import annotations

import datetime
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from html import escape
from pathlib import Path

from bokeh.embed import components
from bokeh.resources import Resources

from transport import Scenario, ScenarioError, Verdict, period_verdict, verdict_range
from transport.constants import ELECTRON_MASS, ELEMENTARY_CHARGE, HBAR2_2M0, PLANCK
from transport.handoff import scenario_hash, versions
from transport.limits import GROWTH, LIMITS
from transport.periods import window_in_words
from transport.scenario import format_scenario
from webapp.enclosed import enclosed
from webapp.figures.board import Board
from webapp.figures.frame import MEV
from webapp.latest import Stop
from webapp.ledger import Ledger, Listing, ledger
from webapp.pages.peaks import ledger_view, number
from webapp.results import natural_span, question
from webapp.theme import LIGHT, css_variables
from webapp.work import Pictures, Wanted, pictures

_STYLE = Path(__file__).parent / "assets" / "report.css"
_MOST_ROWS = 300
# Figures do not follow the width of paper: there each keeps its size on screen, and the row is scaled as one picture.
_PAPER = """<script>
const measure = () => {
  if (matchMedia("print").matches) return
  for (const row of document.querySelectorAll(".figures")) {
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
</script>"""


@dataclass(frozen=True)
class Matter:
    """What a report is about: each part is worked out when a section first asks for it."""

    scenario: Scenario

    @cached_property
    def span(self) -> tuple[float, float]:
        """The energies shown (eV)."""
        return natural_span(question(self.scenario))

    @cached_property
    def verdict(self) -> Verdict | None:
        """The verdict; None where no window is asked."""
        target = self.scenario.target
        return period_verdict(question(self.scenario)) if target is not None and target.windows else None

    @cached_property
    def pictures(self) -> Pictures:
        """What the figures draw."""
        return pictures(Wanted(self.scenario, self.span, self.span, 0), Stop())

    @cached_property
    def ledger(self) -> Ledger:
        """The resonances. Raises ValueError for more periods than a ledger lists."""
        return ledger(Listing(self.scenario, self.span), Stop())

    @cached_property
    def figures(self) -> tuple[str, dict[str, str]]:
        """The script that draws all figures, which share their energy axis, and the place of each by its name."""
        board = self._board()
        parts = (board.profile, board.passes, board.lattice, board.periods.margins, board.periods.emergence)
        for part in parts:
            # Lines that stay sharp on paper, which has no pointer for the tools either.
            part.figure.output_backend = "svg"
            part.figure.toolbar.autohide = True
        script, places = components({part.figure.name: part.figure for part in parts})
        return script, dict(places)

    def _board(self) -> Board:
        board = Board(self.span, drags=True)
        board.paint(LIGHT)
        wanted = Wanted(self.scenario, self.span, self.span, 0)
        board.passes.ask(self.scenario.target)
        board.show(wanted, self.pictures)
        board.show_page(wanted, self.pictures)
        board.show_verdict(self.verdict)
        # What the browser would preview a slider with: a report has none.
        board.passes.hold(None, -1)
        return board


def _verdict(matter: Matter) -> str:
    verdict, scenario = matter.verdict, matter.scenario
    if verdict is None:
        return _section("Verdict", "<p class='sentence'>No window is asked, so there is no verdict.</p>", "verdict")
    state = "met" if verdict.fewest is not None else "missed"
    lines = [f"<p class='sentence'>{escape(verdict.sentence)}</p>"]
    try:
        found = verdict_range(scenario)
        lines.append(f"<p><b>{escape(found.sentence)}</b> <span class='quiet'>{escape(found.assumed)}</span></p>")
    except ScenarioError as error:
        lines.append(f"<p class='quiet'>No range: {escape(str(error))}.</p>")
    windows = [f"{window_in_words(w)}: {w.measure} {'at least' if w.kind == 'pass' else 'at most'} {w.transmission:g}"
               for w in verdict.windows]
    lines.append(_list(windows))
    return _section("Verdict", "".join(lines), f"verdict {state}")


def _bench(matter: Matter) -> str:
    certificate = matter.pictures.lattice.bands.certificate.sentence
    return _section("Bench", _figures(matter, {
        "profile": "Band edge along growth", "passes": f"What {_periods(matter)} let through",
        "lattice": f"Infinite lattice, {certificate}"}))


def _emerging(matter: Matter) -> str:
    margins = {"margins": "Margin of every count"} if matter.verdict else {}
    return _section("Periods", _figures(matter, {**margins, "emergence": "Transmission as periods are added"}, "two"))


def _stack(matter: Matter) -> str:
    scenario = matter.scenario
    rows = [(row.where, row.material or row.profile or ("delta" if row.strength is not None else "by its edge"),
             f"{row.x_ends[0]:g} to {row.x_ends[1]:g}" if row.x_ends else row.x, row.thickness, row.monolayers,
             None if row.band_edge is None else row.band_edge * MEV, row.mass) for row in scenario.sheet]
    header = ("where", "material", "x", "thickness (nm)", "monolayers", "band edge (meV)", "mass (m\u2080)")
    words = f"{_periods(matter)} of {scenario.stack.period_length:.5g} nm, {scenario.stack.length:.5g} nm in all."
    return _section("Stack", f"<p>{escape(words)}</p>{_table(header, rows)}", "long")


def _bands(matter: Matter) -> str:
    bands = matter.pictures.lattice.bands
    rows = [(f"miniband {b.index}", b.bottom * MEV, b.top * MEV, (b.top - b.bottom) * MEV) for b in bands.bands]
    return _section("Bands of the infinite lattice", _seal(bands.certificate.sentence, bands.certificate.complete)
                    + _table(("", "bottom (meV)", "top (meV)", "width (meV)"), rows), "long")


def _resonances(matter: Matter) -> str:
    try:
        view = ledger_view(matter.ledger, None)
    except ValueError as error:
        return _section("Resonances", f"<p>{escape(str(error))}</p>")
    rows = [[text for _, text in row] for row in view["rows"][:_MOST_ROWS]]
    more = len(view["rows"]) - len(rows)
    told = [view["measured"], view["bound"], f"{more:,} more are left out here." if more > 0 else ""]
    return _section("Resonances", _seal(view["certificate"], view["complete"])
                    + _table([column["name"] for column in view["columns"]], rows)
                    + "".join(f"<p class='quiet'>{escape(line)}</p>" for line in told if line), "long")


def _cautions(matter: Matter) -> str:
    limits = [f"<li><b>{_plain(head)}</b> {_plain(rest)}</li>" for head, rest in LIMITS]
    warnings = _list(matter.scenario.warnings) if matter.scenario.warnings else ""
    said = f"{warnings}<ul>{''.join(limits)}</ul><p><b>{escape(GROWTH)}</b></p>"
    return _section("How far this can be trusted", said, "caution long")


def _origin(matter: Matter) -> str:
    constants = [("Planck constant (J s)", f"{PLANCK:.12g}"), ("elementary charge (C)", f"{ELEMENTARY_CHARGE:.12g}"),
                 ("electron mass (kg)", f"{ELECTRON_MASS:.12g}"),
                 ("\u0127\u00b2/2m\u2080 (eV nm\u00b2)", f"{HBAR2_2M0:.16g}")]
    made = ", ".join(f"{name} {text}" for name, text in versions().items())
    text = format_scenario(matter.scenario)
    return _section("Where the numbers come from", _table(("CODATA 2022", "value"), constants)
                    + f"<p class='quiet'>{escape(made)}; scenario SHA-256 {scenario_hash(matter.scenario)}</p>"
                    + f"<h2>The scenario</h2><pre>{escape(text)}</pre>", "long")


Section = Callable[[Matter], str]
SECTIONS: tuple[Section, ...] = (_verdict, _bench, _emerging, _stack, _bands, _resonances, _cautions, _origin)
"""The report, part by part."""


def report_html(scenario: Scenario) -> str:
    """The report of a scenario. Raises ValueError where the one-band model ends within the energies shown."""
    matter = Matter(scenario)
    body = "".join(section(matter) for section in SECTIONS)
    script, _ = matter.figures
    today = datetime.datetime.now(datetime.UTC).strftime("%Y-%m-%d %H:%M UTC")
    said = f"Colonnade report, {today}. Energies count from the left lead\u2019s band edge."
    note = f"<p class='note'>{escape(scenario.note)}</p>" if scenario.note else ""
    return (
        "<!DOCTYPE html>\n<html lang='en'><head><meta charset='utf-8'>"
        "<meta name='viewport' content='width=device-width, initial-scale=1'>"
        f"<title>{escape(scenario.title)} \u00b7 Colonnade</title><style>{css_variables()}{_STYLE.read_text()}</style>"
        f"{Resources(mode='inline', components=['bokeh']).render()}</head><body><main><header>"
        f"<h1>{escape(scenario.title)}</h1>"
        f"<p class='quiet'>{said}</p>{note}</header>"
        f"{body}</main>{script}{_PAPER}{enclosed(scenario)}</body></html>\n"
    )


# Pieces of HTML; text only ever enters escaped.


def _section(title: str, body: str, kind: str = "") -> str:
    return f"<section class='{kind}'><h2>{escape(title)}</h2>{body}</section>"


def _figures(matter: Matter, captions: Mapping[str, str], kind: str = "") -> str:
    _, places = matter.figures
    drawn = (f"<figure><figcaption>{escape(caption)}</figcaption><div class='canvas'>{places[name]}</div></figure>"
             for name, caption in captions.items())
    return f"<div class='figures {kind}'>{''.join(drawn)}</div>"


def _table(header: Sequence[str], rows: Iterable[Sequence[object]]) -> str:
    head = "".join(f"<th>{escape(name)}</th>" for name in header)
    body = "".join("<tr>" + "".join(f"<td>{escape(_cell(value))}</td>" for value in row) + "</tr>" for row in rows)
    return f"<div class='wide'><table><thead><tr>{head}</tr></thead><tbody>{body}</tbody></table></div>"


def _cell(value: object) -> str:
    return "" if value is None else number(value, 6) if isinstance(value, float) else str(value)


def _list(lines: Iterable[str]) -> str:
    return f"<ul>{''.join(f'<li>{escape(line)}</li>' for line in lines)}</ul>"


def _seal(sentence: str, complete: bool) -> str:
    return f"<p class='seal{'' if complete else ' open'}'>{escape(sentence)}</p>"


def _plain(text: str) -> str:
    return escape(text.replace("`", ""))


def _periods(matter: Matter) -> str:
    count = matter.scenario.stack.periods
    return "1 period" if count == 1 else f"{count:,} periods"
