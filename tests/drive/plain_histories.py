"""Each history kind written down a second time, one time at a time, from the words of its definition.

A history is ``(kind, {key: value})`` with the keys as a user writes them (SI); parts are such pairs.
"""

from __future__ import annotations

import math
from typing import Any

from transient.drive import KINDS
from transient.drive.pieces import Drive

History = tuple[str, dict[str, Any]]


def compiled(history: History) -> Drive:
    """The drive of the product."""
    name, keys = history
    given = {("from_" if key == "from" else key): value for key, value in keys.items()}
    if name == "sum":
        given["parts"] = [compiled(part) for part in keys["parts"]]
    if name == "repeat":
        given["part"] = compiled(keys["part"])
    return KINDS[name].build(**given)


def plain(history: History, t: float) -> float:
    """The value at ``t`` by definition; at a jump the value after it."""
    name, keys = history
    return _DEFINITIONS[name](t, **{("start" if key == "from" else key): value for key, value in keys.items()})


def magnitude(history: History) -> float:
    """A bound of the values, for tolerances."""
    name, keys = history
    if name == "sum":
        return sum(magnitude(part) for part in keys["parts"])
    if name == "repeat":
        return magnitude(keys["part"])
    return sum(abs(keys.get(k, 0.0)) for k in ("to", "from", "amplitude", "mean")) + max(
        map(abs, keys.get("values", [0.0]))
    )


def _step(t, to, start=0.0, at=0.0):
    return to if t >= at and t >= 0 else start


def _share(t, at, over):
    return min(max((t - at) / over, 0.0), 1.0)


def _ramp(t, to, over, start=0.0, at=0.0):
    return start + (to - start) * _share(t, at, over)


def _smooth_ramp(t, to, over, start=0.0, at=0.0):
    return start + (to - start) * (1 - math.cos(math.pi * _share(t, at, over))) / 2


def _s_curve(t, to, acceleration, jerk, start=0.0, at=0.0):
    change, x = abs(to - start), max(t - at, 0.0)
    if change == 0.0:
        return to
    # Times of a jerk-limited change: common practice of motion control, from memory.
    if change >= acceleration**2 / jerk:
        total, bend = change / acceleration + acceleration / jerk, acceleration / jerk
    else:
        total, bend = 2 * math.sqrt(change / jerk), math.sqrt(change / jerk)
    if x >= total:
        return to
    # Point symmetric about the middle of the change.
    early = min(x, total - x)
    gone = jerk * early**2 / 2 if early <= bend else jerk * bend**2 / 2 + jerk * bend * (early - bend)
    gone = gone if x <= total / 2 else change - gone
    return start + math.copysign(gone, to - start)


def _trapezoid(t, to, rise, hold, fall, start=0.0, at=0.0):
    if t < 0:
        return start
    x = t - at
    if x < 0 or x >= rise + hold + fall:
        return start
    if x < rise:
        return start + (to - start) * x / rise
    if x < rise + hold:
        return to
    return to + (start - to) * (x - rise - hold) / fall


def _lag(t, to, time_constant, start=0.0, at=0.0):
    return to + (start - to) * math.exp(-max(t - at, 0.0) / time_constant)


def _sine(t, amplitude, frequency=None, period=None, phase=0.0, mean=0.0, at=0.0):
    if t < at or t < 0:
        return mean
    turns = (t - at) * frequency if period is None else (t - at) / period
    return mean + amplitude * math.sin(2 * math.pi * math.fmod(turns, 1.0) + phase)


def _half_sine(t, amplitude, over, at=0.0):
    return amplitude * math.sin(math.pi * (t - at) / over) if 0 <= t - at < over else 0.0


def _table(t, times, values, interpolation="linear"):
    if t < 0 or t < times[0]:
        return values[0]
    row = max(i for i, time in enumerate(times) if time <= t)
    if row == len(times) - 1:
        return values[-1]
    first, last = row, row + 1
    if interpolation == "linear":
        return values[first] + (values[last] - values[first]) * (t - times[first]) / (times[last] - times[first])
    while first > 0 and times[first - 1] < times[first]:
        first -= 1
    while last < len(times) - 1 and times[last + 1] > times[last]:
        last += 1
    return _monotone(times[first : last + 1], values[first : last + 1], row - first, t)


def _monotone(x, y, row, t):
    """Fritsch & Butland, SIAM J. Sci. Stat. Comput. 5 (1984) 300, slopes by the weighted harmonic mean; from memory."""
    n = len(x)
    h = [x[i + 1] - x[i] for i in range(n - 1)]
    d = [(y[i + 1] - y[i]) / h[i] for i in range(n - 1)]
    if n == 2:
        return y[0] + d[0] * (t - x[0])

    def inside(i):
        if d[i - 1] * d[i] <= 0:
            return 0.0
        w1, w2 = 2 * h[i] + h[i - 1], h[i] + 2 * h[i - 1]
        return (w1 + w2) / (w1 / d[i - 1] + w2 / d[i])

    def edge(h0, h1, d0, d1):
        s = ((2 * h0 + h1) * d0 - h0 * d1) / (h0 + h1)
        if s * d0 <= 0:
            return 0.0
        return 3 * d0 if d0 * d1 <= 0 and abs(s) > 3 * abs(d0) else s

    s = [edge(h[0], h[1], d[0], d[1]), *(inside(i) for i in range(1, n - 1)), edge(h[-1], h[-2], d[-1], d[-2])]
    u = (t - x[row]) / h[row]
    return (
        y[row] * (1 + 2 * u) * (1 - u) ** 2
        + y[row + 1] * u**2 * (3 - 2 * u)
        + h[row] * (s[row] * u * (1 - u) ** 2 - s[row + 1] * u**2 * (1 - u))
    )


def _sum(t, parts):
    return math.fsum(plain(part, t) for part in parts)


def _repeat(t, part, every, times=None):
    if t < 0:
        return plain(part, t)
    cycle = math.floor(t / every)
    if times is not None and cycle >= times:
        return plain(part, math.nextafter(every, 0.0))
    return plain(part, t - cycle * every)


_DEFINITIONS = {
    "step": _step,
    "ramp": _ramp,
    "smooth_ramp": _smooth_ramp,
    "s_curve": _s_curve,
    "trapezoid": _trapezoid,
    "lag": _lag,
    "sine": _sine,
    "half_sine": _half_sine,
    "table": _table,
    "sum": _sum,
    "repeat": _repeat,
}
