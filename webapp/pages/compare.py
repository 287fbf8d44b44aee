"""The page *Compare*: the stack on the bench beside up to three others, fact by fact."""

from __future__ import annotations

import functools
import math
from typing import Any

from transport import Scenario, ScenarioError, lattice_bands, period_verdict, resonances
from transport.resolve import SheetRow
from webapp.figures.frame import MEV
from webapp.ledger import MOST_LISTED_PERIODS
from webapp.pages.peaks import number
from webapp.results import natural_span, question

View = dict[str, Any]
Facts = tuple[tuple[str, str], ...]
"""What is compared: name and value, the same names for every scenario."""

_MOST_NAMED = 4
NONE = "\N{EN DASH}"


@functools.lru_cache(maxsize=16)
def facts(scenario: Scenario) -> Facts:
    """The facts of a scenario's stack, its verdict and its peaks."""
    stack, asked = scenario.stack, question(scenario)
    span = natural_span(asked)
    return (
        ("leads", " to ".join(dict.fromkeys(_medium(scenario.sheet[place]) for place in (0, -1)))),
        *((f"{part} layers", _layers(scenario, part)) for part in ("entry", "cell", "exit")),
        ("periods", f"{stack.periods:,}"), ("length", f"{stack.length:.5g} nm"),
        *_verdict(scenario), ("minibands", _minibands(scenario, span)), ("resonances", _peaks(scenario, span)),
    )


def _layers(scenario: Scenario, part: str) -> str:
    rows = [row for row in scenario.sheet if row.where == part]
    shown = ", ".join(f"{_medium(row)} {number(row.thickness or 0.0)} nm" if row.strength is None
                      else f"delta {number(row.strength)} eV nm" for row in rows[:8])
    return f"{shown} and {len(rows) - 8} more" if len(rows) > 8 else shown or "none"


def _medium(row: SheetRow) -> str:
    if row.material is None:
        return f"edge {number((row.band_edge or 0.0) * MEV)} meV"
    return row.material if row.x is None else f"{row.material} {number(row.x, 3)}"


def _verdict(scenario: Scenario) -> Facts:
    names = ("fewest periods", "margin of this count", "best margin", "verdict")
    if scenario.target is None or not scenario.target.windows:
        return tuple(zip(names, (NONE, NONE, NONE, "no window is asked"), strict=True))
    try:
        found = period_verdict(question(scenario))
    except ValueError as error:
        return tuple(zip(names, (NONE, NONE, NONE, str(error)), strict=True))
    count = scenario.stack.periods
    best = max(found.per_period, key=lambda check: -math.inf if check.margin_dB is None else check.margin_dB)
    present = found.per_period[count - 1].margin_dB if count <= len(found.per_period) else None
    return tuple(zip(names, (
        NONE if found.fewest is None else str(found.fewest), _margin(present),
        _margin(best.margin_dB) + (f" at {best.periods}" if best.margin_dB is not None else ""), found.sentence,
    ), strict=True))


def _margin(value: float | None) -> str:
    return NONE if value is None else f"{number(value, 3, sign=True)} dB"


def _minibands(scenario: Scenario, span: tuple[float, float]) -> str:
    try:
        bands = lattice_bands(scenario.stack, span).bands
    except (ValueError, ScenarioError) as error:
        return str(error)
    shown = "; ".join(f"{number(b.bottom * MEV, 5)} to {number(b.top * MEV, 5)} meV" for b in bands[:_MOST_NAMED])
    return shown or "none in range"


def _peaks(scenario: Scenario, span: tuple[float, float]) -> str:
    if scenario.stack.periods > MOST_LISTED_PERIODS:
        return f"not listed above {MOST_LISTED_PERIODS} periods"
    try:
        found = resonances(scenario.stack, span)
    except ValueError as error:
        return str(error)
    first = ", ".join(number(float(e) * MEV, 5) for e in found.energy[:_MOST_NAMED])
    more = " \u2026" if found.energy.size > _MOST_NAMED else ""
    return f"{found.energy.size}: {first}{more} meV" if first else "none"


def compare_view(names: list[str], columns: list[Facts], colours: list[str]) -> View:
    """The table: one column for each scenario, the present one first; a row says whether its values differ."""
    rows = [
        {"name": name, "values": [column[place][1] for column in columns],
         "differs": len({column[place][1] for column in columns}) > 1}
        for place, (name, _) in enumerate(columns[0])
    ] if columns else []
    return {"names": names, "colours": colours, "rows": rows}
