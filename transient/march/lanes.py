"""The march of many cases at once: one case a lane of the vector unit, both halves of its gap side by side.

The scheme is that of ``kernel``: a Crank-Nicolson stage closed by a second-order backward difference with the same
matrix (Bank et al. 1985).  Lengths here are shares of the gap and times shares of its diffusion time, so steps are no
shorter than 1e-9 and the velocities themselves can be the unknowns: with ``z = w + a f`` (``a`` the implicit share of
the step, ``f`` the rates) a step is two solves and nothing else.

A gap is cut in its middle node and its two halves are numbered from their walls inwards: both are eliminated by one
recursion, and the middle node joins them.  Places 0 to 7 of a vector are the lower halves of eight cases, 8 to 15
their upper halves.

Steps are chosen beforehand (see ``_next_block``): after a break of the drive they grow in proportion to the time since,
which is how the flow's own features grow.  Blocks of ``ROWS`` rows have one step length and all lanes change theirs
together, so that factors are computed once a block; a lane that is done takes the next case of the queue.
"""

from __future__ import annotations

import numpy as np

from transient.compiled import compiled, part
from transient.march.closure import ALPHA, GAMMA, SHARE
from transient.march.lanes_inputs import COURSE_ROW, COURSE_UNTIL, FIRST_ROW, LENGTH
from transient.march.lanes_vector import (
    HALF,
    WIDTH,
    fma,
    load,
    magnitude,
    splat,
    store,
    swapped,
    where_above,
)

ROWS = 2  # rows of one block
# what a grid's table holds of each node, both halves: [grid, FIELD, node, side]
STORAGE, CONDUCTANCE, WEIGHT, LEVER, BEFORE, AFTER, STEADY = 0, 1, 2, 3, 4, 5, 6  # STEADY: three rows, unit inputs
NODE_FIELDS = 9
# and of each half's end: [grid, FIELD, side]
HELD, END, FLUX, CELL, RADIUS = 0, 1, 2, 3, 4
END_FIELDS = 5
# what a case says: [case, FIELD]
LONGEST, CALM, GROWTH = 0, 1, 2
CASE_FIELDS = 3
# what a recorded row holds
LOWER_STRESS, UPPER_STRESS, MEAN, AWAY, LOWER_SPEED, UPPER_SPEED, PUSH, FIELDS = 0, 1, 2, 3, 4, 5, 6, 7
# rows of the lanes' own numbers [LANE_FIELDS, WIDTH]
_A, _H, _X, _CEND, _FREE, _HELD, _FLUX, _CELL, _RADIUS, _U, _G = 0, 1, 2, 3, 4, 5, 6, 7, 8, 9, 13
# waves of wall speed and push: real, imaginary part; their rates; turns to the middle and to the end of a step
_WAVE_U, _WAVE_G, _RATE_U, _RATE_G, _MID_U, _END_U, _MID_G, _END_G, LANE_FIELDS = 17, 19, 21, 23, 25, 27, 29, 31, 33
_TINY = 1e-300

SHARE_OF_STAGE = SHARE / ALPHA


@part
def _factor(storage, conductance, pivot, lower, lane):
    """Factors of ``storage + a K`` for the lanes' steps."""
    last = storage.shape[0] - 1
    a = load(lane, _A)
    free = load(lane, _FREE)
    one = splat(1.0)
    through = a * load(conductance, 0)
    p = one / (load(storage, 0) + free * through + a * load(lane, _CEND) + load(lane, _HELD))
    store(pivot, 0, p)
    l = through * p
    store(lower, 1, l)
    gone = free * l * through
    for j in range(1, last):
        above = a * load(conductance, j)
        p = one / (load(storage, j) + through + above - gone)
        store(pivot, j, p)
        l = above * p
        store(lower, j + 1, l)
        gone = l * above
        through = above
    d = load(storage, last) + through - gone
    store(pivot, last, one / (d + swapped(d)))


@part
def _polynomial(lane, row, x):
    """Cubic with coefficients in four rows of ``lane``."""
    return fma(x, fma(x, fma(x, load(lane, row + 3), load(lane, row + 2)), load(lane, row + 1)), load(lane, row))


@part
def _slope(lane, row, x):
    """Derivative of that cubic."""
    return fma(x, fma(x, splat(3.0) * load(lane, row + 3), splat(2.0) * load(lane, row + 2)), load(lane, row + 1))


@part
def _wave(lane, wave, turn):
    """Real part of the wave after a turn."""
    return load(lane, wave) * load(lane, turn) - load(lane, wave + 1) * load(lane, turn + 1)


@part
def _turned(lane, wave, turn):
    """Move the wave on by a turn."""
    real = _wave(lane, wave, turn)
    other = load(lane, wave) * load(lane, turn + 1) + load(lane, wave + 1) * load(lane, turn)
    store(lane, wave, real)
    store(lane, wave + 1, other)


@part
def _step(storage, pivot, lower, y, w, z, lane, share, low, push, high, push_after):
    """One step of all lanes: ``w`` and ``z`` move on; inputs of the two stages (wall speed, push)."""
    last = storage.shape[0] - 1
    a = load(lane, _A)
    bound = load(lane, _HELD) + a * load(lane, _CEND)
    free = load(lane, _FREE)
    # stage one
    extra = a * push
    here = fma(load(storage, 0), load(z, 0) + extra, bound * low)
    store(y, 0, here)
    for j in range(1, last):
        here = fma(load(lower, j), here, load(storage, j) * (load(z, j) + extra))
        store(y, j, here)
    here = fma(load(lower, last), here, load(storage, last) * (load(z, last) + extra))
    x = load(pivot, last) * (here + swapped(here))
    old = load(w, last)
    store(z, last, fma(share, x - old, old))
    for j in range(last - 1, 0, -1):
        x = fma(load(lower, j + 1), x, load(pivot, j) * load(y, j))
        old = load(w, j)
        store(z, j, fma(share, x - old, old))
    x = fma(free * load(lower, 1), x, load(pivot, 0) * load(y, 0))
    old = load(w, 0)
    store(z, 0, fma(share, x - old, old))
    # stage two
    extra = a * push_after
    here = fma(load(storage, 0), load(z, 0) + extra, bound * high)
    store(y, 0, here)
    for j in range(1, last):
        here = fma(load(lower, j), here, load(storage, j) * (load(z, j) + extra))
        store(y, j, here)
    base = load(z, last)
    here = fma(load(lower, last), here, load(storage, last) * (base + extra))
    x = load(pivot, last) * (here + swapped(here))
    store(w, last, x)
    store(z, last, x + x - base)
    for j in range(last - 1, 0, -1):
        x = fma(load(lower, j + 1), x, load(pivot, j) * load(y, j))
        base = load(z, j)
        store(w, j, x)
        store(z, j, x + x - base)
    x = fma(free * load(lower, 1), x, load(pivot, 0) * load(y, 0))
    base = load(z, 0)
    store(w, 0, x)
    store(z, 0, x + x - base)


@part
def _largest(w, steady, lever, before, after):
    """Largest deviation from the steady end over each case's gap, by the parabola around the largest node."""
    last = w.shape[0] - 1
    zero = splat(0.0)
    one = splat(1.0)
    half = splat(0.5)
    best = magnitude(load(w, 0) - load(steady, 0)) * load(lever, 0)
    left = zero
    right = zero
    low = zero  # distance to the node before; 0: the largest is at the wall
    high = one
    was = one
    previous = best
    for j in range(1, last):
        d = magnitude(load(w, j) - load(steady, j)) * load(lever, j)
        right = where_above(was, half, d, right)
        was = where_above(d, best, one, zero)
        left = where_above(d, best, previous, left)
        low = where_above(d, best, load(before, j), low)
        high = where_above(d, best, load(after, j), high)
        best = where_above(d, best, d, best)
        previous = d
    d = magnitude(load(w, last) - load(steady, last)) * load(lever, last)
    right = where_above(was, half, d, right)
    left = where_above(d, best, previous, left)
    right = where_above(d, best, swapped(previous), right)
    low = where_above(d, best, load(before, last), low)
    high = where_above(d, best, load(after, last), high)
    best = where_above(d, best, d, best)
    inside = where_above(low, zero, low, one)
    rise = (best - left) / inside
    fall = (best - right) / high
    bend = where_above(zero, fall, zero, rise + fall)  # 0 where the neighbour in the other half is larger
    width = inside + high
    slope = (rise * high - fall * inside) / width
    more = slope * slope * width * splat(0.25) / where_above(bend, splat(_TINY), bend, one)
    top = best + where_above(bend, splat(_TINY), where_above(low, zero, more, zero), zero)
    other = swapped(top)
    return where_above(top, other, top, other)


@part
def _record(w, weight, steady, lever, before, after, lane, conductance, u, slope, g, out):
    """Stress, mean, largest deviation, wall speed and push of all lanes into rows 0 to 4 of ``out``."""
    last = w.shape[0] - 1
    half = splat(0.5)
    beside = where_above(load(lane, _HELD), half, load(w, 1), load(w, 0))
    flux = fma(load(lane, _FLUX), beside - u, load(lane, _CELL) * (g - slope))
    store(out, 0, flux * load(lane, _RADIUS))
    total = load(weight, 0) * load(w, 0)
    for j in range(1, last + 1):
        total = fma(load(weight, j), load(w, j), total)
    store(out, 1, total + swapped(total))
    store(out, 2, _largest(w, steady, lever, before, after))
    store(out, 3, u)
    store(out, 4, g)


@part
def _next_step(x, known, numbers):
    """Row length of the next block, from the offset ``x`` in a piece: the last blocks share what is left."""
    wanted = max(known[FIRST_ROW], numbers[GROWTH] * x)
    if x < numbers[CALM]:
        wanted = min(wanted, numbers[LONGEST])
    if x < known[COURSE_UNTIL]:
        wanted = min(wanted, known[COURSE_ROW])
    left = known[LENGTH] - x
    if ROWS * wanted >= left:
        return left / ROWS
    if 2 * ROWS * wanted > left:
        return left / (2 * ROWS)
    return wanted


@part
def _set_grid(c, grid, table, ends, storage, conductance, weight, lever, before, after, lane):
    """Put a grid into both halves of lane ``c``."""
    for side in range(2):
        l = c + side * HALF
        for j in range(storage.shape[0]):
            storage[j, l] = table[grid, STORAGE, j, side]
            conductance[j, l] = table[grid, CONDUCTANCE, j, side]
            weight[j, l] = table[grid, WEIGHT, j, side]
            lever[j, l] = table[grid, LEVER, j, side]
            before[j, l] = table[grid, BEFORE, j, side]
            after[j, l] = table[grid, AFTER, j, side]
        lane[_HELD, l] = ends[grid, HELD, side]
        lane[_FREE, l] = 1.0 - ends[grid, HELD, side]
        lane[_CEND, l] = ends[grid, END, side]
        lane[_FLUX, l] = ends[grid, FLUX, side]
        lane[_CELL, l] = ends[grid, CELL, side]
        lane[_RADIUS, l] = ends[grid, RADIUS, side]


@part
def _set_flow(c, grid, table, now, end, w, z, steady):
    """Lane ``c`` at the steady flow of the inputs ``now`` (3,), and the one it will end in, of ``end``."""
    for side in range(2):
        l = c + side * HALF
        for j in range(w.shape[0]):
            begins = 0.0
            ends = 0.0
            for k in range(3):
                begins += now[k] * table[grid, STEADY + k, j, side]
                ends += end[k] * table[grid, STEADY + k, j, side]
            w[j, l] = begins
            z[j, l] = begins
            steady[j, l] = ends


@part
def _set_piece(c, poly, wave, lane):
    """The inputs of a piece, ``poly`` (3, 4) and ``wave`` (3, 4), into lane ``c``."""
    for side in range(2):
        l = c + side * HALF
        for k in range(4):
            lane[_U + k, l] = poly[side, k]
            lane[_G + k, l] = poly[2, k]
        for k in range(2):
            lane[_RATE_U + k, l] = wave[side, 2 + k]
            lane[_RATE_G + k, l] = wave[2, 2 + k]


@part
def _set_waves(c, wave, x, h, lane):
    """Waves of lane ``c`` at the offset ``x`` and their turns in a step ``h``."""
    for side in range(2):
        l = c + side * HALF
        for row in range(2):
            own = side if row == 0 else 2
            real, other, decay, turn = wave[own, 0], wave[own, 1], wave[own, 2], wave[own, 3]
            size = np.exp(decay * x)
            across, up = size * np.cos(turn * x), size * np.sin(turn * x)
            lane[_WAVE_U + 2 * row, l] = real * across - other * up
            lane[_WAVE_U + 2 * row + 1, l] = real * up + other * across
            for part_of in range(2):
                length = GAMMA * h if part_of == 0 else h
                size = np.exp(decay * length)
                to = _MID_U + 4 * row + 2 * part_of
                lane[to, l] = size * np.cos(turn * length)
                lane[to + 1, l] = size * np.sin(turn * length)


@part
def _enter(c, jump, storage, conductance, w, z, lane):
    """What jumps of the inputs (3,) do to the rates of lane ``c``, and to the wall's own node."""
    last = storage.shape[0] - 1
    for side in range(2):
        l = c + side * HALF
        a = lane[_A, l]
        if jump[2] != 0.0:
            for j in range(last + 1):
                if storage[j, l] > 0.0:
                    z[j, l] += a * jump[2]
        if lane[_HELD, l] > 0.5:
            z[1, l] += a * conductance[0, l] * jump[side] / storage[1, l]
            w[0, l] += jump[side]
            z[0, l] = w[0, l]
        elif lane[_CEND, l] > 0.0:
            z[0, l] += a * lane[_CEND, l] * jump[side] / storage[0, l]


@part
def _write(c, case, row, out, rows):
    """Row ``row`` of ``case`` from the vectors of ``out``."""
    rows[case, row, LOWER_STRESS] = out[0, c]
    rows[case, row, UPPER_STRESS] = out[0, c + HALF]
    rows[case, row, MEAN] = out[1, c]
    rows[case, row, AWAY] = out[2, c]
    rows[case, row, LOWER_SPEED] = out[3, c]
    rows[case, row, UPPER_SPEED] = out[3, c + HALF]
    rows[case, row, PUSH] = out[4, c]


@compiled
def march(
    table, ends, grid, numbers,  # [G, NODE_FIELDS, n, 2], [G, END_FIELDS, 2], (C,), [C, CASE_FIELDS]
    pieces, part_of, poly, wave, jump,  # (C,), [C, P, PIECE_FIELDS], [C, P, 3, 4] twice, [C, P, 3]
    before, final, every, waving,  # [C, 3] twice, steps of a row, whether any input has a wave
    rows, row_piece, row_offset, count,  # out: [C, R, FIELDS], [C, R] twice, (C,): -1 where R is too few
):  # fmt: skip
    """March all cases; inputs are in lane units (see ``lanes_inputs``).  Returns the number of lane steps."""
    cases, most = row_piece.shape
    n = table.shape[2]
    storage = np.ones((n, WIDTH))
    conductance = np.ones((n, WIDTH))
    weight = np.zeros((n, WIDTH))
    lever = np.ones((n, WIDTH))
    near = np.ones((n, WIDTH))
    beyond = np.ones((n, WIDTH))
    steady = np.zeros((n, WIDTH))
    pivot = np.ones((n, WIDTH))
    lower = np.zeros((n, WIDTH))
    y = np.zeros((n, WIDTH))
    w = np.zeros((n, WIDTH))
    z = np.zeros((n, WIDTH))
    lane = np.zeros((LANE_FIELDS, WIDTH))
    out = np.zeros((5, WIDTH))
    ratio = np.ones((1, WIDTH))
    own = np.full(HALF, -1)
    grid_of = np.full(HALF, -1)
    piece = np.zeros(HALF, np.int64)
    row = np.zeros(HALF, np.int64)
    at = np.zeros(HALF)
    long = np.zeros(HALF)
    fresh = np.zeros(HALF, np.bool_)
    share = splat(SHARE_OF_STAGE)
    gamma = splat(GAMMA)
    taken = 0
    done = 0
    steps = 0
    for l in range(WIDTH):
        lane[_HELD, l] = 1.0
    while True:
        # --- every lane's next block: the piece goes on, or the next one begins, or the next case
        entered = False
        for c in range(HALF):
            case = own[c]
            fresh[c] = False
            if case >= 0 and at[c] >= part_of[case, piece[c], LENGTH]:
                piece[c] += 1
                at[c] = 0.0
                fresh[c] = True
                if piece[c] == pieces[case]:
                    count[case] = row[c]
                    own[c] = -1
                    done += 1
            if own[c] < 0:
                fresh[c] = False
                lane[_A, c] = 0.0
                lane[_A, c + HALF] = 0.0
                lane[_H, c] = 0.0
                lane[_H, c + HALF] = 0.0
                ratio[0, c] = 0.0
                ratio[0, c + HALF] = 0.0
                if taken == cases:
                    continue
                case = taken
                taken += 1
                own[c] = case
                piece[c] = 0
                row[c] = 0
                at[c] = 0.0
                fresh[c] = True
                if grid[case] != grid_of[c]:
                    grid_of[c] = grid[case]
                    _set_grid(c, grid[case], table, ends, storage, conductance, weight, lever, near, beyond, lane)
                _set_flow(c, grid[case], table, before[case], final[case], w, z, steady)
            p = piece[c]
            entered = entered or fresh[c]
            long[c] = _next_step(at[c], part_of[case, p], numbers[case])
            h = long[c] / every
            if fresh[c]:
                _set_piece(c, poly[case, p], wave[case, p], lane)
            if waving:
                _set_waves(c, wave[case, p], at[c], h, lane)
            for side in range(2):
                l = c + side * HALF
                a = ALPHA * h
                ratio[0, l] = a / lane[_A, l] if lane[_A, l] > 0.0 else 1.0
                lane[_A, l] = a
                lane[_H, l] = h
                lane[_X, l] = at[c]
        if done == cases:
            return steps
        turn = load(ratio, 0)
        for j in range(n):
            still = load(w, j)
            store(z, j, fma(turn, load(z, j) - still, still))
        _factor(storage, conductance, pivot, lower, lane)
        if entered:
            for c in range(HALF):
                if fresh[c]:
                    _enter(c, jump[own[c], piece[c]], storage, conductance, w, z, lane)
            x = load(lane, _X)
            u = _polynomial(lane, _U, x)
            g = _polynomial(lane, _G, x)
            if waving:
                u = u + load(lane, _WAVE_U)
                g = g + load(lane, _WAVE_G)
            _record(w, weight, steady, lever, near, beyond, lane, conductance, u, splat(0.0), g, out)
            for c in range(HALF):
                if fresh[c]:
                    case = own[c]
                    at_row = row[c]
                    _write(c, case, at_row, out, rows)
                    row_piece[case, at_row] = piece[c]
                    row_offset[case, at_row] = 0.0
                    for side in range(2):
                        l = c + side * HALF
                        if lane[_HELD, l] < 0.5:
                            continue
                        # the stress itself does not jump with the wall's acceleration
                        if at_row > 0:
                            rows[case, at_row, side] = rows[case, at_row - 1, side]
                        else:
                            before_jump = lane[_FLUX, l] * jump[case, 0, side] - lane[_CELL, l] * jump[case, 0, 2]
                            rows[case, 0, side] += before_jump * lane[_RADIUS, l]
                    row[c] += 1
        # --- the block
        h = load(lane, _H)
        begin = load(lane, _X)
        for r in range(ROWS):
            g = splat(0.0)
            u = splat(0.0)
            x = begin
            for s in range(every):
                x = fma(splat(float(r * every + s)), h, begin)
                middle = fma(gamma, h, x)
                x = fma(splat(float(r * every + s + 1)), h, begin)
                low = _polynomial(lane, _U, middle)
                push = _polynomial(lane, _G, middle)
                u = _polynomial(lane, _U, x)
                g = _polynomial(lane, _G, x)
                if waving:
                    low = low + _wave(lane, _WAVE_U, _MID_U)
                    push = push + _wave(lane, _WAVE_G, _MID_G)
                    _turned(lane, _WAVE_U, _END_U)
                    _turned(lane, _WAVE_G, _END_G)
                    u = u + load(lane, _WAVE_U)
                    g = g + load(lane, _WAVE_G)
                _step(storage, pivot, lower, y, w, z, lane, share, low, push, u, g)
            slope = _slope(lane, _U, x)
            if waving:
                slope = slope + _wave(lane, _WAVE_U, _RATE_U)
            _record(w, weight, steady, lever, near, beyond, lane, conductance, u, slope, g, out)
            for c in range(HALF):
                case = own[c]
                if case >= 0:
                    at_row = row[c]
                    _write(c, case, at_row, out, rows)
                    offset = at[c] + (r + 1) * long[c]
                    if r == ROWS - 1:
                        left = part_of[case, piece[c], LENGTH]
                        if left - offset <= 1e-9 * long[c]:
                            offset = left
                        at[c] = offset
                    row_piece[case, at_row] = piece[c]
                    row_offset[case, at_row] = offset
                    row[c] += 1
                    steps += every
        # --- a case that has more rows than there is room for is given up
        for c in range(HALF):
            case = own[c]
            if case >= 0 and row[c] + ROWS + 1 > most:
                count[case] = -1
                own[c] = -1
                done += 1
