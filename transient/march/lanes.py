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
from transient.march.closure import ALPHA, GAMMA
from transient.march.lanes_inputs import COURSE_ROW, COURSE_UNTIL, FIRST_ROW, FOLLOWED, LENGTH
from transient.march.lanes_layout import (
    CALM,
    GROWTH,
    LANE_A,
    LANE_BODY,
    LANE_CELL,
    LANE_END_G,
    LANE_END_U,
    LANE_FIELDS,
    LANE_FLUX,
    LANE_G,
    LANE_H,
    LANE_HELD,
    LANE_MID_G,
    LANE_MID_U,
    LANE_PUSH,
    LANE_RADIUS,
    LANE_RATE_U,
    LANE_U,
    LANE_WAVE_G,
    LANE_WAVE_U,
    LANE_X,
    LONGEST,
    ROOM,
    ROWS,
    SHARE_OF_STAGE,
)
from transient.march.lanes_load import enter, set_flow, set_grid, set_piece, set_waves, write
from transient.march.lanes_step import (
    close_first,
    close_second,
    factor,
    first_stage,
    polynomial,
    record,
    respond,
    second_stage,
    slope_of,
    turned,
    waved,
)
from transient.march.lanes_vector import HALF, WIDTH, fma, load, splat, store


@part
def _next_step(x, known, numbers):
    """Row length of the next block, from the offset ``x`` in a piece: the last blocks share what is left."""
    wanted = max(known[FIRST_ROW], numbers[GROWTH] * x)
    if x < numbers[CALM]:
        wanted = min(wanted, numbers[LONGEST])
    if x < known[COURSE_UNTIL]:
        wanted = min(wanted, known[COURSE_ROW])
    left = known[LENGTH] - x
    if known[FOLLOWED] > 0.0:  # what a drive's end leaves behind is as quick as the flow, however long it lasted
        wanted = min(wanted, max(numbers[LONGEST], left / (2 * ROWS)))
    if ROWS * wanted >= left:
        return left / ROWS
    if 2 * ROWS * wanted > left:
        return left / (2 * ROWS)
    return wanted


@compiled
def march(
    table, ends, grid, numbers,  # [G, NODE_FIELDS, n, 2], [G, END_FIELDS, 2], (C,), [C, CASE_FIELDS]
    pieces, part_of, poly, wave, jump,  # (C,), [C, P, PIECE_FIELDS], [C, P, 3, 4] twice, [C, P, 3]
    before, final, every, waving,  # [C, 3] twice, steps of a row, whether any input has a wave
    flowing, kick,  # whether the third input is the mean velocity, [C, P, 3] changes of the inputs' slopes
    rows, row_piece, row_offset, count,  # out: [C, R, FIELDS], [C, R] twice, (C,): -1 where given up
):  # fmt: skip
    """March all cases; inputs are in lane units (see ``lanes_inputs``).  Returns the number of lane steps."""
    cases = row_piece.shape[0]
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
    unit = np.zeros((n if flowing else 1, WIDTH))
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
    gain = splat(1.0)
    nothing = splat(0.0)
    taken = 0
    done = 0
    steps = 0
    for l in range(WIDTH):
        lane[LANE_HELD, l] = 1.0
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
                lane[LANE_A, c] = 0.0
                lane[LANE_A, c + HALF] = 0.0
                lane[LANE_H, c] = 0.0
                lane[LANE_H, c + HALF] = 0.0
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
                    set_grid(c, grid[case], table, ends, storage, conductance, weight, lever, near, beyond, lane)
                set_flow(c, grid[case], table, before[case], final[case], w, z, steady)
            p = piece[c]
            entered = entered or fresh[c]
            long[c] = _next_step(at[c], part_of[case, p], numbers[case])
            h = long[c] / every
            if fresh[c]:
                set_piece(c, poly[case, p], wave[case, p], lane)
            if waving:
                set_waves(c, wave[case, p], at[c], h, lane)
            for side in range(2):
                l = c + side * HALF
                a = ALPHA * h
                ratio[0, l] = a / lane[LANE_A, l] if lane[LANE_A, l] > 0.0 else 1.0
                lane[LANE_A, l] = a
                lane[LANE_H, l] = h
                lane[LANE_X, l] = at[c]
        if done == cases:
            return steps
        turn = load(ratio, 0)
        for j in range(n):
            still = load(w, j)
            store(z, j, fma(turn, load(z, j) - still, still))
        factor(storage, conductance, pivot, lower, lane)
        if flowing:
            gain = respond(storage, pivot, lower, y, unit, weight, lane)
        if entered:
            for c in range(HALF):
                if fresh[c]:
                    jumps = jump[own[c], piece[c]]
                    push = jumps[2]
                    if flowing:  # the liquid as a whole, and what of it moves with the walls, is set going by pressure
                        kicks = kick[own[c], piece[c]]
                        near_walls = weight[0, c] * lane[LANE_HELD, c], weight[0, c + HALF] * lane[LANE_HELD, c + HALF]
                        moved = near_walls[0] * kicks[0] + near_walls[1] * kicks[1]
                        push = (kicks[2] - moved) / (1.0 - near_walls[0] - near_walls[1])
                        if piece[c] == 0:
                            lane[LANE_PUSH, c] = 0.0
                        lane[LANE_PUSH, c] += push
                        lane[LANE_PUSH, c + HALF] = lane[LANE_PUSH, c]
                    enter(c, jumps, push, storage, conductance, w, z, lane)
            x = load(lane, LANE_X)
            u = polynomial(lane, LANE_U, x)
            g = polynomial(lane, LANE_G, x)
            if waving:
                u = u + load(lane, LANE_WAVE_U)
                g = g + load(lane, LANE_WAVE_G)
            if flowing:
                g = load(lane, LANE_PUSH)
            record(w, z, weight, steady, lever, near, beyond, lane, u, splat(0.0), g, out)
            for c in range(HALF):
                if fresh[c]:
                    case = own[c]
                    at_row = row[c]
                    write(c, case, at_row, out, rows)
                    row_piece[case, at_row] = piece[c]
                    row_offset[case, at_row] = 0.0
                    for side in range(2):
                        l = c + side * HALF
                        body = lane[LANE_BODY, l] > 0.5
                        if lane[LANE_HELD, l] < 0.5 and not body:
                            continue
                        # the stress itself does not jump with the wall's acceleration
                        if at_row > 0:
                            rows[case, at_row, side] = rows[case, at_row - 1, side]
                        else:
                            change = -lane[LANE_CELL, l] * jump[case, 0, 2]
                            if body or flowing:  # from rest: nothing before
                                rows[case, 0, side] = 0.0
                                continue
                            change += lane[LANE_FLUX, l] * jump[case, 0, side]
                            rows[case, 0, side] += change * lane[LANE_RADIUS, l]
                    row[c] += 1
        # --- the block
        h = load(lane, LANE_H)
        begin = load(lane, LANE_X)
        for r in range(ROWS):
            g = splat(0.0)
            u = splat(0.0)
            x = begin
            for s in range(every):
                x = fma(splat(float(r * every + s)), h, begin)
                middle = fma(gamma, h, x)
                x = fma(splat(float(r * every + s + 1)), h, begin)
                low = polynomial(lane, LANE_U, middle)
                push = polynomial(lane, LANE_G, middle)
                u = polynomial(lane, LANE_U, x)
                g = polynomial(lane, LANE_G, x)
                if waving:
                    low = low + waved(lane, LANE_WAVE_U, LANE_MID_U)
                    push = push + waved(lane, LANE_WAVE_G, LANE_MID_G)
                    turned(lane, LANE_WAVE_U, LANE_END_U)
                    turned(lane, LANE_WAVE_G, LANE_END_G)
                    u = u + load(lane, LANE_WAVE_U)
                    g = g + load(lane, LANE_WAVE_G)
                if flowing:
                    first_stage(storage, pivot, lower, y, w, z, lane, share, low, nothing)
                    close_first(w, z, unit, weight, share, gain, push)
                    second_stage(storage, pivot, lower, y, w, z, lane, u, nothing)
                    g = close_second(w, z, unit, weight, gain, g)
                else:
                    first_stage(storage, pivot, lower, y, w, z, lane, share, low, push)
                    second_stage(storage, pivot, lower, y, w, z, lane, u, g)
            if flowing:
                store(lane, LANE_PUSH, g)
            slope = slope_of(lane, LANE_U, x)
            if waving:
                slope = slope + waved(lane, LANE_WAVE_U, LANE_RATE_U)
            record(w, z, weight, steady, lever, near, beyond, lane, u, slope, g, out)
            for c in range(HALF):
                case = own[c]
                if case >= 0:
                    at_row = row[c]
                    write(c, case, at_row, out, rows)
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
            if case >= 0 and row[c] + ROWS + 1 > numbers[case, ROOM]:
                count[case] = -1
                own[c] = -1
                done += 1
