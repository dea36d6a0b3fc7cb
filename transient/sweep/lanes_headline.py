"""Headline numbers of many cases from the rows of three levels, each with its error.

``best`` is the extrapolation of the two finer levels, ``other`` that of the two coarser ones: their difference, with a
margin, is the error of every number (as in ``trust.refine``).  Between rows everything is a polynomial in the root of
the time since the last break.
"""

from __future__ import annotations

import numpy as np

from transient.compiled import compiled, part
from transient.march.lanes import AWAY, FIELDS, LOWER_SPEED, MEAN, PUSH

MARGIN = 2.0
ROUNDING = 1e-12
ZERO = 1e-6  # as in ``result.run``
NEVER = np.nan
# facts of each case: sizes of what it ends in
LEVEL, CALM_LOWER, CALM_UPPER, CALM_MEAN, CALM_SPEED, FACTS = 0, 1, 2, 3, 4, 5
# numbers read: [case, NUMBER]
(SETTLE, SETTLE_ERROR, SETTLE_MEAN, SETTLE_MEAN_ERROR, MEAN_PEAK, MEAN_PEAK_ERROR, MEAN_END, MEAN_END_ERROR,
 PUSH_PEAK, PUSH_END, FASTEST, WALL) = range(12)  # fmt: skip
(PEAK, PEAK_ERROR, PEAK_TIME, END, END_ERROR, SETTLE_WALL, SETTLE_WALL_ERROR, LARGEST, CALMED, SPEED_END,
 WALL_FIELDS) = range(11)  # fmt: skip
NUMBERS = WALL + 2 * WALL_FIELDS
STENCIL = 4


@part
def _window(i, piece, bad, count):
    """First of up to four rows around interval ``i`` (from row i to i + 1) in its piece, and how many there are."""
    own = piece[i]
    low = i
    while low > 0 and piece[low - 1] == own and i - low < 1 and not (bad and low - 1 == 0):
        low -= 1
    high = i + 1
    while high + 1 < count and piece[high + 1] == own and high - low < STENCIL - 1:
        high += 1
    while low > 0 and piece[low - 1] == own and high - low < STENCIL - 1:
        low -= 1
    return low, high - low + 1


@part
def _value(root, value, low, points, s):
    """Polynomial through ``points`` rows from ``low`` at root ``s`` (Neville)."""
    t0, t1, t2, t3 = value[low], 0.0, 0.0, 0.0
    if points > 1:
        t1 = value[low + 1]
    if points > 2:
        t2 = value[low + 2]
    if points > 3:
        t3 = value[low + 3]
    if points > 1:
        x0, x1 = root[low], root[low + 1]
        t0 = ((s - x0) * t1 - (s - x1) * t0) / (x1 - x0)
    if points > 2:
        x2 = root[low + 2]
        t1 = ((s - x1) * t2 - (s - x2) * t1) / (x2 - x1)
        t0 = ((s - x0) * t1 - (s - x2) * t0) / (x2 - x0)
    if points > 3:
        x3 = root[low + 3]
        t2 = ((s - x2) * t3 - (s - x3) * t2) / (x3 - x2)
        t1 = ((s - x1) * t2 - (s - x3) * t1) / (x3 - x1)
        t0 = ((s - x0) * t1 - (s - x3) * t0) / (x3 - x0)
    return t0


@part
def _summit(sign, i, root, value, piece, count, out):
    """Largest ``sign`` x value in interval ``i`` into out[0], its root into out[1], doubt of the polynomial out[2]."""
    low, points = _window(i, piece, False, count)
    begin, end = root[i], root[i + 1]
    out[0] = -np.inf
    for k in range(9):
        s = begin + (end - begin) * k / 8.0
        v = sign * _value(root, value, low, points, s)
        if v > out[0]:
            out[0], out[1] = v, s
    step = (end - begin) / 8.0
    for _ in range(3):
        if out[1] - step >= begin and out[1] + step <= end:
            left = sign * _value(root, value, low, points, out[1] - step)
            right = sign * _value(root, value, low, points, out[1] + step)
            bend = left - 2.0 * out[0] + right
            if bend < 0.0:
                s = out[1] + 0.5 * step * (left - right) / bend
                v = sign * _value(root, value, low, points, s)
                if v > out[0]:
                    out[0], out[1] = v, s
        step *= 0.25
    out[2] = 0.0
    if points > 2:
        fewer = sign * _value(root, value, low, points - 1, out[1])
        out[2] = abs(fewer - out[0]) * 0.5


@part
def _peak(root, best, other, piece, count, skip, out, found):
    """Signed value of largest magnitude, its row interval, root and error into ``found`` (5,).

    ``skip`` marks rows without a finite value.
    """
    top = -1
    size = -1.0
    for i in range(count):
        if not skip[i] and abs(best[i]) > size:
            size = abs(best[i])
            top = i
    sign = -1.0 if top >= 0 and best[top] < 0.0 else 1.0
    found[0], found[1], found[2], found[3] = 0.0, 0.0, 0.0, 0.0
    if top < 0:
        found[0] = np.nan
        return
    found[0], found[1], found[2] = size, top, root[top]
    rival = sign * other[top]
    doubt = 0.0
    for i in range(max(top - 2, 0), min(top + 2, count - 1)):
        if skip[i] or skip[i + 1] or piece[i] != piece[i + 1]:
            continue
        _summit(sign, i, root, best, piece, count, out)
        if out[0] > found[0]:
            found[0], found[1], found[2] = out[0], i, out[1]
            doubt = out[2]
            _summit(sign, i, root, other, piece, count, out)
            rival = max(rival, out[0])
    # the largest lies between the largest lower and the largest upper bound of the rows
    below = -np.inf
    above = -np.inf
    for i in range(count):
        if not skip[i]:
            off = MARGIN * abs(best[i] - other[i])
            below = max(below, abs(best[i]) - off)
            above = max(above, abs(best[i]) + off)
    off = max(above - found[0], min(found[0] - below, MARGIN * abs(best[top] - other[top])))
    found[3] = max(MARGIN * abs(found[0] - rival), off) + doubt + ROUNDING * found[0]
    found[0] *= sign


@part
def _cross(level, sign, i, root, value, piece, count):
    """Root in interval ``i`` at which ``sign`` x value passes ``level``, by bisection."""
    low, points = _window(i, piece, False, count)
    a, b = root[i], root[i + 1]
    starts_above = sign * value[i] > level
    for _ in range(50):
        s = 0.5 * (a + b)
        if s in (a, b):
            break
        above = sign * _value(root, value, low, points, s) > level
        if above == starts_above:
            a = s
        else:
            b = s
    return b


@part
def _first_at(level, sign, root, value, time, start, piece, count, skip):
    """Earliest time at which sign x value >= level."""
    for i in range(count):
        if skip[i]:
            continue
        if sign * value[i] >= level:
            if i == 0 or skip[i - 1] or piece[i - 1] != piece[i]:
                return time[i]
            s = _cross(level, sign, i - 1, root, value, piece, count)
            return start[piece[i]] + s * s
    return np.nan


@part
def _settled(level, root, value, off, time, start, piece, count, work, found):
    """Time after which |value| stays within ``level`` and its error, into ``found`` (2,); nan if not by the end.

    ``off`` (n,) the rows' errors.
    """
    found[0] = 0.0
    found[1] = 0.0
    last = -1
    for i in range(count - 1, -1, -1):
        if not abs(value[i]) <= level:
            last = i
            break
    if last == count - 1:
        found[0] = np.nan
        return
    if last < 0:
        # never outside: so does the largest of the errors say
        for i in range(count):
            if abs(value[i]) + off[i] > level:
                found[1] = max(found[1], time[i])
        return
    if piece[last] != piece[last + 1] or not np.isfinite(value[last]):
        found[0] = time[last + 1]
        return
    sign = -1.0 if value[last] < 0.0 else 1.0
    wide = max(off[last], off[last + 1])
    # logarithms where the deviation decays within one sign: then nearly a straight line
    low, points = _window(last, piece, False, count)
    plain = True
    for k in range(low, low + points):
        plain = plain and sign * value[k] > 0.1 * level
    for k in range(low, low + points):
        work[k] = np.log(sign * value[k]) if plain else sign * value[k]
    target = np.log(level) if plain else level
    s = _cross(target, 1.0, last, root, work, piece, count)
    at = start[piece[last]] + s * s
    found[0] = at
    # what one row fewer says
    doubt = 0.0
    if points > 3:
        first = low if low + points - 1 > last + 1 else low + 1
        slope = (work[last + 1] - work[last]) / (root[last + 1] - root[last])
        fewer = _value(root, work, first, points - 1, s)
        doubt = abs(fewer - target) / max(abs(slope), 1e-300) * 2.0 * s
    # slope of the deviation in time at the passage, from the polynomial itself
    step = 1e-3 * (root[last + 1] - root[last])
    rise = (_value(root, work, low, points, s + step) - _value(root, work, low, points, s - step)) / (2.0 * step)
    rise = abs(rise) / max(2.0 * s, 1e-300)
    share = wide / level if plain else wide
    error = 1.2 * share / max(rise, 1e-300) + doubt
    # a later return to the band within the errors
    for i in range(last + 1, count):
        if abs(value[i]) + off[i] > level:
            error = max(error, time[i] - at)
    found[1] = max(error, 4e-16 * at)


@part
def _spread(best, other, count, size, off):
    """Errors of rows: difference with margin, the neighbours' counted too."""
    for i in range(count):
        wide = abs(best[i] - other[i])
        if i > 0:
            wide = max(wide, abs(best[i - 1] - other[i - 1]))
        if i + 1 < count:
            wide = max(wide, abs(best[i + 1] - other[i + 1]))
        off[i] = MARGIN * wide + ROUNDING * size


@compiled
def read(
    coarse, middle, fine,  # rows of three levels, [C, R, FIELDS] each
    row_piece, row_offset, count, start,  # [C, R] twice, (C,), [C, P]: starts of the pieces
    infinite, facts, shear_free,  # [C, P, 2] whether a wall's stress is infinite at a piece's start, [C, FACTS], (2,)
    out,  # [C, NUMBERS]
):  # fmt: skip
    """Headline numbers of all cases in lane units; of a case without rows (``count`` < 0) nan."""
    cases, most = row_piece.shape
    best = np.empty((FIELDS, most))
    other = np.empty((FIELDS, most))
    root = np.empty(most)
    time = np.empty(most)
    off = np.empty(most)
    work = np.empty(most)
    away = np.empty(most)
    skip = np.zeros(most, np.bool_)
    clear = np.zeros(most, np.bool_)
    three = np.zeros(3)
    found = np.zeros(5)
    pair = np.zeros(2)
    for c in range(cases):
        n = count[c]
        if n < 2:
            out[c] = np.nan
            continue
        piece = row_piece[c]
        for i in range(n):
            root[i] = np.sqrt(row_offset[c, i])
            time[i] = start[c, piece[i]] + row_offset[c, i]
            for f in range(FIELDS):
                a, b, d = coarse[c, i, f], middle[c, i, f], fine[c, i, f]
                best[f, i] = d + (d - b) / 3.0
                other[f, i] = b + (b - a) / 3.0
        level = facts[c, LEVEL]
        # velocity
        largest = 0.0
        for i in range(n):
            largest = max(largest, best[AWAY, i])
        size = facts[c, CALM_SPEED]
        if not size > ZERO * largest:
            size = largest
        _spread(best[AWAY], other[AWAY], n, largest, off)
        if size > 0.0:
            _settled(level * size, root, best[AWAY], off, time, start[c], piece, n, work, pair)
            out[c, SETTLE], out[c, SETTLE_ERROR] = pair[0], pair[1]
        else:
            out[c, SETTLE], out[c, SETTLE_ERROR] = 0.0, 0.0
        out[c, FASTEST] = max(largest, facts[c, CALM_SPEED])
        # mean
        _peak(root, best[MEAN], other[MEAN], piece, n, clear, three, found)
        out[c, MEAN_PEAK], out[c, MEAN_PEAK_ERROR] = found[0], found[3]
        _spread(best[MEAN], other[MEAN], n, abs(found[0]), off)
        out[c, MEAN_END], out[c, MEAN_END_ERROR] = best[MEAN, n - 1], off[n - 1]
        size = abs(facts[c, CALM_MEAN])
        if not size > ZERO * abs(found[0]):
            size = abs(found[0])
        if size > 1e-11 * largest:
            for i in range(n):
                away[i] = best[MEAN, i] - facts[c, CALM_MEAN]
            _settled(level * size, root, away, off, time, start[c], piece, n, work, pair)
            out[c, SETTLE_MEAN], out[c, SETTLE_MEAN_ERROR] = pair[0], pair[1]
        else:
            out[c, SETTLE_MEAN], out[c, SETTLE_MEAN_ERROR] = 0.0, 0.0
        # pressure
        _peak(root, best[PUSH], best[PUSH], piece, n, clear, three, found)
        out[c, PUSH_PEAK], out[c, PUSH_END] = found[0], best[PUSH, n - 1]
        # walls
        others = max(abs(facts[c, CALM_LOWER]), abs(facts[c, CALM_UPPER]))
        for side in range(2):
            to = WALL + side * WALL_FIELDS
            unbounded = False
            for i in range(n):
                skip[i] = row_offset[c, i] == 0.0 and infinite[c, piece[i], side]
                unbounded = unbounded or skip[i]
            value = best[side]
            _peak(root, value, other[side], piece, n, skip, three, found)
            peak, error = found[0], found[3]
            _spread(value, other[side], n, abs(peak), off)
            out[c, to + LARGEST] = abs(peak)
            out[c, to + CALMED] = 1.0 if abs(facts[c, CALM_LOWER + side]) > ZERO * abs(peak) else 0.0
            out[c, to + SPEED_END] = best[LOWER_SPEED + side, n - 1]
            out[c, to + END], out[c, to + END_ERROR] = value[n - 1], off[n - 1]
            out[c, to + PEAK], out[c, to + PEAK_ERROR], out[c, to + PEAK_TIME] = np.nan, np.nan, np.nan
            if not unbounded:
                sign = -1.0 if peak < 0.0 else 1.0
                out[c, to + PEAK], out[c, to + PEAK_ERROR] = peak, error
                summit = start[c, piece[int(found[1])]] + found[2] ** 2
                first = _first_at(abs(peak) - error, sign, root, value, time, start[c], piece, n, skip)
                out[c, to + PEAK_TIME] = 0.0 if peak == 0.0 else min(first, summit) if first == first else summit
            calm = facts[c, CALM_LOWER + side]
            size = abs(calm)
            compared = others if unbounded else abs(peak)
            out[c, to + SETTLE_WALL], out[c, to + SETTLE_WALL_ERROR] = np.nan, np.nan
            if not size > ZERO * compared:
                if unbounded:
                    continue
                size = abs(peak)
            if shear_free[side]:
                continue
            if size == 0.0:
                out[c, to + SETTLE_WALL], out[c, to + SETTLE_WALL_ERROR] = 0.0, 0.0
                continue
            for i in range(n):
                away[i] = value[i] - calm
                if skip[i]:
                    away[i] = np.inf
            _settled(level * size, root, away, off, time, start[c], piece, n, work, pair)
            out[c, to + SETTLE_WALL], out[c, to + SETTLE_WALL_ERROR] = pair[0], pair[1]
