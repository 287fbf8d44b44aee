"""The typed-in constants against SciPy's CODATA table."""

import pytest
from scipy import constants as codata

from transport import constants


def test_typed_in_constants_are_those_of_scipy() -> None:
    assert codata.h == constants.PLANCK
    assert codata.e == constants.ELEMENTARY_CHARGE
    assert codata.m_e == constants.ELECTRON_MASS
    assert pytest.approx(codata.hbar / codata.e, rel=1e-15) == constants.HBAR
    assert pytest.approx(codata.hbar**2 / (2 * codata.m_e * codata.e) * 1e18, rel=1e-15) == constants.HBAR2_2M0
