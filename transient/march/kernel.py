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

from transient.compiled import compiled, inlined

GAMMA = 2.0 - np.sqrt(2.0)
ALPHA = GAMMA / 2.0  # the matrix is storage - ALPHA step A in both stages
SHARE = np.sqrt(2.0) / 4.0  # weight of the first two rates in the step
ERROR = (SHARE - (1.0 - SHARE) / 3.0, SHARE - (3.0 * SHARE + 1.0) / 3.0, ALPHA - ALPHA / 3.0)

# what a recorded row holds: the unknowns next to the walls, and the mean of the unknowns with its rate
FIRST, LAST, MEAN, MEAN_RATE, FIELDS = 0, 1, 2, 3, 4
RUNNING, DONE, FULL, STALLED, BROKEN = 0, 1, 2, 3, 4

GROW_MOST, SHRINK_MOST, AIM = 2.0, 0.2, 0.85
KEEP_ABOVE = 1.15  # a step that could grow by less keeps its length, and with it the factors


@inlined
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


@compiled
def march(
    storage, conductance, volume, end_conductance, mean_weight,  # [n, L], [n-1, L], [n, L], [2, L], [n, L]
    piece_start, piece_first, piece_stop, until,  # times of all pieces (P,), each lane's range (L,), end (L,)
    poly, coeff, rate, jump,  # (P, 3, 4), (P, 3, K), (P, 3, K), jumps of the inputs at each piece's start (P, 3)
    first_step, longest_step, calm_after,  # (P,) s: of each piece, and the offset from which steps may be longer
    tolerance, velocity_scale, stress_scale,  # (L,); (L,); [2, L] as end flux
    plan, plan_lands,  # ends of prescribed steps as offsets (S,), whether each ends its piece; empty: adaptive
    record_every, profile_every,
    velocity, rates, travel,  # [n, L] state, updated
    cursor,  # int64 [5, L]: piece, place in the plan, rows, profiles, rows handed over before these
    state,  # [3, L]: offset, step, steps since the piece began
    row_piece, row_offset, rows, profile_row, profiles,  # records: (R, L), (R, L), (R, L, 4), (Q, L), (Q, L, 3, n)
    status,
):  # fmt: skip
    """March every lane from its state to its end, or until its records are full (status FULL: call again).

    Returns the number of solves.  ``status`` (L,) holds RUNNING (start), then DONE, FULL, STALLED (the step
    vanished) or BROKEN (a value is no longer finite).
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
    values = np.empty(3)
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
            if adaptive:
                stop = until[l] if piece + 1 >= piece_stop[l] else piece_start[piece + 1]
                left = (stop - piece_start[piece]) - offset
                wanted = state[1, l]
                if offset < calm_after[piece]:
                    wanted = min(wanted, longest_step[piece])
                if wanted >= left:
                    wanted = left
                elif 2.0 * wanted > left:
                    wanted = 0.5 * left
                step[l] = wanted
            else:
                step[l] = plan[cursor[1, l]] - offset
            scaled[l] = ALPHA * step[l]
            for row in range(3):
                _input(poly, coeff, rate, piece, row, offset + GAMMA * step[l], values)
                middle_in[row, l] = values[0]
                _input(poly, coeff, rate, piece, row, offset + step[l], values)
                end_in[row, l] = values[0]
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

        # --- the two stages
        for i in range(n):
            for l in range(lanes):
                base[i, l] = velocity[i, l] + scaled[l] * rates[i, l]
        _solve(storage, conductance, volume, end_conductance, scaled, pivot, lower, base, middle_in, middle_rate)
        for i in range(n):
            for l in range(lanes):
                middle[i, l] = base[i, l] + scaled[l] * middle_rate[i, l]
                base[i, l] = velocity[i, l] + SHARE * step[l] * (rates[i, l] + middle_rate[i, l])
        _solve(storage, conductance, volume, end_conductance, scaled, pivot, lower, base, end_in, end_rate)
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
            _substitute(conductance, scaled, pivot, lower, error)
            solves += 1

        # --- judge, accept, record
        for l in range(lanes):
            if status[l] != RUNNING:
                continue
            flux_low = end_conductance[0, l] * (end[0, l] - end_in[0, l])
            flux_high = end_conductance[1, l] * (end[n - 1, l] - end_in[1, l])
            if not (np.isfinite(flux_low) and np.isfinite(flux_high) and np.isfinite(end[n // 2, l])):
                status[l] = BROKEN
                continue
            piece = cursor[0, l]
            if adaptive:
                worst = 0.0
                for i in range(n):
                    worst = max(worst, abs(error[i, l]))
                worst /= velocity_scale[l]
                local = max(stress_scale[0, l], abs(flux_low))
                worst = max(worst, end_conductance[0, l] * abs(error[0, l]) / local)
                local = max(stress_scale[1, l], abs(flux_high))
                worst = max(worst, end_conductance[1, l] * abs(error[n - 1, l]) / local)
                ratio = AIM * (tolerance[l] / max(worst, 1e-300)) ** (1.0 / 3.0)
                if worst > tolerance[l] and step[l] > 1e-3 * first_step[piece]:
                    shorter = step[l] * max(SHRINK_MOST, min(ratio, 0.9))
                    state[1, l] = shorter
                    if shorter < 1e-250:
                        status[l] = STALLED
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
                length = stop - piece_start[piece]
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
            if landed or state[2, l] % record_every == 0.0:
                _record(
                    l, piece, state[0, l], mean, mean_rate, profile_every, velocity, rates, travel,
                    cursor, row_piece, row_offset, rows, profile_row, profiles,
                )  # fmt: skip
            if landed:
                state[2, l] = 0.0
                if piece + 1 >= piece_stop[l]:
                    status[l] = DONE
                    continue
                piece += 1
                cursor[0, l] = piece
                state[0, l] = 0.0
                _enter(l, piece, storage, volume, end_conductance, jump, rates, n)
                state[1, l] = min(first_step[piece], state[1, l])
                mean_rate = 0.0
                for i in range(n):
                    mean_rate += mean_weight[i, l] * rates[i, l]
                _record(
                    l, piece, 0.0, mean, mean_rate, profile_every, velocity, rates, travel,
                    cursor, row_piece, row_offset, rows, profile_row, profiles,
                )  # fmt: skip
            if cursor[2, l] + 2 > rows_most or cursor[3, l] + 2 > profiles_most:
                status[l] = FULL


@inlined
def _solve(storage, conductance, volume, end_conductance, scaled, pivot, lower, base, inputs, out):
    """Rates at a stage: (storage - scaled A) f = A base + inputs, into ``out``."""
    n, lanes = storage.shape
    for l in range(lanes):
        here = base[0, l]
        flux = end_conductance[0, l] * (inputs[0, l] - here)
        if n > 1:
            flux += conductance[0, l] * (base[1, l] - here)
        else:
            flux += end_conductance[1, l] * (inputs[1, l] - here)
        out[0, l] = flux + volume[0, l] * inputs[2, l]
    for i in range(1, n - 1):
        for l in range(lanes):
            here = base[i, l]
            source = (
                conductance[i, l] * (base[i + 1, l] - here)
                - conductance[i - 1, l] * (here - base[i - 1, l])
                + volume[i, l] * inputs[2, l]
            )
            out[i, l] = source + lower[i, l] * out[i - 1, l]
    if n > 1:
        i = n - 1
        for l in range(lanes):
            here = base[i, l]
            source = (
                end_conductance[1, l] * (inputs[1, l] - here)
                - conductance[i - 1, l] * (here - base[i - 1, l])
                + volume[i, l] * inputs[2, l]
            )
            out[i, l] = source + lower[i, l] * out[i - 1, l]
    for l in range(lanes):
        out[n - 1, l] *= pivot[n - 1, l]
    for i in range(n - 2, -1, -1):
        for l in range(lanes):
            out[i, l] = (out[i, l] + scaled[l] * conductance[i, l] * out[i + 1, l]) * pivot[i, l]


@inlined
def _substitute(conductance, scaled, pivot, lower, out):
    """Forward and back substitution of ``out`` with the step's factors."""
    n, lanes = out.shape
    for i in range(1, n):
        for l in range(lanes):
            out[i, l] += lower[i, l] * out[i - 1, l]
    for l in range(lanes):
        out[n - 1, l] *= pivot[n - 1, l]
    for i in range(n - 2, -1, -1):
        for l in range(lanes):
            out[i, l] = (out[i, l] + scaled[l] * conductance[i, l] * out[i + 1, l]) * pivot[i, l]


@inlined
def _enter(l, piece, storage, volume, end_conductance, jump, rates, n):
    """Change of the rates across a break: only jumps of the inputs act, so nothing is lost to differences."""
    for i in range(n):
        rates[i, l] += volume[i, l] * jump[piece, 2] / storage[i, l]
    rates[0, l] += end_conductance[0, l] * jump[piece, 0] / storage[0, l]
    rates[n - 1, l] += end_conductance[1, l] * jump[piece, 1] / storage[n - 1, l]


@inlined
def _record(
    l, piece, offset, mean, mean_rate, profile_every, velocity, rates, travel,
    cursor, row_piece, row_offset, rows, profile_row, profiles,
):  # fmt: skip
    """Append a row, and a profile where one is due."""
    n = velocity.shape[0]
    at = cursor[2, l]
    row_piece[at, l] = piece
    row_offset[at, l] = offset
    rows[at, l, 0] = velocity[0, l]
    rows[at, l, 1] = velocity[n - 1, l]
    rows[at, l, 2] = mean
    rows[at, l, 3] = mean_rate
    if (cursor[4, l] + at) % profile_every == 0:
        to = cursor[3, l]
        profile_row[to, l] = at
        for i in range(n):
            profiles[to, l, 0, i] = velocity[i, l]
            profiles[to, l, 1, i] = rates[i, l]
            profiles[to, l, 2, i] = travel[i, l]
        cursor[3, l] = to + 1
    cursor[2, l] = at + 1
