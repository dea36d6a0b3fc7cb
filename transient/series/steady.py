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

    Each is ``constant + wall q(y) + drop P(y)`` with q the profile driven by the lower wall's unit gradient and P
    that of the unit pressure drop; columns of ``weights`` (3, 3).  Dimensionless as in ``GapShape``.
    """

    shape: GapShape
    weights: np.ndarray

    def velocity(self, y: np.ndarray) -> np.ndarray:
        """(3, k) at ``y`` (k,)."""
        return self.weights @ np.stack([np.ones_like(y), *_profiles(self.shape, y)[0]])

    def stress(self) -> np.ndarray:
        """(3, 2): traction on the lower and upper wall."""
        slopes = _profiles(self.shape, np.array([0.0, 1.0]))[1]
        gradient = self.weights[:, 1:] @ slopes
        return gradient * np.array([self.shape.levers[0], -self.shape.levers[1]]) * self.shape.grips

    def mean(self) -> np.ndarray:
        """(3,) section average; in a rotating gap of the tangential speed over the radius."""
        return self.weights @ _means(self.shape)


@lru_cache(maxsize=512)
def steady_flow(shape: GapShape) -> SteadyFlow:
    """Unit steady flows of a gap.  Raises SeriesError where nothing holds the fluid back."""
    if shape.unrestrained:
        raise SeriesError("no wall holds the fluid back, so there is no steady state")
    (value, slope) = _profiles(shape, np.array([0.0, 1.0]))
    terms = np.array([[1.0, 1.0], *value])  # constant, q, P at both ends
    slopes = np.array([[0.0, 0.0], *slope])
    low = _condition(shape.lower, terms[:, 0], -slopes[:, 0])
    high = _condition(shape.upper, terms[:, 1], slopes[:, 1])
    rows = np.array([low, high])
    if shape.axis:
        rows[0] = [0.0, 1.0, 0.0]
    weights = np.zeros((3, 3))
    for i, right in enumerate(np.eye(3)):
        weights[i, :2] = np.linalg.solve(rows[:, :2], shape.grips * right[:2] - right[2] * rows[:, 2])
        weights[i, 2] = right[2]
    if shape.metric == 3:
        weights[2] = 0.0
    return SteadyFlow(shape, weights)


def _condition(slip: float, value: np.ndarray, outward: np.ndarray) -> np.ndarray:
    return outward if slip == FREE else value + slip * outward


def _profiles(shape: GapShape, y: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """((2, k) q and P, (2, k) their slopes); q' = 1 and P' = 0 at the lower wall."""
    a, r = shape.a, shape.a + y
    if shape.metric == 0:
        return np.stack([y, -y * y / 2]), np.stack([np.ones_like(y), -y])
    if shape.axis:
        return np.stack([0 * y, -y * y / 4]), np.stack([0 * y, -y / 2])
    if shape.metric == 1:
        logarithm = np.log1p(y / a)
        wide = -y * (2 * a + y) / 4 + a * a / 2 * logarithm
        narrow = -y * y / 2 + a * a / 2 * log_rest(y / a)
        drop = np.where(y > a / 4, wide, narrow)
        return np.stack([a * logarithm, drop]), np.stack([a / r, -y * (2 * a + y) / (2 * r)])
    return np.stack([a * y * (2 * a + y) / (2 * r * r), 0 * y]), np.stack([(a / r) ** 3, 0 * y])


def _means(shape: GapShape) -> np.ndarray:
    """Means of 1, q, P (integrals by hand)."""
    a = shape.a
    if shape.metric == 0:
        return np.array([1.0, 0.5, -1.0 / 6.0])
    if shape.axis:
        return np.array([1.0, 0.0, -1.0 / 8.0])
    x = 1.0 / a
    rest = float(log_rest(x))
    if shape.metric == 1:
        if a > 4:
            moment = a * (0.5 - x * x / 4 + shape.b**2 * rest / 2)
            drop = -a / 4 - 3 / 16 + (a * shape.b) ** 2 * rest / 4
        else:
            moment = a * (shape.b**2 / 2 * np.log1p(x) - (2 * a + 1) / 4)
            drop = -((2 * a + 1) ** 2) / 16 + a / 2 * moment
        return np.array([1.0, moment / shape.volume, drop / shape.volume])
    spin = 1.0 - a * a * rest if a > 4 else a + 0.5 - a * a * np.log1p(x)
    return np.array([shape.volume, a / 2 * spin, 0.0])
