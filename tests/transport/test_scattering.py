"""Scattering matrices and the closed form: two independent routes to the same amplitudes."""

import numpy as np
import pytest

from tests.transport.stacks import ALL, LOSSY, PLAIN, UNEQUAL
from transport import Stack, scattering_matrix, spectrum
from transport.propagation import transfer
from transport.scattering import of_transfer, step

ENERGIES = np.linspace(0.0311, 1.2, 997)


@pytest.mark.parametrize("name", ALL)
def test_star_products_and_the_closed_form_agree(name: str) -> None:
    stack = ALL[name]
    matrix, curve = scattering_matrix(stack, ENERGIES), spectrum(stack, ENERGIES)
    through = abs(matrix.transmission) ** 2 * np.exp(2 * np.asarray(matrix.log_transmission))
    assert through == pytest.approx(curve.transmission, rel=1e-8, abs=1e-13)
    assert abs(matrix.reflection) ** 2 == pytest.approx(curve.reflection, rel=1e-8, abs=1e-13)
    turned = matrix.transmission * np.exp(-1j * curve.phase)
    assert abs(np.angle(turned)).max() < 1e-8


@pytest.mark.parametrize("name", ALL)
def test_a_lossless_matrix_is_unitary_from_both_sides(name: str) -> None:
    assert scattering_matrix(ALL[name], ENERGIES).unitarity_defect.max() < 1e-9


def test_dephasing_takes_from_transmission_and_reflection_together() -> None:
    curve = spectrum(LOSSY, ENERGIES)
    total = curve.transmission + curve.reflection
    assert total.max() < 1 and total.min() < 0.99


def test_the_star_product_is_associative() -> None:
    pieces = [of_transfer(transfer((layer,), ENERGIES), 1.5) for layer in UNEQUAL.elements[:3]]
    left, right = (pieces[0] @ pieces[1]) @ pieces[2], pieces[0] @ (pieces[1] @ pieces[2])
    assert left.reflection == pytest.approx(right.reflection, abs=1e-14)
    assert left.transmission == pytest.approx(right.transmission, abs=1e-14)


def test_a_step_reflects_by_its_flux_factors() -> None:
    """r = (g1 - g2)/(g1 + g2): textbook formula."""
    edge = step(2.0, 1.0)
    assert edge.reflection == pytest.approx(1 / 3)
    assert abs(edge.transmission) ** 2 == pytest.approx(8 / 9)


def test_a_closed_lead_has_no_scattering_matrix() -> None:
    with pytest.raises(ValueError, match=r"energies: both leads carry waves only above 30 meV, ask above it"):
        scattering_matrix(UNEQUAL, [0.02])


@pytest.mark.parametrize("periods", [1, 2, 3, 10, 63, 64, 1000, 10**6])
def test_log_transmission_stays_finite_however_many_periods(periods: int) -> None:
    curve = spectrum(PLAIN.with_periods(periods), ENERGIES)
    assert np.isfinite(curve.log10_transmission).all()
    seen = curve.transmission > 1e-300
    assert np.log10(curve.transmission[seen]) == pytest.approx(curve.log10_transmission[seen], abs=1e-9)


@pytest.mark.parametrize("name", ALL)
def test_t_is_the_same_from_either_side(name: str) -> None:
    """Reciprocity; energies count from the other lead when the stack is reversed."""
    stack: Stack = ALL[name]
    there = spectrum(stack, ENERGIES).log10_transmission
    back = spectrum(stack.reversed(), ENERGIES - stack.right.band_edge).log10_transmission
    assert back == pytest.approx(there, rel=1e-9, abs=1e-9)
