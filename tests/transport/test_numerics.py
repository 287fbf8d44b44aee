"""The row-wise integrator and minimiser against integrals and minima known in closed form."""

import numpy as np
import pytest
from numpy.polynomial.legendre import leggauss

from transport import numerics


@pytest.mark.parametrize("degree", range(23))
def test_the_kronrod_rule_is_exact_up_to_degree_22(degree: int) -> None:
    """Property that defines the 15-point Kronrod extension (Kronrod, 1965)."""
    value = numerics._KRONROD_WEIGHTS @ numerics._KRONROD_NODES**degree
    assert value == pytest.approx((1 + (-1) ** degree) / (degree + 1), abs=4e-16)


def test_the_gauss_rule_inside_it_is_that_of_numpy() -> None:
    nodes, weights = leggauss(7)
    assert numerics._KRONROD_NODES[1::2] == pytest.approx(nodes, abs=1e-15)
    assert pytest.approx(weights, abs=1e-15) == numerics._GAUSS_WEIGHTS


def test_a_narrow_peak_and_a_square_root_edge_are_integrated_to_ten_digits() -> None:
    width = 1e-4
    cuts = np.array([0.0, 0.5 - width, 0.5, 0.5 + width, 1.0])
    row = np.repeat([0, 1], 4)

    def function(rows: np.ndarray, x: np.ndarray) -> np.ndarray:
        return np.where(rows == 0, 1 / (1 + ((x - 0.5) / width) ** 2), np.sqrt(x))

    found = numerics.row_integrals(function, row, np.tile(cuts[:-1], 2), np.tile(cuts[1:], 2), 2)
    assert found == pytest.approx([2 * width * np.arctan(0.5 / width), 2 / 3], rel=1e-10)


def test_row_minima_finds_a_dip_between_the_end_and_the_first_sample() -> None:
    def function(rows: np.ndarray, x: np.ndarray) -> np.ndarray:
        return np.asarray((x - 0.003) ** 2 + rows)

    row = np.repeat([0, 1], 11)
    x = np.tile(np.linspace(0, 1, 11), 2)
    least, where = numerics.row_minima(function, row, x, function(row, x))
    assert least == pytest.approx([0.0, 1.0], abs=1e-12)
    assert where == pytest.approx([0.003, 0.003], abs=1e-6)
