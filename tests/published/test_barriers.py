"""Single barriers, steps and wells against closed forms, and every kind of stack against 50-digit plane waves."""

import mpmath as mp
import numpy as np
import pytest

from tests.reference import C, scattered
from tests.transport.stacks import ALL, LEAD, LOSSY, PLAIN, UNEQUAL, barrier, well
from transport import Delta, Layer, Lead, Stack, spectrum
from transport.constants import HBAR2_2M0

LOSSY_UNEQUAL = Stack(
    Lead(0.0, 0.067, 0.65), (Layer(1.0, 0.2, 0.08, 0.5), Delta(0.05)), (Layer(3.0, 0.3, 0.092, 0.5), well(5.0)), 6,
    (Layer(2.0, 0.1, 0.07),), Lead(0.04, 0.1, 0.3), dephasing=0.006,
)


def one(layer: Layer | Delta, lead: Lead = LEAD, right: Lead | None = None) -> Stack:
    """A single layer or delta; a delta is given a cell of half a lead's layer on each side."""
    half = Layer(1e-9, lead.band_edge, lead.mass)
    cell = (layer,) if isinstance(layer, Layer) else (half, layer, half)
    return Stack(lead, (), cell, 1, (), right or lead)


@pytest.mark.parametrize("energy", [0.02, 0.1, 0.2999, 0.3, 0.3001, 0.5, 2.0])
def test_rectangular_barrier_below_at_and_above_its_top(energy: float) -> None:
    """1/T = 1 + V^2 sinh^2(kappa d) / 4E(V - E), its limit at E = V: textbook formula (common practice)."""
    d, v, m = mp.mpf(3), mp.mpf("0.3"), mp.mpf("0.067")
    e = mp.mpf(energy)
    if energy == 0.3:
        expected = 1 / (1 + m * v * d**2 / (4 * C))
    else:
        kappa = mp.sqrt(mp.mpc((v - e) * m / C))
        expected = (1 / (1 + v**2 * mp.sinh(kappa * d) ** 2 / (4 * e * (v - e)))).real
    found = spectrum(one(Layer(3.0, 0.3, 0.067)), energy).transmission
    assert float(found) == pytest.approx(float(expected), rel=1e-12)


@pytest.mark.parametrize("right", [Lead(0.1, 0.067), Lead(0.1, 0.15), Lead(-0.2, 0.03)])
def test_step_with_unequal_masses(right: Lead) -> None:
    """T = 4 g1 g2/(g1 + g2)^2 with g = k/m (BenDaniel and Duke, Phys. Rev. 152, 683 (1966))."""
    energy = np.array([0.11, 0.2, 0.9])
    g1, g2 = (np.sqrt((energy - x.band_edge) / (HBAR2_2M0 * x.mass)) for x in (LEAD, right))
    step = Stack(LEAD, (), (Layer(2.0, 0.0, 0.067),), 1, (), right)
    assert spectrum(step, energy).transmission == pytest.approx(4 * g1 * g2 / (g1 + g2) ** 2, rel=1e-12)


def test_delta_and_double_delta() -> None:
    """T = 1/(1 + (m s / 2 C k)^2), and for two a distance a apart 1/T = 1 + 4 b^2 (cos ka + b sin ka)^2, b = ms/2Ck.

    Textbook formulas (common practice).
    """
    energy, m, s, a = np.array([0.01, 0.1, 0.7]), 0.067, 0.35, 4.0
    k = np.sqrt(energy * m / HBAR2_2M0)
    b = m * s / (2 * HBAR2_2M0 * k)
    assert spectrum(one(Delta(s)), energy).transmission == pytest.approx(1 / (1 + b**2), rel=1e-8)
    double = Stack(LEAD, (Delta(s),), (well(a),), 1, (Delta(s),), LEAD)
    expected = 1 / (1 + 4 * b**2 * (np.cos(k * a) + b * np.sin(k * a)) ** 2)
    assert spectrum(double, energy).transmission == pytest.approx(expected, rel=1e-12)


def test_double_barrier_resonance_sits_where_it_was_published() -> None:
    """b = w = 5 nm, V = 0.23 eV, m = 0.067: E = 80.05 meV, width 1.028 meV, published as about 80.1 and 1.03 meV by
    Garcia-Calderon and co-workers (from memory). The half width is read off the curve, so to a percent only.
    """
    wall = Layer(5.0, 0.23, 0.067)
    stack = Stack(LEAD, (wall,), (well(5.0),), 1, (wall,), LEAD)
    curve = spectrum(stack, np.linspace(0.076, 0.084, 80_001))
    peak = curve.energy[curve.transmission.argmax()]
    half = curve.energy[curve.transmission > 0.5]
    assert peak == pytest.approx(0.08005, abs=2e-5)
    assert np.ptp(half) == pytest.approx(1.028e-3, rel=1e-2)


@pytest.mark.parametrize("name", [*ALL, "lossy", "lossy unequal"])
def test_every_kind_of_stack_agrees_with_plane_waves_in_50_digits(name: str) -> None:
    stack = {**ALL, "lossy": LOSSY, "lossy unequal": LOSSY_UNEQUAL}[name]
    energy = np.random.default_rng(11).uniform(0.045, 0.8, 8)
    curve, expected = spectrum(stack, energy), [scattered(stack, e) for e in energy]
    assert curve.transmission == pytest.approx([float(x.transmission) for x in expected], rel=1e-11)
    assert curve.reflection == pytest.approx([float(x.reflection) for x in expected], rel=1e-10, abs=1e-12)
    turned = np.exp(1j * (curve.phase - [float(mp.arg(x.amplitude)) for x in expected]))
    assert abs(np.angle(turned)).max() < 1e-11


@pytest.mark.parametrize("periods", [1, 7, 40, 1000])
def test_n_periods_agree_with_layers_written_out_in_50_digits(periods: int) -> None:
    energy = [0.0801, 0.3, 0.31, 0.4]
    curve = spectrum(PLAIN.with_periods(periods), energy)
    logs = [float(mp.log10(scattered(PLAIN.with_periods(periods), e).transmission)) for e in energy]
    assert curve.log10_transmission == pytest.approx(logs, rel=1e-11, abs=1e-10)


@pytest.mark.parametrize("stack", [PLAIN, UNEQUAL], ids=["plain", "unequal"])
def test_a_million_periods_keep_their_logarithm(stack: Stack) -> None:
    """In a gap log10 T falls by the same amount every period (Bloch's theorem), to -1e6 and beyond."""
    energy, million = [0.15, 0.45], 1_000_000
    near, far = (spectrum(stack.with_periods(n), energy).log10_transmission for n in (1000, million))
    thousand = [mp.log10(scattered(stack.with_periods(n), energy[0]).transmission) for n in (200, 300)]
    slope = float(thousand[1] - thousand[0]) / 100
    assert far[0] == pytest.approx(near[0] + slope * (million - 1000), rel=1e-12)
    assert np.isfinite(far).all()


def test_the_same_equation_solved_by_a_general_library() -> None:
    """scipy.integrate.solve_ivp on (psi, psi'/m), from the transmitted wave backwards."""
    from scipy.integrate import solve_ivp

    energy, g = 0.085, np.sqrt(0.085 / (HBAR2_2M0 * 0.067))
    state = np.array([1.0 + 0j, 1j * g])
    for layer in reversed((barrier(3.0), well(5.0)) * 3):
        q = (energy - layer.band_edge) / HBAR2_2M0
        solved = solve_ivp(
            lambda x, y, q=q, m=layer.mass: [m * y[1], -q * y[0]], (layer.thickness, 0.0), state, rtol=1e-11, atol=1e-13
        )
        state = solved.y[:, -1]
    incident = (state[0] + state[1] / (1j * g)) / 2
    found = spectrum(PLAIN.with_periods(3), energy).transmission
    assert float(found) == pytest.approx(1 / abs(incident) ** 2, rel=1e-8)
