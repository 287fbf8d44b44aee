"""What moves a resonance: exact derivatives against poles of changed stacks, found in 50 digits or by other means."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import mpmath
import numpy as np
import pytest

from tests.transport.stacks import DELTAS, END_WELLS, KANE, LEAD, UNEQUAL, barrier
from transport import (
    Delta,
    Layer,
    Scenario,
    Stack,
    document_from_data,
    document_to_data,
    load_scenario,
    scenario_from_document,
)
from transport.constants import HBAR2_2M0
from transport.effects import sensitivities
from transport.sensitivity import pole_slopes
from transport.structure import Element, Lead

SMALL = {
    "unequal leads": (replace(UNEQUAL, periods=3), 0.2799 - 0.0037j),
    "Kane masses": (replace(KANE, periods=2), 0.0826 - 0.0014j),
    "deltas": (replace(DELTAS, periods=3), 0.2135 - 0.0125j),
    "end wells": (replace(END_WELLS, periods=2), 0.08779 - 0.000014j),
    "a layer at the pole's energy": (
        Stack(LEAD, (), (barrier(2.0), Layer(4.0, 0.062, 0.07)), 2, (barrier(2.0),), LEAD), 0.1764 - 0.008j),
}


def outgoing(stack: Stack, energy: mpmath.mpc) -> mpmath.mpc:
    """The determinant whose zeros are the poles, in 50 digits, written out anew."""
    def mass(medium: Layer | Lead) -> mpmath.mpc:
        return medium.mass * (1 + medium.nonparabolicity * (energy - medium.band_edge))

    def flux_factor(lead: Lead) -> mpmath.mpc:
        return mpmath.sqrt((energy - lead.band_edge) / (HBAR2_2M0 * mass(lead)))

    psi, u = mpmath.mpc(1), -1j * flux_factor(stack.left)
    for element in stack.entry + stack.cell * stack.periods + stack.exit:
        if isinstance(element, Delta):
            u += mpmath.mpf(element.strength) / HBAR2_2M0 * psi
            continue
        m = mass(element)
        k = mpmath.sqrt((energy - element.band_edge) * m / HBAR2_2M0)
        phase = k * element.thickness
        psi, u = (mpmath.cos(phase) * psi + m * mpmath.sin(phase) / k * u,
                  -k / m * mpmath.sin(phase) * psi + mpmath.cos(phase) * u)
    return u - 1j * flux_factor(stack.right) * psi


def pole(stack: Stack, guess: complex) -> complex:
    with mpmath.workdps(50):
        found: complex = mpmath.findroot(lambda e: outgoing(stack, e), mpmath.mpc(guess))
        return found


def with_element(stack: Stack, place: int, element: Element) -> Stack:
    """The stack with another element at a place of `stack.elements`."""
    elements = list(stack.elements)
    elements[place] = element
    before, cell = len(stack.entry), len(stack.cell)
    return Stack(stack.left, tuple(elements[:before]), tuple(elements[before:before + cell]), stack.periods,
                 tuple(elements[before + cell:]), stack.right)


@pytest.mark.parametrize(("stack", "guess"), SMALL.values(), ids=SMALL)
def test_every_derivative_is_that_of_poles_in_50_digits(stack: Stack, guess: complex) -> None:
    """Central differences over 2^-21 in 50-digit arithmetic: their own error is some 1e-13."""
    found = pole_slopes(stack, [complex(pole(stack, guess))])
    for place, element in enumerate(stack.elements):
        names = ("strength",) if isinstance(element, Delta) else ("thickness", "band_edge", "mass", "nonparabolicity")
        for name in names:
            if name == "nonparabolicity" and getattr(element, name) == 0:
                continue  # its own difference would leave the admitted side
            ends = [pole(with_element(stack, place, _moved(element, name, way)), guess) for way in (-1, 1)]
            expected = complex((ends[1] - ends[0]) / (2 * _moved_by(element, name)))
            assert complex(getattr(found, name)[0, place]) == pytest.approx(expected, rel=1e-7)


def _moved_by(element: Element, name: str) -> mpmath.mpf:
    """Half the exact difference of the doubles that `_moved` makes."""
    above, below = (mpmath.mpf(getattr(_moved(element, name, way), name)) for way in (1, -1))
    return (above - below) / 2


def _moved(element: Element, name: str, way: int) -> Element:
    return replace(element, **{name: getattr(element, name) + way * 2.0**-22})


def test_a_stack_of_many_opaque_periods_has_finite_derivatives_that_add_up() -> None:
    """All band edges up by e, leads included, shift a pole by e: the lead's share follows from the others."""
    stack = Stack(LEAD, (), (barrier(6.0), Layer(5.0, 0.0, 0.067)), 60, (barrier(6.0),), LEAD)
    found = pole_slopes(stack, [0.0859 - 1e-15j])
    assert all(np.isfinite(getattr(found, name)).all() for name in ("thickness", "band_edge", "mass"))
    assert found.band_edge.sum().real == pytest.approx(1.0, abs=1e-6)  # nothing of so narrow a state is in the leads


def test_effects_are_sorted_and_in_the_steps_they_say() -> None:
    heron = load_scenario("scenarios/heron-gate.toml")
    scenario = scenario_from_document(document_from_data(
        document_to_data(heron.document) | {"stack": document_to_data(heron.document)["stack"] | {"periods": 3}}))
    at = complex(pole(scenario.stack, 0.058 - 0.003j))
    effects = sensitivities(scenario, at.real, -2 * at.imag)
    sizes = [abs(effect.energy) for effect in effects]
    assert sizes == sorted(sizes, reverse=True)
    assert {effect.figure for effect in effects} == {"thickness", "band edge", "mass", "composition"}
    assert {effect.key for effect in effects} == {"stack.cell[0]", "stack.cell[1]", "stack.exit[0]"}


def test_the_effect_of_composition_is_that_of_another_x() -> None:
    """A scenario with x moved by 1e-5 either way, its poles in 50 digits; thickness in nm, so that it stays."""
    heron = load_scenario("scenarios/heron-gate.toml")
    data = document_to_data(heron.document)
    data["stack"] |= {"periods": 2, "exit": []}
    for nonparabolic in (False, True):
        poles = []
        for x in (0.3 - 1e-5, 0.3, 0.3 + 1e-5):
            data["conditions"] |= {"nonparabolic": nonparabolic}
            poles.append(complex(pole(_at_x(data, x).stack, 0.058 - 0.01j)))
        effects = sensitivities(_at_x(data, 0.3), poles[1].real, -2 * poles[1].imag)
        (found,) = (e for e in effects if e.figure == "composition")
        expected = (poles[2] - poles[0]) / 2e-5 * 0.01
        assert complex(found.energy, -found.width / 2) == pytest.approx(expected, rel=1e-5)


def _at_x(data: dict[str, Any], x: float) -> Scenario:
    data["stack"]["cell"][0] = {"material": "AlGaAs", "x": x, "thickness_nm": 3.0}
    return scenario_from_document(document_from_data(data))
