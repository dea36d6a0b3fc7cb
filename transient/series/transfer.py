"""Transfer functions: the gap's answer in Laplace space to each input, in closed form for every shape and wall.

Young breaks of a drive are answered by inverting these on a hyperbola (Weideman & Trefethen, Math. Comp. 76
(2007) 1341); they also give the steady response to exponentials and the slow-drive coefficients.
"""

from __future__ import annotations

import numpy as np

from transient.series.basis import decaying, growing
from transient.series.gapshape import FREE, GapShape

# Hyperbola z(u) = MU (1 + sin(iu - PHI)), nodes (k + 1/2) STEP, for ages from 1 to 2.3 times the level's smallest.
# Optimised numerically against s^(-1/2) ... s^(-9/2) and exp(-c sqrt s)/s: largest error 2.2e-14 (computed).
PHI, MU, STEP, NODES = 0.88218621, 7.2158968, 0.08221155, 32
CROSSING = MU * (1 - np.sin(PHI))

_U = (np.arange(NODES) + 0.5) * STEP
NODE = MU * (1 + np.sin(1j * _U - PHI))
WEIGHT = STEP / np.pi * MU * 1j * np.cos(1j * _U - PHI)

WALLS = 3  # outputs of wall_transfer: stress on the lower wall, on the upper wall, mean velocity


def wall_transfer(shape: GapShape, s: np.ndarray) -> np.ndarray:
    """(S, 3, 3): inputs by [lower stress, upper stress, mean velocity] at complex ``s`` (S,) off the negative axis."""
    ends = np.array([0.0, 1.0])
    down, up, parts = _solve(shape, s, ends)
    slopes = _combine(parts, down[1], up[1])
    out = np.empty((len(s), 3, 3), complex)
    out[:, :, 0] = shape.levers[0] * slopes[:, :, 0]
    out[:, :, 1] = -shape.levers[1] * slopes[:, :, 1]
    out[:, :, :2] *= shape.grips
    if shape.metric == 3:
        spins = _combine(parts, down[2], up[2])
        out[:, :, 2] = spins[:, :, 1] - spins[:, :, 0]
        return out
    weight = np.array([shape.a, shape.b]) ** shape.metric if shape.metric else np.ones(2)
    flux = slopes * weight
    out[:, :, 2] = (flux[:, :, 1] - flux[:, :, 0]) / shape.volume / s[:, None]
    out[:, 2, 2] += 1.0 / s
    return out


def velocity_transfer(shape: GapShape, s: np.ndarray, y: np.ndarray) -> np.ndarray:
    """(S, 3, k): inputs by velocities at ``y`` (k,)."""
    down, up, parts = _solve(shape, s, y)
    out = _combine(parts, down[0], up[0])
    if shape.metric != 3:
        out[:, 2] += 1.0 / s[:, None]
    return out


def _combine(parts: np.ndarray, down: np.ndarray, up: np.ndarray) -> np.ndarray:
    return parts[:, :, 0, None] * down[:, None, :] + parts[:, :, 1, None] * up[:, None, :]


def _solve(shape: GapShape, s: np.ndarray, y: np.ndarray):  # type: ignore[no-untyped-def]
    """Both solutions at ``y``, and their amounts (S, 3, 2) for each unit input."""
    q = np.sqrt(s)
    ends = np.array([0.0, 1.0])
    up_ends = growing(shape, q, ends)
    down_ends = up_ends if shape.axis else decaying(shape, q, ends)
    low = [_condition(shape.lower, f[0][:, 0], -f[1][:, 0]) for f in (down_ends, up_ends)]
    high = [_condition(shape.upper, f[0][:, 1], f[1][:, 1]) for f in (down_ends, up_ends)]
    right = np.zeros((len(s), 3, 2), complex)
    right[:, 0, 0] = 0.0 if shape.lower == FREE or shape.axis else 1.0
    right[:, 1, 1] = 0.0 if shape.upper == FREE else 1.0
    if shape.metric != 3:
        right[:, 2, 0] = 0.0 if shape.lower == FREE or shape.axis else -1.0 / s
        right[:, 2, 1] = 0.0 if shape.upper == FREE else -1.0 / s
    parts = np.zeros((len(s), 3, 2), complex)
    if shape.axis:
        parts[:, :, 1] = right[:, :, 1] / high[1][:, None]
    else:
        determinant = (low[0] * high[1] - low[1] * high[0])[:, None]
        parts[:, :, 0] = (right[:, :, 0] * high[1][:, None] - right[:, :, 1] * low[1][:, None]) / determinant
        parts[:, :, 1] = (right[:, :, 1] * low[0][:, None] - right[:, :, 0] * high[0][:, None]) / determinant
    up = growing(shape, q, y)
    down = tuple(np.zeros_like(f) for f in up) if shape.axis else decaying(shape, q, y)
    return down, up, parts


def _condition(slip: float, value: np.ndarray, outward: np.ndarray) -> np.ndarray:
    return outward if slip == FREE else value + slip * outward


def sudden_limit(shape: GapShape, y: np.ndarray | None) -> np.ndarray:
    """(3, n) answer at the very instant of a unit jump of each input: [stresses, mean], or velocities at ``y``."""
    if y is None:
        out = np.zeros((3, WALLS))
        for wall, slip in enumerate((shape.lower, shape.upper)):
            if slip != FREE and not (shape.axis and wall == 0):
                out[wall, wall] = -np.inf if slip == 0.0 else -shape.levers[wall] / slip
        return out
    out = np.zeros((3, len(y)))
    if shape.lower == 0.0 and not shape.axis:
        out[0, y == 0.0] = 1.0
    if shape.upper == 0.0:
        out[1, y == 1.0] = 1.0
    return out
