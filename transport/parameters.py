"""The one table of limits, defaults, units and help of everything a scenario may say.

Validation, widget bounds, command-line help and the README all read it. A name is a key of the
scenario file, which means the same and has the same limits wherever it stands; `file_...` counts what a file holds.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType


@dataclass(frozen=True, slots=True)
class Parameter:
    """One quantity; `default` None: required or absent; bounds count unless `low_open`, `high_open`."""

    name: str
    default: float | None
    low: float
    high: float
    unit: str
    help: str
    low_open: bool = False
    high_open: bool = False
    whole: bool = False

    @property
    def requirement(self) -> str:
        """What a value must be, in words: `must be above 0 and at most 10,000 nm`."""
        unit = f" {self.unit}" if self.unit else ""
        number = "a whole number " if self.whole else ""
        if not (self.low_open or self.high_open):
            return f"must be {number}from {in_words(self.low)} to {in_words(self.high)}{unit}"
        lower = "above" if self.low_open else "at least"
        upper = "below" if self.high_open else "at most"
        return f"must be {number}{lower} {in_words(self.low)} and {upper} {in_words(self.high)}{unit}"

    def admits(self, value: float) -> bool:
        """Whether `value` is finite and inside the bounds."""
        if isinstance(value, float) and not math.isfinite(value):
            return False
        above = value > self.low if self.low_open else value >= self.low
        return above and (value < self.high if self.high_open else value <= self.high)


def in_words(number: float) -> str:
    """A limit as people write it: 10,000 and 1e+22, 0.0001 and never 10000.0."""
    return f"{number:,.10g}" if abs(number) < 1e15 else f"{number:.3g}"


def _table(*parameters: Parameter) -> Mapping[str, Parameter]:
    return MappingProxyType({parameter.name: parameter for parameter in parameters})


_EV = 1000.0  # far beyond any one-band model, near enough to keep every product finite
_MEV = 1000 * _EV


PARAMETERS: Mapping[str, Parameter] = _table(
    Parameter("temperature_K", 300.0, 0.0, 2000.0, "K", "temperature of gaps and lattice constants", low_open=True),
    Parameter("dephasing_meV", 0.0, 0.0, _MEV, "meV", "loss: width of the optical potential in every stack layer"),
    Parameter("resolution_meV", 0.0, 0.0, _MEV, "meV", "full width at half maximum of the measuring beam"),
    Parameter("band_edge_eV", None, -_EV, _EV, "eV", "conduction-band edge; explicit edges share one scale"),
    Parameter("mass", None, 1e-4, 1000.0, "m0", "effective mass"),
    Parameter("nonparabolicity_per_eV", None, 0.0, 1000.0, "per eV", "a in m(E) = mass (1 + a (E - V))"),
    Parameter("x", None, 0.0, 1.0, "",
              "composition: fraction of the first-named cation, or of Sb in GaAsSb and AlAsSb"),
    Parameter("x_from", None, 0.0, 1.0, "", "composition at the left face of a graded alloy"),
    Parameter("x_to", None, 0.0, 1.0, "", "composition at its right face"),
    Parameter("thickness_nm", None, 0.0, 10_000.0, "nm", "thickness of a layer", low_open=True),
    Parameter("monolayers", None, 0.0, 20_000.0, "monolayers",
              "thickness of a layer in monolayers, half a lattice constant along growth each", low_open=True),
    Parameter("grading_nm", None, 1e-6, 10_000.0, "nm", "length of the graded interfaces at both faces of a layer"),
    Parameter("from_eV", None, -_EV, _EV, "eV", "linear profile: band edge at the left face"),
    Parameter("to_eV", None, -_EV, _EV, "eV", "linear profile: band edge at the right face"),
    Parameter("mean_eV", None, -_EV, _EV, "eV", "cosine profile: mean band edge"),
    Parameter("amplitude_eV", None, -_EV, _EV, "eV", "cosine profile: amplitude, counted from the mean"),
    Parameter("height_eV", None, -_EV, _EV, "eV", "gaussian, sech2, parabola profile: height at the centre"),
    Parameter("width_nm", None, 1e-6, 10_000.0, "nm", "gaussian, sech2, fermi, parabola profile: width"),
    Parameter("base_eV", 0.0, -_EV, _EV, "eV", "gaussian, sech2 profile: what the height is counted from"),
    Parameter("step_eV", None, -_EV, _EV, "eV", "fermi profile: rise from left to right"),
    Parameter("potential_eV", None, -_EV, _EV, "eV", "samples profile: band edges, equally spaced from face to face"),
    Parameter("delta_eV_nm", None, -1e7, 1e7, "eV nm", "strength of a barrier of zero thickness"),
    Parameter("repeat", None, 1, 2000, "", "how often a list of layers is written", whole=True),
    Parameter("donors_cm3", None, 0.0, 1e22, "per cm3", "donor density of a lead", low_open=True),
    Parameter("fermi_meV", None, -_MEV, _MEV, "meV", "Fermi level above the lead's own band edge"),
    Parameter("cells", None, 1, 20, "", "end cells of a taper, at each end", whole=True),
    Parameter("barrier_share", None, 0.0, 10.0, "", "thickness of an end cell's barriers over the cell's",
              low_open=True),
    Parameter("well_share", 1.0, 0.0, 10.0, "", "thickness of an end cell's wells over the cell's", low_open=True),
    Parameter("offset_percent", 5.0, 0.0, 50.0, "%", "how far band offsets may be off"),
    Parameter("mass_percent", 5.0, 0.0, 50.0, "%", "how far masses may be off"),
    Parameter("monolayer_error", 1, 0, 10, "monolayers", "by how many monolayers every layer of a kind may be off",
              whole=True),
    Parameter("remedy_monolayers", 3, 1, 10, "monolayers", "by how much a remedy may change a layer of the cell",
              whole=True),
    Parameter("periods", None, 1, 1_000_000, "", "how often the cell is repeated", whole=True),
    Parameter("bias_V", 0.0, -_EV, _EV, "V", "difference of the leads' Fermi levels; positive lowers the right lead"),
    Parameter("drop_V", None, -_EV, _EV, "V", "voltage across the stack, in place of bias and built-in drop"),
    Parameter("gap_eV", None, 0.0, _EV, "eV", "band gap; its inverse is the non-parabolicity where none is given",
              low_open=True),
    Parameter("monolayer_nm", None, 0.0, 100.0, "nm", "thickness of one monolayer", low_open=True),
    Parameter("most_periods", 60, 1, 2000, "", "most periods that may be grown", whole=True),
    Parameter("from_meV", None, -_MEV, _MEV, "meV", "bottom of a window"),
    Parameter("to_meV", None, -_MEV, _MEV, "meV", "top of a window"),
    Parameter("transmission", None, 0.0, 1.0, "", "least transmission of a pass window, most of a block window",
              low_open=True),
    Parameter("energy_eV", None, -_EV, _EV, "eV", "energy of motion along growth, from the left lead's edge"),
    Parameter("points", None, 1, 1_000_000, "", "evenly spaced energies of a spectrum", whole=True),
    Parameter("energy_meV", None, -_MEV, _MEV, "meV", "a measured peak, from the left lead's edge"),
    Parameter("width_meV", None, 0.0, _MEV, "meV", "measured full width at half maximum", low_open=True),
    Parameter("uncertainty_meV", None, 0.0, _MEV, "meV", "standard uncertainty of a measured peak", low_open=True),
    Parameter("lever_arm", 0.5, 0.0, 1.0, "",
              "share of a bias dropped before the resonance; 0.5: the middle of a linear drop", low_open=True),
    Parameter("file_peaks", None, 0, 500, "peaks", "measured peaks", whole=True),
    Parameter("file_bytes", None, 1, 1_000_000, "bytes", "size of a scenario file", whole=True),
    Parameter("file_layers", None, 1, 2000, "layers", "layers in a file, repeat groups written out", whole=True),
    Parameter("file_samples", None, 2, 2000, "samples", "samples of one profile", whole=True),
    Parameter("file_slices", None, 1, 20_000, "slices", "constant layers that all profiles of a file are resolved into",
              whole=True),
    Parameter("file_end_cells", None, 1, 20, "end cells", "end cells listed at one end", whole=True),
    Parameter("file_windows", None, 0, 100, "windows", "windows of a target", whole=True),
    Parameter("file_materials", None, 0, 100, "materials", "materials a scenario defines", whole=True),
    Parameter("title", None, 1, 200, "characters", "length of the title", whole=True),
    Parameter("note", None, 0, 10_000, "characters", "length of the note", whole=True),
    Parameter("name", None, 1, 60, "characters", "length of a material's name", whole=True),
)


def default(name: str) -> float:
    """The stated default of a parameter that has one. Raises ValueError where it is required or simply absent."""
    value = PARAMETERS[name].default
    if value is None:
        raise ValueError(f"name is {name!r}: that parameter has no default")
    return value
