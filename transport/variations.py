"""How band edge, mass and nonparabolicity run through a layer of the file: profiles, and graded alloys."""

from __future__ import annotations

from dataclasses import replace

import msgspec
import numpy as np
from numpy.polynomial import chebyshev

from transport.checks import BASED_PROFILES, PROFILE_KEYS
from transport.document import LayerRecord
from transport.media import Media, Medium
from transport.profiles import Curve, Variation, flat
from transport.refusal import refuse_unless

Curves = tuple[Curve, Curve, Curve]

_DEGREE = 31  # of the series in x for a graded alloy; the library's laws are polynomials and quotients of them


def variations_of(media: Media, key: str, record: LayerRecord) -> tuple[Medium, Curves | None]:
    """The medium of a layer (that in its middle, or its mean), and the three curves where anything runs.

    Band edges are on the document's scale. Raises ScenarioError.
    """
    if record.profile is not None:
        curves = (_profile_curve(record), flat(record.mass or 0.0), flat(record.nonparabolicity_per_eV or 0.0))
        edge, mass, nonparabolicity = Variation(record.thickness_nm or 0.0, *curves).mean()
        return Medium(None, None, edge, mass, nonparabolicity), curves
    if record.x_from is None or record.x_to is None:
        return media.medium(key, record), None
    return _graded_alloy(media, key, record, record.x_from, record.x_to)


def _profile_curve(record: LayerRecord) -> Curve:
    """The band edge of a profile layer."""
    assert record.profile is not None
    if record.profile == "samples":
        return Curve("samples", record.potential_eV or ())
    numbers = [float(getattr(record, name)) for name in PROFILE_KEYS[record.profile]]
    return Curve(record.profile, (*numbers, *([record.base_eV or 0.0] if record.profile in BASED_PROFILES else [])))


def _graded_alloy(media: Media, key: str, record: LayerRecord, first: float, last: float) -> tuple[Medium, Curves]:
    """An alloy whose composition runs evenly from face to face, by the library's laws at each composition."""
    name = record.material or ""
    refuse_unless(media.is_graded(name), f"{key}.x_from",
                  f"does not belong to {name}, which is no alloy of the library; take it out, and x_to")

    def at(share: float) -> Medium:
        x = min(max(first + share * (last - first), 0.0), 1.0)
        return media.medium(key, msgspec.structs.replace(record, x=x, x_from=None, x_to=None))

    places = chebyshev.chebpts1(_DEGREE + 1)
    found = [at((1 + place) / 2) for place in places.tolist()]
    values = np.array([[m.band_edge, m.mass, m.nonparabolicity] for m in found])
    edge, mass, nonparabolicity = (
        Curve("series", tuple(column.tolist())) for column in chebyshev.chebfit(places, values, _DEGREE).T)
    warnings = dict.fromkeys(sentence for share in (0.0, 1.0) for sentence in at(share).warnings)
    left, right = at(0.0).faces, at(1.0).faces
    faces = (left[0], right[1]) if left and right else None
    return replace(at(0.5), x=None, warnings=tuple(warnings), faces=faces), (edge, mass, nonparabolicity)
