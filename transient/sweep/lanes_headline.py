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
 PUSH_PEAK, PUSH_END, FASTEST, SPREAD, RELATIVE, TURN_LOWER, TURN_UPPER, SPUN_UP,
 WORK, POWER, WALL) = range(19)  # fmt: skip
(PEAK, PEAK_ERROR, PEAK_TIME, END, END_ERROR, SETTLE_WALL, SETTLE_WALL_ERROR, LARGEST, CALMED, SPEED_END,
 WALL_FIELDS) = range(11)  # fmt: skip
NUMBERS = WALL + 2 * WALL_FIELDS
STENCIL = 4


@part
def _window(i, piece, count):
    """First of up to four rows around interval ``i`` (from row i to i + 1) in its piece, and how many there are."""
    own = piece[i]
    low = i
    if low > 0 and piece[low - 1] == own:
        low -= 1
    high = i + 1
    while high + 1 < count and piece[high + 1] == own and high - low < STENCIL - 1:
        high += 1
    while low > 0 and piece[low - 1] == own and high - low < STENCIL - 1:
        low -= 1
    return low, high - low + 1


@part
def _through(root, value, low, points, line):
    """The polynomial through ``points`` (two to four) rows from ``low``: Newton's form into ``line`` (7,), that is
    its four coefficients and the three roots about which it is written."""
    x0, x1 = root[low], root[low + 1]
    d0, d1 = value[low], value[low + 1]
    line[0] = d0
    line[4], line[5], line[6] = x0, x1, x1
    d01 = (d1 - d0) / (x1 - x0)
    line[1], line[2], line[3] = d01, 0.0, 0.0
    if points > 2:
        x2 = root[low + 2]
        d12 = (value[low + 2] - d1) / (x2 - x1)
        d012 = (d12 - d01) / (x2 - x0)
        line[2], line[6] = d012, x2
        if points > 3:
            x3 = root[low + 3]
            d23 = (value[low + 3] - value[low + 2]) / (x3 - x2)
            line[3] = ((d23 - d12) / (x3 - x1) - d012) / (x3 - x0)


@part
def _at(line, s):
    """Its value at root ``s``."""
    return line[0] + (s - line[4]) * (line[1] + (s - line[5]) * (line[2] + (s - line[6]) * line[3]))


@part
def _slope(line, s):
    """Its derivative at root ``s``."""
    a, b, c = s - line[4], s - line[5], s - line[6]
    return line[1] + (a + b) * line[2] + (a * b + a * c + b * c) * line[3]


@part
def _summit(sign, i, root, value, piece, count, line, out):
    """Largest ``sign`` x value inside interval ``i`` into out[0], its root into out[1], doubt of the polynomial into
    out[2]; -inf where it has no top inside."""
    out[0] = -np.inf
    low, points = _window(i, piece, count)
    _through(root, value, low, points, line)
    a, b = root[i], root[i + 1]
    left, right = sign * _slope(line, a), sign * _slope(line, b)
    if left <= 0.0 or right >= 0.0:
        return
    for _ in range(20):
        s = 0.5 * (a + b)
        slope = sign * _slope(line, s)
        if slope > 0.0:
            a = s
        else:
            b = s
    s = 0.5 * (a + b)
    out[0], out[1] = sign * _at(line, s), s
    out[2] = abs((s - line[4]) * (s - line[5]) * (s - line[6]) * line[3])


@part
def _peak(root, best, other, piece, count, skip, line, out, found):
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
        _summit(sign, i, root, best, piece, count, line, out)
        if out[0] > found[0]:
            found[0], found[1], found[2] = out[0], i, out[1]
            doubt = out[2]
            _summit(sign, i, root, other, piece, count, line, out)
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
def _cross(level, sign, a, b, line):
    """Root between ``a`` and ``b`` at which ``sign`` x the polynomial passes ``level``: Newton's steps, kept between
    the ends by bisection."""
    above = sign * _at(line, a) > level
    s = 0.5 * (a + b)
    for _ in range(60):
        off = sign * _at(line, s) - level
        if (off > 0.0) == above:
            a = s
        else:
            b = s
        slope = sign * _slope(line, s)
        next_s = s - off / slope if slope != 0.0 else a
        if not (next_s > a and next_s < b):
            next_s = 0.5 * (a + b)
        if abs(next_s - s) <= 1e-15 * b or next_s in (a, b):
            return next_s
        s = next_s
    return s


@part
def _first_at(level, sign, root, value, time, start, piece, count, skip, line):
    """Earliest time at which sign x value >= level."""
    for i in range(count):
        if skip[i]:
            continue
        if sign * value[i] >= level:
            if i == 0 or skip[i - 1] or piece[i - 1] != piece[i]:
                return time[i]
            low, points = _window(i - 1, piece, count)
            _through(root, value, low, points, line)
            s = _cross(level, sign, root[i - 1], root[i], line)
            return start[piece[i]] + s * s
    return np.nan


@part
def _settled(level, root, value, off, time, start, piece, count, work, line, found):
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
    low, points = _window(last, piece, count)
    plain = True
    for k in range(low, low + points):
        plain = plain and sign * value[k] > 0.1 * level
    for k in range(low, low + points):
        work[k] = np.log(sign * value[k]) if plain else sign * value[k]
    target = np.log(level) if plain else level
    _through(root, work, low, points, line)
    s = _cross(target, 1.0, root[last], root[last + 1], line)
    at = start[piece[last]] + s * s
    found[0] = at
    rise = abs(_slope(line, s)) / max(2.0 * s, 1e-300)
    # what the polynomial of one row fewer would say
    doubt = abs((s - line[4]) * (s - line[5]) * (s - line[6]) * line[3]) / max(rise, 1e-300)
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


@part
def _moves(best, n, held, middle, out):
    """What the walls and the flow reach: see ``out``.  ``held``: 1 a wall that holds the fluid, 0 free, -1 an axis.

    ``out`` (5,): largest difference of speeds across the gap, mean flow included unless pressed; largest mean against
    the walls' mean speed; each wall's largest speed; 1 where the inner wall rests and the outer one only gains speed.
    """
    spread = 0.0
    relative = 0.0
    pressed = False
    for i in range(n):
        pressed = pressed or best[PUSH, i] != 0.0
    out[2], out[3], out[4] = 0.0, 0.0, 1.0
    for i in range(n):
        low, high = np.inf, -np.inf
        total = 0.0
        walls = 0
        for side in range(2):
            if held[side] >= 0:
                low = min(low, best[LOWER_SPEED + side, i])
                high = max(high, best[LOWER_SPEED + side, i])
            if held[side] == 1:
                total += best[LOWER_SPEED + side, i]
                walls += 1
            out[2 + side] = max(out[2 + side], abs(best[LOWER_SPEED + side, i]))
        before = best[LOWER_SPEED + 1, i - 1] if i > 0 else 0.0
        after = best[LOWER_SPEED + 1, i]
        if best[LOWER_SPEED, i] != 0.0 or after * before < 0.0 or abs(after) < (1.0 - 1e-9) * abs(before):
            out[4] = 0.0
        if not pressed:
            low = min(low, best[MEAN, i] / middle)
            high = max(high, best[MEAN, i] / middle)
        spread = max(spread, high - low)
        relative = max(relative, abs(best[MEAN, i] - total / max(walls, 1)))
    out[0], out[1] = spread, relative


@part
def _power(lower, upper, low, high, reach, push, mean):
    """Work done on the liquid by walls and pressure, per volume and time."""
    return -(lower * low * reach[0] + upper * high * reach[1]) + push * mean


@part
def _work(best, skip_low, skip_high, time, n, calm, reach, out):
    """Work done per volume, magnitudes added up, and the largest power that the steady flow of each instant takes."""
    spent = 0.0
    strongest = 0.0
    last = 0.0
    for i in range(n):
        low, high, push = best[LOWER_SPEED, i], best[LOWER_SPEED + 1, i], best[PUSH, i]
        now = 0.0
        if not (skip_low[i] or skip_high[i]):
            now = abs(_power(best[0, i], best[1, i], low, high, reach, push, best[MEAN, i]))
        if i > 0:
            spent += 0.5 * (time[i] - time[i - 1]) * (now + last)
        last = now
        a = calm[0, 0] * low + calm[0, 1] * high + calm[0, 2] * push
        b = calm[1, 0] * low + calm[1, 1] * high + calm[1, 2] * push
        m = calm[2, 0] * low + calm[2, 1] * high + calm[2, 2] * push
        strongest = max(strongest, abs(_power(a, b, low, high, reach, push, m)))
    out[0] = spent
    out[1] = max(strongest, spent / time[n - 1]) if time[n - 1] > 0.0 else strongest


@compiled
def read(
    coarse, middle, fine,  # rows of three levels, [C, R, FIELDS] each
    row_piece, row_offset, count, start,  # [C, R] twice, (C,), [C, P]: starts of the pieces
    infinite, facts, shear_free, held,  # [C, P, 2] infinite stress as a piece begins, [C, FACTS], (2,), see ``_moves``
    calm, reach, centre,  # [C, 3, 3] steady stresses and mean per unit input, [C, 2] see ``_work``, (C,)
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
    line = np.zeros(7)
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
            _settled(level * size, root, best[AWAY], off, time, start[c], piece, n, work, line, pair)
            out[c, SETTLE], out[c, SETTLE_ERROR] = pair[0], pair[1]
        else:
            out[c, SETTLE], out[c, SETTLE_ERROR] = 0.0, 0.0
        out[c, FASTEST] = max(largest, facts[c, CALM_SPEED])
        # mean
        _peak(root, best[MEAN], other[MEAN], piece, n, clear, line, three, found)
        out[c, MEAN_PEAK], out[c, MEAN_PEAK_ERROR] = found[0], found[3]
        _spread(best[MEAN], other[MEAN], n, abs(found[0]), off)
        out[c, MEAN_END], out[c, MEAN_END_ERROR] = best[MEAN, n - 1], off[n - 1]
        size = abs(facts[c, CALM_MEAN])
        if not size > ZERO * abs(found[0]):
            size = abs(found[0])
        if size > 1e-11 * largest:
            for i in range(n):
                away[i] = best[MEAN, i] - facts[c, CALM_MEAN]
            _settled(level * size, root, away, off, time, start[c], piece, n, work, line, pair)
            out[c, SETTLE_MEAN], out[c, SETTLE_MEAN_ERROR] = pair[0], pair[1]
        else:
            out[c, SETTLE_MEAN], out[c, SETTLE_MEAN_ERROR] = 0.0, 0.0
        # pressure
        _peak(root, best[PUSH], best[PUSH], piece, n, clear, line, three, found)
        out[c, PUSH_PEAK], out[c, PUSH_END] = found[0], best[PUSH, n - 1]
        # what validity rests on
        _moves(best, n, held, centre[c], found)
        out[c, SPREAD : SPUN_UP + 1] = found[:5]
        for i in range(n):
            skip[i] = row_offset[c, i] == 0.0 and infinite[c, piece[i], 0]
            clear[i] = row_offset[c, i] == 0.0 and infinite[c, piece[i], 1]
        _work(best, skip, clear, time, n, calm[c], reach[c], pair)
        out[c, WORK], out[c, POWER] = pair[0], pair[1]
        clear[:] = False
        # walls
        others = max(abs(facts[c, CALM_LOWER]), abs(facts[c, CALM_UPPER]))
        for side in range(2):
            to = WALL + side * WALL_FIELDS
            unbounded = False
            for i in range(n):
                skip[i] = row_offset[c, i] == 0.0 and infinite[c, piece[i], side]
                unbounded = unbounded or skip[i]
            value = best[side]
            _peak(root, value, other[side], piece, n, skip, line, three, found)
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
                first = _first_at(abs(peak) - error, sign, root, value, time, start[c], piece, n, skip, line)
                out[c, to + PEAK_TIME] = 0.0 if peak == 0.0 else min(first, summit) if first == first else summit
            settled = facts[c, CALM_LOWER + side]
            size = abs(settled)
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
                away[i] = value[i] - settled
                if skip[i]:
                    away[i] = np.inf
            _settled(level * size, root, away, off, time, start[c], piece, n, work, line, pair)
            out[c, to + SETTLE_WALL], out[c, to + SETTLE_WALL_ERROR] = pair[0], pair[1]
