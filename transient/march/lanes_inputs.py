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
GROWTH = 0.7  # longest row as a share of the time since the break
FOLLOW = 0.55  # longest row while the flow settles, as a share of its slowest time constant
COURSE = 0.25  # longest row over the time constant of a wave or lag
BENT = 12.0  # least rows of a curved piece
SUDDEN = 1e-3  # share of the time after a jump from which on the flow is followed closely
NOTHING = 1e-11  # changes at a break below this share of the drive's size are round-off
SAME = 1e-12  # times closer than this are one (as in ``drive.times``)
# what is known of each piece: [case, piece, FIELD]; FOLLOWED: whether another one follows
LENGTH, START, FIRST_ROW, COURSE_ROW, COURSE_UNTIL, FOLLOWED, PIECE_FIELDS = 0, 1, 2, 3, 4, 5, 6


@part
def _at_end(poly, wave, x, out):
    """Value, first and second derivative at offset ``x`` into ``out`` (3,), and the size of the terms into out[3]."""
    out[0] = poly[0] + x * (poly[1] + x * (poly[2] + x * poly[3]))
    out[1] = poly[1] + x * (2.0 * poly[2] + x * 3.0 * poly[3])
    out[2] = 2.0 * poly[2] + 6.0 * poly[3] * x
    out[3] = abs(poly[0]) + abs(poly[1] * x) + abs(poly[2] * x * x) + abs(poly[3] * x**3)
    if wave[0] != 0.0 or wave[1] != 0.0:
        size = np.exp(wave[2] * x)
        real = size * (wave[0] * np.cos(wave[3] * x) - wave[1] * np.sin(wave[3] * x))
        other = size * (wave[0] * np.sin(wave[3] * x) + wave[1] * np.cos(wave[3] * x))
        out[3] += np.sqrt(wave[0] ** 2 + wave[1] ** 2)
        for order in range(3):
            out[order] += real
            real, other = real * wave[2] - other * wave[3], real * wave[3] + other * wave[2]


@part
def _place(poly, wave, x, time, scale, out_poly, out_wave):
    """A piece from ``x`` after its start on, in lane units: its cubic and wave (4,) each about that instant."""
    c0, c1, c2, c3 = poly[0], poly[1], poly[2], poly[3]
    out_poly[0] = scale * (c0 + x * (c1 + x * (c2 + x * c3)))
    out_poly[1] = scale * time * (c1 + x * (2.0 * c2 + x * 3.0 * c3))
    out_poly[2] = scale * time * time * (c2 + x * 3.0 * c3)
    out_poly[3] = scale * time * time * time * c3
    if wave[0] != 0.0 or wave[1] != 0.0:
        size = scale * np.exp(wave[2] * x)
        across, up = size * np.cos(wave[3] * x), size * np.sin(wave[3] * x)
        out_wave[0] = wave[0] * across - wave[1] * up
        out_wave[1] = wave[0] * up + wave[1] * across
        out_wave[2] = wave[2] * time
        out_wave[3] = wave[3] * time


@part
def _slack(at, last):
    """How far apart two times may lie and still be one, as in ``drive.times``; ``last`` of the break times."""
    return SAME * max(at, 1e-3 * last)


@part
def _breaks(starts, until, times):
    """Start times (3, P) of the drives' pieces below ``until``, merged and in order, into ``times``; how many."""
    count = 1
    times[0] = 0.0
    last = 0.0
    for which in range(3):
        for p in range(starts.shape[1]):
            if starts[which, p] < until:
                last = max(last, starts[which, p])
    for which in range(3):
        for p in range(starts.shape[1]):
            at = starts[which, p]
            if not (at > 0.0 and at < until):
                continue
            k = count
            while k > 0 and times[k - 1] > at:
                k -= 1
            slack = _slack(at, last)
            if (k > 0 and at - times[k - 1] <= slack) or (k < count and times[k] - at <= slack):
                continue
            for j in range(count, k, -1):
                times[j] = times[j - 1]
            times[k] = at
            count += 1
    return count


@part
def _finest(c, pieces, part_of, poly, wave, jump, bends, inertia, flowing, fine, layer):
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
            begins = sudden or bends[p, which]
            time = 1e300
            if begins:
                time = min(length, 1.0)
                first = min(first, FIRST * beside)
            body = inertia[c, which] if which < 2 else 0.0
            if body > 0.0 and begins:  # as soon as the liquid set in motion is as heavy as the body
                time = min(time, body * body)
                first = min(first, FIRST * body * body)
            elif sudden and which < 2:
                time = SUDDEN * min(length, 1.0)
                first = min(first, 0.2 * time)
            w = wave[c, p, which]
            if w[0] != 0.0 or w[1] != 0.0:
                rate = np.sqrt(w[2] * w[2] + w[3] * w[3])
                time = min(time, 1.0 / rate)
                first = min(first, FIRST / rate)
                course = min(course, COURSE / rate)
                until = max(until, -12.0 / w[2] if w[2] < 0.0 else 1e300)
            if poly[c, p, which, 2] != 0.0 or poly[c, p, which, 3] != 0.0:
                course = min(course, length / BENT)
                until = 1e300
            for side in range(2):
                if flowing or which == 2 or side == which:  # pressure answers what a wall does, and the other feels it
                    layer[c, side] = min(layer[c, side], 0.5 * np.sqrt(time) * fine)
        if first > 1e299:
            first = FIRST * beside
        part_of[c, p, FIRST_ROW] = fine * first
        part_of[c, p, COURSE_ROW] = fine * course
        part_of[c, p, COURSE_UNTIL] = until


@part
def _breaks_of(which, c, n, part_of, poly, wave, before, jump, kick, bends, ends):
    """Jumps of one input at the starts of its pieces, and whether its slope or bend changes there."""
    old_value, old_slope, old_bend = before, 0.0, 0.0
    old_size, old_length = abs(before), 1e300
    for p in range(n):
        own, own_wave = poly[c, p, which], wave[c, p, which]
        _at_end(own, own_wave, 0.0, ends)
        length = part_of[c, p, LENGTH]
        value, slope, curve, size = ends[0], ends[1], ends[2], ends[3]
        _at_end(own, own_wave, length, ends)
        size = max(size, ends[3])
        largest = max(size, old_size)
        shorter = min(length, old_length)
        jump[c, p, which] = value - old_value
        # round-off of the values, and of the time at which they come
        noise = NOTHING * largest + 1e-15 * part_of[c, p, START] * (abs(slope) + abs(old_slope))
        if abs(value - old_value) <= noise:
            jump[c, p, which] = 0.0
        kick[c, p, which] = slope - old_slope
        kink, twist = abs(slope - old_slope) * shorter, abs(curve - old_bend) * shorter * shorter
        if kink <= 1e-9 * largest:
            kick[c, p, which] = 0.0
        bends[p, which] = kink > 1e-9 * largest or twist > 1e-7 * largest
        old_value, old_slope, old_bend = ends[0], ends[1], ends[2]
        old_size, old_length = size, length


@compiled
def join(
    starts, poly_of, wave_of,  # the drives' pieces: [C or 1, 3, P], [.., 3, P, 4] twice
    before, until, time, scale, inertia, fine,  # [C, 3] in SI, (C,) s, (C,) s, [C, 3] lane units per SI, [C, 2], (C,)
    flowing,  # whether the third input is the mean velocity
    pieces, part_of, poly, wave, jump, kick, layer,  # out: (C,), [C, Q, PIECE_FIELDS], [C, Q, 3, 4] twice, [C, Q, 3]
    # twice (jumps of the inputs and of their slopes), [C, 2]
):  # fmt: skip
    """Join the three drives of every row; pieces that a row does not have start at infinity or have no length.

    ``inertia``: of a body over that of the gap's liquid, 0 where the speed is prescribed.  ``before`` is scaled in
    place.
    """
    cases, most = part_of.shape[0], part_of.shape[1]
    times = np.empty(most + 3)
    ends = np.zeros(4)
    bends = np.zeros((most, 3), np.bool_)
    for c in range(cases):
        own = c if starts.shape[0] > 1 else 0
        n = _breaks(starts[own], until[c], times)
        pieces[c] = n
        for p in range(n):
            at = times[p]
            stop = times[p + 1] if p + 1 < n else until[c]
            part_of[c, p, LENGTH] = (stop - at) / time[c]
            part_of[c, p, START] = at / time[c]
            part_of[c, p, FOLLOWED] = 1.0 if p + 1 < n else 0.0
        for which in range(3):
            before[c, which] *= scale[c, which]
            piece = 0
            for p in range(n):
                slack = _slack(times[p], times[n - 1])
                for k in range(piece + 1, starts.shape[2]):
                    if starts[own, which, k] <= times[p] + slack:
                        piece = k
                x = times[p] - starts[own, which, piece]
                if abs(x) <= slack:
                    x = 0.0
                _place(
                    poly_of[own, which, piece], wave_of[own, which, piece], x, time[c], scale[c, which],
                    poly[c, p, which], wave[c, p, which],
                )  # fmt: skip
            _breaks_of(which, c, n, part_of, poly, wave, before[c, which], jump, kick, bends, ends)
        _finest(c, n, part_of, poly, wave, jump, bends, inertia, flowing, fine[c], layer)


@compiled
def rise_times(which, pieces, part_of, poly, wave, jump, out):
    """Swing of an input over its steepest rate (C,), in diffusion times: 0 with a jump, inf where constant."""
    ends = np.zeros(4)
    for c in range(len(out)):
        low, high, steepest = np.inf, -np.inf, 0.0
        sudden = False
        for p in range(pieces[c]):
            sudden = sudden or jump[c, p, which] != 0.0
            for k in range(17):
                _at_end(poly[c, p, which], wave[c, p, which], part_of[c, p, LENGTH] * k / 16.0, ends)
                low, high = min(low, ends[0]), max(high, ends[0])
                steepest = max(steepest, abs(ends[1]))
        out[c] = 0.0 if sudden else (high - low) / steepest if steepest > 0.0 else np.inf
