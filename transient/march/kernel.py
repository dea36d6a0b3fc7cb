"""The compiled march: many gaps side by side in the lanes of the vector unit, one of them a batch of one.

Each step is a Crank-Nicolson stage to ``GAMMA`` of the step closed by a second-order backward difference stage with
the same matrix (Bank et al. 1985): second order, and unlike Crank-Nicolson alone it forgets what the grid cannot
resolve instead of ringing.  The local error is that of Hosea & Shampine (1996), passed once through the matrix so
that it is bounded for stiff modes.

Stages are solved for the rates ``f = dw/dt``, not for the velocities: a rate computed from differences of
velocities would lose all its digits in steps of 1e-15 s, and the rates make values between steps known.
Array layout ``[node, lane]``; inner loops run over lanes.
"""

from __future__ import annotations

import numpy as np

from transient.compiled import compiled, part
from transient.march.closure import (
    ALPHA,
    ERROR,
    GAMMA,
    PLACE,
    RATE,
    SHARE,
    SPEED,
    close_error,
    close_walls,
    guess_walls,
)
from transient.march.standstill import advance_walls, begin, impulse, left_curve, until_event
from transient.march.tridiagonal import solve_rates, substitute, unit_responses

# what a recorded row holds: the unknowns next to the walls, the mean of the unknowns with its rate, the walls' motion
# (speed, rate, place of the lower and of the upper) and the pressure drop per length
FIRST, LAST, MEAN, MEAN_RATE, WALLS, DROP, FIELDS = 0, 1, 2, 3, 4, 10, 11
RUNNING, DONE, FULL, STALLED, BROKEN, BEYOND = 0, 1, 2, 3, 4, 5
LANDS, EVENT = 1, 2  # marks of recorded rows: ends a piece of the drive; a body stops or breaks away here

GROW_MOST, SHRINK_MOST, AIM = 2.0, 0.2, 0.85
KEEP_ABOVE = 1.15  # a step that could grow by less keeps its length, and with it the factors


@part
def _input(poly, coeff, rate, piece, row, x, out):
    """Value, first and second derivative of one input at local time ``x`` into ``out`` (3,)."""
    c0, c1, c2, c3 = poly[piece, row, 0], poly[piece, row, 1], poly[piece, row, 2], poly[piece, row, 3]
    value = c0 + x * (c1 + x * (c2 + x * c3))
    slope = c1 + x * (2.0 * c2 + x * 3.0 * c3)
    curve = 2.0 * c2 + 6.0 * c3 * x
    for k in range(coeff.shape[2]):
        s = rate[piece, row, k]
        term = coeff[piece, row, k] * np.exp(s * x)
        value += term.real
        slope += (term * s).real
        curve += (term * s * s).real
    out[0], out[1], out[2] = value, slope, curve


def _march_of(closed: bool):
    """The march with bodies and prescribed flow (``closed``) or without: one source, and a user without bodies need
    not wait for their part to be compiled."""

    def march(
        storage, conductance, volume, end_conductance, mean_weight, end_weight,
        # [n, L], [n-1, L], [n, L], [2, L], [n, L], [2, L]
        link, flow, curve_speed, curve_value, event_step,  # [2, L, LINKS], (L,), (V,), (V,), (L,): see ``closure``
        piece_start, piece_first, piece_stop, until,  # times of all pieces (P,), each lane's range (L,), end (L,)
        poly, coeff, rate, jump,  # (P, 3, 4), (P, 3, K), (P, 3, K), jumps of the inputs at each piece's start (P, 3)
        first_step,  # (P,) s: of each piece
        longest_step, calm_after, swift_step, swift_until,  # (P,) s: bounds of the steps, and until which offset
        tolerance, velocity_scale, stress_scale,  # (L,); (L,); [2, L] as end flux
        plan, plan_lands,  # ends of prescribed steps as offsets (S,), whether each ends its piece; empty: adaptive
        record_every, profile_every,
        velocity, rates, travel, wall, gradient, mode,  # state, updated: [n, L] thrice, [3, 2, L], (L,), int64 [2, L]
        cursor,  # int64 [5, L]: piece, place in the plan, rows, profiles, rows handed over before these
        state,  # [4, L]: offset, step, steps since the piece or the last event, that event's own offset in the piece
        row_piece, row_offset, rows, row_mark,  # records: (R, L), (R, L), (R, L, FIELDS), (R, L)
        profile_row, profiles,  # (Q, L), (Q, L, 3, n)
        status,
    ):  # fmt: skip
        """March every lane from its state to its end, or until its records are full (status FULL: call again).

        Returns the number of solves.  ``status`` (L,) holds RUNNING (start), then DONE, FULL, STALLED (the step
        vanished), BROKEN (a value is no longer finite) or BEYOND (a body's speed left its curve).
        """
        n, lanes = storage.shape
        adaptive = plan.shape[0] == 0
        pivot = np.empty((n, lanes))
        lower = np.empty((n, lanes))
        base = np.empty((n, lanes))
        middle = np.empty((n, lanes))
        middle_rate = np.empty((n, lanes))
        end = np.empty((n, lanes))
        end_rate = np.empty((n, lanes))
        error = np.empty((n, lanes))
        step = np.empty(lanes)
        scaled = np.empty(lanes)
        factored = np.zeros(lanes)
        middle_in = np.zeros((3, lanes))
        end_in = np.zeros((3, lanes))
        end_slope = np.zeros((3, lanes))
        values = np.empty(3)
        # responses to a unit of either wall's speed and of the pressure; what they do beside the walls and in the mean
        units = np.zeros((3, n if closed else 1, lanes))
        response = np.zeros((3, 3, lanes))  # [beside the lower wall, beside the upper, mean; cause; lane]
        wall_base = np.zeros((2, lanes))
        place_base = np.zeros((2, lanes))
        wall_middle = np.zeros((3, 2, lanes))
        wall_end = np.zeros((3, 2, lanes))
        wall_error = np.zeros((2, lanes))
        given_middle = np.zeros((3, lanes))
        given_end = np.zeros((3, lanes))
        net_before = np.zeros((2, lanes))
        gradient_middle = np.zeros(lanes)
        gradient_end = np.zeros(lanes)
        matrix = np.zeros((3, 3))
        right = np.zeros(3)
        change = np.zeros(3)
        guess = np.zeros(3)
        near = np.zeros(2)
        place = np.zeros(2)
        load = np.zeros(2)
        slope = np.zeros(2)
        solves = 0
        rows_most = rows.shape[0]
        profiles_most = profiles.shape[0]

        while True:
            running = 0
            # --- the step of each lane, and its inputs there
            for l in range(lanes):
                if status[l] != RUNNING:
                    step[l] = 0.0
                    scaled[l] = 0.0
                    continue
                running += 1
                piece = cursor[0, l]
                offset = state[0, l]
                since = state[3, l]
                if adaptive:
                    stop = until[l] if piece + 1 >= piece_stop[l] else piece_start[piece + 1]
                    left = (stop - piece_start[piece]) - since - offset
                    wanted = state[1, l]
                    if since + offset < calm_after[piece]:
                        wanted = min(wanted, longest_step[piece])
                    if since + offset < swift_until[piece]:
                        wanted = min(wanted, swift_step[piece])
                    if wanted >= left:
                        wanted = left
                    elif 2.0 * wanted > left:
                        wanted = 0.5 * left
                    step[l] = wanted
                else:
                    step[l] = plan[cursor[1, l]] - offset
                scaled[l] = ALPHA * step[l]
                for row in range(3):
                    _input(poly, coeff, rate, piece, row, since + (offset + GAMMA * step[l]), values)
                    middle_in[row, l] = values[0]
                    _input(poly, coeff, rate, piece, row, since + (offset + step[l]), values)
                    end_in[row, l] = values[0]
                    end_slope[row, l] = values[1]
            if running == 0:
                return solves

            # --- factors, kept while no lane changes its step
            same = True
            for l in range(lanes):
                same = same and scaled[l] == factored[l]
            if not same:
                for l in range(lanes):
                    factored[l] = scaled[l]
                    diagonal = storage[0, l] + scaled[l] * end_conductance[0, l]
                    if n > 1:
                        diagonal += scaled[l] * conductance[0, l]
                    else:
                        diagonal += scaled[l] * end_conductance[1, l]
                    pivot[0, l] = 1.0 / diagonal
                    lower[0, l] = 0.0
                for i in range(1, n):
                    for l in range(lanes):
                        below = scaled[l] * conductance[i - 1, l]
                        above = scaled[l] * (conductance[i, l] if i + 1 < n else end_conductance[1, l])
                        factor = below * pivot[i - 1, l]
                        lower[i, l] = factor
                        pivot[i, l] = 1.0 / (storage[i, l] + below + above - factor * below)
                if closed:
                    unit_responses(
                        conductance, volume, end_conductance, mean_weight, scaled, pivot, lower, units, response
                    )
                    solves += 3

            # --- the two stages
            for i in range(n):
                for l in range(lanes):
                    base[i, l] = velocity[i, l] + scaled[l] * rates[i, l]
            if closed:
                for l in range(lanes):
                    for e in range(2):
                        wall_base[e, l] = wall[SPEED, e, l] + scaled[l] * wall[RATE, e, l]
                        place_base[e, l] = wall[PLACE, e, l] + scaled[l] * wall[SPEED, e, l]
                guess_walls(link, flow, wall_base, gradient, middle_in, given_middle)
            solve_rates(
                storage, conductance, volume, end_conductance, scaled, pivot, lower, base, middle_in, middle_rate
            )
            if closed:
                for l in range(lanes):
                    if status[l] == RUNNING:
                        close_walls(
                            l, link, mode, flow, end_conductance, mean_weight, end_weight, units, response, scaled,
                            curve_speed, curve_value, middle_in, given_middle, base, middle_rate, wall_base, place_base,
                            wall_middle, gradient_middle, guess, place, near, matrix, right, change, load, slope,
                        )  # fmt: skip
            for i in range(n):
                for l in range(lanes):
                    middle[i, l] = base[i, l] + scaled[l] * middle_rate[i, l]
                    base[i, l] = velocity[i, l] + SHARE * step[l] * (rates[i, l] + middle_rate[i, l])
            if closed:
                for l in range(lanes):
                    for e in range(2):
                        part = SHARE * step[l]
                        wall_base[e, l] = wall[SPEED, e, l] + part * (wall[RATE, e, l] + wall_middle[RATE, e, l])
                        place_base[e, l] = wall[PLACE, e, l] + part * (wall[SPEED, e, l] + wall_middle[SPEED, e, l])
                guess_walls(link, flow, wall_base, gradient_middle, end_in, given_end)
            solve_rates(storage, conductance, volume, end_conductance, scaled, pivot, lower, base, end_in, end_rate)
            if closed:
                for l in range(lanes):
                    if status[l] == RUNNING:
                        close_walls(
                            l, link, mode, flow, end_conductance, mean_weight, end_weight, units, response, scaled,
                            curve_speed, curve_value, end_in, given_end, base, end_rate, wall_base, place_base,
                            wall_end, gradient_end, guess, place, near, matrix, right, change, load, slope,
                        )  # fmt: skip
            for i in range(n):
                for l in range(lanes):
                    end[i, l] = base[i, l] + scaled[l] * end_rate[i, l]
            solves += 2
            if adaptive:
                for i in range(n):
                    for l in range(lanes):
                        error[i, l] = (storage[i, l] * step[l]) * (
                            ERROR[0] * rates[i, l] + ERROR[1] * middle_rate[i, l] + ERROR[2] * end_rate[i, l]
                        )
                substitute(conductance, scaled, pivot, lower, error)
                solves += 1
                if closed:
                    for l in range(lanes):
                        if status[l] == RUNNING:
                            close_error(
                                l, link, mode, flow, end_conductance, mean_weight, end_weight, units, response, scaled,
                                curve_speed, curve_value, step, wall, wall_middle, wall_end, error, wall_error,
                                matrix, right, change, load, slope,
                            )  # fmt: skip

            # --- judge, accept, record
            for l in range(lanes):
                if status[l] != RUNNING:
                    continue
                if closed:
                    speed_low = wall_end[SPEED, 0, l]
                    speed_high = wall_end[SPEED, 1, l]
                else:
                    speed_low = end_in[0, l]
                    speed_high = end_in[1, l]
                flux_low = end_conductance[0, l] * (end[0, l] - speed_low)
                flux_high = end_conductance[1, l] * (end[n - 1, l] - speed_high)
                if not (np.isfinite(flux_low) and np.isfinite(flux_high) and np.isfinite(end[n // 2, l])):
                    status[l] = BROKEN
                    continue
                piece = cursor[0, l]
                if adaptive:
                    worst = 0.0
                    for i in range(n):
                        worst = max(worst, abs(error[i, l]))
                    for e in range(2):
                        worst = max(worst, abs(wall_error[e, l]))
                    worst /= velocity_scale[l]
                    local = max(stress_scale[0, l], abs(flux_low))
                    worst = max(worst, end_conductance[0, l] * abs(error[0, l] - wall_error[0, l]) / local)
                    local = max(stress_scale[1, l], abs(flux_high))
                    worst = max(worst, end_conductance[1, l] * abs(error[n - 1, l] - wall_error[1, l]) / local)
                    ratio = AIM * (tolerance[l] / max(worst, 1e-300)) ** (1.0 / 3.0)
                    if worst > tolerance[l] and step[l] > 1e-3 * first_step[piece]:
                        shorter = step[l] * max(SHRINK_MOST, min(ratio, 0.9))
                        state[1, l] = shorter
                        if shorter < 1e-250:
                            status[l] = STALLED
                        continue
                    if closed:
                        shorter = until_event(
                            l, link, mode, end_conductance, curve_speed, curve_value, given_end, end, wall, wall_end,
                            gradient_end, net_before, step[l], tolerance[l], velocity_scale[l], stress_scale, load,
                        )  # fmt: skip
                        if shorter > 0.0:
                            state[1, l] = shorter
                            continue
                    if ratio >= KEEP_ABOVE or ratio < 1.0:
                        grown = step[l] * max(SHRINK_MOST, min(ratio, GROW_MOST))
                    else:
                        grown = step[l]
                    # a step cut short to land on a break says nothing against the longer one before it
                    if step[l] < state[1, l] and ratio >= 1.0:
                        grown = max(grown, state[1, l])
                    state[1, l] = grown
                    stop = until[l] if piece + 1 >= piece_stop[l] else piece_start[piece + 1]
                    length = stop - piece_start[piece] - state[3, l]
                    landed = step[l] >= length - state[0, l] or state[0, l] + step[l] >= length
                    state[0, l] = length if landed else state[0, l] + step[l]
                else:
                    state[0, l] = plan[cursor[1, l]]
                    landed = plan_lands[cursor[1, l]]
                    cursor[1, l] += 1
                state[2, l] += 1.0
                mean = 0.0
                mean_rate = 0.0
                for i in range(n):
                    travel[i, l] += (
                        SHARE * step[l] * (velocity[i, l] + middle[i, l]) + scaled[l] * end[i, l]
                    )
                    velocity[i, l] = end[i, l]
                    rates[i, l] = end_rate[i, l]
                    mean += mean_weight[i, l] * end[i, l]
                    mean_rate += mean_weight[i, l] * end_rate[i, l]
                event = False
                mark = 0
                if closed:
                    event = advance_walls(
                        l, link, mode, end_conductance, curve_speed, curve_value, given_end, end_slope, velocity, wall,
                        wall_end, gradient, gradient_end, net_before, load,
                    )  # fmt: skip
                    if left_curve(l, link, curve_speed, wall):
                        status[l] = BEYOND
                        continue
                else:
                    for e in range(2):
                        wall[SPEED, e, l] = end_in[e, l]
                        wall[RATE, e, l] = end_slope[e, l]
                    gradient[l] = end_in[2, l]
                if landed:
                    mark = LANDS
                elif event:
                    mark = EVENT
                if landed or event or state[2, l] % record_every == 0.0:
                    _record(
                        l, piece, state[0, l], mean, mean_rate, profile_every, velocity, rates, travel, wall, gradient,
                        cursor, row_piece, row_offset, rows, row_mark, profile_row, profiles, mark,
                    )  # fmt: skip
                if not (landed or event):
                    if cursor[2, l] + 2 > rows_most or cursor[3, l] + 2 > profiles_most:
                        status[l] = FULL
                    continue
                state[2, l] = 0.0
                if landed and piece + 1 >= piece_stop[l]:
                    status[l] = DONE
                    continue
                longest = event_step[l]
                if not landed:
                    state[3, l] += state[0, l]
                state[0, l] = 0.0
                if landed:
                    piece += 1
                    cursor[0, l] = piece
                    state[3, l] = 0.0
                    longest = first_step[piece]
                    if event:
                        longest = min(longest, event_step[l])
                if closed:
                    for row in range(3):
                        _input(poly, coeff, rate, piece, row, state[3, l], values)
                        end_in[row, l] = values[0]
                        end_slope[row, l] = values[1]
                    if landed:
                        impulse(
                            l, link, mode, flow, storage, volume, end_weight, mean_weight, jump[piece, 2], velocity,
                            wall,
                        )
                    begin(
                        l, link, mode, flow, storage, conductance, volume, end_conductance, end_weight, mean_weight,
                        curve_speed, curve_value, end_in, end_slope, velocity, rates, wall, gradient, load,
                    )  # fmt: skip
                else:
                    _enter(l, piece, storage, volume, end_conductance, jump, rates, n)
                    for row in range(3):
                        _input(poly, coeff, rate, piece, row, 0.0, values)
                        if row < 2:
                            wall[SPEED, row, l] = values[0]
                            wall[RATE, row, l] = values[1]
                        else:
                            gradient[l] = values[0]
                state[1, l] = min(longest, state[1, l])
                mean = 0.0
                mean_rate = 0.0
                for i in range(n):
                    mean += mean_weight[i, l] * velocity[i, l]
                    mean_rate += mean_weight[i, l] * rates[i, l]
                mark = 0
                _record(
                    l, piece, state[0, l], mean, mean_rate, profile_every, velocity, rates, travel, wall, gradient,
                    cursor, row_piece, row_offset, rows, row_mark, profile_row, profiles, mark,
                )  # fmt: skip
                if cursor[2, l] + 2 > rows_most or cursor[3, l] + 2 > profiles_most:
                    status[l] = FULL

    return compiled(march)


march_open = _march_of(False)
march_closed = _march_of(True)


@compiled
def enter(
    storage, conductance, volume, end_conductance, mean_weight, end_weight,
    link, flow, curve_speed, curve_value, step_of_flow, inputs, input_slopes, velocity, rates, wall, gradient, mode,
):  # fmt: skip
    """Rates, friction's modes and pressure just after t = 0; ``inputs``, ``input_slopes`` [3, L] there,
    ``step_of_flow`` (L,) a sudden change of the prescribed mean velocity."""
    load = np.zeros(2)
    for l in range(velocity.shape[1]):
        impulse(l, link, mode, flow, storage, volume, end_weight, mean_weight, step_of_flow[l], velocity, wall)
        begin(
            l, link, mode, flow, storage, conductance, volume, end_conductance, end_weight, mean_weight,
            curve_speed, curve_value, inputs, input_slopes, velocity, rates, wall, gradient, load,
        )  # fmt: skip


@part
def _enter(l, piece, storage, volume, end_conductance, jump, rates, n):
    """Change of the rates across a break: only jumps of the inputs act, so nothing is lost to differences."""
    for i in range(n):
        rates[i, l] += volume[i, l] * jump[piece, 2] / storage[i, l]
    rates[0, l] += end_conductance[0, l] * jump[piece, 0] / storage[0, l]
    rates[n - 1, l] += end_conductance[1, l] * jump[piece, 1] / storage[n - 1, l]


@part
def _record(
    l, piece, offset, mean, mean_rate, profile_every, velocity, rates, travel, wall, gradient,
    cursor, row_piece, row_offset, rows, row_mark, profile_row, profiles, mark,
):  # fmt: skip
    """Append a row, and a profile where one is due."""
    n = velocity.shape[0]
    at = cursor[2, l]
    row_piece[at, l] = piece
    row_offset[at, l] = offset
    row_mark[at, l] = mark
    rows[at, l, 0] = velocity[0, l]
    rows[at, l, 1] = velocity[n - 1, l]
    rows[at, l, 2] = mean
    rows[at, l, 3] = mean_rate
    for kind in range(3):
        for e in range(2):
            rows[at, l, 4 + 2 * kind + e] = wall[kind, e, l]
    rows[at, l, 10] = gradient[l]
    if (cursor[4, l] + at) % profile_every == 0:
        to = cursor[3, l]
        profile_row[to, l] = at
        for i in range(n):
            profiles[to, l, 0, i] = velocity[i, l]
            profiles[to, l, 1, i] = rates[i, l]
            profiles[to, l, 2, i] = travel[i, l]
        cursor[3, l] = to + 1
    cursor[2, l] = at + 1


