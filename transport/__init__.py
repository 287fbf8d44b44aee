"""Transmission, resonances and the emerging band structure of finite periodic barrier stacks."""

from transport.allowance import VerdictRange, margin_range, verdict_range
from transport.document import Document, document_from_data, document_to_data
from transport.lattice import Band, Bands, Bloch, Certificate, bloch, certify, default_range, lattice_bands
from transport.matching import EndsProposal, MatchedEnds, describe_ends, matched_ends, with_ends
from transport.materials import Material, material
from transport.measuring import measured_transmission
from transport.nearest import NearestStacks, Remedy, nearest_stacks
from transport.periods import PeriodCheck, Verdict, period_verdict
from transport.refusal import ScenarioError
from transport.scattering import Scattering, scattering_matrix
from transport.scenario import (
    Scenario,
    format_scenario,
    load_scenario,
    parse_scenario,
    save_scenario,
    scenario_from_document,
)
from transport.spectrum import Spectrum, spectrum, transmission_map
from transport.structure import Delta, Layer, Lead, Profile, Stack, Target, Window, band_profile

__all__ = [
    # what a stack is
    "Delta", "Document", "Layer", "Lead", "Material", "Profile", "Scenario", "ScenarioError", "Stack", "Target",
    "Window", "band_profile", "document_from_data", "document_to_data", "format_scenario", "load_scenario",
    "material", "parse_scenario", "save_scenario", "scenario_from_document",
    # how it scatters
    "Band", "Bands", "Bloch", "Certificate", "Scattering", "Spectrum", "bloch", "certify", "default_range",
    "lattice_bands", "measured_transmission", "scattering_matrix", "spectrum", "transmission_map",
    # what users decide
    "EndsProposal", "MatchedEnds", "NearestStacks", "PeriodCheck", "Remedy", "Verdict", "VerdictRange",
    "describe_ends", "margin_range", "matched_ends", "nearest_stacks", "period_verdict", "verdict_range", "with_ends",
]
