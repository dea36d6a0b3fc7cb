"""Bessel functions in the forms that keep all digits: phase and amplitude, and exponentially scaled pairs."""

from __future__ import annotations

import numpy as np
from scipy.special import ive, jv, kve, yv

from transient.series.gapshape import GapShape

# Hankel's expansions reach round-off from here on (error about exp(-2 z)).
LARGE = 28.0
# The general routines lose digits and at last fail beyond this argument.
HUGE = 1e5
_TERMS = 26


def _hankel_coefficients(order: float) -> np.ndarray:
    """a_k(nu) of Abramowitz & Stegun (1964) 9.2.5-9.2.10 and 9.7.2, k = 0 .. TERMS-1."""
    out = np.ones(_TERMS)
    for k in range(1, _TERMS):
        out[k] = out[k - 1] * (4 * order * order - (2 * k - 1) ** 2) / (8 * k)
    return out


def _expansion(order: float, w: np.ndarray) -> np.ndarray:
    """sum of a_k w^k (Horner)."""
    out = np.zeros_like(w)
    for coefficient in _hankel_coefficients(order)[::-1]:
        out = out * w + coefficient
    return out


def reduced_hankel(order: float, z: np.ndarray) -> np.ndarray:
    """sqrt(pi z / 2) H1_nu(z) exp(-i (z - nu pi/2 - pi/4)) for real z > 0, any shape: slow, near 1 for large z.

    Its argument is what Bessel functions differ in phase from plain sines (A&S 9.2.5, 9.2.6).
    """
    z = np.asarray(z, dtype=float)
    if order == -0.5 or order == 0.5:
        return np.ones(z.shape, complex)
    out = np.empty(z.shape, complex)
    far = z >= LARGE
    out[far] = _expansion(order, 1j / z[far])
    near = ~far
    x = z[near]
    out[near] = np.sqrt(np.pi * x / 2) * (jv(order, x) + 1j * yv(order, x))
    out[near] *= np.exp(-1j * (x - order * np.pi / 2 - np.pi / 4))
    return out


def hankel_slopes(order: float, z: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """The reduced Hankel function and its first two derivatives by z, for z > LARGE."""
    terms = _hankel_coefficients(order) * 1j ** np.arange(_TERMS) * z[:, None] ** -np.arange(float(_TERMS))
    k = np.arange(_TERMS)
    return terms.sum(axis=1), -(terms * k).sum(axis=1) / z, (terms * k * (k + 1)).sum(axis=1) / z**2


def scaled_k(order: float, z: np.ndarray, expand: bool | np.ndarray) -> np.ndarray:
    """K_nu(z) exp(z) for Re z > 0; where ``expand`` by Hankel's expansion (A&S 9.7.2)."""
    return _scaled(order, z, expand, _general_k, 1.0, np.sqrt(np.pi / 2))


def scaled_i(order: float, z: np.ndarray, expand: bool | np.ndarray) -> np.ndarray:
    """I_nu(z) exp(-z); expanded (A&S 9.7.1) it is the growing solution without its decaying admixture."""
    return _scaled(order, z, expand, _general_i, -1.0, 1.0 / np.sqrt(2 * np.pi))


def _general_k(order: float, z: np.ndarray) -> np.ndarray:
    return kve(order, z)


def _general_i(order: float, z: np.ndarray) -> np.ndarray:
    return ive(order, z) * np.exp(-1j * z.imag)


def _scaled(order, z, expand, general, sign, factor):  # type: ignore[no-untyped-def]
    far = np.broadcast_to(expand, z.shape) | (np.abs(z) > HUGE)
    out = np.empty(z.shape, complex)
    x = z[far]
    out[far] = factor / np.sqrt(x) * _expansion(order, sign / x)
    out[~far] = general(order, z[~far])
    return out


def decaying(shape: GapShape, q: np.ndarray, y: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """(value, slope, integral kernel) of the solution of s w = r^-m (r^m w')' that decays away from the lower wall.

    ``q`` (S,) = sqrt(s), Re q > 0; ``y`` (k,) in gaps.  Each (S, k).  The third, in rotating gaps only, is the
    integral of r w with the sign of its antiderivative.
    """
    return _solution(shape, q, y, scaled_k, -1.0, np.exp(-q[:, None] * y[None, :]))


def growing(shape: GapShape, q: np.ndarray, y: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """The same for the solution that decays away from the upper wall (regular at a pipe's axis)."""
    return _solution(shape, q, y, scaled_i, 1.0, np.exp(-q[:, None] * (1.0 - y[None, :])))


def _solution(shape, q, y, function, sign, damping):  # type: ignore[no-untyped-def]
    q = q[:, None]
    if shape.metric == 0:
        return damping, sign * q * damping, np.zeros_like(damping)
    r = shape.a + y[None, :]
    expand = np.abs(q * shape.a) > LARGE
    order = shape.order
    z = q * r
    power = damping * (r**-order if order else 1.0)
    value = function(order, z, expand) * power
    slope = sign * q * function(order + 1, z, expand) * power
    integral = sign * function(0, z, expand) / q * damping if shape.metric == 3 else np.zeros_like(damping)
    return value, slope, integral
