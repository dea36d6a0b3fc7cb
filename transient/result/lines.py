"""Time lines: where lines of particles that were laid across the gap have moved, as dye or bubbles show in a rig."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from transient.result.result import Result, ResultError


def time_lines(result: Result, laid: Sequence[float], seen: float) -> np.ndarray:
    """Displacement (k, N) m along the flow, at ``seen`` (s), of lines laid across the gap at ``laid`` (k,) s.

    Over the result's ``position``; lines laid after ``seen`` are NaN.  Between stored profiles the way is the cubic
    through travel and velocity.  Raises ResultError where the file holds no travel, or for times outside the run.
    """
    for name in ("profile_time", "position", "velocity", "travel"):
        if name not in result.variables:
            raise ResultError(f"time lines: this file holds no {name}")
    laid = np.atleast_1d(np.asarray(laid, float))
    first, last = float(result.profile_time[0]), float(result.profile_time[-1])
    for time in (*laid.tolist(), float(seen)):
        if not first <= time <= last * (1.0 + 1e-12):
            raise ResultError(f"time lines: {time:g} s lies outside the run's profiles, {first:g} s to {last:g} s")
    moved = travelled(result, np.array([float(seen)])) - travelled(result, laid)
    return np.where(laid[:, None] <= seen, moved, np.nan)


def travelled(result: Result, time: np.ndarray) -> np.ndarray:
    """Distance (k, N) m travelled since the start, at ``time`` (k,) s."""
    at, way, velocity = result.profile_time, result.travel, result.velocity
    low = np.clip(np.searchsorted(at, time, side="right") - 1, 0, len(at) - 2)
    step = (at[low + 1] - at[low])[:, None]
    share = np.clip((time - at[low])[:, None] / np.where(step > 0.0, step, 1.0), 0.0, 1.0)
    rise = way[low + 1] - way[low]
    first, second = velocity[low] * step, velocity[low + 1] * step
    bend, twist = 3.0 * rise - 2.0 * first - second, first + second - 2.0 * rise
    return way[low] + share * (first + share * (bend + share * twist))
