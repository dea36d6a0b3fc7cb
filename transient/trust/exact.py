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

    Raises ``SeriesError`` where the case has no series solution.
    """
    flow = ladder.best.flow
    exact = solve(problem, ahead.until)
    stress = _stress_error(flow, exact)
    value, bound = exact.mean(flow.piece, flow.offset)
    mean = np.abs(flow.mean - value) + bound
    away = ladder.best.deviation
    if away is None:
        level_stress, level_mean, level_profile = stress, mean, np.zeros(len(flow.profile_row))
    elif ahead.kind == "steady":
        level_stress, level_mean = stress, mean
        level_profile = _profile_error(away, exact, _steady_end(problem, ladder))
    else:
        apart = deviation(problem, ahead.until)
        level_stress = _stress_error(away, apart)
        value, bound = apart.mean(away.piece, away.offset)
        level_mean = np.abs(away.mean - value) + bound
        level_profile = _profile_error(away, apart, np.zeros_like)
    peak = np.array([_peak_error(flow.stress_curve(end), flow, exact, end, stress[:, end]) for end in (0, 1)])
    mean_peak = _peak_error(flow.mean_curve(), flow, exact, None, mean)
    return Errors("exact", stress, mean, level_stress, level_mean, level_profile, peak, mean_peak)


def _steady_end(problem: Problem, ladder: Ladder) -> Callable[[np.ndarray], np.ndarray]:
    """The steady velocity that the drives end in, as a function of the coordinate."""
    best = ladder.best
    return lambda r: steady_profile(problem, best.steady_speeds, best.steady_gradient, r)


def _stress_error(history: History, exact: Solution) -> np.ndarray:
    """|march - series| + bound (n, 2); 0 where the march itself says infinite."""
    value, bound = exact.stress(history.piece, history.offset)
    stated = np.isfinite(history.stress)
    with np.errstate(invalid="ignore"):
        off = np.abs(history.stress - value) + bound
    return np.where(stated, np.where(np.isfinite(off), off, np.inf), 0.0)


def _profile_error(away: History, exact: Solution, end: Callable[[np.ndarray], np.ndarray]) -> np.ndarray:
    """|largest of the march - largest of the series| + bound (k,) over the gap at the kept profiles.

    ``away`` holds the deviation whose largest value is judged; the series gives it plus ``end`` (a function of the
    coordinate).  It is looked at between the nodes too, where the march only interpolates.
    """
    rows = away.profile_row
    dense = np.interp(np.arange(2 * len(away.position) - 1) / 2.0, np.arange(len(away.position)), away.position)
    shift = end(dense)
    value = largest(away.position, away.profile, away.profile_rate)[0]
    out = np.empty(len(rows))
    chunk = max(1, MOST_AT_ONCE // len(dense))
    for first in range(0, len(rows), chunk):
        part = slice(first, first + chunk)
        at = rows[part]
        true, bound = exact.velocity(away.piece[at], away.offset[at], dense)
        true = true - shift
        out[part] = np.abs(value[part] - largest(dense, true, np.zeros_like(true))[0]) + bound
    return out


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
