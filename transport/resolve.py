"""From a document to the stack the engine computes, the target in eV, and the grower's sheet."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, replace
from itertools import pairwise

from transport.checks import written_out
from transport.document import Document, LayerRecord, LeadRecord, WindowRecord, default_measure
from transport.ends import KEY, end_layers
from transport.graded import lay_out, require_reach
from transport.materials import OFFSET_WARNING
from transport.media import Edges, Media, Medium
from transport.parameters import PARAMETERS
from transport.profiles import Variation
from transport.refusal import ScenarioError, refuse_unless, shown
from transport.structure import Lead, Stack, Target, Window
from transport.variations import variations_of

HIGHEST_PARABOLIC = 0.2
"""Share of the gap above a band edge up to which one mass will do: Kane's is then a fifth heavier (common practice)."""
HIGHEST_BENT = 0.5
"""The same where masses bend: beyond, Kane's two bands are not enough either (common practice)."""


@dataclass(frozen=True, slots=True)
class SheetRow:
    """One line of the grower's sheet, from the left lead's side; the cell stands once.

    `where`: left lead, entry, cell, exit or right lead; `key`: its place in the file. `material` is None for a layer
    or lead given by its edge, and for a delta. Lengths nm, `band_edge` eV from the left lead's edge, `mass` m0,
    `nonparabolicity` 1/eV, `strength` (of a delta only) eV nm; None where it does not apply. `monolayers` may be
    fractional: growth rounds it.

    A layer whose edge or mass runs has a `variation` through it, `profile` names it in words, and band edge, mass and
    nonparabolicity are means over the layer; `x_ends`: compositions at the faces of a graded alloy; `grading`:
    length of its graded interfaces (nm). `slices`: how many elements of the stack the row comes to. `faces`: edges of
    a library material at its left and right face.
    """

    where: str
    key: str
    material: str | None = None
    x: float | None = None
    thickness: float | None = None
    monolayers: float | None = None
    band_edge: float | None = None
    mass: float | None = None
    nonparabolicity: float | None = None
    strength: float | None = None
    warnings: tuple[str, ...] = ()
    x_ends: tuple[float, float] | None = None
    profile: str | None = None
    grading: float | None = None
    variation: Variation | None = None
    slices: int = 1
    faces: tuple[Edges, Edges] | None = None


def monolayer_of(row: SheetRow) -> float:
    """Thickness of one monolayer in nm; for a layer whose material has none, about that of GaAs (common practice)."""
    return row.thickness / row.monolayers if row.thickness and row.monolayers else 0.2827


def altered(row: SheetRow, thickness: float = 0.0, band_edge: float = 0.0, mass_share: float = 0.0) -> SheetRow:
    """A layer's row, thicker by so many nm, higher by so many eV, heavier by a share."""
    new, heavier = (row.thickness or 0.0) + thickness, 1 + mass_share
    variation = row.variation.scaled(new, 1.0, heavier).moved(band_edge) if row.variation else None
    return replace(row, thickness=new, band_edge=(row.band_edge or 0.0) + band_edge, mass=(row.mass or 0.0) * heavier,
                   variation=variation)


@dataclass(frozen=True, slots=True)
class Resolved:
    """What a document comes to."""

    stack: Stack
    target: Target | None
    sheet: tuple[SheetRow, ...]
    warnings: tuple[str, ...]


def resolve(document: Document) -> Resolved:
    """The stack, target, sheet and warnings of a checked document. Raises ScenarioError."""
    _refuse_a_drop(document)
    media = Media(document)
    zero = media.medium("leads.left", document.leads.left).band_edge
    target = _target(document)
    rows = tuple(_sheet(document, media, zero))
    _refuse_broken_gaps(rows)
    stack, counts = stack_of(rows, target, document.stack.periods, document.conditions.dephasing_meV / 1000)
    sheet = tuple(replace(row, slices=count) for row, count in zip(rows, counts, strict=True))
    return Resolved(stack, target, sheet, _warnings(sheet, media, target))


def stack_of(
    sheet: Sequence[SheetRow], target: Target | None, periods: int, dephasing: float
) -> tuple[Stack, tuple[int, ...]]:
    """The stack that a sheet describes, and how many elements each row comes to. Raises ScenarioError.

    Profiles are resolved for energies up to the target's windows and beyond (`graded.lay_out`).
    """
    made = lay_out(sheet, [window.top for window in target.windows] if target else [])
    stack = Stack(lead_of(sheet[0]), made.entry, made.cell, periods, made.exit, lead_of(sheet[-1]), dephasing)
    return stack, made.counts


def _refuse_a_drop(document: Document) -> None:
    """A drop tilts the cells so that no two are alike; the engine computes equal cells only."""
    stack, leads = document.stack, document.leads
    tilted = "the stack would be tilted and no longer periodic, which this version does not compute"
    if stack.drop_V is not None:
        refuse_unless(stack.drop_V == 0, "stack.drop_V", f"is {shown(stack.drop_V)}: {tilted}; set it to 0")
        return
    refuse_unless(stack.bias_V == 0, "stack.bias_V", f"is {shown(stack.bias_V)}: {tilted}; set it to 0")
    refuse_unless(not _built_in_drop(leads.left, leads.right), "stack.bias_V",
                  f"is 0, but the leads' Fermi levels differ and leave a built-in drop: {tilted}; "
                  "give both leads the same doping, or set stack.drop_V = 0")


def _built_in_drop(left: LeadRecord, right: LeadRecord) -> bool:
    """Whether both leads have a Fermi level and it lies differently above their band edges."""
    if any(lead.donors_cm3 is None and lead.fermi_meV is None for lead in (left, right)):
        return False
    if left.fermi_meV is not None:
        return left.fermi_meV != right.fermi_meV
    # The Fermi level of given donors depends on the mass too: only equal leads surely have the same.
    return left != right


def _refuse_broken_gaps(sheet: Sequence[SheetRow]) -> None:
    """Neighbours, the cell's last layer and its first among them; a delta has no thickness and parts nothing."""
    layers = [row for row in sheet if row.strength is None]
    cell = [row for row in layers if row.where == "cell"]
    for left, right in (*pairwise(layers), (cell[-1], cell[0])):
        if left.faces is None or right.faces is None:
            continue
        lower, upper = sorted((left.faces[1], right.faces[0]), key=lambda edges: edges.valence)
        gap = lower.conduction - upper.valence
        refuse_unless(
            gap >= 0, right.key, f"is {right.faces[0].label} beside {left.faces[1].label} ({left.key}), a broken gap: "
            f"the conduction edge of {lower.label} lies {-gap * 1000:.3g} meV below the valence edge of {upper.label}, "
            "and a one-band model does not hold there; take another material, or put a third between them")


def _sheet(document: Document, media: Media, zero: float) -> Iterable[SheetRow]:
    stack = document.stack
    left, right = end_layers(
        stack.ends, stack.cell, lambda *at: variations_of(media, *at)[0]) if stack.ends else ((), ())
    parts = {
        "entry": [*written_out("stack.entry", stack.entry), *((KEY, record) for record in left)],
        "cell": written_out("stack.cell", stack.cell),
        "exit": [*((KEY, record) for record in right), *written_out("stack.exit", stack.exit)],
    }
    yield _row("left lead", "leads.left", media.medium("leads.left", document.leads.left), zero)
    for part, layers in parts.items():
        yield from (_layer_row(part, key, record, media, zero) for key, record in layers)
    yield _row("right lead", "leads.right", media.medium("leads.right", document.leads.right), zero)


def _row(where: str, key: str, medium: Medium, zero: float) -> SheetRow:
    return SheetRow(where, key, medium.material, medium.x, band_edge=medium.band_edge - zero, mass=medium.mass,
                    nonparabolicity=medium.nonparabolicity, warnings=medium.warnings, faces=medium.faces)


def _layer_row(part: str, key: str, record: LayerRecord, media: Media, zero: float) -> SheetRow:
    if record.kind == "delta":
        return SheetRow(part, key, thickness=0.0, strength=record.delta_eV_nm)
    medium, curves = variations_of(media, key, record)
    thickness, monolayers = _thickness(key, record, medium)
    row = replace(_row(part, key, medium, zero), thickness=thickness, monolayers=monolayers, grading=record.grading_nm)
    if curves is None:
        return row
    variation = Variation(thickness, replace(curves[0], shift=curves[0].shift - zero), *curves[1:])
    require_reach(key, variation)
    edge, mass, nonparabolicity = variation.mean()
    ends = None if record.x_from is None or record.x_to is None else (record.x_from, record.x_to)
    words = f"x = {ends[0]:g} to {ends[1]:g}" if ends else record.profile
    return replace(row, band_edge=edge, mass=mass, nonparabolicity=nonparabolicity, x_ends=ends, profile=words,
                   variation=variation)


def _thickness(key: str, record: LayerRecord, medium: Medium) -> tuple[float, float | None]:
    """Thickness in nm and, where the medium has them, in monolayers."""
    if record.thickness_nm is not None:
        return record.thickness_nm, record.thickness_nm / medium.monolayer if medium.monolayer else None
    assert record.monolayers is not None
    if medium.monolayer is None:
        raise ScenarioError(f"{key}.monolayers", f"needs the thickness of one; give [materials.{medium.material}] "
                            "a monolayer_nm, or the layer a thickness_nm")
    thickness = record.monolayers * medium.monolayer
    most = PARAMETERS["thickness_nm"].high
    refuse_unless(0 < thickness <= most, f"{key}.monolayers",
                  f"come to {thickness:.6g} nm, but a layer has above 0 and at most {most:,.0f} nm; give fewer")
    return thickness, record.monolayers


def lead_of(row: SheetRow) -> Lead:
    """The lead that a line of the sheet describes."""
    assert row.band_edge is not None and row.mass is not None
    return Lead(row.band_edge, row.mass, row.nonparabolicity or 0.0)


def _target(document: Document) -> Target | None:
    if document.target is None:
        return None
    return Target(tuple(_window(window) for window in document.target.windows), document.target.most_periods)


def _window(window: WindowRecord) -> Window:
    measure = window.measure or default_measure(window.kind)
    return Window(window.kind, window.from_meV / 1000, window.to_meV / 1000, window.transmission, measure)


def _warnings(sheet: tuple[SheetRow, ...], media: Media, target: Target | None) -> tuple[str, ...]:
    """Every sentence once, in the order of the sheet."""
    found = dict.fromkeys(sentence for row in sheet for sentence in row.warnings)
    if target and target.windows:
        found |= dict.fromkeys(_too_high(sheet, max(window.top for window in target.windows)))
    if len(media.library) > 1:
        found[OFFSET_WARNING] = None
    return tuple(found)


def _too_high(sheet: Sequence[SheetRow], top: float) -> Iterator[str]:
    """A sentence on the material above whose edge `top` (eV) lies by the largest share of its gap, if one is due."""
    reaches = [((top - row.band_edge) / _gap(row.faces[0]), row) for row in sheet
               if row.faces and row.band_edge is not None and row.variation is None]
    share, row = max(reaches, key=lambda reach: reach[0], default=(0.0, sheet[0]))
    bent = bool(row.nonparabolicity)
    if row.faces and row.band_edge is not None and share > (HIGHEST_BENT if bent else HIGHEST_PARABOLIC):
        remedy = "" if bent else "; conditions.nonparabolic = true takes the masses there for heavier"
        yield (f"Windows reach {(top - row.band_edge) * 1000:.3g} meV above the band edge of {row.faces[0].label}, "
               f"{share:.2g} of its gap: one band is not enough so high{remedy}.")


def _gap(edges: Edges) -> float:
    return edges.conduction - edges.valence
