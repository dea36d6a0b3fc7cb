"""Transfer functions at any s: in closed form, and near s = 0, where that would lose its digits, by power series.

The gap's answers are analytic around s = 0 out to its slowest eigenvalue.  Their power series come from a circle half
way out (Cauchy), the first coefficient from the steady flow itself, so that sums that vanish in steady flow do so here.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from transient.series.gapshape import GapShape
from transient.series.modes import modes
from transient.series.steady import steady_flow
from transient.series.transfer import velocity_transfer, wall_transfer

_CIRCLE = 64  # points: the next coefficient that they mistake is 2^-64 of its own
_TERMS = 30
_RADIUS, _NEAR = 0.5, 0.15  # of the slowest eigenvalue: 30 powers of 0.15 leave 2e-25


def wall_response(shape: GapShape, s: np.ndarray) -> np.ndarray:
    """(S, 3, 3) as ``wall_transfer``, for all s off the negative axis."""
    return _anywhere(shape, s, None)


def velocity_response(shape: GapShape, s: np.ndarray, y: np.ndarray) -> np.ndarray:
    """(S, 3, k) as ``velocity_transfer``, for all s off the negative axis."""
    return _anywhere(shape, s, tuple(y.tolist()))


def _anywhere(shape: GapShape, s: np.ndarray, y: tuple[float, ...] | None) -> np.ndarray:
    if shape.unrestrained:
        return _closed_form(shape, s, y)
    near = np.abs(s) < _NEAR * _slowest(shape)
    if not near.any():
        return _closed_form(shape, s, y)
    series = _series(shape, y)
    out = np.empty((len(s), 3, series.shape[2]), complex)
    total = np.zeros((int(near.sum()), 3, series.shape[2]), complex)
    for coefficient in series[::-1]:
        total = total * s[near, None, None] + coefficient
    out[near] = total
    if not near.all():
        out[~near] = _closed_form(shape, s[~near], y)
    return out


def _closed_form(shape: GapShape, s: np.ndarray, y: tuple[float, ...] | None) -> np.ndarray:
    return wall_transfer(shape, s) if y is None else velocity_transfer(shape, s, np.array(y))


def _slowest(shape: GapShape) -> float:
    return float(modes(shape, 2).rate[0])


@lru_cache(maxsize=32)
def _series(shape: GapShape, y: tuple[float, ...] | None) -> np.ndarray:
    """(TERMS, 3, Q) power series."""
    circle = _RADIUS * _slowest(shape) * np.exp(2j * np.pi * (np.arange(_CIRCLE) + 0.5) / _CIRCLE)
    powers = circle[None, :] ** -np.arange(_TERMS)[:, None]
    out = np.einsum("ks,siq->kiq", powers, _closed_form(shape, circle, y)).real / _CIRCLE
    steady = steady_flow(shape)
    if y is None:
        out[0] = np.concatenate([steady.stress(), steady.mean()[:, None]], axis=1)
    else:
        out[0] = steady.velocity(np.array(y))
    return out
