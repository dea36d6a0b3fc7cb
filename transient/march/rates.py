"""Rates of change of wall stresses, from the stresses' own rows.

The rate of a stress cannot be had from the rates of the node beside the wall: those are right to the square of the
step, and the stress's rate is their small difference to the wall's acceleration divided by a tiny cell.  The rows
themselves are differentiated instead, in the square root of the time since the last break, of which a stress is a
smooth function (after a jump of speed: the stress times that root).
"""

from __future__ import annotations

import numpy as np

from transient.compiled import compiled
from transient.gap.problem import Inputs, Problem
from transient.result.history import History

STENCIL = 5


def stress_rates(piece: np.ndarray, offset: np.ndarray, stress: np.ndarray) -> np.ndarray:
    """dtau/dt (n, 2) at rows of ``piece``, ``offset`` (n,); ``stress`` (n, 2), NaN where infinite."""
    first = np.flatnonzero(np.append(True, piece[1:] != piece[:-1]))
    last = np.append(first[1:], len(piece)) - 1
    owner = np.repeat(np.arange(len(first)), last - first + 1)
    out = np.empty_like(stress)
    for end in range(stress.shape[1]):
        infinite = np.isnan(stress[first, end])
        out[:, end] = _rates(offset, stress[:, end], first + infinite, last, infinite, owner)
        out[first[infinite], end] = np.nan
    return out


def accelerations(problem: Problem, inputs: Inputs, history: History, end: int) -> tuple[np.ndarray, np.ndarray]:
    """A body's acceleration (n,), NaN where it is infinite, and its rate.

    Infinite with the stress on its wall; of a body that weighs nothing, or on whose face the pressure acts, also where
    anything else is.
    """
    body = problem.walls[end].body
    assert body is not None
    infinite = np.isnan(history.stress[:, end])
    if body.mass == 0.0 or body.displaced:
        infinite = infinite | np.isnan(history.stress).any(axis=1) | np.isnan(history.gradient)
    if body.mass == 0.0:
        infinite = infinite | _sudden_load(problem, inputs, history, end)
    value = np.where(infinite, np.nan, history.acceleration[:, end])
    return value, stress_rates(history.piece, history.offset, value[:, None])[:, 0]


def _sudden_load(problem: Problem, inputs: Inputs, history: History, end: int) -> np.ndarray:
    """Rows (n,) at which a body's load jumps."""
    body = problem.walls[end].body
    assert body is not None
    jumps = inputs.row(end).jumps(0) != 0.0
    if problem.start == "rest" and body.stiffness * body.initial_displacement != 0.0:
        jumps[0] = True
    return (history.offset == 0.0) & jumps[history.piece]


def _rates(
    offset: np.ndarray, value: np.ndarray, first: np.ndarray, last: np.ndarray, infinite: np.ndarray, owner: np.ndarray
) -> np.ndarray:
    """Rates of one wall's stress: pieces' usable rows run from ``first`` to ``last`` (P,)."""
    root = np.sqrt(offset)
    scaled = np.where(infinite[owner], root * value, value)
    size = np.minimum(last - first + 1, STENCIL)
    out = np.zeros(len(value))
    for points in np.unique(size[owner]):
        rows = np.flatnonzero(size[owner] == points)
        if points < 2:
            continue
        own = owner[rows]
        start = np.clip(rows - points // 2, first[own], last[own] - points + 1)
        window = start[:, None] + np.arange(points)
        slope = _slope(root[window], root[rows], scaled[window])
        s = root[rows]
        safe = np.where(s > 0.0, s, 1.0)
        by_root = np.where(infinite[own], (slope - value[rows]) / safe, slope)
        out[rows] = by_root / (2.0 * safe)
        begins = rows[(offset[rows] == 0.0) & (rows == first[own])]
        few = min(int(points), 3)
        ahead = begins[:, None] + np.arange(few)
        out[begins] = _slope(offset[ahead], offset[begins], value[ahead])
    return out


def _slope(x: np.ndarray, at: np.ndarray, value: np.ndarray) -> np.ndarray:
    """Derivative (m,) at ``at`` (m,) of the polynomial through ``value`` at ``x`` (m, q), distinct nodes."""
    out = np.empty(len(at))
    _fill_slope(x, at, value, out)
    return out


@compiled
def _fill_slope(x, at, value, out):  # type: ignore[no-untyped-def]
    q = x.shape[1]
    for m in range(len(at)):
        scale = x[m, q - 1] - x[m, 0]
        total = 0.0
        for i in range(q):
            bottom, top = 1.0, 0.0
            for j in range(q):
                if j == i:
                    continue
                bottom *= (x[m, i] - x[m, j]) / scale
                part = 1.0
                for k in range(q):
                    if k not in (i, j):
                        part *= (at[m] - x[m, k]) / scale
                top += part
            total += value[m, i] * top / bottom
        out[m] = total / scale
