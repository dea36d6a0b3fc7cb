"""The march against the exact solution: what every stored row and headline number is off by."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np

from transient.gap.problem import Problem
from transient.march.levels import Ladder
from transient.march.march import with_rates
from transient.march.regime import Outlook
from transient.result.curve import Curve
from transient.result.history import History, largest
from transient.result.run import Errors
from transient.series.regime import deviation
from transient.series.solution import Solution, solve
from transient.trust.quasi_steady import steady_profile

# Bisections of the interval around a peak at which the exact curve is looked at; its error is then 4^-n of the
# curve's sagitta over one step.
NARROWINGS = 5
RESOLVED = 3e-9  # of a settling time: how closely the exact passage is found
ROUNDING = 1e-13  # of the usual stress, or mean velocity, about
PEAK_MARGIN = 1.02  # for what is compared point by point
PASSAGE_MARGIN = 1.1  # for the exact deviation's own largest place, which lies between the places looked at
BETWEEN_MARGIN = 1.5  # see ``_looks``
AROUND = np.linspace(-1.0, 1.0, 9)
MOST_AT_ONCE = 4_000_000  # velocities compared in one go


@dataclass(frozen=True, eq=False)
class Exact:
    """The series of a case: of the ``flow``, and of its ``deviation`` from what it ends in (a series of its own where
    that is periodic, None without): the deviation series less ``stress`` (2,), ``mean`` and ``velocity`` (a function
    of the coordinate)."""

    flow: Solution
    deviation: Solution | None
    stress: np.ndarray
    mean: float
    velocity: Callable[[np.ndarray], np.ndarray]

    def away(self, time: np.ndarray, column: int, position: np.ndarray, lever: np.ndarray | float) -> np.ndarray:
        """Magnitude (m,) of the deviation at absolute times (m,): 0 largest speed, 1 mean, 2 and 3 walls' stress."""
        assert self.deviation is not None
        piece, offset = self.deviation.locate(time)
        if column == 0:
            field, _ = self.deviation.velocity(piece, offset, position)
            field = (field - self.velocity(position)) * lever
            return largest(position, field, np.zeros_like(field))[0]
        walls, _ = self.deviation.stress_and_mean(piece, offset)
        if column == 1:
            return np.abs(walls[:, 2] - self.mean)
        return np.abs(walls[:, column - 2] - self.stress[column - 2])


def exact_of(problem: Problem, ahead: Outlook, ladder: Ladder) -> Exact:
    """The series of a case.  Raises ``SeriesError`` where it has none."""
    flow = solve(problem, ahead.until)
    best = ladder.best
    if best.deviation is None:
        return Exact(flow, None, np.zeros(2), 0.0, np.zeros_like)
    if ahead.kind == "steady":
        return Exact(flow, flow, best.steady_stress, best.steady_mean, _steady_end(problem, ladder))
    return Exact(flow, deviation(problem, ahead.until), np.zeros(2), 0.0, np.zeros_like)


def sharpened(
    settling: dict[str, Any], exact: Exact, ladder: Ladder, errors: Errors, names: dict[str, int]
) -> dict[str, Any]:
    """The settling part of a summary with errors that include the exact crossing beside each stated time.

    ``names``: walls and their ends.  The exact deviation is looked for its last passage of the band near the time.
    """
    away = ladder.best.deviation
    if exact.deviation is None or away is None:
        return settling
    nodes = np.arange(2 * len(away.position) - 1) / 2.0
    dense = np.interp(nodes, np.arange(len(away.position)), away.position)
    lever = 1.0 if away.lever is None else dense
    said, size, spread = settling, settling["relative_to"], settling["errors"]
    # the size of a periodic regime, or a peak that stands in for a size, is a computed one too; a steady one is exact
    known = {0: size["velocity"], 1: abs(exact.mean), 2: abs(exact.stress[0]), 3: abs(exact.stress[1])}
    unsure = [float(errors.level_profile[away.largest.curve.value.argmax()]), errors.mean_peak, *errors.peak]
    if said["regime"] == "periodic":
        known, unsure = {}, _orbit_errors(ladder)
    rows = [("velocity", said["velocity"], spread["velocity"], size["velocity"], 0)]
    rows.append(("flow", said["flow"], spread["flow"], size["flow"], 1))
    rows += [(n, said["stress"][n], spread["stress"][n], size["stress"][n], 2 + end) for n, end in names.items()]
    found = {}
    for name, time, error, scale, column in rows:
        found[name] = error
        if time is None or error is None or not time or not scale:
            continue
        share = 0.0 if column in known and abs(known[column] - scale) <= 1e-9 * scale else unsure[column] / scale
        for band in {said["within"] * scale * (1.0 + side * share) for side in (-1.0, 1.0)}:
            off = _exact_passage(exact, away, time, error, band, column, dense, lever)
            found[name] = max(found[name], float(PASSAGE_MARGIN * off))
    told = {"velocity": found["velocity"], "flow": found["flow"], "stress": {n: found[n] for n in names}}
    return {**settling, "error": found["velocity"], "errors": told}


def _orbit_errors(ladder: Ladder) -> list[float]:
    """How far the sizes of a periodic regime (largest speed, mean, stresses) are from those of the next best answer,
    which is their error's bound: extrapolation has removed most of it."""
    best, other = ladder.best.orbit, ladder.next_best.orbit
    assert best is not None
    assert other is not None
    pairs = [(best.largest_curve(), other.largest_curve()), (best.mean_curve(), with_rates(other).mean_curve())]
    pairs += [(best.stress_curve(end), with_rates(other).stress_curve(end)) for end in (0, 1)]
    sizes = [[abs(curve.magnitude()[0]) for curve in pair] for pair in pairs]
    return [abs(a - b) if np.isfinite(a) and np.isfinite(b) else 0.0 for a, b in sizes]


def _exact_passage(
    exact: Exact, away: History, time: float, error: float, band: float, column: int, dense: np.ndarray,
    lever: np.ndarray | float,
) -> float:  # fmt: skip
    """How far from ``time`` the exact deviation last falls below ``band`` within a step of it; 0 if it does not."""
    rows = away.time[away.profile_row] if column == 0 else away.time  # long runs keep few profiles
    i = int(np.clip(np.searchsorted(rows, time), 1, max(len(rows) - 1, 1)))
    step = float(rows[min(i, len(rows) - 1)] - rows[i - 1])
    # where the stated error is right the passage lies within a few of it; else anywhere in the step
    for wide in (3.0 * error, max(3.0 * error, step)):
        low, high = max(time - wide, 0.0), min(time + wide, float(away.time[-1]))
        where = 0.0
        while high - low > max(RESOLVED * time, 0.02 * error):
            t = np.linspace(low, high, 13)
            above = exact.away(t, column, dense, lever) > band
            crossing = np.flatnonzero(above[:-1] & ~above[1:])
            if len(crossing) == 0:
                break
            low, high = float(t[crossing[-1]]), float(t[crossing[-1] + 1])
            where = max(abs(low - time), abs(high - time))
        if where > 0.0:
            return where
    return 0.0


def compare(problem: Problem, ahead: Outlook, ladder: Ladder, series: Exact | None = None) -> Errors:
    """Errors of the ladder's best histories against the series (``kind`` "exact"), series' own bounds included.

    A row's error covers the parts of the steps beside it, where the march only interpolates.
    ``series`` default: that of the case; raises ``SeriesError`` where it has none.
    """
    series = exact_of(problem, ahead, ladder) if series is None else series
    flow = ladder.best.flow
    exact = series.flow
    stress, mean = _errors(flow, exact)
    away = ladder.best.deviation
    if away is None:
        level_stress, level_mean, level_profile = stress, mean, np.zeros(len(flow.profile_row))
    elif ahead.kind == "steady":
        level_stress, level_mean = stress, mean
        level_profile = _profile_error(away, exact, series.velocity)
    else:
        apart = series.deviation
        assert apart is not None
        level_stress, level_mean = _errors(away, apart)
        level_profile = _profile_error(away, apart, np.zeros_like)
    peak = np.array([_peak_error(flow.stress_curve(end), flow, exact, end, stress[:, end]) for end in (0, 1)])
    mean_peak = _peak_error(flow.mean_curve(), flow, exact, None, mean)
    return Errors("exact", stress, mean, level_stress, level_mean, level_profile, peak, mean_peak)


def _errors(history: History, exact: Solution) -> tuple[np.ndarray, np.ndarray]:
    """|march - series| + bound of the stresses (n, 2) and of the mean velocity (n,), at rows and between them.

    0 where the march itself says infinite.
    """
    inside = np.flatnonzero(history.step > 0.0)
    curves = [history.stress_curve(0), history.stress_curve(1), history.mean_curve()]
    half = _looks(inside)
    piece = np.concatenate([history.piece, history.piece[inside]])
    offset = np.concatenate([history.offset, history.offset[inside] + curves[0].passed(inside, half)])
    value = np.stack([np.concatenate([curve.value, curve.at(inside, half)]) for curve in curves], axis=1)
    true, bound = exact.stress_and_mean(piece, offset)
    with np.errstate(invalid="ignore"):
        off = np.abs(value - true) + bound
    shown = np.abs(np.where(np.isfinite(value), value, 0.0))
    # the usual size, not the largest: that may be what an infinite stress left behind
    usual = np.median(shown, axis=0)
    usual[:2] = usual[:2].max()
    off = np.where(np.isfinite(value), np.where(np.isfinite(off), off + ROUNDING * (usual + shown), np.inf), 0.0)
    rows = _beside(off, inside, len(history.time))
    return np.where(np.isfinite(history.stress), rows[:, :2], 0.0), rows[:, 2]


def _looks(inside: np.ndarray) -> np.ndarray:
    """Where in each interval the march is compared: at 0.3 and 0.7 by turns.  Half-way, the error that wrong slopes
    make would vanish; at these places both that one and the cubic's own are above two thirds of their largest."""
    return np.where(inside % 2 == 0, 0.3, 0.7)


def _beside(off: np.ndarray, inside: np.ndarray, rows: int) -> np.ndarray:
    """Errors at the rows (n, c), each at least those towards its neighbours; ``off`` holds rows, then looks."""
    out, between = off[:rows].copy(), BETWEEN_MARGIN * off[rows:]
    out[inside] = np.maximum(out[inside], between)
    out[inside + 1] = np.maximum(out[inside + 1], between)
    return out


def _steady_end(problem: Problem, ladder: Ladder) -> Callable[[np.ndarray], np.ndarray]:
    """The steady velocity that the drives end in, as a function of the coordinate."""
    best = ladder.best
    return lambda r: steady_profile(problem, best.steady_speeds, best.steady_gradient, r)


def _profile_error(away: History, exact: Solution, end: Callable[[np.ndarray], np.ndarray]) -> np.ndarray:
    """|largest of the march - largest of the series| + bound (j,) over the gap, at the curve's instants and between.

    ``away`` holds the deviation whose largest value is judged; the series gives it plus ``end`` (a function of the
    coordinate).  It is looked at between the nodes too, where the march only interpolates.
    """
    nodes = np.arange(2 * len(away.position) - 1) / 2.0
    dense = np.interp(nodes, np.arange(len(away.position)), away.position)
    shift = end(dense)
    lever = 1.0 if away.lever is None else dense
    told = away.largest
    curve = told.curve
    inside = np.flatnonzero((curve.step > 0.0) & (told.piece[1:] == told.piece[:-1]))
    half = _looks(inside)
    piece = np.concatenate([told.piece, told.piece[inside]])
    offset = np.concatenate([told.offset, told.offset[inside] + curve.passed(inside, half)])
    value = np.concatenate([curve.value, curve.at(inside, half)])
    off = np.empty(len(piece))
    chunk = max(1, MOST_AT_ONCE // len(dense))
    for first in range(0, len(piece), chunk):
        part = slice(first, first + chunk)
        true, bound = exact.velocity(piece[part], offset[part], dense)
        true = (true - shift) * lever
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
    reached = -np.inf
    for _ in range(NARROWINGS):
        at = np.clip(offset[:, None] + half[:, None] * AROUND, 0.0, _lengths(history, piece)[:, None])
        found, bound = _values(exact, np.repeat(piece, len(AROUND)), at.ravel(), end)
        found = np.where(np.isfinite(found), sign * found, -np.inf).reshape(at.shape)
        top = found.argmax(axis=1)
        rows_at = np.arange(len(at))
        winner = found[rows_at, top]
        reached = best
        if winner.max() >= best:
            best = float(winner.max())
            bound_there = float(bound.reshape(at.shape)[rows_at, top].max())
        offset, half = at[rows_at, top], half / 4.0
    # what the last narrowing still added stands for what the next ones would; the rows beside the peak know as much
    top = int(np.nanargmax(height))
    beside = float(rows[max(top - 1, 0) : top + 2].max())
    return max(PEAK_MARGIN * (abs(abs(value) - best) + bound_there + max(best - reached, 0.0)), beside)


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
