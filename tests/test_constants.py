"""The typed-in constants against SciPy's CODATA table."""

import pytest
from scipy import constants as codata

from transport import constants


def test_typed_in_constants_are_those_of_scipy() -> None:
    assert constants.PLANCK == codata.h
    assert constants.ELEMENTARY_CHARGE == codata.e
    assert constants.ELECTRON_MASS == codata.m_e
    assert constants.HBAR == pytest.approx(codata.hbar / codata.e, rel=1e-15)
    assert constants.HBAR2_2M0 == pytest.approx(codata.hbar**2 / (2 * codata.m_e * codata.e) * 1e18, rel=1e-15)
