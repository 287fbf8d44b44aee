"""Transmission, resonances and the emerging band structure of finite periodic barrier stacks."""

from transport.lattice import Band, Bands, Bloch, Certificate, bloch, certify, default_range, lattice_bands
from transport.measuring import measured_transmission
from transport.periods import PeriodCheck, Verdict, period_verdict
from transport.spectrum import Spectrum, spectrum, transmission_map
from transport.structure import Delta, Layer, Lead, Profile, Stack, Target, Window, band_profile

__all__ = [
    "Band", "Bands", "Bloch", "Certificate", "Delta", "Layer", "Lead", "PeriodCheck", "Profile",
    "Spectrum", "Stack", "Target", "Verdict", "Window", "band_profile", "bloch", "certify", "default_range",
    "lattice_bands", "measured_transmission", "period_verdict", "spectrum", "transmission_map",
]
