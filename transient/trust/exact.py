"""The march against the exact solution: what every stored row and headline number is off by."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from transient.gap.problem import Problem
from transient.march.levels import Ladder
from transient.march.regime import Outlook
from transient.result.curve import Curve
from transient.result.history import History, largest
from transient.result.run import Errors
from transient.series.coupled import ClosedSolution
from transient.series.orbit import ClosedDeviation
from transient.series.regime import deviation, periodic
from transient.series.solution import Solution, solve
from transient.trust.coupled import motion_errors, speed_errors
from transient.trust.peaks import peak_errors, speed_error
from transient.trust.quasi_steady import steady_profile

ROUNDING = 1e-13  # of the usual stress, or mean velocity, about
BETWEEN_MARGIN = 1.5  # see ``_looks``
MOST_AT_ONCE = 4_000_000  # velocities compared in one go


@dataclass(frozen=True, eq=False)
class Exact:
    """The series of a case: of the ``flow``, and of its ``deviation`` from what it ends in (a series of its own where
    that is periodic, None without): the deviation series less ``stress`` (2,), ``mean`` and ``velocity`` (a function
    of the coordinate); ``orbit`` one period of that end where it is periodic."""

    flow: Solution
    deviation: Solution | None
    stress: np.ndarray
    mean: float
    velocity: Callable[[np.ndarray], np.ndarray]
    orbit: Solution | None = None

    def away_velocity(self, time: np.ndarray, position: np.ndarray, lever: np.ndarray | float) -> np.ndarray:
        """Largest speed (m,) of the deviation over ``position``, m/s, at absolute times (m,)."""
        assert self.deviation is not None
        piece, offset = self.deviation.locate(time)
        field, _ = self.deviation.velocity(piece, offset, position)
        field = (field - self.velocity(position)) * lever
        return largest(position, field, np.zeros_like(field))[0]

    def away_walls(self, time: np.ndarray) -> np.ndarray:
        """Magnitudes (m, 3) of the deviation at absolute times (m,): mean velocity, both walls' stress."""
        assert self.deviation is not None
        walls, _ = self.deviation.stress_and_mean(*self.deviation.locate(time))
        return np.abs(walls[:, [2, 0, 1]] - np.array([self.mean, *self.stress]))


def exact_of(problem: Problem, ahead: Outlook, ladder: Ladder) -> Exact:
    """The series of a case.  Raises ``SeriesError`` where it has none."""
    flow = solve(problem, ahead.until)
    best = ladder.best
    if best.deviation is None:
        return Exact(flow, None, np.zeros(2), 0.0, np.zeros_like)
    if ahead.kind == "steady":
        return Exact(flow, flow, best.steady_stress, best.steady_mean, _steady_end(problem, ladder))
    return Exact(flow, deviation(problem, ahead.until), np.zeros(2), 0.0, np.zeros_like, periodic(problem))


def orbit_errors(ladder: Ladder, exact: Exact) -> list[float]:
    """How far the sizes of a periodic regime (largest speed, mean, stresses) are from the exact ones."""
    orbit, series = ladder.best.orbit, exact.orbit
    assert orbit is not None
    assert series is not None
    stress, mean = _errors(orbit, series)
    peaks = peak_errors(_curves(orbit), orbit, series, np.column_stack([stress, mean]))
    profile = _profile_error(orbit, series, np.zeros_like)
    return [speed_error(orbit, series, profile), float(peaks[2]), *(float(peak) for peak in peaks[:2])]


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
    peaks = peak_errors(_curves(flow), flow, exact, np.column_stack([stress, mean]))
    more = _more(problem, ladder, series) if problem.closed else {}
    return Errors("exact", stress, mean, level_stress, level_mean, level_profile, peaks[:2], float(peaks[2]), more)


def _more(problem: Problem, ladder: Ladder, series: Exact) -> dict[str, np.ndarray]:
    """Of what bodies and a prescribed flow make results, see ``Errors.more``."""
    assert isinstance(series.flow, ClosedSolution)
    more = motion_errors(problem, ladder.inputs, ladder.best.flow, series.flow)
    if ladder.best.deviation is None:
        return more
    if series.deviation is series.flow:
        return {**more, "level_speed": more["speed"]}
    assert isinstance(series.deviation, ClosedDeviation)
    return {**more, "level_speed": speed_errors(problem, ladder.best.deviation, series.deviation)}


def _curves(history: History) -> list[Curve]:
    """Both stresses and the mean velocity over time."""
    return [history.stress_curve(0), history.stress_curve(1), history.mean_curve()]


def _errors(history: History, exact: Solution) -> tuple[np.ndarray, np.ndarray]:
    """|march - series| + bound of the stresses (n, 2) and of the mean velocity (n,), at rows and between them.

    0 where the march itself says infinite.
    """
    inside = np.flatnonzero(history.step > 0.0)
    curves = _curves(history)
    half = _looks(inside, history.offset[inside] == 0.0)
    passed = curves[0].passed(inside, half)
    piece = np.concatenate([history.piece, history.piece[inside]])
    offset = np.concatenate([history.offset, history.offset[inside] + passed])
    there = [curve.at(inside, curve.share_of(inside, passed)) for curve in curves]
    value = np.stack([np.concatenate([curve.value, own]) for curve, own in zip(curves, there, strict=True)], axis=1)
    own = ~_again(history, value, len(piece))
    true, bound = (found[np.cumsum(own) - 1] for found in exact.stress_and_mean(piece[own], offset[own]))
    with np.errstate(invalid="ignore"):
        off = np.abs(value - true) + bound
    shown = np.abs(np.where(np.isfinite(value), value, 0.0))
    # the usual size, not the largest: that may be what an infinite stress left behind
    usual = np.median(shown, axis=0)
    usual[:2] = usual[:2].max()
    off = np.where(np.isfinite(value), np.where(np.isfinite(off), off + ROUNDING * (usual + shown), np.inf), 0.0)
    rows = _beside(off, inside, len(history.time))
    return np.where(np.isfinite(history.stress), rows[:, :2], 0.0), rows[:, 2]


def _again(history: History, value: np.ndarray, instants: int) -> np.ndarray:
    """Which of the instants (n,) are the later side of a break that nothing jumps at: the row before says the same."""
    out, rows = np.zeros(instants, bool), len(history.time)
    same = (history.piece[1:] != history.piece[:-1]) & (value[1:rows] == value[: rows - 1]).all(axis=1)
    same &= (history.speed[1:] == history.speed[:-1]).all(axis=1) & (history.gradient[1:] == history.gradient[:-1])
    out[1:rows] = same
    return out


def _looks(inside: np.ndarray, begins: np.ndarray) -> np.ndarray:
    """Where in each interval the march is compared: at 0.3 and 0.7 by turns.  Half-way, the error that wrong slopes
    make would vanish; at these places both that one and the cubic's own are above two thirds of their largest.  Right
    after a break, where it ``begins``, a parabola in the root of time misses most at 0.36."""
    return np.where(begins, 0.36, np.where(inside % 2 == 0, 0.3, 0.7))


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
    dense = away.around_largest
    shift = end(dense)
    lever = 1.0 if away.lever is None else dense
    told = away.largest
    curve = told.curve
    inside = np.flatnonzero((curve.step > 0.0) & (told.piece[1:] == told.piece[:-1]))
    half = _looks(inside, told.offset[inside] == 0.0)
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
