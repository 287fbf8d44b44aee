"""Transmission, resonances and the emerging band structure of finite periodic barrier stacks."""

from transport.allowance import VerdictRange, margin_range, verdict_range
from transport.document import Document, document_from_data, document_to_data
from transport.effects import Effect, sensitivities
from transport.lattice import Band, Bands, Bloch, Certificate, bloch, certify, default_range, lattice_bands
from transport.matching import EndsProposal, MatchedEnds, describe_ends, matched_ends, with_ends
from transport.materials import Material, material
from transport.measured import MeasuredPeaks, measured_peaks, read_peaks
from transport.measuring import measured_transmission
from transport.nearest import NearestStacks, Remedy, nearest_stacks
from transport.peaks import PeakComparison, PeakFit, compare_peaks, fit_peaks
from transport.periods import PeriodCheck, Verdict, period_verdict
from transport.refusal import ScenarioError
from transport.resonance import PoleCertificate, Resonances, resonances
from transport.scattering import Scattering, scattering_matrix
from transport.scenario import (
    Scenario,
    format_scenario,
    load_scenario,
    parse_scenario,
    save_scenario,
    scenario_from_document,
)
from transport.sensitivity import Slopes, pole_slopes
from transport.spectrum import Spectrum, spectrum, transmission_map
from transport.structure import Delta, Layer, Lead, Profile, Stack, Target, Window, band_profile
from transport.wave import (
    LocalDensity,
    Wave,
    charge,
    dwell_time,
    local_density_of_states,
    phase_time,
    pole_wave,
    wave,
)

__all__ = [
    # what a stack is
    "Delta", "Document", "Layer", "Lead", "Material", "Profile", "Scenario", "ScenarioError", "Stack", "Target",
    "Window", "band_profile", "document_from_data", "document_to_data", "format_scenario", "load_scenario",
    "material", "parse_scenario", "save_scenario", "scenario_from_document",
    # how it scatters
    "Band", "Bands", "Bloch", "Certificate", "LocalDensity", "PoleCertificate", "Resonances", "Scattering", "Slopes",
    "Spectrum", "Wave", "bloch", "certify", "charge", "default_range", "dwell_time", "lattice_bands",
    "local_density_of_states", "measured_transmission", "phase_time", "pole_slopes", "pole_wave", "resonances",
    "scattering_matrix", "spectrum", "transmission_map", "wave",
    # what users decide
    "Effect", "EndsProposal", "MatchedEnds", "MeasuredPeaks", "NearestStacks", "PeakComparison", "PeakFit",
    "PeriodCheck", "Remedy", "Verdict", "VerdictRange",
    "compare_peaks", "describe_ends", "fit_peaks", "margin_range", "matched_ends", "measured_peaks", "nearest_stacks",
    "period_verdict", "read_peaks", "sensitivities", "verdict_range", "with_ends",
]
