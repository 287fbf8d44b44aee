"""Waves, dwell and phase times and local densities against closed forms and against plane waves in 20 to 50 digits."""

import mpmath as mp
import numpy as np
import pytest

from tests.reference import CHARGE, HBAR, C
from tests.transport.stacks import ALL, KANE_LEAD, LEAD, LOSSY
from transport import Delta, Layer, Lead, Stack
from transport.constants import HBAR2_2M0
from transport.march import Side
from transport.wave import dwell_time, local_density_of_states, phase_time, wave

HBAR_EV = HBAR / CHARGE
UNEVEN = Stack(
    KANE_LEAD, (Layer(1.0, 0.2, 0.08, 0.5), Delta(0.05)), (Layer(3.0, 0.3, 0.092, 0.5), Layer(5.0, 0.0, 0.067)), 3,
    (Layer(2.0, 0.1, 0.07), Delta(-0.1)), Lead(0.04, 0.1, 0.3),
)
SEVERAL = {**ALL, "uneven": UNEVEN}
BELOW = (0.02, 0.1, 0.25, 0.2999)
STEP = mp.mpf("1e-18")
D, V, M = 3.0, 0.3, 0.067
ALONE = Stack(LEAD, (), (Layer(D, V, M),), 1, (), LEAD)


def medium(part: Layer | Lead, energy: mp.mpf, loss: float = 0.0) -> tuple[mp.mpc, mp.mpc]:
    """k and m of a layer or lead."""
    kinetic = energy - mp.mpf(part.band_edge) + mp.mpc(0, loss) / 2
    mass = mp.mpf(part.mass) * (1 + mp.mpf(part.nonparabolicity) * kinetic)
    return mp.sqrt(mp.mpc(kinetic * mass / C)), mass


def carried(stack: Stack, energy: mp.mpf) -> tuple[mp.mpc, list[tuple[Layer, mp.mpc, mp.mpc]]]:
    """Incident amplitude for a transmitted wave of 1, and each layer from the right with (psi, psi'/m) at its right."""
    k, mass = medium(stack.right, energy)
    psi, slope, met = mp.mpc(1), 1j * k / mass, []
    for element in reversed(stack.entry + stack.cell * stack.periods + stack.exit):
        if isinstance(element, Delta):
            slope -= mp.mpf(element.strength) / C * psi
            continue
        met.append((element, psi, slope))
        psi, slope = within(element, energy, stack.dephasing, psi, slope, mp.mpf(element.thickness))
    k, mass = medium(stack.left, energy)
    return (psi + slope * mass / (1j * k)) / 2, met


def within(layer: Layer, energy: mp.mpf, loss: float, psi: mp.mpc, slope: mp.mpc, s: mp.mpf) -> tuple[mp.mpc, mp.mpc]:
    """(psi, psi'/m) at s nm to the left of the right face."""
    k, mass = medium(layer, energy, loss)
    cosine, sine = mp.cos(k * s), mp.sin(k * s)
    return psi * cosine - slope * mass / k * sine, psi * k / mass * sine + slope * cosine


def dwelt(stack: Stack, energy: mp.mpf) -> mp.mpf:
    """Dwell time (s) by mpmath's quadrature of |psi|^2 + C (dm/dE) |psi'/m|^2."""
    incident, met = carried(stack, energy)
    total = mp.mpf(0)
    for layer, psi, slope in met:
        rate = C * mp.mpf(layer.mass) * mp.mpf(layer.nonparabolicity)

        def density(s: mp.mpf, at: tuple = (layer, psi, slope), rate: mp.mpf = rate) -> mp.mpf:  # type: ignore[type-arg]
            here, bend = within(at[0], energy, stack.dephasing, at[1], at[2], s)
            return abs(here) ** 2 + rate * abs(bend) ** 2

        with mp.workdps(20):
            panels = mp.linspace(0, mp.mpf(layer.thickness), 2 + int(layer.thickness / 6))
            total += mp.quad(density, panels, method="gauss-legendre")
    k, mass = medium(stack.left, energy)
    return total / abs(incident) ** 2 * HBAR_EV / (2 * C * (k / mass).real)


@pytest.mark.parametrize("name", [*SEVERAL, "lossy"])
def test_dwell_time_agrees_with_quadrature_in_20_digits(name: str) -> None:
    stack, energy = {**SEVERAL, "lossy": LOSSY}[name].with_periods(2), np.array([0.061, 0.3007, 0.77])
    expected = [float(dwelt(stack, mp.mpf(float(e)))) for e in energy]
    assert dwell_time(stack, energy) == pytest.approx(expected, rel=1e-10, abs=0)


@pytest.mark.parametrize("name", [*SEVERAL, "lossy"])
def test_phase_time_agrees_with_the_derivative_in_50_digits(name: str) -> None:
    """A difference over 2e-18 eV, which leaves more than 20 of 50 digits right."""
    stack, energy = {**SEVERAL, "lossy": LOSSY}[name], np.array([0.061, 0.3, 0.77])
    expected = []
    for e in energy:
        above, below = (carried(stack, mp.mpf(float(e)) + step)[0] for step in (STEP, -STEP))
        expected.append(float(-HBAR_EV * mp.arg(above / below) / (2 * STEP)))
    assert phase_time(stack, energy) == pytest.approx(expected, rel=1e-10, abs=0)


def barrier_numbers(energy: float) -> tuple[float, float, float]:
    k, kappa = (float(np.sqrt(kinetic * M / HBAR2_2M0)) for kinetic in (energy, V - energy))
    mass_over_hbar = float(HBAR_EV) / (2 * HBAR2_2M0) * M  # s/nm^2
    return k, kappa, mass_over_hbar


@pytest.mark.parametrize("energy", BELOW)
def test_psi_inside_a_rectangular_barrier(energy: float) -> None:
    """|psi|^2 = T (cosh^2 kappa(d - x) + (k/kappa)^2 sinh^2 kappa(d - x)) for unit incident amplitude: textbook."""
    k, kappa, per_velocity = barrier_numbers(energy)
    found = wave(ALONE, energy, points_per_nm=20.0)
    depth = kappa * (D - found.position)
    through = 1 / (1 + V**2 * np.sinh(kappa * D) ** 2 / (4 * energy * (V - energy)))
    expected = through * (np.cosh(depth) ** 2 + (k / kappa * np.sinh(depth)) ** 2) * per_velocity / k
    assert found.density[0] == pytest.approx(expected, rel=1e-11, abs=0)


@pytest.mark.parametrize("energy", BELOW)
def test_dwell_and_phase_time_of_a_rectangular_barrier(energy: float) -> None:
    """Buettiker, Phys. Rev. B 27, 6178 (1983), equations for the dwell and the phase time (from memory)."""
    k, kappa, scale = barrier_numbers(energy)
    both, turn = k**2 + kappa**2, 2 * kappa * D
    bottom = 4 * k**2 * kappa**2 + both**2 * np.sinh(kappa * D) ** 2
    dwell = scale * k / kappa * (turn * (kappa**2 - k**2) + both * np.sinh(turn)) / bottom
    phase = scale / (k * kappa) * (turn * k**2 * (kappa**2 - k**2) + both**2 * np.sinh(turn)) / bottom
    rel = 1e-9 if energy < 0.29 else 1e-6  # the published forms cancel at the top of the barrier
    assert dwell_time(ALONE, energy) == pytest.approx(dwell, rel=rel, abs=0)
    assert phase_time(ALONE, energy) == pytest.approx(phase, rel=rel, abs=0)


def test_the_phase_time_of_a_thick_barrier_no_longer_grows() -> None:
    """2 m/(hbar k kappa): Hartman, J. Appl. Phys. 33, 3427 (1962)."""
    k, kappa, scale = barrier_numbers(0.1)
    for thickness in (20.0, 60.0, 2000.0):
        thick = Stack(LEAD, (), (Layer(thickness, V, M),), 1, (), LEAD)
        assert phase_time(thick, 0.1) == pytest.approx(2 * scale / (k * kappa), rel=1e-9, abs=0)


@pytest.mark.parametrize("lead", [LEAD, KANE_LEAD], ids=["plain", "Kane"])
def test_free_electrons_fill_space_evenly(lead: Lead) -> None:
    """1/(pi hbar v) states per eV, nm and spin, v = dE/(hbar dk) (textbook); time of flight L/v; current 1."""
    stack = Stack(lead, (), (Layer(5.0, 0.0, lead.mass, lead.nonparabolicity),), 3, (), lead)
    energy = np.array([0.01, 0.1, 0.7])
    mass = lead.mass * (1 + 2 * lead.nonparabolicity * energy)  # d(E m(E))/dE
    k = np.sqrt(energy * lead.mass * (1 + lead.nonparabolicity * energy) / HBAR2_2M0)
    velocity = 2 * HBAR2_2M0 * k / mass / float(HBAR_EV)
    found = local_density_of_states(stack, energy)
    expected = 1 / (np.pi * float(HBAR_EV) * velocity)
    assert found.density == pytest.approx(np.tile(expected[:, None], found.position.size), rel=1e-12, abs=0)
    sides: tuple[Side, Side] = ("left", "right")
    for side in sides:
        assert dwell_time(stack, energy, side) == pytest.approx(15.0 / velocity, rel=1e-12, abs=0)
        assert abs(wave(stack, energy, side).current) == pytest.approx(1, rel=1e-12, abs=0)
    assert phase_time(stack, energy) == pytest.approx(15.0 / velocity, rel=1e-12, abs=0)


def test_before_a_closed_lead_stands_a_standing_wave() -> None:
    """4 cos^2(k (L - x) - atan(kappa/k)) / (2 pi hbar v), equal masses: textbook."""
    stack, energy = Stack(LEAD, (), (Layer(30.0, 0.0, M),), 1, (), Lead(V, M)), np.array([[0.05], [0.2]])
    k, kappa = (np.sqrt(kinetic * M / HBAR2_2M0) for kinetic in (energy, V - energy))
    found = local_density_of_states(stack, energy.ravel())
    angle = k * (30.0 - found.position) - np.arctan(kappa / k)
    scale = M / (2 * HBAR2_2M0 * k) / (2 * np.pi)
    assert found.density == pytest.approx(4 * np.cos(angle) ** 2 * scale, rel=1e-9, abs=1e-12)


def test_behind_a_delta_the_wave_is_flat() -> None:
    """|psi|^2 = T/v right of a delta, T = 1/(1 + (m s/2Ck)^2); left of it it beats with R: textbook."""
    stack = Stack(LEAD, (), (Layer(20.0, 0.0, M), Delta(0.2), Layer(10.0, 0.0, M)), 1, (), LEAD)
    k, scale = np.sqrt(0.1 * M / HBAR2_2M0), float(HBAR_EV) / (2 * HBAR2_2M0) * M
    b = M * 0.2 / (2 * HBAR2_2M0 * k)
    found = wave(stack, 0.1, points_per_nm=50.0)
    behind = found.position >= 20.0
    assert found.density[0, behind] == pytest.approx(scale / k / (1 + b**2), rel=1e-12, abs=0)
    reflected = -1j * b / (1 + 1j * b)
    x = found.position[~behind] - 20.0
    assert found.density[0, ~behind] == pytest.approx(
        scale / k * abs(np.exp(1j * k * x) + reflected * np.exp(-1j * k * x)) ** 2, rel=1e-11, abs=0)
