"""The march against the exact solution: what every stored row and headline number is off by."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from transient.gap.problem import Problem
from transient.march.levels import Ladder
from transient.march.regime import Outlook
from transient.result.curve import Curve
from transient.result.history import History, largest
from transient.result.run import Errors
from transient.series.regime import deviation
from transient.series.solution import Solution, solve
from transient.trust.quasi_steady import steady_profile

# Bisections of the interval around a peak at which the exact curve is looked at; its error is then 4^-n of the
# curve's sagitta over one step.
NARROWINGS = 4
AROUND = np.linspace(-1.0, 1.0, 9)
MOST_AT_ONCE = 4_000_000  # velocities compared in one go


def compare(problem: Problem, ahead: Outlook, ladder: Ladder) -> Errors:
    """Errors of the ladder's best histories against the series (``kind`` "exact"), series' own bounds included.

    A row's error covers the halves of the steps beside it, where the march only interpolates.
    Raises ``SeriesError`` where the case has no series solution.
    """
    flow = ladder.best.flow
    exact = solve(problem, ahead.until)
    stress, mean = _errors(flow, exact)
    away = ladder.best.deviation
    if away is None:
        level_stress, level_mean, level_profile = stress, mean, np.zeros(len(flow.profile_row))
    elif ahead.kind == "steady":
        level_stress, level_mean = stress, mean
        level_profile = _profile_error(away, exact, _steady_end(problem, ladder))
    else:
        apart = deviation(problem, ahead.until)
        level_stress, level_mean = _errors(away, apart)
        level_profile = _profile_error(away, apart, np.zeros_like)
    peak = np.array([_peak_error(flow.stress_curve(end), flow, exact, end, stress[:, end]) for end in (0, 1)])
    mean_peak = _peak_error(flow.mean_curve(), flow, exact, None, mean)
    return Errors("exact", stress, mean, level_stress, level_mean, level_profile, peak, mean_peak)


def _errors(history: History, exact: Solution) -> tuple[np.ndarray, np.ndarray]:
    """|march - series| + bound of the stresses (n, 2) and of the mean velocity (n,), at rows and half-way between.

    0 where the march itself says infinite.
    """
    inside = np.flatnonzero(history.step > 0.0)
    curves = [history.stress_curve(0), history.stress_curve(1), history.mean_curve()]
    half = np.full(len(inside), 0.5)
    piece = np.concatenate([history.piece, history.piece[inside]])
    offset = np.concatenate([history.offset, history.offset[inside] + curves[0].passed(inside, half)])
    value = np.stack([np.concatenate([curve.value, curve.at(inside, half)]) for curve in curves], axis=1)
    true, bound = exact.stress_and_mean(piece, offset)
    with np.errstate(invalid="ignore"):
        off = np.abs(value - true) + bound
    off = np.where(np.isfinite(value), np.where(np.isfinite(off), off, np.inf), 0.0)
    rows = _beside(off, inside, len(history.time))
    return np.where(np.isfinite(history.stress), rows[:, :2], 0.0), rows[:, 2]


def _beside(off: np.ndarray, inside: np.ndarray, rows: int) -> np.ndarray:
    """Errors at the rows (n, c), each at least those half-way to its neighbours; ``off`` holds rows, then halves."""
    out, between = off[:rows].copy(), off[rows:]
    out[inside] = np.maximum(out[inside], between)
    out[inside + 1] = np.maximum(out[inside + 1], between)
    return out


def _steady_end(problem: Problem, ladder: Ladder) -> Callable[[np.ndarray], np.ndarray]:
    """The steady velocity that the drives end in, as a function of the coordinate."""
    best = ladder.best
    return lambda r: steady_profile(problem, best.steady_speeds, best.steady_gradient, r)


def _profile_error(away: History, exact: Solution, end: Callable[[np.ndarray], np.ndarray]) -> np.ndarray:
    """|largest of the march - largest of the series| + bound (j,) over the gap at the curve's instants and half-way.

    ``away`` holds the deviation whose largest value is judged; the series gives it plus ``end`` (a function of the
    coordinate).  It is looked at between the nodes too, where the march only interpolates.
    """
    nodes = np.arange(2 * len(away.position) - 1) / 2.0
    dense = np.interp(nodes, np.arange(len(away.position)), away.position)
    shift = end(dense)
    told = away.largest
    curve = told.curve
    inside = np.flatnonzero((curve.step > 0.0) & (told.piece[1:] == told.piece[:-1]))
    half = np.full(len(inside), 0.5)
    piece = np.concatenate([told.piece, told.piece[inside]])
    offset = np.concatenate([told.offset, told.offset[inside] + curve.passed(inside, half)])
    value = np.concatenate([curve.value, curve.at(inside, half)])
    off = np.empty(len(piece))
    chunk = max(1, MOST_AT_ONCE // len(dense))
    for first in range(0, len(piece), chunk):
        part = slice(first, first + chunk)
        true, bound = exact.velocity(piece[part], offset[part], dense)
        true = true - shift
        off[part] = np.abs(value[part] - largest(dense, true, np.zeros_like(true))[0]) + bound
    return _beside(off[:, None], inside, len(told.piece))[:, 0]


def _peak_error(curve: Curve, history: History, exact: Solution, end: int | None, rows: np.ndarray) -> float:
    """|largest of the march - largest of the series|: the series is searched wherever the march comes near its peak."""
    value, _ = curve.magnitude()
    if not np.isfinite(value) or value == 0.0:
        return float(np.max(rows, initial=0.0))
    time, tops, interval = curve.turning
    height = np.abs(curve.value)
    near = abs(value) - 3.0 * float(np.max(rows[np.isfinite(height)], initial=0.0))
    piece, offset, half = _candidates(history, time, tops, interval, height, min(near, 0.999 * abs(value)))
    sign = float(np.sign(value))
    best = -np.inf
    bound_there = 0.0
    for _ in range(NARROWINGS):
        at = np.clip(offset[:, None] + half[:, None] * AROUND, 0.0, _lengths(history, piece)[:, None])
        found, bound = _values(exact, np.repeat(piece, len(AROUND)), at.ravel(), end)
        found = np.where(np.isfinite(found), sign * found, -np.inf).reshape(at.shape)
        top = found.argmax(axis=1)
        rows_at = np.arange(len(at))
        winner = found[rows_at, top]
        if winner.max() >= best:
            best = float(winner.max())
            bound_there = float(bound.reshape(at.shape)[rows_at, top].max())
        offset, half = at[rows_at, top], half / 4.0
    return abs(abs(value) - best) + bound_there


def _candidates(
    history: History, time: np.ndarray, tops: np.ndarray, interval: np.ndarray, height: np.ndarray, near: float
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """(piece, offset, half width) of the instants around which the peak may lie: extremes inside steps, and rows."""
    step = np.append(history.step, 0.0)
    wide = np.maximum(step, np.append(0.0, history.step))
    inner = np.abs(tops) >= near
    with np.errstate(invalid="ignore"):
        # of the rows, those that are not below a neighbour
        left = np.append(-np.inf, np.where(np.isfinite(height[:-1]), height[:-1], -np.inf))
        right = np.append(np.where(np.isfinite(height[1:]), height[1:], -np.inf), -np.inf)
        outer = (height >= near) & (height >= left) & (height >= right)
    if not outer.any() and not inner.any():
        outer = height >= np.nanmax(height)
    row = np.flatnonzero(outer)
    inside = interval[inner]
    piece = np.concatenate([history.piece[row], history.piece[inside]])
    offset = np.concatenate([history.offset[row], history.offset[inside] + (time[inner] - history.time[inside])])
    half = np.concatenate([wide[row], step[inside]])
    if len(piece) > 400:  # a periodic peak comes back: the highest of its copies will do
        score = np.concatenate([height[row], np.abs(tops[inner])])
        best = np.argsort(-score, kind="stable")[:400]
        piece, offset, half = piece[best], offset[best], half[best]
    return piece, offset, half


def _lengths(history: History, piece: np.ndarray) -> np.ndarray:
    """Length (m,) of the given pieces: the offset of their last rows."""
    last = np.flatnonzero(np.append(history.piece[1:] != history.piece[:-1], True))
    return history.offset[last][piece - history.piece[0]]


def _values(exact: Solution, piece: np.ndarray, offset: np.ndarray, end: int | None) -> tuple[np.ndarray, np.ndarray]:
    if end is None:
        return exact.mean(piece, offset)
    value, bound = exact.stress(piece, offset)
    return value[:, end], bound[:, end]
