"""Modes written with the Bessel functions themselves, where phases would lose digits.

Two places: the slowest mode of fluid that is held but weakly (lambda << 1), and a thin inner cylinder.
``phi = r^-nu sqrt(pi lambda / 2) (Y_nu(lambda r) J_a - J_nu(lambda r) Y_a) / |H_a|`` with ``_a`` the lower wall's
condition is the same function as in ``modes``.
"""

from __future__ import annotations

import numpy as np
from scipy.special import jv, yv

from transient.series.gapshape import FREE, GapShape

# Slower than this, phases lose digits.
WEAK = 1.0


def weak_root(shape: GapShape, below: float) -> tuple[float, float]:
    """(the one root below ``below``, its relative error)."""
    from scipy.optimize import brentq  # rarely needed, and slow to load

    log_root = brentq(lambda v: _balance(shape, np.exp(v)), np.log(1e-12), np.log(below), xtol=1e-16, rtol=9e-16)
    root = float(np.exp(log_root))
    for _ in range(3):
        slope = (_balance(shape, root * (1 + 1e-4)) - _balance(shape, root * (1 - 1e-4))) / 2e-4
        root *= 1 - _balance(shape, root) / slope
    return root, float(1e-15 / abs(slope))


def bessel_mode(shape: GapShape, root: np.ndarray, y: np.ndarray) -> np.ndarray:
    """Modes of ``root`` (M, 1) at ``y`` (k,): (M, k)."""
    j_part, y_part = _condition(shape, root, shape.a, shape.lower, 1.0)
    r = shape.a + y
    z = root * r
    mix = (yv(shape.order, z) * j_part - jv(shape.order, z) * y_part) / np.hypot(j_part, y_part)
    return np.sqrt(np.pi * root / 2) * r**-shape.order * mix


def bessel_mean(shape: GapShape, root: float) -> float:
    """Integral of r phi over the gap, by Gauss-Legendre in log r: in closed form the ends all but cancel."""
    x, weight = np.polynomial.legendre.leggauss(120)
    span = np.log1p(1.0 / shape.a)
    y = shape.a * np.expm1(0.5 * (x + 1.0) * span)
    phi = bessel_mode(shape, np.array([[root]]), y)[0]
    return float(phi * (shape.a + y) ** 2 @ weight * 0.5 * span)


def _condition(shape: GapShape, x, r: float, slip: float, side: float):  # type: ignore[no-untyped-def]
    """J and Y in a wall's condition, C_nu + side slip lambda C_(nu+1)."""
    return tuple(sum(parts) for parts in _terms(shape, x, r, slip, side))


def _terms(shape: GapShape, x, r: float, slip: float, side: float):  # type: ignore[no-untyped-def]
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
