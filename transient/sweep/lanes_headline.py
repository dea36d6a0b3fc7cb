"""Headline numbers of many cases from the rows of three levels, each with its error.

``best`` is the extrapolation of the two finer levels, ``other`` that of the two coarser ones: their difference, with a
margin, is the error of every number (as in ``trust.refine``).  Between rows everything is a polynomial in the root of
the time since the last break.
"""

from __future__ import annotations

import numpy as np

from transient.compiled import compiled, part
from transient.march.lanes_layout import FIELDS, LOWER_SPEED, MEAN, PUSH

MARGIN = 2.0
REMOVED = 0.98  # an extrapolation takes away at most this share of the finest level's error: where errors of grid and
# step cross, the difference of two extrapolations says nothing
ROUNDING = 1e-12
ZERO = 1e-6  # as in ``result.run``
NOTHING = 1e-11  # as in ``headline.settling``
# facts of each case: what it ends in
LEVEL, CALM_SPEED, FACTS = 0, 1, 2
# numbers read of each quantity: [case, QUANTITY, NUMBER]; DEVIATION is that from the steady end
LOWER, UPPER, MEAN_FLOW, DEVIATION, PRESSURE, QUANTITIES = 0, 1, 2, 3, 4, 5
PEAK, PEAK_ERROR, PEAK_TIME, END, END_ERROR, SETTLE, SETTLE_ERROR, LARGEST, CALMED, NUMBERS = range(10)
# what validity rests on: [case, SEEN]
SPREAD, RELATIVE, TURN_LOWER, TURN_UPPER, SPUN_UP, WORK, POWER, SPEED_LOWER, SPEED_UPPER, SEEN = range(10)
BETWEEN, AT_A_BREAK = 3.0, 10.0  # margins of what lies between rows, and right after a break
STENCIL = 6
POINTS, ROWS_KNOWN = 2 * STENCIL, 2 * STENCIL + 1  # places in ``line`` of the rows used and of those there are


@part
def _doubt(line, s, first):
    """The larger of its last term and the next one at ``s``, or half of the last but one where there is no next: a
    small term may be so by chance.  Near a break (``first``) rows say less."""
    used, known = int(line[POINTS]), int(line[ROWS_KNOWN])
    product = 1.0
    worst = 0.0
    for k in range(min(used + 1, known)):
        term = abs(line[k] * product)
        if k >= 2 and k >= used - 1:
            worst = max(worst, term)
        elif k >= 2 and k == used - 2 and used == known:
            worst = 0.5 * term
        product *= s - line[STENCIL + k]
    return worst * (AT_A_BREAK if first else BETWEEN)


@part
def _through(i, root, value, piece, count, line):
    """The polynomial around interval ``i`` (rows i to i + 1) through up to six rows of its piece, nearest first, in
    Newton's form: coefficients, roots and number of rows in ``line``.  Returns the doubt in the middle.

    As many rows as leave the least doubt in the middle of the interval: what is not smooth in the root of the time, as
    the first signs of a motion at the far wall, takes few.
    """
    low, high = i, i + 1
    best = 2
    line[STENCIL], line[STENCIL + 1] = root[i], root[i + 1]
    line[0], line[1] = value[i], value[i + 1]
    points = 2
    while points < STENCIL:
        down = low > 0 and piece[low - 1] == piece[i] and np.isfinite(value[low - 1])
        up = high + 1 < count and piece[high + 1] == piece[i] and np.isfinite(value[high + 1])
        if not (down or up):
            break
        if down and (not up or i - low <= high - i - 1):
            low -= 1
            row = low
        else:
            high += 1
            row = high
        line[points], line[STENCIL + points] = value[row], root[row]
        points += 1
    for order in range(1, points):
        for k in range(points - 1, order - 1, -1):
            line[k] = (line[k] - line[k - 1]) / (line[STENCIL + k] - line[STENCIL + k - order])
    # the terms in the middle of the interval; as many as leave the least doubt, see ``_doubt``
    middle = 0.5 * (root[i] + root[i + 1])
    product = (middle - root[i]) * (middle - root[i + 1])
    least = np.inf
    before = 0.0
    for k in range(2, points):
        term = abs(line[k] * product)
        if k > 2 and max(before, term) <= least:
            least = max(before, term)
            best = k
        if k == points - 1 and max(0.5 * before, term) <= least:
            best = points
        before = term
        product *= middle - line[STENCIL + k]
    line[POINTS], line[ROWS_KNOWN] = best, points
    return least


@part
def _at(line, s):
    """Its value at root ``s``."""
    last = int(line[POINTS]) - 1
    total = line[last]
    for k in range(last - 1, -1, -1):
        total = line[k] + (s - line[STENCIL + k]) * total
    return total


@part
def _slope(line, s):
    """Its derivative at root ``s``."""
    last = int(line[POINTS]) - 1
    total = line[last]
    slope = 0.0
    for k in range(last - 1, -1, -1):
        slope = total + (s - line[STENCIL + k]) * slope
        total = line[k] + (s - line[STENCIL + k]) * total
    return slope


@part
def _first_of(i, piece):
    """Whether row ``i`` is the first of its piece."""
    return i == 0 or piece[i - 1] != piece[i]


@part
def _summit(sign, i, root, value, piece, count, line, out):
    """Largest ``sign`` x value inside interval ``i`` into out[0], its root into out[1], doubt of the polynomial into
    out[2]; -inf where it has no top inside, with the doubt in the middle."""
    out[0] = -np.inf
    _through(i, root, value, piece, count, line)
    a, b = root[i], root[i + 1]
    left, right = sign * _slope(line, a), sign * _slope(line, b)
    if left <= 0.0 or right >= 0.0:
        out[2] = _doubt(line, 0.5 * (a + b), False)
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
    out[2] = _doubt(line, s, _first_of(i, piece))


@part
def _peak(root, best, other, own, piece, count, skip, line, out, found):
    """Signed value of largest magnitude, its row interval, root and error into ``found`` (5,).

    ``own`` (n,) the rows' errors; ``skip`` marks rows without a finite value.
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
    if size == 0.0:
        return
    rival = sign * other[top]
    doubt = 0.0
    loose = 0.0
    for i in range(max(top - 1, 0), min(top + 2, count - 1)):
        if skip[i] or skip[i + 1] or piece[i] != piece[i + 1]:
            continue
        _summit(sign, i, root, best, piece, count, line, out)
        if i in (top - 1, top):
            loose = max(loose, out[2])
        if out[0] > found[0]:
            found[0], found[1], found[2] = out[0], i, out[1]
            doubt = out[2]
            _summit(sign, i, root, other, piece, count, line, out)
            rival = max(rival, out[0])
    if found[0] == size and 0 < top < count - 1 and piece[top - 1] == piece[top + 1]:
        doubt = loose  # a smooth top that neither neighbouring polynomial has
    # the largest lies between the largest lower and the largest upper bound of the rows
    below = -np.inf
    above = -np.inf
    for i in range(count):
        if not skip[i]:
            below = max(below, abs(best[i]) - own[i])
            above = max(above, abs(best[i]) + own[i])
    off = max(above - found[0], min(found[0] - below, own[top]))
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
        if abs(next_s - s) <= 1e-13 * b or next_s in (a, b):
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
            _through(i - 1, root, value, piece, count, line)
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
    # as it is, or its logarithm, in which a decay is nearly a straight line: whichever leaves less doubt
    for k in range(max(last - STENCIL + 2, 0), min(last + STENCIL, count)):
        work[k] = np.log(sign * value[k]) if sign * value[k] > 0.0 else np.nan
    decays = np.isfinite(work[last + 1])
    if decays:
        plain = _through(last, root, value, piece, count, line) / abs(value[last + 1] - value[last])
        decays = not _through(last, root, work, piece, count, line) / abs(work[last + 1] - work[last]) > plain
    if decays:
        s = _cross(np.log(level), 1.0, root[last], root[last + 1], line)
        share = wide / level
    else:
        _through(last, root, value, piece, count, line)
        s = _cross(level, sign, root[last], root[last + 1], line)
        share = wide
    rise = max(abs(_slope(line, s)) / max(2.0 * s, 1e-300), 1e-300)
    at = start[piece[last]] + s * s
    found[0] = at
    error = (1.2 * share + _doubt(line, s, _first_of(last, piece))) / rise
    # a later return to the band within the errors
    for i in range(last + 1, count):
        if abs(value[i]) + off[i] > level:
            error = max(error, time[i] - at)
    found[1] = max(error, 4e-16 * at)


@part
def _spread(own, count, size, off):
    """Errors of rows, the neighbours' counted too."""
    for i in range(count):
        wide = own[i]
        if i > 0:
            wide = max(wide, own[i - 1])
        if i + 1 < count:
            wide = max(wide, own[i + 1])
        off[i] = wide + ROUNDING * size


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
def _work(best, skip, time, n, calm, reach, out):
    """Work done per volume, magnitudes added up, and the largest power that the steady flow of each instant takes."""
    spent = 0.0
    strongest = 0.0
    last = 0.0
    for i in range(n):
        low, high, push = best[LOWER_SPEED, i], best[LOWER_SPEED + 1, i], best[PUSH, i]
        now = 0.0
        if not (skip[0, i] or skip[1, i]):
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


@part
def _size(which, calm, peak, others, largest, unbounded, free):
    """What settling of a quantity is relative to: its steady value, its own peak where that is zero; nan for never."""
    if free:
        return np.nan
    size = abs(calm)
    if which < MEAN_FLOW and unbounded:
        return size if size > ZERO * others else np.nan
    if not size > ZERO * abs(peak):
        size = abs(peak)
    if which == MEAN_FLOW and size <= NOTHING * largest:
        return 0.0  # no net flow at all: what is left is round-off
    return size


@compiled
def read(
    coarse, between, fine,  # rows of three levels, [C, R, FIELDS] each
    row_piece, row_offset, count, start,  # [C, R] twice, (C,), [C, P]: starts of the pieces
    infinite, facts, free, held,  # [C, P, 2] infinite stress as a piece begins, [C, FACTS], (5,), (2,) see ``_moves``
    calm, final, reach, middle,  # [C, 3, 3] steady values per unit input, [C, 3], [C, 2] see ``_work``, (C,)
    out, seen,  # [C, QUANTITIES, NUMBERS], [C, SEEN]
):  # fmt: skip
    """Headline numbers of all cases in lane units; of a case without rows (``count`` < 0) nan."""
    cases, most = row_piece.shape
    best = np.empty((FIELDS, most))
    other = np.empty((FIELDS, most))
    own = np.empty((FIELDS, most))
    root = np.empty(most)
    time = np.empty(most)
    off = np.empty(most)
    work = np.empty(most)
    away = np.empty(most)
    skip = np.zeros((QUANTITIES, most), np.bool_)
    top = np.zeros(3)
    line = np.zeros(ROWS_KNOWN + 1)
    found = np.zeros(5)
    pair = np.zeros(2)
    steady = np.zeros(QUANTITIES)
    for c in range(cases):
        n = count[c]
        out[c] = np.nan
        if n < 2:
            continue
        piece = row_piece[c]
        for i in range(n):
            root[i] = np.sqrt(row_offset[c, i])
            time[i] = start[c, piece[i]] + row_offset[c, i]
            for f in range(FIELDS):
                a, b, d = coarse[c, i, f], between[c, i, f], fine[c, i, f]
                best[f, i] = d + (d - b) / 3.0
                other[f, i] = b + (b - a) / 3.0
                own[f, i] = max(MARGIN * abs(best[f, i] - other[f, i]), (1.0 - REMOVED) * abs(best[f, i] - d))
            for side in range(2):
                skip[side, i] = row_offset[c, i] == 0.0 and infinite[c, piece[i], side]
        for k in range(3):
            steady[k] = calm[c, k, 0] * final[c, 0] + calm[c, k, 1] * final[c, 1] + calm[c, k, 2] * final[c, 2]
        _moves(best, n, held, middle[c], found)
        for k in range(5):
            seen[c, k] = found[k]
        _work(best, skip, time, n, calm[c], reach[c], pair)
        seen[c, WORK], seen[c, POWER] = pair[0], pair[1]
        seen[c, SPEED_LOWER], seen[c, SPEED_UPPER] = best[LOWER_SPEED, n - 1], best[LOWER_SPEED + 1, n - 1]
        others = max(abs(steady[0]), abs(steady[1]))
        largest = 0.0
        for k in range(QUANTITIES):
            which = DEVIATION if k == 0 else k - 1 if k < PRESSURE else k  # the deviation first
            value, rival, numbers = best[which], other[which], out[c, which]
            _peak(root, value, rival, own[which], piece, n, skip[which], line, top, found)
            peak, error = found[0], found[3]
            if which == DEVIATION:
                largest = abs(peak)
            unbounded = False
            for i in range(n):
                unbounded = unbounded or skip[which, i]
            _spread(own[which], n, max(abs(peak), largest if which == MEAN_FLOW else 0.0), off)
            numbers[LARGEST] = abs(peak)
            numbers[CALMED] = 1.0 if abs(steady[which]) > ZERO * abs(peak) else 0.0
            numbers[END], numbers[END_ERROR] = value[n - 1], off[n - 1]
            if not unbounded:
                numbers[PEAK], numbers[PEAK_ERROR] = peak, error
                summit = start[c, piece[int(found[1])]] + found[2] ** 2
                sign = -1.0 if peak < 0.0 else 1.0
                first = np.nan
                if which < MEAN_FLOW:
                    first = _first_at(abs(peak) - error, sign, root, value, time, start[c], piece, n, skip[which], line)
                numbers[PEAK_TIME] = 0.0 if peak == 0.0 else min(first, summit) if first == first else summit
            if which == PRESSURE:
                continue
            calm_value = facts[c, CALM_SPEED] if which == DEVIATION else steady[which]
            size = _size(which, calm_value, peak, others, largest, unbounded, free[which])
            for i in range(n):
                away[i] = value[i] if which == DEVIATION else value[i] - steady[which]
                if skip[which, i]:
                    away[i] = np.inf
            if size > 0.0:
                _settled(facts[c, LEVEL] * size, root, away, off, time, start[c], piece, n, work, line, pair)
                numbers[SETTLE], numbers[SETTLE_ERROR] = pair[0], pair[1]
            elif size == 0.0:
                numbers[SETTLE], numbers[SETTLE_ERROR] = 0.0, 0.0
