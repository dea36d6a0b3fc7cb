"""The regime a case ends in, and the flow's deviation from it: what settling is judged by."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from transient.drive.pieces import Drive, common_period, merge_times
from transient.gap.problem import Inputs, Problem
from transient.series.answers import mode_count
from transient.series.coupled import solve_closed
from transient.series.gapshape import GapShape, SeriesError, shape_of
from transient.series.modes import Modes, modes
from transient.series.orbit import ClosedDeviation, Orbit, closed_orbit
from transient.series.solution import Solution
from transient.series.steady import steady_flow
from transient.series.timeline import WINDOWS, states, timeline

# Two coefficients that agree to this share are the same drive, followed to the end.
_SAME = 1e-11
# Most pieces spent on the past of a periodic regime.
_MOST_LEAD = 20_000


@dataclass(frozen=True, eq=False)
class Regime:
    """Eventual ``drives`` (lower, upper, pressure) continued back to t = 0; ``period`` s, None if constant."""

    drives: tuple[Drive, Drive, Drive]
    period: float | None
    since: float


def regime(problem: Problem) -> Regime | None:
    """What the problem's drives end in, or None if in neither a constant nor a periodic state."""
    ends = [drive.eventual for drive in problem.drives]
    if any(end.drive is None for end in ends):
        return None
    period, common = common_period([end.period for end in ends])
    if not common:
        return None
    return Regime(tuple(end.drive for end in ends), period, max(end.since for end in ends))  # type: ignore[arg-type]


@dataclass(frozen=True, eq=False)
class SteadyState:
    """Steady flow for given inputs: ``stress`` (2,) Pa on the lower and upper wall, ``mean`` velocity m/s."""

    problem: Problem
    shape: GapShape
    inputs: np.ndarray
    stress: np.ndarray
    mean: float

    def velocity(self, r: np.ndarray) -> np.ndarray:
        """(k,) velocity (rotating gaps: angular) at coordinates ``r`` (k,) m."""
        y = np.clip((np.asarray(r, dtype=float) - self.problem.inner) / self.problem.gap, 0.0, 1.0)
        return self.inputs @ steady_flow(self.shape).velocity(y)


def steady(problem: Problem, values: np.ndarray) -> SteadyState:
    """Closed-form steady flow for lower speed, upper speed, pressure drop per length ``values`` (3,) in SI."""
    shape = shape_of(problem)
    flow = steady_flow(shape)
    inputs = np.asarray(values, dtype=float) * [1.0, 1.0, problem.gap**2 / problem.viscosity]
    rotating = problem.rotating
    stress = inputs @ flow.stress() * problem.viscosity / (1.0 if rotating else problem.gap)
    return SteadyState(problem, shape, inputs, stress, float(inputs @ flow.mean()) * (problem.gap if rotating else 1.0))


def periodic(problem: Problem, until: float | None = None) -> Solution | Orbit:
    """The periodic (or steady) state itself on [0, ``until``), default one period.  Raises SeriesError without one."""
    if problem.closed:
        return _closed_orbit(problem)
    end = _need(problem)
    shape = shape_of(problem)
    span = until or end.period or problem.diffusion_time
    now = _rows(end.drives, span, None)
    return _with_past(problem, shape, end, now, None)


def deviation(problem: Problem, until: float) -> Solution | ClosedDeviation:
    """The flow less its eventual steady or periodic state, on [0, ``until``), each mode followed to its own end.

    ``velocity``, ``stress`` and ``mean`` of the result are differences.  Raises SeriesError if there is no such state.
    """
    if problem.closed:
        return _closed_deviation(problem, until)
    end = _need(problem)
    shape = shape_of(problem)
    groups = [drive.breaks(until) for drive in (*problem.drives, *end.drives)]
    starts = merge_times(groups)
    actual = _rows(problem.drives, until, starts)
    if problem.start == "rest":
        actual = Inputs(actual.starts, actual.poly, actual.coeff, actual.rate, np.zeros(3))
    return _with_past(problem, shape, end, less(actual, _rows(end.drives, until, starts)), actual.before)


def _closed_orbit(problem: Problem) -> Orbit:
    end = regime(problem)
    if end is None or end.period is None:
        raise SeriesError("the drive does not end in a periodic state")
    return closed_orbit(problem, _rows(end.drives, end.period, None), end.period)


def _closed_deviation(problem: Problem, until: float) -> ClosedDeviation:
    orbit = _closed_orbit(problem)
    end = regime(problem)
    assert end is not None
    starts = merge_times([drive.breaks(until) for drive in (*problem.drives, *end.drives)])
    return ClosedDeviation(solve_closed(problem, until), orbit, starts)


def _need(problem: Problem) -> Regime:
    steady_flow(shape_of(problem))
    end = regime(problem)
    if end is None:
        raise SeriesError("the drive ends in neither a steady nor a periodic state")
    return end


def _rows(drives: tuple[Drive, ...], until: float, starts: np.ndarray | None) -> Inputs:
    """Drives on common ``starts`` (default: their own breaks)."""
    if starts is None:
        starts = merge_times([drive.breaks(until) for drive in drives])
    rows = [drive.pieces(until, starts) for drive in drives]
    most = max(row.coeff.shape[1] for row in rows)
    coeff = np.zeros((len(starts), 3, most), complex)
    rate = np.zeros_like(coeff)
    for i, row in enumerate(rows):
        coeff[:, i, : row.coeff.shape[1]] = row.coeff
        rate[:, i, : row.rate.shape[1]] = row.rate
    before = np.array([drive.before for drive in drives], dtype=float)
    return Inputs(starts, np.stack([row.poly for row in rows], axis=1), coeff, rate, before)


def less(one: Inputs, other: Inputs) -> Inputs:
    """``one`` - ``other`` on the same starts; what agrees to round-off goes altogether."""
    poly = one.poly - other.poly
    lengths = np.append(np.diff(one.starts), 0.0)[:, None, None] ** np.arange(4.0)
    size = (np.abs(one.poly) * lengths).sum(axis=2) + np.abs(other.poly[:, :, 0]) + np.abs(one.coeff).sum(axis=2)
    scale = size[:, :, None] / np.where(lengths > 0, lengths, 1.0)
    reach = np.maximum(np.abs(one.poly) + np.abs(other.poly), np.where(np.arange(4) == 0, scale, 0.0))
    poly = np.where(np.abs(poly) <= _SAME * reach, 0.0, poly)
    coeff, rest = one.coeff.copy(), -other.coeff
    for k in range(rest.shape[2]):
        for n in range(coeff.shape[2]):
            same = np.abs(one.rate[:, :, n] - other.rate[:, :, k]) <= _SAME * np.abs(other.rate[:, :, k])
            same &= (rest[:, :, k] != 0) & (one.coeff[:, :, n] != 0)
            total = coeff[:, :, n] + rest[:, :, k]
            # Phases of fast waves are only as good as time over period.
            total = np.where(np.abs(total) <= 10 * _SAME * np.abs(one.coeff[:, :, n]), 0.0, total)
            coeff[:, :, n] = np.where(same, total, coeff[:, :, n])
            rest[:, :, k] = np.where(same, 0.0, rest[:, :, k])
    coeff = np.concatenate([coeff, rest], axis=2)
    rate = np.concatenate([one.rate, other.rate], axis=2)
    used = (coeff != 0).any(axis=(0, 1))
    return Inputs(one.starts, poly, coeff[:, :, used], rate[:, :, used], one.before - other.before)


def _with_past(problem, shape, end, now, held):  # type: ignore[no-untyped-def]
    """A Solution of the inputs ``now`` from t = 0 on; before it the regime itself, or ``held`` (3,) less the regime."""
    sign, base = (1.0, np.zeros(3)) if held is None else (-1.0, held)
    period = end.period
    if period is None:
        level = _rows(end.drives, problem.diffusion_time, None).poly[0, :, 0]
        line = timeline(Inputs(now.starts, now.poly, now.coeff, now.rate, base + sign * level), problem)
        window = line.window()
        return Solution(problem, shape, line, states(line, modes(shape, mode_count(window))), window, now.starts)
    cycle = _rows(end.drives, period, None)
    window, cycles = _past_cycles(timeline(now, problem).window(), period / problem.diffusion_time, len(cycle.starts))
    past = _rows(end.drives, cycles * period, None)
    last = _value(cycle, len(cycle.starts) - 1, period - cycle.starts[-1])
    poly = sign * past.poly
    poly[:, :, 0] += base
    whole = _concatenate(
        Inputs(past.starts - cycles * period, poly, sign * past.coeff, past.rate, base + sign * last), now
    )
    line = timeline(whole, problem)
    kept = modes(shape, mode_count(window))
    start, worst = _periodic_amplitudes(problem, cycle, period, last, kept)
    return Solution(problem, shape, line, states(line, kept, sign * start, worst), window, now.starts, len(past.starts))


def _past_cycles(longest: float, period: float, pieces: int) -> tuple[float, int]:
    """(window, periods before t = 0 that fill it): the longest window whose past is not too long to write down."""
    for window in WINDOWS:
        cycles = int(np.ceil(window / period * (1 + 1e-9)))
        if window <= longest and cycles * pieces <= _MOST_LEAD:
            break
    return window, cycles


def _value(inputs: Inputs, piece: int, x: float) -> np.ndarray:
    """(3,) inputs at local time ``x`` of a piece."""
    return np.array([inputs.row(i).at(np.array([piece]), np.array([x]))[0] for i in range(3)])


def _concatenate(one: Inputs, two: Inputs) -> Inputs:
    width = max(one.coeff.shape[2], two.coeff.shape[2])
    coeff, rate = (
        np.concatenate([np.pad(a, ((0, 0), (0, 0), (0, width - a.shape[2]))) for a in pair])
        for pair in ((one.coeff, two.coeff), (one.rate, two.rate))
    )
    return Inputs(
        np.concatenate([one.starts, two.starts]), np.concatenate([one.poly, two.poly]), coeff, rate, one.before
    )


def _periodic_amplitudes(problem: Problem, cycle: Inputs, period: float, last: np.ndarray, kept: Modes):  # type: ignore[no-untyped-def]
    """Amplitudes (M,) just before each period begins and their reach: what one period adds, over what it forgets."""
    scale = np.array([1.0, 1.0, problem.gap**2 / problem.viscosity])
    smooth = len(cycle.starts) == 1 and not cycle.poly[0, :, 1:].any() and not cycle.rate[0].real.any()
    if smooth:
        rate = cycle.rate[0] * problem.diffusion_time
        swing = cycle.coeff[0] * scale[:, None] * rate
        answers = swing[None] / (rate[None] + kept.rate[:, None, None])
        terms = kept.share * answers.real.sum(axis=2)
        return -terms.sum(axis=1), np.abs(terms).sum(axis=1)
    again = Inputs(np.array([period]), cycle.poly[:1], cycle.coeff[:1], cycle.rate[:1], last)
    once = _concatenate(Inputs(cycle.starts, cycle.poly, cycle.coeff, cycle.rate, last), again)
    gained = states(timeline(once, problem), kept)
    forgotten = -np.expm1(-kept.rate * period / problem.diffusion_time)
    return gained.ahead[-1] / forgotten, gained.reach[-1] / forgotten
