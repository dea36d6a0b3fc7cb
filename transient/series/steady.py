"""Steady flow in closed form: plates, pipe, axial and rotating annulus, with slip and shear-free walls."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from transient.series.gapshape import FREE, GapShape, SeriesError


def log_rest(x: np.ndarray | float) -> np.ndarray | float:
    """log(1 + x) - x + x^2/2 without cancellation, x >= 0."""
    x = np.asarray(x, dtype=float)
    small = np.minimum(x, 0.25)
    series = np.zeros_like(x)
    for k in range(30, 2, -1):
        series = (1.0 if k % 2 else -1.0) / k + small * series
    return np.where(x < 0.25, small**3 * series, np.log1p(x) - x + x * x / 2)


@dataclass(frozen=True, eq=False)
class SteadyFlow:
    """Three unit steady flows: lower wall's speed, upper wall's speed, pressure drop per length (rows).

    Each is a sum of four profiles, columns of ``weights`` (3, 4): a constant, the wall-driven profiles that vanish at
    the lower and at the upper wall, and that of the unit pressure drop.  Dimensionless as in ``GapShape``.
    """

    shape: GapShape
    weights: np.ndarray

    def velocity(self, y: np.ndarray) -> np.ndarray:
        """(3, k) at ``y`` (k,)."""
        return self.weights @ _profiles(self.shape, y)[0]

    def stress(self) -> np.ndarray:
        """(3, 2): traction on the lower and upper wall."""
        gradient = self.weights @ _profiles(self.shape, np.array([0.0, 1.0]))[1]
        return gradient * np.array([self.shape.levers[0], -self.shape.levers[1]]) * self.shape.grips

    def mean(self) -> np.ndarray:
        """(3,) section average; in a rotating gap of the tangential speed over the radius."""
        return self.weights @ _means(self.shape)


@lru_cache(maxsize=512)
def steady_flow(shape: GapShape) -> SteadyFlow:
    """Unit steady flows of a gap.  Raises SeriesError where nothing holds the fluid back."""
    if shape.unrestrained:
        raise SeriesError("no wall holds the fluid back, so there is no steady state")
    value, slope = _profiles(shape, np.array([0.0, 1.0]))
    low = _condition(shape.lower, value[:, 0], -slope[:, 0])
    high = _condition(shape.upper, value[:, 1], slope[:, 1])
    if shape.axis:
        low = np.array([0.0, 1.0, 0.0, 0.0])
    # Two walls that hold: each speed in the profile that vanishes at the other wall, so that small values stay exact.
    # Else a constant carries the speed of the one wall there is.
    pair = [1, 2] if shape.grips.all() else [0, 1]
    weights = np.zeros((3, 4))
    for i, right in enumerate(np.eye(3)):
        known = shape.grips * right[:2] - right[2] * np.array([low[3], high[3]])
        weights[i, pair] = _solve(low[pair], high[pair], known)
        weights[i, 3] = right[2]
    if shape.metric == 3:
        weights[2] = 0.0
    return SteadyFlow(shape, weights)


def _solve(low: np.ndarray, high: np.ndarray, known: np.ndarray) -> np.ndarray:
    """Both amounts by Cramer's rule, which keeps zeros."""
    determinant = low[0] * high[1] - low[1] * high[0]
    return np.array([known[0] * high[1] - known[1] * low[1], known[1] * low[0] - known[0] * high[0]]) / determinant


def _condition(slip: float, value: np.ndarray, outward: np.ndarray) -> np.ndarray:
    return outward if slip == FREE else value + slip * outward


def _profiles(shape: GapShape, y: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """((4, k) profiles, (4, k) their slopes); the wall-driven ones have slopes 1 and -1 at the lower wall."""
    a, b, r = shape.a, shape.b, shape.a + y
    one, zero, down = np.ones_like(y), np.zeros_like(y), 1.0 - y
    if shape.metric == 0:
        return np.stack([one, y, down, -y * y / 2]), np.stack([zero, one, -one, -y])
    if shape.axis:
        return np.stack([one, zero, zero, -y * y / 4]), np.stack([zero, zero, zero, -y / 2])
    if shape.metric == 1:
        logarithm = np.log1p(y / a)
        wide = -y * (2 * a + y) / 4 + a * a / 2 * logarithm
        narrow = -y * y / 2 + a * a / 2 * log_rest(y / a)
        drop = np.where(y > a / 4, wide, narrow)
        return (
            np.stack([one, a * logarithm, a * np.log1p(down / r), drop]),
            np.stack([zero, a / r, -a / r, -y * (2 * a + y) / (2 * r)]),
        )
    up = a * y * (2 * a + y) / (2 * r * r)
    return (
        np.stack([one, up, a**3 * down * (b + r) / (2 * (r * b) ** 2), zero]),
        np.stack([zero, (a / r) ** 3, -((a / r) ** 3), zero]),
    )


def _means(shape: GapShape) -> np.ndarray:
    """Means of the four profiles (integrals by hand); narrow gaps by what is left of the logarithm."""
    a, b = shape.a, shape.b
    if shape.metric == 0:
        return np.array([1.0, 0.5, 0.5, -1.0 / 6.0])
    if shape.axis:
        return np.array([1.0, 0.0, 0.0, -1.0 / 8.0])
    x, wide = 1.0 / a, a < 4
    rest, logarithm = float(log_rest(x)), float(np.log1p(x))
    if shape.metric == 1:
        if wide:
            up = a * (b * b / 2 * logarithm - (2 * a + 1) / 4)
            down = a * ((2 * a + 1) / 4 - a * a / 2 * logarithm)
            drop = -((2 * a + 1) ** 2) / 16 + a / 2 * up
        else:
            up = a * (0.5 - x * x / 4 + b * b * rest / 2)
            down = a * logarithm * shape.volume - up
            drop = -a / 4 - 3 / 16 + (a * b) ** 2 * rest / 4
        return np.array([1.0, up / shape.volume, down / shape.volume, drop / shape.volume])
    up = a / 2 * (a + 0.5 - a * a * logarithm if wide else 1.0 - a * a * rest)
    total = a * (2 * a + 1) / (2 * b * b) * shape.volume
    down = a**3 / 2 * (logarithm - (2 * a + 1) / (2 * b * b)) if wide else total - up
    return np.array([shape.volume, up, down, 0.0])
