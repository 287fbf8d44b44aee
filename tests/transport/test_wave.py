"""Waves inside the stack: against the spectrum, against a general solver, and against what is conserved."""

from typing import Any

import numpy as np
import pytest
from scipy.integrate import simpson, solve_ivp
from scipy.optimize import brentq, newton

from tests.transport.stacks import ALL, FREE, KANE, LEAD, LOSSY, OPAQUE, PLAIN, UNEQUAL
from transport import Delta, Layer, Lead, Stack, scattering_matrix, spectrum
from transport.constants import HBAR, HBAR2_2M0
from transport.march import Side
from transport.propagation import transfer
from transport.wave import charge, dwell_time, local_density_of_states, phase_time, pole_wave, wave

SIDES: tuple[Side, Side] = ("left", "right")
ENERGIES = np.linspace(0.0411, 1.2, 211)
LOSSY_KANE = Stack(
    KANE.left, (Layer(2.0, 0.1, 0.08, 0.5),), KANE.cell, 4, (Delta(0.1),), Lead(0.02, 0.08, 0.4), dephasing=0.01
)
DELTA_ENDS = Stack(LEAD, (Delta(0.3), Delta(-0.1)), PLAIN.cell, 3, (Delta(0.2),), Lead(0.01, 0.09))
KANE_STEP = Stack(LEAD, (Layer(2.0, 0.1, 0.08, 0.5),), KANE.cell, 4, (), Lead(0.02, 0.08, 0.4))
EVERY = {**ALL, "lossy": LOSSY, "lossy Kane": LOSSY_KANE, "delta ends": DELTA_ENDS, "Kane step": KANE_STEP}
STILL = {name: stack for name, stack in EVERY.items() if not stack.dephasing}
both_sides = pytest.mark.parametrize("side", SIDES)
mixed = pytest.mark.parametrize("stack", [UNEQUAL, KANE_STEP, LOSSY_KANE, DELTA_ENDS],
                                ids=["unequal", "Kane", "lossy", "deltas"])
every = pytest.mark.parametrize("name", EVERY)


def flux_factor(lead: Lead, energy: Any) -> Any:
    """g = k/m of an open lead, from its definition."""
    mass = lead.mass * (1 + lead.nonparabolicity * (energy - lead.band_edge))
    return np.sqrt((energy - lead.band_edge) / (HBAR2_2M0 * mass))


def velocity(lead: Lead, energy: Any) -> Any:
    """hbar k/m in nm/s."""
    return 2 * HBAR2_2M0 / HBAR * flux_factor(lead, energy)


def flux_factor_slope(lead: Lead, energy: Any) -> Any:
    """d ln g/dE: half of 1/(E - V) - alpha/(1 + alpha (E - V)), from the definition of g."""
    kinetic, alpha = energy - lead.band_edge, lead.nonparabolicity
    return (1 / kinetic - alpha / (1 + alpha * kinetic)) / 2


def pole(stack: Stack, near: complex) -> complex:
    """The complex energy at which nothing comes in: secant steps on F of `transport.chain`'s docstring."""
    def incoming(energy: complex) -> complex:
        m = transfer(stack.entry + stack.cell * stack.periods + stack.exit, np.array([energy]))
        left, right = flux_factor(stack.left, energy), flux_factor(stack.right, energy)
        return complex((right * m.a + left * m.d + 1j * (m.c - left * right * m.b))[0])

    return complex(newton(incoming, near, tol=1e-17, maxiter=100))


@both_sides
@every
def test_what_comes_out_is_the_spectrum_with_its_phase(name: str, side: Side) -> None:
    stack = EVERY[name]
    found, curve = wave(stack, ENERGIES, side), spectrum(stack, ENERGIES)
    end, sign, far = (-1, 1, stack.right) if side == "left" else (0, -1, stack.left)
    assert sign * found.current[:, end] == pytest.approx(curve.transmission, rel=1e-10, abs=0)
    amplitude = found.psi[:, end] * np.sqrt(velocity(far, ENERGIES))
    assert abs(amplitude) ** 2 == pytest.approx(curve.transmission, rel=1e-10, abs=0)
    assert abs(np.angle(amplitude * np.exp(-1j * curve.phase))).max() < 1e-9


@both_sides
@every
def test_where_it_comes_in_it_is_the_incident_and_the_reflected_wave(name: str, side: Side) -> None:
    stack = EVERY[name]
    found, matrix = wave(stack, ENERGIES, side), scattering_matrix(stack, ENERGIES)
    face, lead, reflection = (0, stack.left, matrix.reflection) if side == "left" else (
        -1, stack.right, matrix.reflection_back)
    assert found.psi[:, face] * np.sqrt(velocity(lead, ENERGIES)) == pytest.approx(1 + reflection, abs=1e-9)
    assert abs(found.current[:, face]) == pytest.approx(1 - abs(reflection) ** 2, rel=1e-8, abs=1e-9)


@both_sides
@pytest.mark.parametrize("name", STILL)
def test_current_is_the_same_everywhere_without_dephasing(name: str, side: Side) -> None:
    current = wave(STILL[name], ENERGIES, side).current
    assert (np.ptp(current, axis=1) <= 1e-10 * abs(current).min(axis=1)).all()


@both_sides
@every
def test_current_is_the_textbook_current(name: str, side: Side) -> None:
    """(hbar/m0) Im(psi* psi'/m), to the rounding of |psi| |psi'/m|; it may itself be smaller by many decades."""
    found = wave(EVERY[name], ENERGIES, side)
    scale = 2 * HBAR2_2M0 / HBAR
    size = scale * abs(found.psi) * abs(found.slope)
    assert (abs(scale * (found.psi.conj() * found.slope).imag - found.current) <= 1e-10 * size).all()


@both_sides
@mixed
def test_psi_is_what_a_general_solver_finds(stack: Stack, side: Side) -> None:
    """scipy.integrate.solve_ivp on (psi, psi'/m), layer by layer away from the face where the wave goes out."""
    energy, leftwards = 0.137, side == "left"
    found = wave(stack, energy, side)
    face = -1 if leftwards else 0
    state = np.array([found.psi[0, face], (1j if leftwards else -1j) * found.psi[0, face] * flux_factor(
        stack.right if leftwards else stack.left, energy)])
    elements, place = stack.entry + stack.cell * stack.periods + stack.exit, stack.length if leftwards else 0.0
    for element in reversed(elements) if leftwards else elements:
        if isinstance(element, Delta):
            state[1] += (-1 if leftwards else 1) * element.strength / HBAR2_2M0 * state[0]
            continue
        kinetic = energy - element.band_edge + 0.5j * stack.dephasing
        mass = element.mass * (1 + element.nonparabolicity * kinetic)
        end = place + (-element.thickness if leftwards else element.thickness)
        solved = solve_ivp(
            lambda x, y, q=kinetic / HBAR2_2M0, m=mass: [m * y[1], -q * y[0]], (place, end), state,
            method="DOP853", rtol=1e-11, atol=1e-13 * abs(state[0]), dense_output=True,
        )
        low, high = min(place, end), max(place, end)
        inside = np.flatnonzero((found.position > low + 1e-9) & (found.position < high - 1e-9))
        there = solved.sol(found.position[inside])
        assert found.density[0, inside] == pytest.approx(abs(there[0]) ** 2, rel=1e-8, abs=0)
        assert abs(found.psi[0, inside] - there[0]).max() < 1e-8 * abs(there[0]).max()
        assert abs(found.slope[0, inside] - there[1]).max() < 1e-8 * abs(there[1]).max()
        state, place = solved.y[:, -1], end


@both_sides
@every
def test_psi_and_its_slope_are_continuous(name: str, side: Side) -> None:
    """1e-9 nm to either side of every face; at a delta the slope steps by strength psi / C (textbook)."""
    stack, beside = EVERY[name], 1e-9
    faces, steps, place = [], [], 0.0
    for element in stack.entry + stack.cell * stack.periods + stack.exit:
        if isinstance(element, Layer):
            place += element.thickness
            faces.append(place)
            steps.append(0.0)
        elif faces:
            steps[-1] += element.strength / HBAR2_2M0
    at, step = np.array(faces[:-1]), np.array(steps[:-1])
    found = wave(stack, ENERGIES, side, positions=np.concatenate([at - beside, at + beside]))
    (psi_1, psi_2), (slope_1, slope_2) = (np.hsplit(part, 2) for part in (found.psi, found.slope))
    size = abs(psi_1) + abs(slope_1)
    assert (abs(psi_2 - psi_1) < 1e-6 * size).all()
    assert (abs(slope_2 - slope_1 - step * psi_1) < 1e-6 * size * (1 + abs(step))).all()


def test_positions_cover_both_faces_of_every_layer_with_the_spacing_asked_for() -> None:
    found = wave(UNEQUAL, 0.2, points_per_nm=3.0)
    faces = np.cumsum([0.0, *(e.thickness for e in UNEQUAL.entry + UNEQUAL.cell * 6 + UNEQUAL.exit
                              if isinstance(e, Layer))])
    assert np.diff(found.position).max() <= 1 / 3 + 1e-12
    assert np.diff(found.position).min() > 0
    assert abs(found.position[:, None] - faces).min(axis=0).max() < 1e-12


@both_sides
def test_given_positions_and_chosen_ones_agree(side: Side) -> None:
    chosen = wave(LOSSY_KANE, ENERGIES[::20], side)
    given = wave(LOSSY_KANE, ENERGIES[::20], side, positions=chosen.position[::-1])
    assert given.psi[:, ::-1] == pytest.approx(chosen.psi, rel=1e-9, abs=0)
    assert given.current[:, ::-1] == pytest.approx(chosen.current, rel=1e-9, abs=0)


@pytest.mark.parametrize("stack", [PLAIN.with_periods(500), UNEQUAL.with_periods(500), OPAQUE.with_periods(40)],
                         ids=["plain", "unequal", "opaque"])
def test_long_and_opaque_stacks_stay_finite_and_decay_as_the_spectrum_says(stack: Stack) -> None:
    """In a gap |psi|^2 at the far face is T over the far lead's velocity, through hundreds of decades."""
    energy = np.array([0.08, 0.15, 0.45])
    found, logs = wave(stack, energy, points_per_nm=0.5), spectrum(stack, energy).log10_transmission
    assert np.isfinite(found.psi).all()
    assert np.isfinite(found.current).all()
    seen = logs > -290
    expected = logs[seen] - np.log10(velocity(stack.right, energy[seen]))
    assert np.log10(found.density[seen, -1]) == pytest.approx(expected, abs=1e-9)
    assert np.isfinite(dwell_time(stack, energy)).all()
    assert np.isfinite(phase_time(stack, energy)).all()


def test_one_barrier_thicker_than_any_exponent_decays_evenly() -> None:
    """ln |psi|^2 falls by 2 kappa a nm (textbook), from 1 to 1e-300 and below, without a warning."""
    stack = Stack(LEAD, (), (Layer(900.0, 0.3, 0.092),), 1, (), LEAD)
    found = wave(stack, 0.1, positions=[10.0, 110.0, 300.0, 900.0])
    kappa = np.sqrt(0.2 * 0.092 / HBAR2_2M0)
    assert np.diff(np.log(found.density[0, :3])) == pytest.approx([-200 * kappa, -380 * kappa], rel=1e-12, abs=0)
    assert found.density[0, 3] == 0
    thinner = Stack(LEAD, (), (Layer(90.0, 0.3, 0.092),), 1, (), LEAD)
    assert dwell_time(stack, 0.1) == pytest.approx(dwell_time(thinner, 0.1), rel=1e-12, abs=0)


def gauss(stack: Stack) -> tuple[Any, Any, Any]:
    """Positions, weights and dm/dE (layers, 60) of Gauss-Legendre rules over each layer, exact here to rounding."""
    nodes, weights = np.polynomial.legendre.leggauss(60)
    layers = [e for e in stack.entry + stack.cell * stack.periods + stack.exit if isinstance(e, Layer)]
    half = np.array([[layer.thickness / 2] for layer in layers])
    rate = np.array([[layer.mass * layer.nonparabolicity] for layer in layers])
    return 2 * np.cumsum(half)[:, None] + half * (nodes - 1), half * weights, rate * np.ones_like(nodes)


@both_sides
@every
def test_dwell_time_and_charge_are_integrals_of_the_density(name: str, side: Side) -> None:
    """Of |psi|^2 + C (dm/dE) |psi'/m|^2, over each layer."""
    stack, energy = EVERY[name], ENERGIES[::20]
    at, weights, rate = gauss(stack)
    found = wave(stack, energy, side, positions=at)
    density = found.density + HBAR2_2M0 * rate.ravel() * abs(found.slope) ** 2
    parts = (density.reshape(-1, *at.shape) * weights).sum(axis=2)
    assert dwell_time(stack, energy, side) == pytest.approx(parts.sum(axis=1), rel=1e-9, abs=0)
    share = charge(stack, energy, side)
    assert share == pytest.approx(parts / parts.sum(axis=1, keepdims=True), rel=1e-8, abs=0)
    assert share.sum(axis=1) == pytest.approx(1, abs=1e-12)


@pytest.mark.parametrize("stack", [LOSSY, LOSSY_KANE], ids=["lossy", "lossy Kane"])
def test_what_dephasing_absorbs_is_what_stays_inside_for_its_time(stack: Stack) -> None:
    """1 - T - R = dephasing/hbar times the dwell time: the continuity equation, integrated over the stack."""
    curve = spectrum(stack, ENERGIES)
    taken = stack.dephasing / HBAR * dwell_time(stack, ENERGIES)
    assert taken == pytest.approx(1 - curve.transmission - curve.reflection, abs=1e-11)


@pytest.mark.parametrize("name", STILL)
def test_dwell_times_are_the_phase_times_without_the_self_interference(name: str) -> None:
    """tau_left + tau_right = 2 phase time + hbar (g_L'/g_L Im r + g_R'/g_R Im r').

    From the closed form of the integral of |psi|^2 and unitarity, arg r + arg r' = 2 arg t + pi; one side alone:
    Winful, Phys. Rev. Lett. 91, 260401 (2003).
    """
    stack, matrix = STILL[name], scattering_matrix(STILL[name], ENERGIES)
    dwell = dwell_time(stack, ENERGIES) + dwell_time(stack, ENERGIES, "right")
    parts = zip((stack.left, stack.right), (matrix.reflection, matrix.reflection_back), strict=True)
    interference = HBAR * sum(flux_factor_slope(lead, ENERGIES) * r.imag for lead, r in parts)
    assert dwell == pytest.approx(2 * phase_time(stack, ENERGIES) + interference, rel=1e-8, abs=0)


@every
def test_the_states_counted_in_the_stack_are_its_dwell_times_over_2_pi_hbar(name: str) -> None:
    stack, energy = EVERY[name], ENERGIES[::20]
    at, weights, _ = gauss(stack)
    states = local_density_of_states(stack, energy, positions=at).density @ weights.ravel()
    expected = (dwell_time(stack, energy) + dwell_time(stack, energy, "right")) / (2 * np.pi * HBAR)
    assert states == pytest.approx(expected, rel=1e-9, abs=0)


def test_a_closed_right_lead_turns_all_back() -> None:
    """psi is a standing wave, its current 0; from the right nothing can come."""
    stack = Stack(LEAD, (), FREE.cell, 2, (), Lead(0.4, 0.1))
    found = wave(stack, [0.1, 0.3])
    assert abs(found.current).max() == 0
    turned = found.psi / found.psi[:, :1]
    assert abs(turned.imag).max() < 1e-12
    assert (phase_time(stack, [0.5]) > 0).all()
    assert np.isfinite(dwell_time(stack, [0.1, 0.3])).all()


def test_below_a_lead_only_the_other_feeds_the_density() -> None:
    stack = Stack(LEAD, (), FREE.cell, 2, (), Lead(-0.1, 0.1))
    density = local_density_of_states(stack, [-0.2, -0.05, 0.05])
    assert (density.density[0] == 0).all()
    lone = wave(stack.reversed(), 0.05)
    assert density.density[1] == pytest.approx(lone.density[0, ::-1] / (2 * np.pi * HBAR), rel=1e-9, abs=0)
    assert density.density[2].min() > 0


@mixed
def test_a_stack_turned_round_shows_the_same_wave_from_the_other_side(stack: Stack) -> None:
    shift = stack.right.band_edge
    here, there = wave(stack, ENERGIES, "right"), wave(stack.reversed(), ENERGIES - shift, "left")
    assert stack.length - there.position[::-1] == pytest.approx(here.position, abs=1e-9)
    assert there.density[:, ::-1] == pytest.approx(here.density, rel=1e-7, abs=0)


def test_a_decaying_state_has_unit_norm_and_goes_out_on_both_sides() -> None:
    wall = Layer(5.0, 0.23, 0.067)
    stack = Stack(LEAD, (wall,), (Layer(5.0, 0.0, 0.067),), 1, (wall,), LEAD)
    energy = pole(stack, 0.08 - 0.0005j)
    found = pole_wave(stack, [energy], points_per_nm=200.0)
    assert simpson(found.density[0], x=found.position) == pytest.approx(1, rel=1e-9, abs=0)
    outwards = 1j * np.sqrt(energy / (HBAR2_2M0 * 0.067))
    assert found.slope[0, -1] / found.psi[0, -1] == pytest.approx(outwards, rel=1e-9, abs=0)
    assert found.slope[0, 0] / found.psi[0, 0] == pytest.approx(-outwards, rel=1e-9, abs=0)
    assert found.density[0] == pytest.approx(found.density[0, ::-1], rel=1e-9, abs=0)


def test_a_decaying_state_loses_at_its_faces_what_its_width_says() -> None:
    """Width/hbar = outward current over norm: the continuity equation at a complex energy."""
    stack = Stack(LEAD, (Layer(4.0, 0.25, 0.08, 0.3),), (Layer(5.0, 0.0, 0.067, 0.6), Layer(4.0, 0.3, 0.09)), 1, (),
                  Lead(-0.02, 0.07))
    energy = pole(stack, 0.085 - 0.001j)
    found = pole_wave(stack, [energy])
    assert -2 * energy.imag / HBAR == pytest.approx(found.current[0, -1] - found.current[0, 0], rel=1e-9, abs=0)


@pytest.mark.parametrize("near", [0.0763 - 0.00017j, 0.0872 - 0.00023j])
def test_a_decaying_state_is_whole_where_its_two_ends_are_joined(near: complex) -> None:
    """psi and psi'/m just left and just right of every face, in a stack of eight wells."""
    stack, beside = ALL["closed off"], 1e-9
    faces = np.cumsum([layer.thickness for layer in stack.cell * 8 if isinstance(layer, Layer)])
    found = pole_wave(stack, [pole(stack, near)], positions=np.concatenate([faces - beside, faces + beside]))
    size = abs(found.psi).max() + abs(found.slope).max()
    for part in (found.psi, found.slope):
        before, behind = np.split(part[0], 2)
        assert abs(behind - before).max() < 1e-7 * size


def test_a_long_lived_state_dies_away_on_both_sides() -> None:
    """Walls of e^-40, so 1e-34 in density: carried from one end only, the other tail would be rounding."""
    wall = Layer(60.0, 0.3, 0.067)
    stack = Stack(LEAD, (wall,), (Layer(6.0, 0.0, 0.067),), 1, (wall,), LEAD)

    def even(energy: float) -> float:  # k tan(k w/2) = kappa: textbook condition of the lowest level
        k, kappa = (np.sqrt(kinetic * 0.067 / HBAR2_2M0) for kinetic in (energy, 0.3 - energy))
        return float(k * np.tan(3 * k) - kappa)

    found = pole_wave(stack, [brentq(even, 0.01, 0.08, xtol=1e-18)])
    assert found.density[0] == pytest.approx(found.density[0, ::-1], rel=1e-6, abs=0)
    assert found.density[0, 0] < 1e-33 * found.density.max()


def test_two_ends_that_do_not_join_are_no_pole() -> None:
    with pytest.raises(ValueError, match=r"energies: at .* eV no wave goes out on both sides, give poles"):
        pole_wave(PLAIN, [0.2 - 0.01j])


@pytest.mark.parametrize("call", [wave, charge, dwell_time])
def test_a_side_is_left_or_right(call: Any) -> None:
    with pytest.raises(ValueError, match=r"side is 'top': give 'left' or 'right', where the wave comes from"):
        call(PLAIN, [0.1], "top")


@pytest.mark.parametrize("call", [wave, charge, dwell_time])
def test_no_wave_comes_from_a_closed_lead(call: Any) -> None:
    with pytest.raises(ValueError, match=r"energies: the left lead is closed below 0 eV, ask above it"):
        call(UNEQUAL, [0.1, 0.0])
    with pytest.raises(ValueError, match=r"energies: the right lead is closed below 0\.03 eV, ask above it"):
        call(UNEQUAL, [0.02], "right")


def test_a_phase_time_needs_both_leads_open() -> None:
    with pytest.raises(ValueError, match=r"energies: the right lead is closed below 0\.03 eV"):
        phase_time(UNEQUAL, [0.02])


@pytest.mark.parametrize("call", [wave, charge, dwell_time, phase_time, local_density_of_states, pole_wave])
@pytest.mark.parametrize("value", [np.nan, np.inf])
def test_energies_are_finite(call: Any, value: float) -> None:
    with pytest.raises(ValueError, match=r"energies: every one must be a finite number of eV"):
        call(PLAIN, [0.1, value])


@pytest.mark.parametrize("call", [wave, charge, dwell_time, phase_time, local_density_of_states])
def test_the_model_ends_where_a_mass_falls_to_0(call: Any) -> None:
    stack = Stack(LEAD, (), (Layer(3.0, 2.0, 0.1, 1.0),), 1, (), LEAD)
    with pytest.raises(ValueError, match=r"the one-band model ends at 1000 meV"):
        call(stack, [0.5])


def test_the_model_ends_in_a_closed_lead_too() -> None:
    stack = Stack(LEAD, (), PLAIN.cell, 1, (), Lead(2.0, 0.1, 1.0))
    with pytest.raises(ValueError, match=r"the one-band model ends at 1000 meV, where a lead's mass falls to 0"):
        wave(stack, [0.5])


@pytest.mark.parametrize("position", [-0.1, 64.1, np.nan])
def test_positions_lie_in_the_stack(position: float) -> None:
    with pytest.raises(ValueError, match=r"positions: every one must lie in the stack, from 0 to 64 nm"):
        wave(PLAIN, [0.1], positions=[1.0, position])


@pytest.mark.parametrize("spacing", [0.0, -1.0, np.nan, np.inf])
def test_a_spacing_is_above_0(spacing: float) -> None:
    with pytest.raises(ValueError, match=r"points_per_nm is .*: give a number above 0"):
        wave(PLAIN, [0.1], points_per_nm=spacing)


def test_too_much_is_refused_before_it_is_begun() -> None:
    with pytest.raises(ValueError, match=r"10,000 energies at 6,401 places are more than .* ask for fewer"):
        local_density_of_states(PLAIN, np.linspace(0.1, 0.2, 10_000), points_per_nm=100)
    with pytest.raises(ValueError, match=r"1 energies at 2,000,000 places"):
        wave(PLAIN.with_periods(1_000_000), [0.1])


@pytest.mark.parametrize("call", [wave, local_density_of_states])
def test_no_energies_give_no_rows(call: Any) -> None:
    assert call(PLAIN, []).density.shape[0] == 0
