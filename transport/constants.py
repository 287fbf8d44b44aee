"""Physical constants in the units of the engine: eV, nm, s, free-electron masses.

CODATA 2022. Typed in, because importing scipy.constants alone takes longer than the rest of the engine;
tests/test_constants.py compares every value with it.
"""

from __future__ import annotations

import math

PLANCK = 6.62607015e-34  # J s, exact
ELEMENTARY_CHARGE = 1.602176634e-19  # C, exact
ELECTRON_MASS = 9.1093837139e-31  # kg

HBAR: float = PLANCK / (2 * math.pi) / ELEMENTARY_CHARGE
"""hbar in eV s."""

HBAR2_2M0: float = (PLANCK / (2 * math.pi)) ** 2 / (2 * ELECTRON_MASS) / ELEMENTARY_CHARGE * 1e18
"""hbar^2 / 2 m0 in eV nm^2."""
