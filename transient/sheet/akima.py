"""A smooth curve through points that does not overshoot beside a steep step."""

from __future__ import annotations

import numpy as np


def akima(x: np.ndarray, y: np.ndarray, at: np.ndarray) -> np.ndarray:
    """Values (m,) at ``at`` of the modified Akima curve through ``x`` (n,), rising, and ``y`` (n,).

    Cubics with the slopes of Akima (J. ACM 17, 1970, 589), weights with the half sum of neighbouring slopes added so
    that flat stretches stay flat (the usual modification; from memory).  One or two points: a straight line.
    """
    if len(x) < 3:
        return np.interp(at, x, y)
    rise = np.diff(y) / np.diff(x)
    before = 2.0 * rise[0] - rise[1]
    after = 2.0 * rise[-1] - rise[-2]
    rise = np.concatenate([[2.0 * before - rise[0], before], rise, [after, 2.0 * after - rise[-1]]])
    change = np.abs(np.diff(rise)) + 0.5 * np.abs(rise[1:] + rise[:-1])
    left, right = change[2:], change[:-2]
    total = left + right
    flat = total <= 1e-9 * total.max(initial=0.0)
    slope = np.where(flat, 0.0, (left * rise[1:-2] + right * rise[2:-1]) / np.where(flat, 1.0, total))
    low = np.clip(np.searchsorted(x, at, side="right") - 1, 0, len(x) - 2)
    step = x[low + 1] - x[low]
    s = (at - x[low]) / step
    first, second, up = slope[low] * step, slope[low + 1] * step, y[low + 1] - y[low]
    return y[low] + s * (first + s * (3.0 * up - 2.0 * first - second + s * (first + second - 2.0 * up)))
