"""What refinement alone says of the errors: the best answer against the next best, row by row.

With two levels the extrapolation is compared with its finer level (whose error it has removed: far too careful); with
three, the extrapolation of the finer two with that of the coarser two, whose error is several times its own.
"""

from __future__ import annotations

import numpy as np

from transient.march.levels import Ladder
from transient.march.readings import with_rates
from transient.result.curve import Curve
from transient.result.run import ZERO, Errors

# The coarser extrapolation errs more than the finer one by a factor of 16 in smooth flow and of 2 beside kinks: the
# difference alone covers both, the margin the luck of two errors of one sign.  Measured, see the experiment.
MARGIN = 2.0
ROUNDING = 2e-13
# A cubic over two steps errs 16 times as much as over one where both follow the flow, but no more than it where slopes
# are wrong, as where a wide step passes a quick decay.
DOUBLED = 1.5
AROUND = 2  # rows to either side whose differences count too: where two levels' errors cross, one row says nothing


def estimate(ladder: Ladder) -> Errors:
    """Errors of the ladder's best histories from the next best ones (``kind`` "estimate")."""
    best, other = ladder.best, ladder.next_best
    flow = best.flow
    stress = spread(flow.stress, other.flow.stress)
    mean = spread(flow.mean, other.flow.mean)
    away, other_away = best.deviation, other.deviation
    if away is None or other_away is None:
        level_stress, level_mean, level_profile = stress, mean, np.zeros(len(flow.profile_row))
    else:
        level_stress = spread(away.stress, other_away.stress)
        level_mean = spread(away.mean, other_away.mean)
        lever = 1.0 if away.lever is None else away.lever
        profile = (spread(away.profile, other_away.profile) * lever).max(axis=1)
        owner = away.largest.owner
        level_profile = np.maximum(profile[owner], profile[np.minimum(owner + 1, len(profile) - 1)])
    # what no level tells, since all share the rows: how far off the cubic between rows may be
    stress = stress + _between([flow.stress_curve(end) for end in (0, 1)])
    mean = mean + _between([flow.mean_curve()])[:, 0]
    if away is not None:
        level_stress = level_stress + _between([away.stress_curve(end) for end in (0, 1)])
        level_mean = level_mean + _between([away.mean_curve()])[:, 0]
        level_profile = level_profile + _between([away.largest_curve()])[:, 0]
    peak = np.array([_peak(flow.stress_curve(end), other.flow.stress_curve(end), stress[:, end]) for end in (0, 1)])
    mean_peak = _peak(flow.mean_curve(), other.flow.mean_curve(), mean)
    sizes = np.array([float(level_profile.max(initial=0.0)), mean_peak, *peak])
    sizes = np.where(_vanishing(ladder), sizes, 0.0) if best.orbit is None else _orbit_sizes(ladder)
    return Errors(
        "estimate", stress, mean, level_stress, level_mean, level_profile, peak, mean_peak, _more(ladder), sizes
    )  # fmt: skip


def _vanishing(ladder: Ladder) -> np.ndarray:
    """Which of largest speed, mean and stresses (4,) end in nothing, so that the run's own peaks are their size."""
    best = ladder.best
    if best.steady_velocity is None:
        return np.zeros(4, bool)
    flow = best.flow
    end = np.array([np.abs(best.steady_velocity).max(), abs(best.steady_mean), *np.abs(best.steady_stress)])
    stress = np.nanmax(np.abs(flow.stress), axis=0, initial=0.0)
    return end <= ZERO * np.array([np.abs(flow.profile).max(), np.abs(flow.mean).max(), *stress])


def _orbit_sizes(ladder: Ladder) -> np.ndarray:
    """Errors (4,) of the largest speed, mean and stresses over a period."""
    best, other = ladder.best.orbit, ladder.next_best.orbit
    assert best is not None
    assert other is not None
    other = with_rates(other)
    pairs = [(best.mean_curve(), other.mean_curve())]
    pairs += [(best.stress_curve(end), other.stress_curve(end)) for end in (0, 1)]
    out = [MARGIN * abs(best.largest_curve().magnitude()[0] - other.largest_curve().magnitude()[0])]
    out[0] += float(_between([best.largest_curve()]).max(initial=0.0))
    for curve, rival in pairs:
        rows = spread(curve.value[:, None], rival.value[:, None])[:, 0] + _between([curve])[:, 0]
        out.append(_peak(curve, rival, rows))
    return np.array(out)


def _more(ladder: Ladder) -> dict[str, np.ndarray]:
    """Of what bodies and a prescribed flow make results, see ``Errors.more``."""
    best, other = ladder.best, ladder.next_best
    names = ("gradient", "speed", "acceleration", "place")
    out = {name: spread(getattr(best.flow, name), getattr(other.flow, name)) for name in names}
    if best.deviation is not None and other.deviation is not None:
        out["level_speed"] = spread(best.deviation.speed, other.deviation.speed)
    return out


def _between(curves: list[Curve]) -> np.ndarray:
    """Bound (n, columns) of the cubics' error beside each row, from what cubics over two steps miss."""
    off = np.stack([curve.without() for curve in curves], axis=1) / DOUBLED
    beside = off.copy()
    beside[1:] = np.maximum(beside[1:], off[:-1])
    beside[:-1] = np.maximum(beside[:-1], off[1:])
    return beside


def spread(best: np.ndarray, other: np.ndarray) -> np.ndarray:
    """Bound of the error of ``best``: its distance to ``other`` with the margin, never below round-off."""
    finite = np.isfinite(best)
    size = np.abs(best[finite]).max(initial=0.0)
    off = np.abs(np.where(finite, best - other, 0.0))
    wide = off.copy()
    for shift in range(1, AROUND + 1):
        wide[shift:] = np.maximum(wide[shift:], off[:-shift])
        wide[:-shift] = np.maximum(wide[:-shift], off[shift:])
    return np.where(finite, MARGIN * wide + ROUNDING * size, 0.0)


def _peak(best, other, rows: np.ndarray) -> float:
    """Error of the largest magnitude: of the two values, and of the rows beside it."""
    value, at = best.magnitude()
    if not np.isfinite(value):
        return 0.0
    beside = np.clip(np.searchsorted(best.time, at) + np.arange(-AROUND, AROUND + 1), 0, len(rows) - 1)
    return float(max(MARGIN * abs(abs(value) - abs(other.magnitude()[0])), rows[beside].max()))
