"""Extrema and integrals of many rows at once: the loops run over refinement steps, never over energies or rows.

A function here takes (row, energy), two flat arrays, and returns one value each.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from transport.oscillation import Floats

Rows = NDArray[np.int64]
RowFunction = Callable[[Rows, Floats], Floats]

_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(10)
_GOLDEN = (3 - 5**0.5) / 2


def row_minima(function: RowFunction, row: Rows, energy: Floats, value: Floats) -> tuple[Floats, Floats]:
    """The least value of each row and where: sampled points, with every sampled dip refined to rounding.

    `row` ascends from 0 without gaps, `energy` ascends within a row, and the samples are close enough to bracket each
    dip. Rows of a value that never falls below its ends keep the end. Returns (values, energies), one per row.
    """
    row, energy, value = _with_shoulders(function, row, energy, value)
    inner = (row[:-2] == row[2:]) & (value[1:-1] <= value[:-2]) & (value[1:-1] <= value[2:])
    middle = np.flatnonzero(inner & np.isfinite(value[1:-1])) + 1
    best = np.lexsort((value, row))
    first = np.searchsorted(row[best], np.arange(row[-1] + 1))
    least, place = value[best[first]].copy(), energy[best[first]].copy()
    if middle.size:
        bracket = np.array([energy[middle - 1], energy[middle], energy[middle + 1]])
        dips = np.array([value[middle - 1], value[middle], value[middle + 1]])
        at, low = _dips(function, row[middle], bracket, dips)
        order = np.lexsort((low, row[middle]))
        rows, pick = np.unique(row[middle][order], return_index=True)
        better = low[order][pick] < least[rows]
        least[rows[better]], place[rows[better]] = low[order][pick][better], at[order][pick][better]
    return least, place


def _with_shoulders(
    function: RowFunction, row: Rows, energy: Floats, value: Floats
) -> tuple[Rows, Floats, Floats]:
    """The samples with one more just inside each row's ends, where a dip could hide beside the end point."""
    joined = row[1:] == row[:-1]
    first = np.flatnonzero(joined & np.concatenate([[True], ~joined[:-1]]))
    last = np.flatnonzero(joined & np.concatenate([~joined[1:], [True]]))
    step = 1e-6 * (energy[1:] - energy[:-1])
    places = np.concatenate([first + 1, last + 1])
    added = np.concatenate([energy[first] + step[first], energy[last + 1] - step[last]])
    order = np.argsort(places, kind="stable")
    places, added = places[order], added[order]
    rows = row[places - 1]
    return (np.insert(row, places, rows), np.insert(energy, places, added),
            np.insert(value, places, function(rows, added)))


def _dips(function: RowFunction, row: Rows, x: Floats, f: Floats) -> tuple[Floats, Floats]:
    """Minimum inside each bracket x[0] < x[1] < x[2] by parabolas, with golden sections where they stall."""
    x, f = x.copy(), f.copy()
    active = np.arange(row.size)
    for step in range(60):
        a, b, c = x[:, active]
        new = _parabola_vertex(x[:, active], f[:, active])
        wide = np.where(c - b > b - a, b + _GOLDEN * (c - b), b - _GOLDEN * (b - a))
        lost = ~np.isfinite(new) | (new <= a) | (new >= c)
        new = np.where(lost | (step % 4 == 3), wide, new)
        nudge = np.maximum(1e-4 * (c - a), np.spacing(abs(b)))
        new = np.where(abs(new - b) < nudge, b + np.where(c - b > b - a, nudge, -nudge), new)
        inside = (new > a) & (new < c) & (new != b)
        active, new = active[inside], new[inside]
        if not active.size:
            break
        _narrow(x, f, active, new, function(row[active], new))
        flat = np.ptp(f[:, active], axis=0) <= 1e-13 * np.maximum(abs(f[1, active]), 1e-3)
        active = active[~flat]
    return x[1], f[1]


def _parabola_vertex(x: Floats, f: Floats) -> Floats:
    left, right = x[1] - x[0], x[2] - x[1]
    rise, fall = (f[2] - f[1]) / right, (f[1] - f[0]) / left
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        return np.asarray(x[1] - (rise * left + fall * right) / (2 * (rise - fall)))


def _narrow(x: Floats, f: Floats, active: Rows, new: Floats, value: Floats) -> None:
    """Put a new point into each active bracket and keep the three around the lowest."""
    right, lower = new > x[1, active], value < f[1, active]
    for kept, take in ((0, right & lower), (2, ~right & lower)):
        x[kept, active[take]], f[kept, active[take]] = x[1, active[take]], f[1, active[take]]
    x[1, active[lower]], f[1, active[lower]] = new[lower], value[lower]
    for end, take in ((2, right & ~lower), (0, ~right & ~lower)):
        x[end, active[take]], f[end, active[take]] = new[take], value[take]


def row_integrals(
    function: RowFunction, row: Rows, low: Floats, high: Floats, rows: int, tolerance: float = 1e-11
) -> Floats:
    """Integral over all intervals of each row, by 10-point Gauss rules halved until both halves add up to the whole.

    The integrand is not negative; `tolerance` is relative to each row's integral. Ends may carry square-root edges.
    """
    done = np.zeros(rows)
    whole = _gauss(function, row, low, high)
    total = np.bincount(row, whole, rows)
    for _ in range(60):
        middle = low + (high - low) / 2
        two = np.tile(row, 2)
        halves = _gauss(function, two, np.concatenate([low, middle]), np.concatenate([middle, high]))
        first, second = halves[: row.size], halves[row.size :]
        error = abs(first + second - whole)
        rough = (error > tolerance * total[row] / 8) & (middle > low) & (middle < high)
        done += np.bincount(row[~rough], (first + second)[~rough], rows)
        if not rough.any():
            break
        row, whole = np.tile(row[rough], 2), np.concatenate([first[rough], second[rough]])
        low, high = np.concatenate([low[rough], middle[rough]]), np.concatenate([middle[rough], high[rough]])
        total = done + np.bincount(row, whole, rows)
    return done


def _gauss(function: RowFunction, row: Rows, low: Floats, high: Floats) -> Floats:
    energy, weight = gauss_nodes(low, high)
    value = function(np.repeat(row, _NODES.size), energy.ravel()).reshape(energy.shape)
    return np.asarray((value * weight).sum(axis=1))


def gauss_nodes(low: Floats, high: Floats) -> tuple[Floats, Floats]:
    """Nodes and weights of the 10-point Gauss-Legendre rule on each interval: two arrays (intervals, 10)."""
    half = (high - low)[:, None] / 2
    return low[:, None] + half * (_NODES + 1), half * _WEIGHTS
