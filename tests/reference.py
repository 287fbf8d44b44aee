"""An arithmetic that shares nothing with the engine: plane waves matched layer by layer, in 50 digits (mpmath).

Where the engine multiplies real matrices and takes N periods in closed form, this walks backwards from the
transmitted wave through every layer written out, with complex wave numbers. Slow, and only for tests.
"""

from __future__ import annotations

from dataclasses import dataclass

import mpmath as mp

from transport import Delta, Layer, Lead, Stack

mp.mp.dps = 50
HBAR, MASS, CHARGE = mp.mpf("6.62607015e-34") / (2 * mp.pi), mp.mpf("9.1093837139e-31"), mp.mpf("1.602176634e-19")
C = HBAR**2 / (2 * MASS) / CHARGE * 10**18
"""hbar^2/2m0 in eV nm^2, CODATA 2022."""


@dataclass(frozen=True)
class Amplitudes:
    """T, R and the amplitude t between the outer faces (in psi, not in flux)."""

    transmission: mp.mpf
    reflection: mp.mpf
    amplitude: mp.mpc


def _medium(part: Layer | Lead, energy: mp.mpf, loss: mp.mpf) -> tuple[mp.mpc, mp.mpc]:
    edge = mp.mpf(part.band_edge) - 0.5j * loss
    mass = mp.mpf(part.mass) * (1 + mp.mpf(part.nonparabolicity) * (energy - edge))
    return mp.sqrt(mp.mpc((energy - edge) * mass / C)), mass


def scattered(stack: Stack, energy: float) -> Amplitudes:
    """T, R and t of a stack at one energy where both leads are open."""
    e, loss = mp.mpf(energy), mp.mpf(stack.dephasing)
    k, mass = _medium(stack.right, e, mp.mpf(0))
    psi, slope, out = mp.mpc(1), 1j * k / mass, k / mass
    for element in reversed(stack.entry + stack.cell * stack.periods + stack.exit):
        if isinstance(element, Delta):
            slope -= mp.mpf(element.strength) / C * psi
            continue
        k, mass = _medium(element, e, loss)
        if k == 0:
            psi -= mass * mp.mpf(element.thickness) * slope
            continue
        right, left = (psi + slope * mass / (1j * k)) / 2, (psi - slope * mass / (1j * k)) / 2
        turn = mp.exp(1j * k * mp.mpf(element.thickness))
        right, left = right / turn, left * turn
        psi, slope = right + left, 1j * k / mass * (right - left)
    k, mass = _medium(stack.left, e, mp.mpf(0))
    incident, reflected = (psi + slope * mass / (1j * k)) / 2, (psi - slope * mass / (1j * k)) / 2
    flux = (out / (k / mass)).real
    return Amplitudes(flux / abs(incident) ** 2, abs(reflected / incident) ** 2, 1 / incident)


def discriminant(stack: Stack, energy: mp.mpf) -> mp.mpf:
    """Trace of the cell's transfer matrix, from two independent solutions carried through the cell."""
    trace = mp.mpf(0)
    for start in ((mp.mpf(1), mp.mpf(0)), (mp.mpf(0), mp.mpf(1))):
        psi, slope = start
        for element in stack.cell:
            if isinstance(element, Delta):
                slope = slope + mp.mpf(element.strength) / C * psi
                continue
            k, mass = _medium(element, energy, mp.mpf(0))
            z = k * mp.mpf(element.thickness)
            sine = mp.sin(z) * mass / k if k != 0 else mass * mp.mpf(element.thickness)
            psi, slope = mp.cos(z) * psi + sine * slope, -mp.sin(z) * k / mass * psi + mp.cos(z) * slope
        trace += psi.real if start[0] else slope.real
    return trace


def band_edge(stack: Stack, near: float, value: int) -> mp.mpf:
    """The energy near a guess (eV) where the discriminant is +2 or -2, by the secant method."""
    guess = mp.mpf(near)
    return mp.findroot(lambda e: discriminant(stack, e) - value, (guess, guess + mp.mpf("1e-9")), tol=1e-40)
