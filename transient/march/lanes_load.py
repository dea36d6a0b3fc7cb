"""A case into a lane, its pieces one after the other, and its rows out of it: see ``lanes``."""

from __future__ import annotations

import numpy as np

from transient.compiled import part
from transient.march.closure import GAMMA
from transient.march.lanes_layout import (
    AFTER,
    AWAY,
    BEFORE,
    BODY,
    CELL,
    CONDUCTANCE,
    DRIVE,
    END,
    FLUID,
    FLUX,
    HELD,
    LANE_A,
    LANE_BODY,
    LANE_CELL,
    LANE_CEND,
    LANE_DRIVE,
    LANE_FLUID,
    LANE_FLUX,
    LANE_FREE,
    LANE_G,
    LANE_HELD,
    LANE_MID_U,
    LANE_RADIUS,
    LANE_RATE_G,
    LANE_RATE_U,
    LANE_U,
    LANE_WAVE_U,
    LEVER,
    LOWER_SPEED,
    LOWER_STRESS,
    MEAN,
    PUSH,
    RADIUS,
    STEADY,
    STORAGE,
    UPPER_SPEED,
    UPPER_STRESS,
    WEIGHT,
)
from transient.march.lanes_vector import HALF


@part
def set_grid(c, grid, table, ends, storage, conductance, weight, lever, before, after, lane):
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
        lane[LANE_HELD, l] = ends[grid, HELD, side]
        lane[LANE_FREE, l] = 1.0 - ends[grid, HELD, side]
        lane[LANE_CEND, l] = ends[grid, END, side]
        lane[LANE_FLUX, l] = ends[grid, FLUX, side]
        lane[LANE_CELL, l] = ends[grid, CELL, side]
        lane[LANE_RADIUS, l] = ends[grid, RADIUS, side]
        lane[LANE_DRIVE, l] = ends[grid, DRIVE, side]
        lane[LANE_BODY, l] = ends[grid, BODY, side]
        lane[LANE_FLUID, l] = ends[grid, FLUID, side]


@part
def set_flow(c, grid, table, now, end, w, z, steady):
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
def set_piece(c, poly, wave, lane):
    """The inputs of a piece, ``poly`` (3, 4) and ``wave`` (3, 4), into lane ``c``."""
    for side in range(2):
        l = c + side * HALF
        for k in range(4):
            lane[LANE_U + k, l] = poly[side, k]
            lane[LANE_G + k, l] = poly[2, k]
        for k in range(2):
            lane[LANE_RATE_U + k, l] = wave[side, 2 + k]
            lane[LANE_RATE_G + k, l] = wave[2, 2 + k]


@part
def set_waves(c, wave, x, h, lane):
    """Waves of lane ``c`` at the offset ``x`` and their turns in a step ``h``."""
    for side in range(2):
        l = c + side * HALF
        for row in range(2):
            own = side if row == 0 else 2
            real, other, decay, turn = wave[own, 0], wave[own, 1], wave[own, 2], wave[own, 3]
            size = np.exp(decay * x)
            across, up = size * np.cos(turn * x), size * np.sin(turn * x)
            lane[LANE_WAVE_U + 2 * row, l] = real * across - other * up
            lane[LANE_WAVE_U + 2 * row + 1, l] = real * up + other * across
            for part_of in range(2):
                length = GAMMA * h if part_of == 0 else h
                size = np.exp(decay * length)
                to = LANE_MID_U + 4 * row + 2 * part_of
                lane[to, l] = size * np.cos(turn * length)
                lane[to + 1, l] = size * np.sin(turn * length)


@part
def enter(c, jump, push, storage, conductance, w, z, lane):
    """What jumps of the wall inputs (3,) and of the ``push`` do to the rates of lane ``c``, and to the wall's node."""
    last = storage.shape[0] - 1
    for side in range(2):
        l = c + side * HALF
        a = lane[LANE_A, l]
        if push != 0.0:
            for j in range(last + 1):
                if storage[j, l] > 0.0:
                    z[j, l] += a * push * (lane[LANE_FLUID, l] if j == 0 else 1.0)
        if lane[LANE_HELD, l] > 0.5:
            z[1, l] += a * conductance[0, l] * jump[side] / storage[1, l]
            w[0, l] += jump[side]
            z[0, l] = w[0, l]
        elif lane[LANE_DRIVE, l] > 0.0:
            z[0, l] += a * lane[LANE_DRIVE, l] * jump[side] / storage[0, l]


@part
def write(c, case, row, out, rows):
    """Row ``row`` of ``case`` from the vectors of ``out``."""
    rows[case, row, LOWER_STRESS] = out[0, c]
    rows[case, row, UPPER_STRESS] = out[0, c + HALF]
    rows[case, row, MEAN] = out[1, c]
    rows[case, row, AWAY] = out[2, c]
    rows[case, row, LOWER_SPEED] = out[3, c]
    rows[case, row, UPPER_SPEED] = out[3, c + HALF]
    rows[case, row, PUSH] = out[4, c]
