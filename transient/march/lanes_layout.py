"""Where what stands in the arrays of the lanes: see ``lanes``."""

from __future__ import annotations

from transient.march.closure import ALPHA, SHARE

ROWS = 2  # rows of one block
# what a grid's table holds of each node, both halves: [grid, FIELD, node, side]
STORAGE, CONDUCTANCE, WEIGHT, LEVER, BEFORE, AFTER, STEADY = 0, 1, 2, 3, 4, 5, 6  # STEADY: three rows, unit inputs
NODE_FIELDS = 9
# and of each half's end: [grid, FIELD, side]
# HELD 1 where the end's node has the wall's speed; END what an input of zero draws from that node per unit of speed,
# DRIVE what a unit of the input gives it; BODY 1 where the node is a wall that carries a body, FLUID the share of its
# storage that is fluid; FLUX, CELL, RADIUS the stress: conductance beside the wall, half cell, divisor of a flux
HELD, END, FLUX, CELL, RADIUS, DRIVE, BODY, FLUID = 0, 1, 2, 3, 4, 5, 6, 7
END_FIELDS = 8
# what a case says: [case, FIELD]
LONGEST, CALM, GROWTH, ROOM, CASE_FIELDS = 0, 1, 2, 3, 4  # ROOM: rows after which it is given up
# what a recorded row holds
LOWER_STRESS, UPPER_STRESS, MEAN, AWAY, PUSH, LOWER_SPEED, UPPER_SPEED, FIELDS = 0, 1, 2, 3, 4, 5, 6, 7
# rows of the lanes' own numbers [LANE_FIELDS, WIDTH]
LANE_A, LANE_H, LANE_X, LANE_CEND, LANE_FREE, LANE_HELD, LANE_FLUX, LANE_CELL, LANE_RADIUS = range(9)
LANE_U, LANE_G = 9, 13  # cubics of wall speed and push
# waves of both: real, imaginary part; their rates; turns to the middle and to the end of a step
LANE_WAVE_U, LANE_WAVE_G, LANE_RATE_U, LANE_RATE_G = 17, 19, 21, 23
LANE_MID_U, LANE_END_U, LANE_MID_G, LANE_END_G = 25, 27, 29, 31
LANE_DRIVE, LANE_BODY, LANE_FLUID, LANE_PUSH, LANE_FIELDS = 33, 34, 35, 36, 37

SHARE_OF_STAGE = SHARE / ALPHA
