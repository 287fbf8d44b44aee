"""How fast is the engine: against a compiled loop where there is one, and against the time a person waits.

Run with `python3 -m tests.run tests/benchmarks -s`. Prints; nothing here fails for being slow.
"""

from __future__ import annotations

import ctypes
import subprocess
import sys
from pathlib import Path
from shutil import which

import numpy as np
import pytest

from tests.benchmarks.harness import machine, median_ms, median_ratio
from tests.transport.stacks import CLOSED_OFF, PLAIN
from tests.transport.test_periods import Asked, blocking, passing
from tests.transport.test_profiles import RUNNING
from transport import Layer, Lead, Stack, Target, lattice_bands, period_verdict, spectrum
from transport.constants import HBAR2_2M0
from transport.profiles import slices

SIZE = 10_000


@pytest.fixture(scope="module", autouse=True)
def where() -> None:
    print(f"\n{machine()}")


@pytest.fixture(scope="module")
def loop(tmp_path_factory: pytest.TempPathFactory) -> ctypes.CDLL:
    assert which("cc"), "the compiled loop needs a C compiler: apt-get install gcc"
    built = tmp_path_factory.mktemp("loop") / "loop.so"
    source = Path(__file__).with_name("loop.c")
    subprocess.run(["cc", "-O3", "-march=native", "-shared", "-fPIC", str(source), "-o", str(built), "-lm"], check=True)
    return ctypes.CDLL(str(built))


def pointer(array: np.ndarray) -> object:
    return array.ctypes.data_as(ctypes.POINTER(ctypes.c_double))


@pytest.mark.parametrize("periods", [1, 10, 100, 1000])
def test_spectrum_against_a_compiled_loop(loop: ctypes.CDLL, periods: int) -> None:
    grids = [np.linspace(0.001, 0.5, SIZE) + shift for shift in np.random.default_rng(periods).uniform(0, 4e-5, 41)]
    stack, result = PLAIN.with_periods(periods), np.empty(SIZE)
    layers = [layer for layer in stack.cell if isinstance(layer, Layer)]
    thickness, edge, mass = (
        np.array([getattr(layer, name) for layer in layers]) for name in ("thickness", "band_edge", "mass")
    )
    number = ctypes.c_double

    def compiled(i: int) -> None:
        loop.transmission(SIZE, pointer(grids[i]), 2, pointer(thickness), pointer(edge), pointer(mass), periods,
                          number(0.067), number(HBAR2_2M0), pointer(result))

    def everything(i: int) -> None:
        curve = spectrum(stack, grids[i])
        _ = curve.transmission, curve.reflection, curve.log10_transmission, curve.phase

    for name, run in (("T", lambda i: spectrum(stack, grids[i]).transmission), ("T, R, log10 T, phase", everything)):
        ratio, ours, theirs = median_ratio(run, compiled)
        print(f"N = {periods:4d}, {SIZE} energies, {name}: {ours:.2f} ms, loop {theirs:.2f} ms, ratio {ratio:.2f}")
    compiled(0)
    seen = np.isfinite(result)
    assert spectrum(stack, grids[0]).transmission[seen] == pytest.approx(result[seen], abs=1e-8)


def test_bands_with_certificate() -> None:
    top = lattice_bands(PLAIN, between=(0.0, 9.0)).bands[9].top
    took = median_ms(lambda i: lattice_bands(PLAIN, between=(0.0, top - 1e-3 - i * 1e-6)))
    print(f"10 certified bands: {took:.1f} ms")


def test_verdict_of_sixty_counts() -> None:
    windows = (passing(0.075, 0.09, 0.3, "mean"), passing(0.08, 0.085, 0.05), blocking(0.12, 0.25, 1e-4))

    def run(i: int) -> None:
        shifted = tuple(
            type(w)(w.kind, w.bottom + i * 1e-7, w.top, w.transmission, w.measure) for w in windows
        )
        period_verdict(Asked(CLOSED_OFF, Target(shifted, 60)))

    print(f"verdict, N = 1...60, three windows: {median_ms(run):.0f} ms")


def test_chosen_energies() -> None:
    stack = CLOSED_OFF.with_periods(50)
    took = median_ms(lambda i: spectrum(stack, between=(0.0, 0.4 + i * 1e-6)).transmission)
    print(f"chosen energies, 50 periods over two minibands: {took:.0f} ms")


@pytest.mark.parametrize("name", ["cosine", "running mass", "graded"])
def test_periods_of_profiles(name: str) -> None:
    """60 periods of a profile at 2,000 energies: to be at most 60 ms on one core; and resolving it, once."""
    variation, lead = RUNNING[name], Lead(0.0, 0.067)
    stack = Stack(lead, (), slices(variation, 0.0, 0.9), 60, (), lead)
    took = median_ms(lambda i: spectrum(stack, np.linspace(0.01, 0.5, 2000) + i * 1e-7).transmission)
    resolved = median_ms(lambda i: slices(variation, 0.0, 0.9 + i * 1e-6), 5)
    print(f"60 periods, 2000 energies, {name}, {len(stack.cell)} slices: {took:.1f} ms; resolved in {resolved:.0f} ms")


def test_import() -> None:
    took = median_ms(lambda i: subprocess.run([sys.executable, "-c", "import transport"], check=True), 5)
    print(f"interpreter and import transport: {took:.0f} ms")
