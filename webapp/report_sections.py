"""The sections of the report, one function each: what is found becomes markup and figures.

A new section is a function at its place in SECTIONS.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from bokeh.models import Span

from transport import constants
from transport.cautions import GROWTH, TRUST
from transport.handoff import versions
from transport.sheet import grown_layers, sheet_notes
from webapp.figures.frame import MEV, EnergyAxis
from webapp.figures.lattice import LatticeFigure, Minibands, describe_lattice
from webapp.figures.margins import MarginsFigure, describe_margins
from webapp.figures.passes import PassesFigure, describe_passes
from webapp.figures.profile import ProfileFigure, describe_profile
from webapp.findings import Findings
from webapp.markup import Markup, coded, listed, number, paragraphs, table, text
from webapp.pages.periods import verdict_view
from webapp.theme import LIGHT

MOST_ROWS = 120
"""Rows of a table that a report lists; the data files have them all."""


@dataclass(frozen=True, slots=True)
class Card:
    """A live figure with its caption (markup) and its text alternative."""

    figure: Any
    caption: str
    words: str


@dataclass(frozen=True, slots=True)
class Row:
    """Figures side by side; stacked where there is no room."""

    cards: tuple[Card, ...]


@dataclass(frozen=True, slots=True)
class Section:
    """A section under its title; parts are markup or rows of figures."""

    key: str
    title: str
    parts: tuple[str | Row, ...]


def verdict_section(found: Findings, axis: EnergyAxis) -> Section:
    """The answer, how far it can be off, and how the stack as it stands does."""
    view = verdict_view(found.verdict, found.scenario.stack.periods, LIGHT)
    spread = ""
    if isinstance(found.range, str):
        spread = f'<p class="range">Range: {text(found.range)}</p>'
    elif found.range is not None:
        spread = (f'<p class="range">{text(found.range.sentence)} '
                  f'<span class="quiet">{text(found.range.assumed)}</span></p>')
    body = (f'<div class="answer" data-state="{view["state"]}"><p class="sentence">{text(view["sentence"])}</p>'
            f'{spread}<p class="quiet">{text(view["present"])}</p></div>')
    return Section("verdict", "Verdict", (body,))


def bench_section(found: Findings, axis: EnergyAxis) -> Section:
    """Profile, transmission and infinite lattice on the one energy axis."""
    scenario, minibands = found.scenario, Minibands()
    profile, passes = ProfileFigure(axis, drags=False), PassesFigure(axis, drags=False)
    infinite = LatticeFigure(axis, minibands, drags=False)
    minibands.shade(profile.figure)
    minibands.shade(passes.figure)
    for part in (profile, passes, infinite, minibands):
        part.paint(LIGHT)
    minibands.show(found.lattice.bands)
    profile.show(found.profile, found.span)
    passes.ask(scenario.target)
    passes.show(found.passage)
    infinite.show(found.lattice)
    infinite.show_points(found.points)
    count = scenario.stack.periods
    verb = "1 period passes" if count == 1 else f"{count:,} periods pass"
    beam = f" dashed: seen at {scenario.resolution * 1e3:g} meV" if scenario.resolution else ""
    windows = scenario.target.windows if scenario.target else ()
    return Section("bench", "One energy axis", (Row((
        Card(profile.figure, '<span><b class="warm">Band edge</b> along growth</span>',
             describe_profile(scenario.stack, found.profile)),
        Card(passes.figure, f'<span><b class="warm">{verb}</b><span class="quiet">{text(beam)}</span></span>',
             describe_passes(found.passage, windows)),
        Card(infinite.figure, '<b class="cool">Infinite lattice</b> '
             f'<span class="quiet">{text(found.lattice.bands.certificate.sentence)}</span>',
             describe_lattice(found.lattice)))),
        *([paragraphs([found.passage.note])] if found.passage.note else [])))


def margins_section(found: Findings, axis: EnergyAxis) -> Section | None:
    """The margin of every number of periods."""
    if found.verdict is None:
        return None
    marker = Span(location=found.scenario.stack.periods, dimension="height", line_width=2,
                  line_color=LIGHT.marker)
    margins = MarginsFigure(marker, drags=False)
    margins.paint(LIGHT)
    margins.show(found.verdict)
    legend = "".join(f'<span style="color:{entry["colour"]}"><i class="key {entry["kind"]}"></i>{text(entry["name"])}'
                     "</span>" for entry in verdict_view(found.verdict, 1, LIGHT)["legend"])
    lead = paragraphs(["Filled marks meet the target, hollow ones miss it; colour and shape name the window that "
                       "limits. The upright line is the stack as it stands."])
    return Section("margins", "Margin of every number of periods", (lead, Row((
        Card(margins.figure, f'<span class="legend">{legend}</span>', describe_margins(found.verdict)),))))


def target_section(found: Findings, axis: EnergyAxis) -> Section | None:
    """What is asked."""
    target = found.scenario.target
    if target is None or not target.windows:
        return None
    rows = [(place, w.kind, w.bottom * MEV, w.top * MEV, w.measure,
             Markup(("\N{GREATER-THAN OR EQUAL TO} " if w.kind == "pass" else "\N{LESS-THAN OR EQUAL TO} ")
                    + number(w.transmission))) for place, w in enumerate(target.windows, 1)]
    words = f"Every window met, with at most {target.most_periods:,} periods."
    return Section("target", "Target", (paragraphs([words]), table(
        ("window", "kind", "from (meV)", "to (meV)", "measured by", "transmission"), rows, "Target")))


def ledger_section(found: Findings, axis: EnergyAxis) -> Section:
    """Every resonance, certified."""
    title, ledger = "Resonances", found.ledger
    if isinstance(ledger, str):
        return Section("resonances", title, (paragraphs([ledger], "fault"),))
    rows = [(int(ledger.index[i]), ledger.energy[i] * MEV, ledger.width[i] * MEV, ledger.lifetime[i] * 1e12,
             ledger.peak_transmission[i],
             f"{ledger.miniband[i]}.{ledger.number[i]}" if ledger.miniband[i] else "in a gap")
            for i in range(min(ledger.energy.size, MOST_ROWS))]
    head = ("no.", "energy (meV)", "width (meV)", "lifetime (ps)", "peak transmission", "miniband")
    still = " without its dephasing" if found.scenario.stack.dephasing else ""
    notes = [f"The ledger of the stack as it stands{still}, {ledger.certificate.sentence}."]
    if ledger.bound.size:
        bound = ", ".join(f"{energy * MEV:.6g}" for energy in ledger.bound[:MOST_ROWS])
        notes.append(f"Bound below both leads: {bound} meV.")
    return Section("resonances", title, (
        paragraphs(notes), table(head, rows, title, 6) if rows else "", _more(ledger.energy.size)))


def peaks_section(found: Findings, axis: EnergyAxis) -> Section | None:
    """The first measured peaks beside the resonances they are."""
    peaks, title = found.peaks, "Measured peaks"
    if peaks is None:
        return None
    if isinstance(peaks, str):
        return Section("peaks", title, (paragraphs([peaks], "fault"),))
    measured, ledger = peaks.measured, peaks.resonances
    rows = []
    for place, partner in enumerate(peaks.pairs[:MOST_ROWS]):
        own = (int(ledger.index[partner]), ledger.energy[partner] * MEV, peaks.deviation[place] * MEV,
               ledger.width[partner] * MEV) if partner >= 0 else (None,) * 4
        rows.append((measured.energy[place] * MEV, measured.uncertainty[place] * MEV, *own[:3],
                     measured.width[place] * MEV, own[3]))
    head = ("measured (meV)", "uncertainty (meV)", "resonance", "computed (meV)", "measured \N{MINUS SIGN} computed "
            "(meV)", "measured width (meV)", "computed width (meV)")
    words = f"Paired in order, never crossing. Root mean square deviation {peaks.rms * MEV:.4g} meV."
    return Section("peaks", title, (paragraphs([words]), table(head, rows, title), _more(measured.energy.size)))


def bands_section(found: Findings, axis: EnergyAxis) -> Section:
    """The infinite lattice's bands, certified."""
    bands = found.lattice.bands
    rows = [(b.index, b.bottom * MEV, b.top * MEV, (b.top - b.bottom) * MEV, b.bottom_mass, b.top_mass)
            for b in bands.bands[:MOST_ROWS]]
    low, high = (edge * MEV for edge in found.span)
    words = f"Minibands from {low:.5g} to {high:.5g} meV, {bands.certificate.sentence}.".replace("-", "\N{MINUS SIGN}")
    head = ("miniband", "bottom (meV)", "top (meV)", "width (meV)", "mass at bottom (m\u2080)", "mass at top (m\u2080)")
    return Section("bands", "Bands of the infinite lattice", (
        paragraphs([words]), table(head, rows, "Bands") if rows else "", _more(len(bands.bands))))


def stack_section(found: Findings, axis: EnergyAxis) -> Section:
    """The grower's sheet, with the leads and the usual caution."""
    scenario = found.scenario
    layers = grown_layers(scenario)
    rows: list[tuple[Any, ...]] = [
        (g.row.where, g.times, _name(g.row.material, g.row.strength), g.row.x, g.row.thickness, g.row.monolayers,
         g.whole, g.difference, g.first, g.last, None if g.row.band_edge is None else g.row.band_edge * MEV, g.row.mass)
        for g in layers[:MOST_ROWS]]
    left, right = ((row.where, None, row.material or "by its edge", row.x, None, None, None, None, None, None,
                    (row.band_edge or 0.0) * MEV, row.mass) for row in (scenario.sheet[0], scenario.sheet[-1]))
    head = ("where", "times", "material", "x", "nm", "monolayers", "whole", "difference (nm)", "top, first (nm)",
            "top, last (nm)", "edge (meV)", "mass (m\u2080)")
    conditions = scenario.document.conditions
    words = [f"At {conditions.temperature_K:g} K"
             + (f", strained to {conditions.substrate}" if conditions.substrate else "")
             + (", with non-parabolic masses" if conditions.nonparabolic else "")
             + (f", dephasing {conditions.dephasing_meV:g} meV" if conditions.dephasing_meV else "")
             + (f", beam of {conditions.resolution_meV:g} meV" if conditions.resolution_meV else "") + "."]
    return Section("stack", "Stack: the grower\N{RIGHT SINGLE QUOTATION MARK}s sheet", (
        paragraphs([*words, *sheet_notes(scenario, layers)]), table(head, [left, *rows, right], "Stack"),
        _more(len(layers)), paragraphs([GROWTH], "caution")))


def _name(material: str | None, strength: float | None) -> str:
    return material or ("by its edge" if strength is None else f"delta, {strength:g} eV nm")


def _more(count: int) -> str:
    left = count - MOST_ROWS
    return paragraphs([f"{left:,} more are in the data files."]) if left > 0 else ""


def warnings_section(found: Findings, axis: EnergyAxis) -> Section | None:
    """What the engine says about the materials."""
    warnings = found.scenario.warnings
    return Section("warnings", "Warnings", (listed(map(text, warnings)),)) if warnings else None


def trust_section(found: Findings, axis: EnergyAxis) -> Section:
    """The model's limits."""
    return Section("trust", "How far the numbers can be trusted", (
        listed(f"<b>{text(lead)}</b> {coded(rest)}" for lead, rest in TRUST),))


def constants_section(found: Findings, axis: EnergyAxis) -> Section:
    """Constants and versions."""
    rows = [("Planck constant h", number(constants.PLANCK, 9), "J s, exact"),
            ("elementary charge e", number(constants.ELEMENTARY_CHARGE, 10), "C, exact"),
            ("electron mass m\u2080", number(constants.ELECTRON_MASS, 11), "kg, CODATA 2022"),
            ("\u0127", number(constants.HBAR, 10), "eV s, from these"),
            ("\u0127\u00b2 / 2m\u2080", number(constants.HBAR2_2M0, 10), "eV nm\u00b2, from these")]
    facts = "".join(f"<div><dt>{text(name)}</dt><dd>{value} {text(unit)}</dd></div>" for name, value, unit in rows)
    made = "".join(f"<div><dt>{text(name)}</dt><dd>{text(version)}</dd></div>" for name, version in versions().items())
    return Section("constants", "Constants and versions", (f"<dl>{facts}{made}</dl>",))


SECTIONS: tuple[Callable[[Findings, EnergyAxis], Section | None], ...] = (
    verdict_section, bench_section, margins_section, target_section, stack_section, bands_section, ledger_section,
    peaks_section, warnings_section, trust_section, constants_section,
)
"""Every section in its order, made of what is found and the shared energy axis; None: the scenario has no such part."""
