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
_MOST_ROUGH = 100_000  # intervals halved at once


def row_minima(function: RowFunction, row: Rows, energy: Floats, value: Floats) -> tuple[Floats, Floats]:
    """The least value of each row and where: sampled points, with every sampled dip refined to rounding.

    `row` ascends from 0 without gaps, `energy` ascends within a row, and the samples are close enough to bracket each
    dip. Rows of a value that never falls below its ends keep the end. Returns (values, energies), one per row.
    """
    row, energy, value = _with_turning_points(function, row, energy, value)
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


def _with_turning_points(
    function: RowFunction, row: Rows, energy: Floats, value: Floats
) -> tuple[Rows, Floats, Floats]:
    """The samples, and one more wherever the cubic through four neighbours turns inside an interval.

    So two shallow turns between neighbouring samples, or one beside the end of a row, are not missed. Rows have at
    least four samples.
    """
    interval = np.flatnonzero(row[1:] == row[:-1])
    first, last = np.searchsorted(row, row[interval]), np.searchsorted(row, row[interval], side="right")
    stencil = np.clip(interval - 1, first, last - 4) + np.arange(4)[:, None]
    origin, scale = energy[interval], energy[interval + 1] - energy[interval]
    turns = _cubic_turns((energy[stencil] - origin) / scale, value[stencil])
    found = origin + scale * turns
    inside = (found > energy[interval]) & (found < energy[interval + 1])
    inside[1] &= found[1] != found[0]
    places, added = np.broadcast_to(interval + 1, turns.shape)[inside], found[inside]
    order = np.lexsort((added, places))
    places, added = places[order], added[order]
    rows = row[places - 1]
    return (np.insert(row, places, rows), np.insert(energy, places, added),
            np.insert(value, places, function(rows, added)))


def _cubic_turns(x: Floats, f: Floats) -> Floats:
    """Where the derivative of the cubic through (x, f), each (4, n), vanishes: (2, n), NaN if nowhere."""
    with np.errstate(divide="ignore", invalid="ignore"):
        one = np.diff(f, axis=0) / np.diff(x, axis=0)
        two = np.diff(one, axis=0) / (x[2:] - x[:-2])
        three = (two[1] - two[0]) / (x[3] - x[0])
        a, b = 3 * three, 2 * (two[0] - three * (x[0] + x[1] + x[2]))
        c = one[0] - two[0] * (x[0] + x[1]) + three * (x[0] * x[1] + x[0] * x[2] + x[1] * x[2])
        q = -(b + np.copysign(np.sqrt(b * b - 4 * a * c), b)) / 2
        return np.array([q / a, c / q])


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
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        rise, fall = (f[2] - f[1]) / right, (f[1] - f[0]) / left
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
    """Integral over all intervals of each row, by the 7-15-point Gauss-Kronrod pair, halved where the two disagree.

    The integrand is not negative; `tolerance` is relative to each row's integral. Ends may carry square-root edges.
    The error of the 15-point rule is judged as QUADPACK does (Piessens et al. (1983)): (200 difference)^(3/2).
    """
    done = np.zeros(rows)
    for _ in range(60):
        fine, coarse = _kronrod(function, row, low, high)
        total = done + np.bincount(row, fine, rows)
        share = abs(fine - coarse) / np.maximum(total[row], 1e-300)
        middle = low + (high - low) / 2
        # Within some tens of doubles the integrand is rounding, and halving would never end.
        rough = ((200 * share) ** 1.5 > tolerance / 8) & (share > 1e-15) & (high - low > 64 * np.spacing(abs(middle)))
        if np.count_nonzero(rough) > _MOST_ROUGH:  # an integrand that is rounding everywhere does not get smoother
            rough[:] = False
        done += np.bincount(row[~rough], fine[~rough], rows)
        if not rough.any():
            break
        row = np.tile(row[rough], 2)
        low, high = np.concatenate([low[rough], middle[rough]]), np.concatenate([middle[rough], high[rough]])
    return done


def _kronrod(function: RowFunction, row: Rows, low: Floats, high: Floats) -> tuple[Floats, Floats]:
    """The 15-point Kronrod and the 7-point Gauss value of each interval."""
    half = (high - low) / 2
    energy = low[:, None] + half[:, None] * (_KRONROD_NODES + 1)
    value = function(np.repeat(row, _KRONROD_NODES.size), energy.ravel()).reshape(energy.shape)
    return half * (value @ _KRONROD_WEIGHTS), half * (value[:, 1::2] @ _GAUSS_WEIGHTS)


def _mirrored(half: list[float], sign: int) -> Floats:
    """A symmetric table from its first half and middle."""
    return np.array(half + [sign * value for value in half[-2::-1]])


# QUADPACK's qk15 table, from memory; tests/test_numerics.py proves the degree of exactness.
_KRONROD_NODES = _mirrored([
    -0.991455371120812639206854697526329, -0.949107912342758524526189684047851, -0.864864423359769072789712788640926,
    -0.741531185599394439863864773280788, -0.586087235467691130294144838258730, -0.405845151377397166906606412076961,
    -0.207784955007898467600689403773245, 0.0], -1)
_KRONROD_WEIGHTS = _mirrored([
    0.022935322010529224963732008058970, 0.063092092629978553290700663189204, 0.104790010322250183839876322541518,
    0.140653259715525918745189590510238, 0.169004726639267902826583426598550, 0.190350578064785409913256402421014,
    0.204432940075298892414161999234649, 0.209482141084727828012999174891714], 1)
_GAUSS_WEIGHTS = _mirrored([
    0.129484966168869693270611432679082, 0.279705391489276667901467771423780, 0.381830050505118944950369775488975,
    0.417959183673469387755102040816327], 1)


def gauss_nodes(low: Floats, high: Floats) -> tuple[Floats, Floats]:
    """Nodes and weights of the 10-point Gauss-Legendre rule on each interval: two arrays (intervals, 10)."""
    half = (high - low)[:, None] / 2
    return low[:, None] + half * (_NODES + 1), half * _WEIGHTS
