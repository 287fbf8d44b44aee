"""Counting by the Pruefer angle against a matrix that counts by itself: Sturm sequences of a finite-difference box."""

import numpy as np
import pytest
from scipy.linalg import eigvalsh_tridiagonal

from tests.transport.stacks import ALL, CLOSED_OFF, LEAD, PLAIN, barrier, well
from transport import Delta, Layer, Stack
from transport.chain import Chain
from transport.constants import HBAR2_2M0
from transport.oscillation import first_reaching, rotation, through, zeros, zeros_at


def box_levels(stack: Stack, below: float) -> np.ndarray:
    """Dirichlet eigenvalues of the stack in a closed box, by finite differences (general library: SciPy).

    The step divides every layer; masses sit between grid points, edges on them as averages (BenDaniel and Duke).
    """
    step = 0.025
    layers = stack.entry + stack.cell * stack.periods + stack.exit
    edge = np.concatenate([np.full(round(x.thickness / step), x.band_edge) for x in layers if isinstance(x, Layer)])
    mass = np.concatenate([np.full(round(x.thickness / step), x.mass) for x in layers if isinstance(x, Layer)])
    hop = HBAR2_2M0 / (mass * step**2)
    diagonal = hop[:-1] + hop[1:] + (edge[:-1] + edge[1:]) / 2
    return np.asarray(eigvalsh_tridiagonal(diagonal, -hop[1:-1], select="v", select_range=(-10.0, below)))


@pytest.mark.parametrize("stack", [PLAIN, CLOSED_OFF, ALL["unequal"]], ids=["plain", "closed off", "unequal"])
@pytest.mark.parametrize("periods", [1, 2, 7])
def test_zeros_of_the_whole_stack_count_the_levels_of_the_box(stack: Stack, periods: int) -> None:
    stack = stack.with_periods(periods)
    levels = box_levels(stack, 0.6)
    between = (levels[:-1] + levels[1:]) / 2  # far from any level, so that the grid's error cannot matter
    assert zeros(Chain(stack, between), periods).tolist() == list(range(1, levels.size))


@pytest.mark.parametrize("name", ALL)
def test_n_cells_at_once_count_as_n_cells_one_by_one(name: str) -> None:
    stack = ALL[name]
    energy = np.linspace(-0.05, 0.9, 3001) + 1e-7
    written_out = Stack(stack.left, stack.entry + stack.cell * 4, stack.cell, 1, stack.exit, stack.right)
    one_by_one = zeros(Chain(written_out, energy), 1)
    assert np.array_equal(zeros(Chain(stack, energy), 5), one_by_one)


def test_a_level_between_two_thick_walls_is_counted_once() -> None:
    deep = (barrier(40.0), well(5.0), barrier(40.0))
    energy = np.linspace(0.0, 0.29, 20_001)
    counts = through(deep, energy).zeros
    assert set(np.diff(counts)) == {0, 1}
    assert counts[-1] == 2


@pytest.mark.parametrize("name", ALL)
def test_the_lifted_bloch_phase_grows_with_energy(name: str) -> None:
    turns = rotation(Chain(ALL[name], np.linspace(-0.2, 3.0, 20_001))).turns
    assert np.diff(turns).min() > -1e-9


@pytest.mark.parametrize("name", ALL)
def test_zeros_at_one_energy_are_those_of_many_energies(name: str) -> None:
    stack = ALL[name]
    elements = stack.entry + stack.cell * stack.periods + stack.exit
    energy = np.concatenate([np.random.default_rng(1).uniform(0.001, 2.0, 300), [0.3]])  # and E = V of the barriers
    together = np.broadcast_to(through(elements, energy).zeros, energy.shape)
    assert [zeros_at(elements, at) for at in energy.tolist()] == together.tolist()


def test_zeros_accept_a_number_of_periods_for_each_energy() -> None:
    chain, counts = Chain(PLAIN, np.array([0.08, 0.3, 0.5])), np.array([3, 40, 7])
    singly = [int(zeros(Chain(PLAIN, chain.energy[i : i + 1]), int(n))[0]) for i, n in enumerate(counts)]
    assert zeros(chain, counts).tolist() == singly


def test_first_reaching_finds_every_step_of_a_staircase_to_the_last_bit() -> None:
    steps = np.array([0.1, 0.1 + 1e-15, 0.7, 2.0])
    found = first_reaching(lambda e: np.searchsorted(steps, e, side="right"), [1, 2, 3, 4], -1.0, 5.0)
    assert found.tolist() == steps.tolist()


def test_an_empty_list_of_layers_leaves_the_phase_point_where_it_was() -> None:
    assert through((), np.array([0.1])).zeros == 0
    assert zeros(Chain(Stack(LEAD, (), (well(5.0),), 1, (), LEAD), np.array([1e-3])), 1).tolist() == [0]


def test_an_entry_of_deltas_alone_is_counted_at_many_energies() -> None:
    stack = Stack(LEAD, (Delta(0.3),), PLAIN.cell, 5, (), LEAD)
    chain = Chain(stack, np.linspace(0.01, 0.4, 1000))
    few = [zeros(Chain(stack, part), 5) for part in np.split(chain.energy, 10)]
    assert np.array_equal(zeros(chain, 5), np.concatenate(few))
