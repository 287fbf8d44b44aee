"""The library of materials: band edge, mass, gap and monolayer at a temperature, composition and strain.

Source: Vurgaftman, Meyer and Ram-Mohan, J. Appl. Phys. 89, 5815 (2001); every value with its table number stands in
materials.toml. The Gamma valley only; masses are those of low temperature, as in the paper. x counts the first-named
cation or, where there is one cation only, antimony.
"""

from __future__ import annotations

import functools
import math
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from importlib import resources

import msgspec

from transport.refusal import nearest

WARMEST_FITTED = 600.0
"""Temperature (K) above which Varshni's fits are extrapolations (common practice)."""
LARGEST_MISMATCH = 0.005
"""Relative difference of lattice constants above which strain needs a word."""
OFFSET_WARNING = "Band offsets between materials are known to about 20 meV at best; energies inherit that."


class GapClosedError(ValueError):
    """The temperature is so high that the fitted gap is 0 or less; the message says what to do about it."""


class _Binary(msgspec.Struct, frozen=True, forbid_unknown_fields=True):
    lattice_nm: float
    lattice_per_K: float
    gap_eV: float
    varshni_alpha_eV_per_K: float
    varshni_beta_K: float
    valence_edge_eV: float
    mass: float
    a_c_eV: float
    c11_GPa: float
    c12_GPa: float
    indirect: bool = False


class _Alloy(msgspec.Struct, frozen=True, forbid_unknown_fields=True):
    first: str
    second: str
    gap_bowing_eV: tuple[float, ...]
    mass_bowing: float = 0.0
    valence_edge_bowing_eV: float = 0.0
    a_c_bowing_eV: float = 0.0
    indirect: bool = False
    indirect_above: float = 1.0
    indirect_below: float = 0.0
    doubt: str = ""


class _Library(msgspec.Struct, frozen=True, forbid_unknown_fields=True):
    binaries: Mapping[str, _Binary]
    alloys: Mapping[str, _Alloy]


@dataclass(frozen=True, slots=True)
class Material:
    """A material as the engine needs it: energies eV, lengths nm, mass m0.

    `band_edge` is the conduction-band edge on the scale of the paper's valence-band offsets (0 = valence edge of
    InSb), strain included; `valence_edge`, `gap` and `lattice_constant` are unstrained. `monolayer` is half the
    lattice constant along growth, which strain against a substrate stretches or shortens. `warnings` are sentences
    for the user.
    """

    name: str
    x: float | None
    band_edge: float
    mass: float
    gap: float
    lattice_constant: float
    valence_edge: float
    monolayer: float
    warnings: tuple[str, ...] = ()

    @property
    def label(self) -> str:
        """The name with its composition, as in running text."""
        return _label(self.name, self.x)


@dataclass(frozen=True, slots=True)
class _Bulk:
    lattice_constant: float
    gap: float
    valence_edge: float
    mass: float
    a_c: float
    c11: float
    c12: float


def material_names() -> tuple[str, ...]:
    """Every name of the library: binaries, then alloys."""
    return (*_library().binaries, *_library().alloys)


def substrate_names() -> tuple[str, ...]:
    """Names that may be a substrate: the binaries."""
    return tuple(_library().binaries)


def is_alloy(name: str) -> bool:
    """Whether the library material called `name` needs a composition x."""
    return name in _library().alloys


def base_of(name: str) -> str | None:
    """What an alloy of the library becomes at x = 0; None for a binary."""
    alloy = _library().alloys.get(name)
    return alloy.second if alloy else None


@functools.lru_cache(maxsize=1024)
def material(name: str, x: float | None, temperature: float, substrate: str | None = None) -> Material:
    """The library material `name` of composition `x` (None for a binary) at `temperature` (K).

    With `substrate` (a binary) the Gamma edge is shifted by a_c tr(eps) of a layer grown on it along [001], and its
    monolayer is stretched by eps_zz: eps_xx = eps_yy = a_substrate / a - 1, eps_zz = -2 C12/C11 eps_xx. Raises
    ValueError for a name the library lacks, an x that does not fit or a temperature below 0, GapClosedError for too
    high a one. Source: see the module.
    """
    _check_use(name, x, temperature, substrate)
    bulk = _bulk(name, x, temperature)
    if bulk.gap <= 0:
        raise GapClosedError(f"is {temperature:g} K, where the gap of {name} has closed; lower it")
    in_plane, along = (0.0, 0.0) if substrate is None else _strain(bulk, _bulk(substrate, None, temperature))
    # Compression (a negative trace) raises the edge, because a_c is negative.
    edge = bulk.valence_edge + bulk.gap + bulk.a_c * (2 * in_plane + along)
    return Material(name, x, edge, bulk.mass, bulk.gap, bulk.lattice_constant, bulk.valence_edge,
                    bulk.lattice_constant * (1 + along) / 2, _warnings(name, x, temperature))


def mismatch(found: Material, reference: Material) -> float:
    """Relative difference of the lattice constants, (a - a_reference) / a_reference."""
    return found.lattice_constant / reference.lattice_constant - 1


def _check_use(name: str, x: float | None, temperature: float, substrate: str | None) -> None:
    if name not in material_names():
        raise ValueError(f"name is {name!r}: {nearest(str(name), material_names())}")
    if is_alloy(name) != (x is not None) or not 0 <= (x or 0.0) <= 1:
        raise ValueError(f"x is {x!r}: give an alloy a composition from 0 to 1, a binary none")
    if not 0 <= temperature < math.inf:
        raise ValueError(f"temperature is {temperature!r}: give kelvin, 0 or above and finite")
    if substrate is not None and substrate not in substrate_names():
        raise ValueError(f"substrate is {substrate!r}: give one of {', '.join(substrate_names())}")


@functools.cache
def _library() -> _Library:
    text = resources.files("transport").joinpath("materials.toml").read_text(encoding="utf-8")
    return msgspec.convert(tomllib.loads(text), _Library)


def _bulk(name: str, x: float | None, temperature: float) -> _Bulk:
    if x is None:
        return _binary(_library().binaries[name], temperature)
    alloy = _library().alloys[name]
    first = _binary(_library().binaries[alloy.first], temperature)
    second = _binary(_library().binaries[alloy.second], temperature)
    gap_bowing = math.fsum(term * x**power for power, term in enumerate(alloy.gap_bowing_eV))
    return _Bulk(
        lattice_constant=_bowed(x, first.lattice_constant, second.lattice_constant),
        gap=_bowed(x, first.gap, second.gap, gap_bowing),
        valence_edge=_bowed(x, first.valence_edge, second.valence_edge, alloy.valence_edge_bowing_eV),
        mass=_bowed(x, first.mass, second.mass, alloy.mass_bowing),
        a_c=_bowed(x, first.a_c, second.a_c, alloy.a_c_bowing_eV),
        c11=_bowed(x, first.c11, second.c11),
        c12=_bowed(x, first.c12, second.c12),
    )


def _binary(values: _Binary, temperature: float) -> _Bulk:
    varshni = values.varshni_alpha_eV_per_K * temperature**2 / (temperature + values.varshni_beta_K)
    lattice = values.lattice_nm + values.lattice_per_K * (temperature - 300.0)
    return _Bulk(lattice, values.gap_eV - varshni, values.valence_edge_eV, values.mass,
                 values.a_c_eV, values.c11_GPa, values.c12_GPa)


def _bowed(x: float, first: float, second: float, bowing: float = 0.0) -> float:
    return x * first + (1 - x) * second - x * (1 - x) * bowing


def _strain(bulk: _Bulk, substrate: _Bulk) -> tuple[float, float]:
    """eps_xx = eps_yy and eps_zz of a pseudomorphic layer on (001): free to move along growth only."""
    in_plane = substrate.lattice_constant / bulk.lattice_constant - 1
    return in_plane, -2 * bulk.c12 / bulk.c11 * in_plane


def _label(name: str, x: float | None) -> str:
    return name if x is None else f"{name} (x = {x:g})"


def _warnings(name: str, x: float | None, temperature: float) -> tuple[str, ...]:
    label = _label(name, x)
    sentences = []
    if _is_indirect(name, x):
        sentences.append(f"{label} is indirect: its lowest valley is not Gamma{_crossover(name)}, and only Gamma is "
                         "counted.")
    if temperature > WARMEST_FITTED:
        sentences.append(f"The gap of {label} at {temperature:g} K is extrapolated beyond {WARMEST_FITTED:g} K.")
    if x is not None and (doubt := _library().alloys[name].doubt):
        sentences.append(f"{label}: {doubt}")
    return tuple(sentences)


def _is_indirect(name: str, x: float | None) -> bool:
    if x is None:
        return _library().binaries[name].indirect
    alloy = _library().alloys[name]
    return alloy.indirect or x > alloy.indirect_above or x < alloy.indirect_below


def _crossover(name: str) -> str:
    """Where an alloy turns indirect, in words; nothing for what is indirect throughout."""
    alloy = _library().alloys.get(name)
    if alloy is None or alloy.indirect:
        return ""
    place = alloy.indirect_above if alloy.indirect_above < 1 else alloy.indirect_below
    return f" (the crossover is near x = {place:g})"
