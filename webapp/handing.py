"""The page *Hand-off* of one session: what leaves as a file, made off the event loop, and layer sheets that come in."""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass

from transport import Scenario, ScenarioError
from transport.document import LayerRecord
from transport.handoff import TABLES, grower_csv, python_script, table, to_csv, to_json
from transport.scenario import format_scenario
from transport.sheet import read_layer_sheet, read_rates
from webapp.latest import Latest, Stop
from webapp.messages import in_words
from webapp.pages.handoff import sheet_view
from webapp.remedies import Later
from webapp.results import Span
from webapp.service import Visit

_CSV, _JSON, _PLAIN = "text/csv", "application/json", "text/plain"


@dataclass(frozen=True, slots=True)
class Export:
    """Something to be made: `what` of a scenario over `span` (eV); `rates` as `sheet.read_rates` reads them."""

    scenario: Scenario
    what: str
    span: Span
    rates: str = ""


def export(asked: Export, stop: Stop) -> tuple[str, str, str]:
    """File name, media type and text of what is asked for. Raises ValueError as the engine does."""
    scenario, what = asked.scenario, asked.what
    stem = re.sub(r"[^a-z0-9]+", "-", scenario.title.lower()).strip("-")[:60] or "scenario"
    if what == "report":
        from webapp.report import report_html  # BokehJS is read for it

        return f"{stem}.html", "text/html", report_html(scenario)
    if what == "scenario":
        return f"{stem}.toml", _PLAIN, format_scenario(scenario)
    if what == "python":
        return f"{stem}.py", _PLAIN, python_script(scenario, asked.span)
    if what == "grower":
        return f"{stem}-to-grow.csv", _CSV, grower_csv(scenario, read_rates(asked.rates))
    if what == "json":
        tables = {}
        for name in TABLES:
            stop.check()
            tables[name] = table(scenario, name, asked.span)
        return f"{stem}.json", _JSON, to_json(scenario, tables)
    return f"{stem}-{what}.csv", _CSV, to_csv(scenario, table(scenario, what, asked.span))


class Handing:
    """What goes out and comes in. `tell` hands named parts to the page; `later` is the way of results to it."""

    def __init__(self, tell: Callable[..., None], later: Later, visit: Visit) -> None:
        self._tell = tell
        self._layers: tuple[LayerRecord, ...] = ()
        self._exports = Latest(export, later(self._made), later(self._not_made), interrupts=True, line=visit.line)

    def close(self) -> None:
        """The visitor has gone."""
        self._exports.cancel()

    def make(self, scenario: Scenario, what: str, span: Span, rates: str) -> None:
        """Make something that leaves as a file."""
        self._tell(handoff={"state": "working", "sentence": ""})
        self._exports.ask(Export(scenario, what, span, rates))

    def _made(self, _: Export, found: tuple[str, str, str]) -> None:
        name, media, text = found
        self._tell(handoff={"state": "none", "sentence": f"{name} is ready."},
                   download={"name": name, "media": media, "text": text})

    def _not_made(self, _: Export, error: Exception) -> None:
        self._tell(handoff={"state": "fault", "sentence": in_words(error)})

    def look_at(self, text: str, unit: str | None) -> None:
        """Read a layer sheet and show what it comes to."""
        self._layers = ()
        try:
            read = read_layer_sheet(text, unit)
        except ScenarioError as error:
            self._tell(sheet=sheet_view((), (str(error),)))
            return
        # A sheet is taken whole or not at all: a layer left out would be another stack.
        self._layers = () if read.faults else read.layers
        self._tell(sheet=sheet_view(read.layers, read.faults))

    def taken(self) -> tuple[LayerRecord, ...]:
        """The layers of the sheet that was read last; none where a line of it was wrong."""
        return self._layers
