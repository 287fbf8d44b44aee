"""Profile layers, graded alloys and graded interfaces against closed forms, Airy, Weber and Mathieu functions, and a
general integrator."""

from __future__ import annotations

import math
from collections.abc import Callable

import mpmath as mp
import numpy as np
import pytest
from scipy.integrate import solve_ivp
from scipy.special import erf, mathieu_a, mathieu_b

from tests.reference import C
from transport import Lead, Scenario, Stack, lattice_bands, parse_scenario, spectrum
from transport.constants import HBAR2_2M0
from transport.materials import material
from transport.profiles import Curve, Variation, flat, on_steps, slices
from transport.propagation import transfer

MASS = 0.067
COSINE = Variation(10.0, Curve("cosine", (0.15, 0.15)), flat(MASS), flat(0.0))


def stack(variation: Variation, left: Lead, right: Lead, top: float = 1.0) -> Stack:
    """One profile between leads, right to 1e-10 from the lowest lead edge up to `top` (eV)."""
    low = min(left.band_edge, right.band_edge)
    return Stack(left, (), slices(variation, low, low + top), 1, (), right)


def profile(shape: str, numbers: tuple[float, ...], thickness: float, shift: float = 0.0) -> Variation:
    return Variation(thickness, Curve(shape, numbers, shift=shift), flat(MASS), flat(0.0))


def test_edges_of_a_cosine_lattice_are_mathieus_characteristic_values() -> None:
    """y'' + (a - 2q cos 2z) y = 0, z = pi x/L: bands a_0..b_1, a_1..b_2, ... (DLMF 28.2; SciPy's functions)."""
    length, mean, amplitude = 10.0, 0.15, 0.15
    unit = math.pi**2 * HBAR2_2M0 / (MASS * length**2)
    cell = Stack(Lead(0.0, MASS), (), slices(COSINE, 0.0, 0.9), 5, (), Lead(0.0, MASS))
    found = lattice_bands(cell, between=(0.0, 0.7))
    q = amplitude / unit / 2
    for n, band in enumerate(found.bands):
        assert band.bottom == pytest.approx(mean + unit * mathieu_a(n, q), abs=1e-10)
        assert band.top == pytest.approx(mean + unit * mathieu_b(n + 1, q), abs=1e-10)
    assert len(found.bands) == sum(mean + unit * mathieu_a(n, q) < 0.7 for n in range(40))
    assert found.certificate.complete and found.certificate.counted == len(found.bands)


@pytest.mark.parametrize(("height", "width"), [(0.3, 1.0), (0.05, 3.0), (-0.2, 1.3), (0.001, 0.5)])
def test_eckart_and_poeschl_teller_transmission(height: float, width: float) -> None:
    """V0 / cosh^2(x/w): T = sinh^2(pi k w) / (sinh^2(pi k w) + cos^2(pi/2 sqrt(1 - 4 m V0 w^2/C))).

    Eckart, Phys. Rev. 35, 1303 (1930); Landau and Lifshitz, Quantum Mechanics, paragraph 25. Over 40 widths.
    """
    lead = Lead(0.0, MASS)
    energy = np.array([0.003, 0.02, 0.11, 0.29, 0.5, 0.8])
    wave = np.sinh(np.pi * np.sqrt(energy * MASS / HBAR2_2M0) * width) ** 2
    inner = np.cos(np.pi / 2 * np.sqrt(complex(1 - 4 * MASS * height * width**2 / HBAR2_2M0))).real ** 2 \
        if 4 * MASS * height * width**2 / HBAR2_2M0 <= 1 else \
        math.cosh(math.pi / 2 * math.sqrt(4 * MASS * height * width**2 / HBAR2_2M0 - 1)) ** 2
    found = spectrum(stack(profile("sech2", (height, width, 0.0), 40 * width), lead, lead), energy)
    assert found.transmission == pytest.approx(wave / (wave + inner), rel=1e-9)


@pytest.mark.parametrize("order", [1, 2, 3])
def test_a_well_of_integer_order_reflects_nothing(order: int) -> None:
    """V0 = -n (n + 1) C/(m w^2): Poeschl and Teller; Landau and Lifshitz, paragraph 25. Over 40 widths."""
    lead, width = Lead(0.0, MASS), 2.0
    depth = -order * (order + 1) * HBAR2_2M0 / (MASS * width**2)
    found = spectrum(stack(profile("sech2", (depth, width, 0.0), 40 * width), lead, lead), np.linspace(0.001, 0.9, 50))
    assert found.reflection == pytest.approx(0, abs=1e-16)


@pytest.mark.parametrize("width", [0.1, 0.5, 2.0])
def test_reflection_of_a_fermi_step(width: float) -> None:
    """V0 / (1 + exp(-x/w)): R = [sinh(pi w (k1 - k2)) / sinh(pi w (k1 + k2))]^2 (Landau and Lifshitz, paragraph 25)."""
    step, energy = 0.1, np.array([0.1001, 0.105, 0.13, 0.2, 0.5])
    k1, k2 = (np.sqrt((energy - edge) * MASS / HBAR2_2M0) for edge in (0.0, step))
    expected = (np.sinh(np.pi * width * (k1 - k2)) / np.sinh(np.pi * width * (k1 + k2))) ** 2
    variation = profile("fermi", (step, width), 80 * width)
    found = spectrum(stack(variation, Lead(0.0, MASS), Lead(step, MASS)), energy)
    assert found.reflection == pytest.approx(expected, rel=1e-8, abs=1e-13)


def weber_transmission(height: float, width: float, length: float, energy: float) -> float:
    """A parabola cut at +-L/2, leads at its edges: exact, by Weber's functions U(a, z) (DLMF 12.2) in 40 digits.

    With x = z w / sqrt(2 i w sqrt(h m/C)), psi'' = m (V - E)/C psi becomes U'' = (z^2/4 + a) U.
    """
    with mp.workdps(40):
        h, w, e, m = mp.mpf(height), mp.mpf(width), mp.mpf(energy), mp.mpf(MASS)
        scale = mp.sqrt(2 * mp.mpc(0, 1) * mp.sqrt(h * m / C) / w)
        a = m * (h - e) / C / scale**2
        edge = h * (1 - (mp.mpf(length) / 2 / w) ** 2)
        k = mp.sqrt((e - edge) * m / C)
        rows = []
        for x in (-mp.mpf(length) / 2, mp.mpf(length) / 2):
            z = scale * x
            pair = [(mp.pcfu(a, s * z), s * scale * (s * z / 2 * mp.pcfu(a, s * z) - mp.pcfu(a - 1, s * z)))
                    for s in (1, -1)]
            rows.append(mp.matrix([[pair[0][0], pair[1][0]], [pair[0][1], pair[1][1]]]))
        matrix = rows[1] * rows[0] ** -1
        i = mp.mpc(0, 1)
        denominator = k * (matrix[0, 0] + matrix[1, 1]) + i * (matrix[1, 0] - k**2 * matrix[0, 1])
        return float(4 * k**2 / abs(denominator) ** 2)


@pytest.mark.parametrize("energy", [-0.1, 0.05, 0.25, 0.3, 0.35, 0.6])
def test_parabolic_barrier_by_webers_functions_and_by_kemble(energy: float) -> None:
    """T = 1/(1 + exp(2 pi (V0 - E)/hw)), w the frequency of the inverted oscillator.

    Kemble, Phys. Rev. 48, 549 (1935); Hill and Wheeler, Phys. Rev. 89, 1102 (1953). Kemble's is of
    a parabola without end. Cut at ten widths its corners still reflect, about a thousandth.
    """
    height, width, length = 0.3, 3.0, 60.0
    edge = height * (1 - (length / 2 / width) ** 2)
    variation = profile("parabola", (height, width), length, shift=-edge)
    lead = Lead(0.0, MASS)
    found = float(spectrum(stack(variation, lead, lead, top=2 - edge), energy - edge).transmission)
    assert found == pytest.approx(weber_transmission(height, width, length, energy), rel=1e-9)
    quantum = 2 * math.sqrt(height * HBAR2_2M0 / MASS) / width
    assert found == pytest.approx(1 / (1 + math.exp(2 * math.pi * (height - energy) / quantum)), rel=5e-3)


@pytest.mark.parametrize(("first", "last"), [(0.3, 0.1), (0.0, 0.4), (0.5, -0.3)])
def test_linear_barrier_by_airy_functions(first: float, last: float) -> None:
    """psi = Ai(z), Bi(z), z = (V - E) (m/(C s^2))^(1/3), slope s (DLMF 9.2), in 40 digits."""
    length, right = 7.0, Lead(-0.1, 0.08)
    energy = np.array([0.01, 0.09, 0.2, 0.33, 0.6, 0.9])
    expected = []
    with mp.workdps(40):
        slope, mass = (mp.mpf(last) - mp.mpf(first)) / length, mp.mpf(MASS)
        unit = mp.cbrt(mass / (C * slope**2))
        turn = mp.sign(slope) * mp.cbrt(mass * abs(slope) / C)
        for e in energy:
            a, b = ([[f(unit * (mp.mpf(v) - mp.mpf(float(e)))) for f in (mp.airyai, mp.airybi)],
                     [turn * f(unit * (mp.mpf(v) - mp.mpf(float(e))), derivative=1) / mass
                      for f in (mp.airyai, mp.airybi)]] for v in (first, last))
            m = mp.matrix(b) * mp.matrix(a) ** -1
            g1, g2 = (mp.sqrt((mp.mpf(float(e)) - mp.mpf(lead.band_edge)) / (C * mp.mpf(lead.mass)))
                      for lead in (Lead(0.0, MASS), right))
            f = g2 * m[0, 0] + g1 * m[1, 1] + mp.mpc(0, 1) * (m[1, 0] - g1 * g2 * m[0, 1])
            expected.append(float(4 * g1 * g2 / abs(f) ** 2))
    found = spectrum(stack(profile("linear", (first, last), length), Lead(0.0, MASS), right), energy)
    assert found.transmission == pytest.approx(expected, rel=1e-9)


@pytest.mark.parametrize(("mass", "order"), [(flat(MASS), 6), (Curve("cosine", (0.08, 0.04)), 4)])
def test_the_order_of_convergence_is_six_for_a_constant_mass_and_four_for_one_that_runs(
    mass: Curve, order: int
) -> None:
    """Uniform steps, halved: errors against much finer ones fall by 2^order."""
    variation = Variation(10.0, Curve("cosine", (0.15, 0.15)), mass, flat(0.0))
    energy = np.linspace(0.01, 0.6, 7)

    def matrix(steps: int) -> np.ndarray:
        m = transfer(on_steps(variation, np.linspace(0, 10.0, steps + 1)), energy)
        return np.asarray(np.array([m.a, m.b, m.c, m.d]) * np.exp(m.log_scale))

    errors = [np.abs(matrix(steps) - matrix(2048)).max() for steps in (16, 32, 64)]
    assert np.log2(np.array(errors[:-1]) / errors[1:]) == pytest.approx(order, abs=0.25)


SCENARIO = """\
format = 1
conditions = { temperature_K = 77, nonparabolic = NONPARABOLIC }
leads = { left = { material = "GaAs" }, right = { material = "GaAs" } }
[stack]
periods = 1
cell = [ LAYERS ]
"""

Medium = Callable[[float], tuple[float, float, float]]
"""Band edge (eV), mass and nonparabolicity (1/eV) at x nm from the left lead."""


def explicit(edge: Callable[[float], float], mass: float = 0.08, alpha: float = 0.5) -> Medium:
    return lambda x: (edge(x), mass, alpha)


def alloy(first: float, last: float, length: float) -> Medium:
    ground = material("GaAs", None, 77.0)

    def at(x: float) -> tuple[float, float, float]:
        found = material("AlGaAs", first + (last - first) * x / length, 77.0)
        return found.band_edge - ground.band_edge, found.mass, 1 / found.gap

    return at


def interface(x: float) -> tuple[float, float, float]:
    """Lead at -0.4 to 0; 3 nm of Al0.3Ga0.7As with both faces graded over 0.8 nm; the right lead's half."""
    a, b = material("GaAs", None, 77.0), material("AlGaAs", 0.3, 77.0)
    share = min((1 + erf(4 * (x - 0.4) / 0.8) / erf(2)) / 2, (1 - erf(4 * (x - 3.4) / 0.8) / erf(2)) / 2, 1)
    values = zip((0.0, a.mass, 1 / a.gap), (b.band_edge - a.band_edge, b.mass, 1 / b.gap), strict=True)
    edge, mass, alpha = (p + share * (q - p) for p, q in values)
    return edge, mass, alpha


SAMPLES = [0.0, 0.2, 0.25, 0.1, 0.35, 0.0]
KINDS: dict[str, tuple[str, list[float], Medium]] = {
    "linear": ('profile = "linear", from_eV = 0.3, to_eV = 0.1, thickness_nm = 6.0', [6.0],
               explicit(lambda x: 0.3 - 0.2 * x / 6)),
    "cosine": ('profile = "cosine", mean_eV = 0.1, amplitude_eV = -0.2, thickness_nm = 9.0', [9.0],
               explicit(lambda x: 0.1 - 0.2 * math.cos(2 * math.pi * x / 9))),
    "gaussian": ('profile = "gaussian", height_eV = 0.3, width_nm = 1.1, base_eV = -0.02, thickness_nm = 8.0',
                 [4.0, 8.0], explicit(lambda x: -0.02 + 0.3 * math.exp(-((x - 4) ** 2) / (2 * 1.1**2)))),
    "sech2": ('profile = "sech2", height_eV = 0.3, width_nm = 0.7, base_eV = 0.03, thickness_nm = 8.0', [4.0, 8.0],
              explicit(lambda x: 0.03 + 0.3 / math.cosh((x - 4) / 0.7) ** 2)),
    "fermi": ('profile = "fermi", step_eV = -0.3, width_nm = 0.4, thickness_nm = 8.0', [4.0, 8.0],
              explicit(lambda x: -0.3 / (1 + math.exp(-(x - 4) / 0.4)))),
    "parabola": ('profile = "parabola", height_eV = 0.3, width_nm = 3.0, thickness_nm = 7.0', [7.0],
                 explicit(lambda x: 0.3 * (1 - ((x - 3.5) / 3) ** 2))),
    "samples": (f'profile = "samples", potential_eV = {SAMPLES}, thickness_nm = 7.5', [1.5, 3.0, 4.5, 6.0, 7.5],
                explicit(lambda x: float(np.interp(x, np.linspace(0, 7.5, 6), SAMPLES)))),
    "graded alloy": ('material = "AlGaAs", x_from = 0.05, x_to = 0.4, thickness_nm = 6.0', [6.0],
                     alloy(0.05, 0.4, 6.0)),
    "graded interfaces": ('material = "AlGaAs", x = 0.3, thickness_nm = 3.0, grading_nm = 0.8',
                          [0.4, 0.8, 3.0, 3.4, 3.8], interface),
}


def read(name: str) -> Scenario:
    layer = KINDS[name][0]
    mass = ", mass = 0.08, nonparabolicity_per_eV = 0.5" if "profile" in layer else ""
    text = SCENARIO.replace("NONPARABOLIC", "true")
    if "grading" in layer:  # every cell is the same: the graded faces stand within it
        halves = '{ material = "GaAs", thickness_nm = 0.4 }'
        return parse_scenario(text.replace("LAYERS", f"{halves}, {{ {layer} }}, {halves}"))
    return parse_scenario(text.replace("LAYERS", f"{{ {layer}{mass} }}"))


@pytest.mark.parametrize("name", KINDS)
def test_every_kind_agrees_with_a_general_integrator(name: str) -> None:
    """SciPy's DOP853 at rtol 1e-12 on psi' = m(E) u, u' = (V - E) psi / C, carried from the right lead."""
    scenario, (_, ends, medium) = read(name), KINDS[name]
    left, right = scenario.stack.left, scenario.stack.right
    energy = np.array([0.03, 0.11, 0.21, 0.36, 0.7])
    expected = []
    for e in energy:
        k1, k2 = (math.sqrt(e * lead.mass * (1 + lead.nonparabolicity * e) / HBAR2_2M0) for lead in (left, right))
        g1, g2 = (k / (lead.mass * (1 + lead.nonparabolicity * e)) for k, lead in ((k1, left), (k2, right)))

        def slope(x: float, y: np.ndarray, e: float = e) -> list[complex]:
            edge, mass, alpha = medium(x)
            return [mass * (1 + alpha * (e - edge)) * y[1], (edge - e) / HBAR2_2M0 * y[0]]

        state = np.array([1.0, 1j * g2])
        for low, high in reversed(list(zip([0.0, *ends], ends, strict=False))):
            state = solve_ivp(slope, (high, low), state, method="DOP853", rtol=1e-12, atol=1e-14).y[:, -1]
        incident = (state[0] + state[1] / (1j * g1)) / 2
        expected.append(g2 / g1 / abs(incident) ** 2)
    assert spectrum(scenario.stack, energy).transmission == pytest.approx(expected, rel=1e-9)
