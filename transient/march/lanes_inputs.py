"""The inputs of many cases in the units of the lanes, and how finely each piece of them is marched.

A row's three drives (lower wall, upper wall, pressure drop per length) are joined on common pieces: times become shares
of the diffusion time, the pressure drop per length what it would make of the velocity.
"""

from __future__ import annotations

import numpy as np

from transient.compiled import compiled, part

# At accuracy 1e-3, and in proportion to its fourth root (the error left by two extrapolated levels is of fourth order).
# From trials over ramps of 1e-4 to 1 diffusion times.
FIRST = 0.05  # first row of a piece as a share of the shortest time beside its break
GROWTH = 0.5  # longest row as a share of the time since the break
FOLLOW = 0.45  # longest row while the flow settles, as a share of its slowest time constant
COURSE = 0.35  # longest row over the time constant of a wave or lag
BENT = 12.0  # least rows of a curved piece
SUDDEN = 1e-3  # share of the time after a jump from which on the flow is followed closely
NOTHING = 1e-11  # changes at a break below this share of the drive's size are round-off
SAME = 1e-12  # times closer than this are one (as in ``drive.times``)
# what is known of each piece: [case, piece, FIELD]
LENGTH, START, FIRST_ROW, COURSE_ROW, COURSE_UNTIL, PIECE_FIELDS = 0, 1, 2, 3, 4, 5


@part
def _owner(starts, at, slack):
    """Piece of a drive that holds at time ``at``."""
    found = 0
    for p in range(1, starts.shape[0]):
        if starts[p] <= at + slack:
            found = p
    return found


@part
def _move_wave(wave, x, out):
    """``wave`` (4,) real and imaginary coefficient and rate, from its own start to ``x`` after it."""
    size = np.exp(wave[2] * x)
    across, up = size * np.cos(wave[3] * x), size * np.sin(wave[3] * x)
    out[0] = wave[0] * across - wave[1] * up
    out[1] = wave[0] * up + wave[1] * across
    out[2] = wave[2]
    out[3] = wave[3]


@part
def _at_end(poly, wave, x, out):
    """Value, first and second derivative at offset ``x`` into ``out`` (3,), and the size of the terms into out[3:]."""
    out[0] = poly[0] + x * (poly[1] + x * (poly[2] + x * poly[3]))
    out[1] = poly[1] + x * (2.0 * poly[2] + x * 3.0 * poly[3])
    out[2] = 2.0 * poly[2] + 6.0 * poly[3] * x
    out[3] = abs(poly[0]) + abs(poly[1] * x) + abs(poly[2] * x * x) + abs(poly[3] * x**3)
    if wave[0] != 0.0 or wave[1] != 0.0:
        size = np.exp(wave[2] * x)
        real = size * (wave[0] * np.cos(wave[3] * x) - wave[1] * np.sin(wave[3] * x))
        other = size * (wave[0] * np.sin(wave[3] * x) + wave[1] * np.cos(wave[3] * x))
        out[3] += np.hypot(wave[0], wave[1])
        for order in range(3):
            out[order] += real
            real, other = real * wave[2] - other * wave[3], real * wave[3] + other * wave[2]


@part
def _place(starts, poly, wave, row, which, at, slack, time, push, out_poly, out_wave):
    """One drive from ``at`` on, its cubic and wave about that time, in lane units."""
    own = row if starts.shape[0] > 1 else 0
    p = _owner(starts[own], at, slack)
    x = at - starts[own, p]
    if abs(x) <= slack:
        x = 0.0
    c0, c1, c2, c3 = poly[own, p, 0], poly[own, p, 1], poly[own, p, 2], poly[own, p, 3]
    scale = push if which == 2 else 1.0
    out_poly[which, 0] = scale * (c0 + x * (c1 + x * (c2 + x * c3)))
    out_poly[which, 1] = scale * time * (c1 + x * (2.0 * c2 + x * 3.0 * c3))
    out_poly[which, 2] = scale * time * time * (c2 + x * 3.0 * c3)
    out_poly[which, 3] = scale * time**3 * c3
    _move_wave(wave[own, p], x, out_wave[which])
    out_wave[which, 0] *= scale
    out_wave[which, 1] *= scale
    out_wave[which, 2] *= time
    out_wave[which, 3] *= time


@part
def _collect(starts, row, until, times, count):
    own = row if starts.shape[0] > 1 else 0
    for p in range(starts.shape[1]):
        if starts[own, p] < until and starts[own, p] > 0.0:
            times[count] = starts[own, p]
            count += 1
    return count


@part
def _finest(c, pieces, part_of, poly, wave, jump, bend, fine, layer):
    """First rows and courses of all pieces of case ``c``, and each wall's finest layer as a share of the gap."""
    layer[c, 0] = 1.0
    layer[c, 1] = 1.0
    last_length = 1e300
    for p in range(pieces):
        length = part_of[c, p, LENGTH]
        beside = min(length, min(last_length, 0.5))
        last_length = length
        first = 1e300
        course = 1e300
        until = 0.0
        for which in range(3):
            sudden = jump[c, p, which] != 0.0
            begins = sudden or bend[c, p, which] != 0.0
            time = 1e300
            if begins:
                time = min(length, 1.0)
                first = min(first, FIRST * beside)
            if sudden and which < 2:
                time = SUDDEN * min(length, 1.0)
                first = min(first, 0.2 * time)
            w = wave[c, p, which]
            if w[0] != 0.0 or w[1] != 0.0:
                rate = np.hypot(w[2], w[3])
                time = min(time, 1.0 / rate)
                first = min(first, FIRST / rate)
                course = min(course, COURSE / rate)
                until = max(until, -12.0 / w[2] if w[2] < 0.0 else 1e300)
            if poly[c, p, which, 2] != 0.0 or poly[c, p, which, 3] != 0.0:
                course = min(course, length / BENT)
                until = 1e300
            for side in range(2):
                if which == 2 or side == which:
                    layer[c, side] = min(layer[c, side], 0.5 * np.sqrt(time) * fine)
        if first > 1e299:
            first = FIRST * beside
        part_of[c, p, FIRST_ROW] = fine * first
        part_of[c, p, COURSE_ROW] = fine * course
        part_of[c, p, COURSE_UNTIL] = until


@compiled
def join(
    starts_low, poly_low, wave_low, starts_high, poly_high, wave_high, starts_push, poly_push, wave_push,
    before, until, time, push, fine,  # [C, 3] in SI, (C,) s, (C,) s, (C,) m/s per Pa/m, (C,)
    pieces, part_of, poly, wave, jump, layer,  # out: (C,), [C, P, PIECE_FIELDS], [C, P, 3, 4] twice, [C, P, 3], [C, 2]
):  # fmt: skip
    """Join the three drives of every row ([C or 1, P], [.., P, 4], [.., P, 4] each); ``before`` is scaled in place."""
    cases, most = part_of.shape[0], part_of.shape[1]
    times = np.empty(most + 3)
    ends = np.zeros(4)
    bends = np.zeros((cases, most, 3))
    for c in range(cases):
        count = 1
        times[0] = 0.0
        count = _collect(starts_low, c, until[c], times, count)
        count = _collect(starts_high, c, until[c], times, count)
        count = _collect(starts_push, c, until[c], times, count)
        ordered = np.sort(times[:count])
        slack = SAME * until[c]
        n = 0
        for k in range(count):
            if n == 0 or ordered[k] - times[n - 1] > slack:
                times[n] = ordered[k]
                n += 1
        pieces[c] = n
        before[c, 2] *= push[c]
        for p in range(n):
            at = times[p]
            stop = times[p + 1] if p + 1 < n else until[c]
            part_of[c, p, LENGTH] = (stop - at) / time[c]
            part_of[c, p, START] = at / time[c]
            _place(starts_low, poly_low, wave_low, c, 0, at, slack, time[c], push[c], poly[c, p], wave[c, p])
            _place(starts_high, poly_high, wave_high, c, 1, at, slack, time[c], push[c], poly[c, p], wave[c, p])
            _place(starts_push, poly_push, wave_push, c, 2, at, slack, time[c], push[c], poly[c, p], wave[c, p])
        for which in range(3):
            old_value, old_slope, old_bend = before[c, which], 0.0, 0.0
            old_size, old_length = abs(old_value), 1e300
            for p in range(n):
                _at_end(poly[c, p, which], wave[c, p, which], 0.0, ends)
                length = part_of[c, p, LENGTH]
                value, slope, curve, size = ends[0], ends[1], ends[2], ends[3]
                _at_end(poly[c, p, which], wave[c, p, which], min(length, 1e3), ends)
                size = max(size, ends[3])
                largest = max(size, old_size)
                shorter = min(length, old_length)
                jump[c, p, which] = value - old_value
                if abs(value - old_value) <= NOTHING * largest:
                    jump[c, p, which] = 0.0
                bends[c, p, which] = 0.0
                kink, twist = abs(slope - old_slope) * shorter, abs(curve - old_bend) * shorter**2
                if kink > 1e-9 * largest or twist > 1e-7 * largest:
                    bends[c, p, which] = 1.0
                old_value, old_slope, old_bend = ends[0], ends[1], ends[2]
                old_size, old_length = size, length
        _finest(c, n, part_of, poly, wave, jump, bends, fine[c], layer)


@compiled
def rise_times(pieces, part_of, poly, wave, jump, out):
    """Swing of the pressure drop over its steepest rate (C,), in diffusion times: 0 with a jump, inf where constant."""
    ends = np.zeros(4)
    for c in range(len(out)):
        low, high, steepest = np.inf, -np.inf, 0.0
        sudden = False
        for p in range(pieces[c]):
            sudden = sudden or jump[c, p, 2] != 0.0
            for k in range(17):
                _at_end(poly[c, p, 2], wave[c, p, 2], part_of[c, p, LENGTH] * k / 16.0, ends)
                low, high = min(low, ends[0]), max(high, ends[0])
                steepest = max(steepest, abs(ends[1]))
        out[c] = 0.0 if sudden else (high - low) / steepest if steepest > 0.0 else np.inf
