"""A quantity over time as the cubic through values and rates: extremes, crossings, integrals between the rows."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from transient.compiled import compiled

LONG_AGO = 1e3  # steps: a cubic in the root of so long a time is one in time


@dataclass(frozen=True, eq=False)
class Curve:
    """n rows: ``time`` (n,) s, ``value``, ``rate`` (n,); ``step`` (n-1,) lengths, 0 across a break.

    With ``offset`` (n-1,), the times since the last break at which the steps begin, the cubic is one in the root of
    that time: a flow that answers to a break is smooth in it, and steps may double.  A ``share`` of an interval counts
    in the same measure.  Rows that are not finite, and the steps beside them, are left out of every answer.
    """

    time: np.ndarray
    value: np.ndarray
    rate: np.ndarray
    step: np.ndarray
    offset: np.ndarray | None = None

    @cached_property
    def measure(self) -> np.ndarray | None:
        """``offset`` as it is used: where a break leaves no trace in this quantity, its first step counts as one long
        after a break, which makes the cubic one in time.

        Which of the two it is, the next row tells: each reading over two steps is held against the row between them.
        """
        if self.offset is None:
            return None
        out = self.offset.copy()
        i = np.flatnonzero((self.offset[:-1] == 0.0) & (self.step[:-1] > 0.0) & (self.step[1:] > 0.0))
        if len(i):
            first, both = self.step[i], self.step[i] + self.step[i + 1]
            rise, end = self.value[i + 2] - self.value[i], self.rate[i + 2] * both
            with np.errstate(invalid="ignore"):
                s, x, begin = np.sqrt(first / both), first / both, self.rate[i] * both
                root = (2.0 * rise - 2.0 * end) * s + (2.0 * end - rise) * s * s
                time = x * (begin + x * (3.0 * rise - 2.0 * begin - end + x * (begin + end - 2.0 * rise)))
                seen = self.value[i + 1] - self.value[i]
                plain = i[np.abs(time - seen) < np.abs(root - seen)]
            out[plain] = LONG_AGO * self.step[plain]
        return out

    @cached_property
    def _roots(self) -> tuple[np.ndarray, np.ndarray]:
        """Roots of the times since the break at both ends of each interval; plain times where no break is known."""
        if self.measure is None:
            return np.zeros_like(self.step), self.step
        return np.sqrt(self.measure), np.sqrt(self.measure + self.step)

    def passed(self, interval: np.ndarray, share: np.ndarray) -> np.ndarray:
        """Time from the start of the given intervals to ``share`` of them, s."""
        if self.offset is None:
            return share * self.step[interval]
        low, high = (root[interval] for root in self._roots)
        gone = share * (high - low)
        return gone * (2.0 * low + gone)

    def share_of(self, interval: np.ndarray, passed: np.ndarray) -> np.ndarray:
        """The inverse of ``passed``; 1 where an interval has no length."""
        low, high = (root[interval] for root in self._roots)
        width = np.where(high > low, high - low, 1.0)
        if self.offset is None:
            share = passed / width
        else:
            share = passed / (np.sqrt(low * low + passed) + low + (passed == 0.0)) / width
        return np.where(high > low, share, 1.0)

    @cached_property
    def cubic(self) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
        """Coefficients in s = (t - time) / step of each interval, lowest power first, (n-1,) each."""
        low, high = self.value[:-1], self.value[1:]
        rise = high - low
        if self.offset is None:
            slope_low, slope_high = self.rate[:-1] * self.step, self.rate[1:] * self.step
        else:
            first, last = self._roots
            slope_high = 2.0 * last * self.rate[1:] * (last - first)
            # right at a break the rate in time may be infinite: values and the slope at the other end make a parabola
            with np.errstate(invalid="ignore"):
                slope_low = np.where(
                    first > 0.0, 2.0 * first * self.rate[:-1] * (last - first), 2.0 * rise - slope_high
                )
        return low, slope_low, 3.0 * rise - 2.0 * slope_low - slope_high, slope_low + slope_high - 2.0 * rise

    def at(self, interval: np.ndarray, share: np.ndarray) -> np.ndarray:
        """Values at ``share`` of the given intervals."""
        c0, c1, c2, c3 = (c[interval] for c in self.cubic)
        return c0 + share * (c1 + share * (c2 + share * c3))

    def without(self) -> np.ndarray:
        """How far off (n,) the cubic over two steps is at the row between them; 0 at rows beside a break."""
        inner = np.flatnonzero((self.step[:-1] > 0.0) & (self.step[1:] > 0.0)) + 1
        out = np.zeros(len(self.value))
        if len(inner) == 0:
            return out
        low, high = inner - 1, inner + 1
        long = np.stack([self.step[low] + self.step[inner], np.zeros(len(inner))], axis=1).ravel()[:-1]
        offset = None
        if self.offset is not None:
            offset = np.stack([self.measure[low], np.zeros(len(inner))], axis=1).ravel()[:-1]
        ends = [np.stack([of[low], of[high]], axis=1).ravel() for of in (self.time, self.value, self.rate)]
        curve = Curve(*ends, long, offset)
        even = 2 * np.arange(len(inner))
        off = np.abs(curve.at(even, curve.share_of(even, self.step[low])) - self.value[inner])
        out[inner] = np.where(np.isfinite(off), off, 0.0)
        return out

    def sample(self, time: np.ndarray) -> np.ndarray:
        """Values at absolute times (m,), clipped to the rows; a break gives its later side."""
        time = np.clip(time, self.time[0], self.time[-1])
        interval = np.clip(np.searchsorted(self.time, time, side="right") - 1, 0, len(self.step) - 1)
        share = self.share_of(interval, np.maximum(time - self.time[interval], 0.0))
        return self.at(interval, np.clip(share, 0.0, 1.0))

    @cached_property
    def turning(self) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        """(time, value, interval) of every extreme inside an interval."""
        c0, c1, c2, c3 = self.cubic
        # c1 + 2 c2 s + 3 c3 s^2 = 0, by the form that does not cancel
        with np.errstate(all="ignore"):
            root = np.sqrt(np.maximum(c2 * c2 - 3.0 * c1 * c3, 0.0))
            real = c2 * c2 - 3.0 * c1 * c3 >= 0.0
            q = -(c2 + np.where(c2 >= 0, root, -root))
            pair = np.concatenate([q / (3.0 * c3), c1 / q])
        interval = np.concatenate([np.arange(len(self.step))] * 2)
        inside = np.concatenate([real, real]) & np.isfinite(pair) & (pair > 0.0) & (pair < 1.0)
        inside &= (self.step > 0.0)[interval]
        interval, share = interval[inside], pair[inside]
        value = c0[interval] + share * (c1[interval] + share * (c2[interval] + share * c3[interval]))
        keep = np.isfinite(value)
        return (self.time[interval] + self.passed(interval, share))[keep], value[keep], interval[keep]

    def extreme(self, sign: float) -> tuple[float, float]:
        """(value, its earliest time) where sign x value is largest; (nan, nan) without finite rows."""
        time, value, _ = self.turning
        finite = np.isfinite(self.value)
        time = np.concatenate([self.time[finite], time])
        value = np.concatenate([self.value[finite], value])
        if len(value) == 0:
            return np.nan, np.nan
        best = (sign * value).max()
        first = time[sign * value >= best].min()
        return float(sign * best), float(first)

    def magnitude(self) -> tuple[float, float]:
        """(signed value, time) where |value| is largest; (nan, nan) without finite rows."""
        high, low = self.extreme(1.0), self.extreme(-1.0)
        return high if not abs(low[0]) > abs(high[0]) else low

    @cached_property
    def _highest(self) -> dict[float, np.ndarray]:
        return {}

    def _tops(self, sign: float) -> np.ndarray:
        """Largest sign x value of each interval (n-1,), its first row included and its last left out; infinite where
        that row is not finite."""
        if sign not in self._highest:
            _, value, interval = self.turning
            top = np.where(np.isfinite(self.value[:-1]), sign * self.value[:-1], np.inf)
            np.maximum.at(top, interval, sign * value)
            self._highest[sign] = top
        return self._highest[sign]

    def _interval(self, i: int, sign: float) -> tuple[float, ...]:
        """Coefficients of one interval times ``sign``, as plain floats."""
        return tuple(sign * float(c[i]) for c in self.cubic)

    def first_at(self, level: float, sign: float) -> float:
        """Earliest time at which sign x value >= level; nan if never."""
        time, value, interval = self.turning
        tops = np.full(len(self.step), -np.inf)
        np.maximum.at(tops, interval, sign * value)
        with np.errstate(invalid="ignore"):
            rows = np.where(np.isfinite(self.value), sign * self.value, -np.inf)
            hit = np.flatnonzero((rows[1:] >= level) | (tops >= level))
        if rows[0] >= level:
            return float(self.time[0])
        if len(hit) == 0:
            return np.nan
        i = int(hit[0])
        if not np.isfinite(self.value[i]) or self.step[i] <= 0.0:
            return float(self.time[i + 1])
        peak = 1.0
        inside = interval == i
        if inside.any():
            shares = self.share_of(interval[inside], time[inside] - self.time[i])
            above = sign * value[inside] >= level
            if above.any():
                peak = float(shares[above].min())
        share = _crossing(self._interval(i, sign), level, 0.0, peak)
        return float(self.time[i] + self.passed(np.array([i]), np.array([share]))[0])

    def last_above(self, level: float) -> float:
        """Time after which |value| stays at or below ``level``: 0 if always, nan if not by the end."""
        return max(self.last_over(level, 1.0), self.last_over(level, -1.0), key=lambda t: np.inf if np.isnan(t) else t)

    def last_over(self, level: float, sign: float) -> float:
        """Time after which sign x value stays at or below ``level``: 0 if always, nan if not by the end."""
        time, value, interval = self.turning
        last = float(sign * self.value[-1])
        if not last <= level:  # a value that is not finite is above
            return np.nan
        above = np.flatnonzero(self._tops(sign) > level)
        if len(above) == 0:
            return 0.0
        i = int(above[-1])
        if self.step[i] <= 0.0 or not np.isfinite(self.value[i]):
            return float(self.time[i + 1])
        inside = (interval == i) & (sign * value > level)
        low = float(self.share_of(interval[inside], time[inside] - self.time[i]).max(initial=0.0))
        share = _crossing(self._interval(i, -sign), -level, low, 1.0)
        return float(self.time[i] + self.passed(np.array([i]), np.array([share]))[0])

    def integral(self) -> np.ndarray:
        """Running integral at the rows (n,); a step after an infinite value counts by its finite end."""
        c0, c1, c2, c3 = self.cubic
        low, high = self._roots
        width = high - low
        plain = c0 + c1 / 2.0 + c2 / 3.0 + c3 / 4.0
        if self.offset is None:
            part = plain * width
        else:
            part = 2.0 * width * (low * plain + width * (c0 / 2.0 + c1 / 3.0 + c2 / 4.0 + c3 / 5.0))
        finite = np.isfinite(part)
        part = np.where(finite, part, np.where(np.isfinite(self.value[1:]), self.value[1:], 0.0) * self.step)
        return np.concatenate([[0.0], np.cumsum(part)])


def _crossing(cubic: tuple[float, ...], level: float, low: float, high: float) -> float:
    """Where a cubic in s rises through ``level`` on [low, high], by bisection to the last digit."""
    c0, c1, c2, c3 = cubic
    return _rises_through(c0 - level, c1, c2, c3, low, high)


@compiled
def _rises_through(c0, c1, c2, c3, low, high):  # type: ignore[no-untyped-def]
    for _ in range(60):
        middle = 0.5 * (low + high)
        if not low < middle < high:
            break
        if c0 + middle * (c1 + middle * (c2 + middle * c3)) < 0.0:
            low = middle
        else:
            high = middle
    return high
