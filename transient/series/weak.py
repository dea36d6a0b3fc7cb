"""The slowest mode where walls hold the fluid but weakly: lambda << 1, where phases would lose digits.

Written with the Bessel functions themselves, ``phi = r^-nu (Y_nu(lambda r) J_a - J_nu(lambda r) Y_a) / |H_a|`` with
``_a`` the lower wall's condition, the same function as in ``modes``.
"""

from __future__ import annotations

import numpy as np
from scipy.optimize import brentq
from scipy.special import jv, yv

from transient.series.gapshape import FREE, GapShape

# Slower than this, phases lose digits.
WEAK = 1.0


def weak_root(shape: GapShape, below: float) -> tuple[float, float]:
    """(the one root below ``below``, its relative error)."""
    log_root = brentq(lambda v: _balance(shape, np.exp(v)), np.log(1e-12), np.log(below), xtol=1e-16, rtol=9e-16)
    root = float(np.exp(log_root))
    for _ in range(3):
        slope = (_balance(shape, root * (1 + 1e-4)) - _balance(shape, root * (1 - 1e-4))) / 2e-4
        root *= 1 - _balance(shape, root) / slope
    return root, float(1e-15 / abs(slope))


def weak_ends(shape: GapShape, root: float) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Values, slopes and (rotating) C_0 at both ends, each (2,)."""
    factor, j_part, y_part = _amounts(shape, root)
    ends = np.array([shape.a, shape.b])
    slope = -factor * root * ends**-shape.order * _mix(shape.order + 1, root * ends, j_part, y_part)
    value = factor * ends**-shape.order * _mix(shape.order, root * ends, j_part, y_part)
    for end, (slip, side) in enumerate(((shape.lower, 1.0), (shape.upper, -1.0))):
        if slip == FREE:
            slope[end] = 0.0
        elif slip < 1.0:
            value[end] = side * slip * slope[end]
        else:
            slope[end] = side * value[end] / slip
    spin = factor * _mix(0, root * ends, j_part, y_part) if shape.metric == 3 else np.zeros(2)
    return value, slope, spin


def weak_velocity(shape: GapShape, root: float, y: np.ndarray) -> np.ndarray:
    """The mode at ``y`` (k,)."""
    factor, j_part, y_part = _amounts(shape, root)
    r = shape.a + y
    return factor * r**-shape.order * _mix(shape.order, root * r, j_part, y_part)


def _mix(order: float, z: np.ndarray, j_part: float, y_part: float) -> np.ndarray:
    return yv(order, z) * j_part - jv(order, z) * y_part


def _amounts(shape: GapShape, root: float) -> tuple[float, float, float]:
    j_part, y_part = _condition(shape, root, shape.a, shape.lower, 1.0)
    size = np.hypot(j_part, y_part)
    return float(np.sqrt(np.pi * root / 2)), j_part / size, y_part / size


def _condition(shape: GapShape, x: float, r: float, slip: float, side: float) -> tuple[float, float]:
    """J and Y in a wall's condition, C_nu + side slip lambda C_(nu+1)."""
    return tuple(float(sum(parts)) for parts in _terms(shape, x, r, slip, side))  # type: ignore[return-value]


def _terms(shape: GapShape, x: float, r: float, slip: float, side: float) -> list[tuple[float, ...]]:
    nu = shape.order
    if slip == FREE:
        return [(f(nu + 1, x * r),) for f in (jv, yv)]
    return [(f(nu, x * r), side * slip * x * f(nu + 1, x * r)) for f in (jv, yv)]


def _balance(shape: GapShape, x: float) -> float:
    """The characteristic function over the size of its terms."""
    high = _terms(shape, x, shape.b, shape.upper, -1.0)
    j_high, y_high = (sum(parts) for parts in high)
    j_size, y_size = (sum(abs(part) for part in parts) for parts in high)
    if shape.axis:
        return j_high / j_size
    j_low, y_low = _condition(shape, x, shape.a, shape.lower, 1.0)
    return (j_low * y_high - y_low * j_high) / (abs(j_low) * y_size + abs(y_low) * j_size)
