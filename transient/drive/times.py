"""When two times are one, and what periods have in common."""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np

# Two break points closer than this, relative to the larger time, are one: 0.1 + 0.2 must meet 0.3.
SAME_TIME = 1e-12
# Periods whose ratio is a fraction with larger terms than this are taken as having no common period.
LARGEST_RATIO = 1000


def slack(times: np.ndarray) -> np.ndarray:
    """How far apart break times (n,) of one run, sorted, may lie and still be one."""
    return SAME_TIME * np.maximum(times, times[-1] * 1e-3)


def merge_times(groups: list[np.ndarray]) -> np.ndarray:
    """Sorted union of break times; those that differ by round-off only become one (the earliest given)."""
    times = np.sort(np.concatenate(groups))
    if len(times) == 0:
        return times
    near = slack(times)
    keep = np.concatenate([[True], np.diff(times) > near[1:]])
    while True:
        # In a crowd of close times those that have drifted away from the one kept count again.
        drifted = times - times[keep][np.cumsum(keep) - 1] > near
        if not drifted.any():
            return times[keep]
        keep |= drifted & ~np.concatenate([[False], drifted[:-1]])


def common_period(periods: list[float | None]) -> tuple[float | None, bool]:
    """(smallest common period, whether there is one); constants (None) do not count."""
    real = [p for p in periods if p is not None]
    if not real:
        return None, True
    base = real[0]
    multiple = Fraction(1)
    for p in real[1:]:
        ratio = Fraction(p / base).limit_denominator(LARGEST_RATIO)
        if not 0 < ratio <= LARGEST_RATIO or abs(float(ratio) - p / base) > 1e-9 * p / base:
            return None, False
        # The least common multiple of two fractions in lowest terms.
        multiple = Fraction(
            math.lcm(multiple.numerator, ratio.numerator), math.gcd(multiple.denominator, ratio.denominator)
        )
    common = base * float(multiple)
    if common > LARGEST_RATIO * max(real):
        return None, False
    return common, True
