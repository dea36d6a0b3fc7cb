"""What profiles on graded nodes tell: integrals over the gap, wall fluxes, and how soon after a break they can.

Shares nothing with the solver's own volumes and conductances, so that it can judge them.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from transient.gap.problem import LOWER, UPPER

STENCIL = 7  # nodes of the one-sided difference
ROUNDING = 64.0 * np.finfo(float).eps


@dataclass(frozen=True, eq=False)
class Forms:
    """Integrals over the gap of cubics through N nodes, times r^m.

    ``weight`` (N,): integral of w; ``mass``, ``stiffness`` (4, N): diagonals 0 to 3 (the upper ones doubled) of the
    quadratic forms of w^2 and (dw/dr)^2.
    """

    weight: np.ndarray
    mass: np.ndarray
    stiffness: np.ndarray


def _lagrange(nodes: np.ndarray, x: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Values and slopes (I, g, q) of the q Lagrange polynomials on ``nodes`` (I, q) at ``x`` (I, g)."""
    q = nodes.shape[1]
    value, slope = np.empty((*x.shape, q)), np.empty((*x.shape, q))
    for j in range(q):
        others = [k for k in range(q) if k != j]
        factor = [(x - nodes[:, k, None]) / (nodes[:, j, None] - nodes[:, k, None]) for k in others]
        value[..., j] = math.prod(factor)
        slope[..., j] = sum(
            math.prod(f for i, f in enumerate(factor) if i != left) / (nodes[:, j, None] - nodes[:, k, None])
            for left, k in enumerate(others)
        )
    return value, slope


def distinct(position: np.ndarray) -> np.ndarray:
    """Indices of nodes (ends kept) that lie further apart than round-off of the coordinate."""
    least = ROUNDING * float(np.abs(position).max())
    keep = np.append(True, np.diff(position) > least)
    if not keep[-1]:
        keep[-1] = True
        keep[np.flatnonzero(keep)[-2]] = False
    keep[0] = True
    return np.flatnonzero(keep)


def forms(position: np.ndarray, metric: int) -> Forms:
    """The integrals on nodes ``position`` (N >= 4,), which may be graded."""
    return _forms(tuple(position.tolist()), metric)


@lru_cache(maxsize=8)  # several balances of one solve ask for the same
def _forms(nodes: tuple[float, ...], metric: int) -> Forms:
    position = np.array(nodes)
    n = len(position)
    depth = position - position[0]
    first = np.clip(np.arange(n - 1) - 1, 0, n - 4)
    index = first[:, None] + np.arange(4)
    x, weight = np.polynomial.legendre.leggauss(5)
    step = np.diff(depth)[:, None]
    at = depth[:-1, None] + 0.5 * step * (x + 1.0)
    measure = 0.5 * step * weight * (position[0] + at) ** metric
    # Scaled by the interval, so that products of small differences stay in range.
    value, slope = _lagrange((depth[index] - depth[:-1, None]) / step, (at - depth[:-1, None]) / step)
    slope = slope / step[..., None]
    total = np.zeros(n)
    np.add.at(total, index, (measure[..., None] * value).sum(axis=1))
    mass, stiffness = np.zeros((4, n)), np.zeros((4, n))
    for i in range(4):
        for j in range(i, 4):
            twice = 1.0 if i == j else 2.0
            np.add.at(mass[j - i], index[:, i], twice * (measure * value[..., i] * value[..., j]).sum(axis=1))
            np.add.at(stiffness[j - i], index[:, i], twice * (measure * slope[..., i] * slope[..., j]).sum(axis=1))
    return Forms(total, mass, stiffness)


def quadratic(diagonals: np.ndarray, a: np.ndarray, b: np.ndarray) -> np.ndarray:
    """Symmetric quadratic form (k,) of profiles ``a`` and ``b`` (k, N) from its ``diagonals`` (4, N)."""
    out = (a * b) @ diagonals[0]
    for d in range(1, 4):
        out = out + 0.5 * (a[:, :-d] * b[:, d:] + a[:, d:] * b[:, :-d]) @ diagonals[d, :-d]
    return out


def resolution_time(position: np.ndarray, kinematic: float, accuracy: float) -> np.ndarray:
    """Time (2,) after a break until the layer at each wall is wide enough for ``STENCIL`` nodes to follow it.

    On an error-function layer the one-sided difference over ``span`` errs by 6e-6 (span^2/(nu t))^3 of the local value
    (from the layer's seventh derivative); a tenth of the accuracy is allowed.
    """
    span = np.array([position[STENCIL - 1] - position[0], position[-1] - position[-STENCIL]])
    return span**2 / kinematic * max(1.0, (6e-5 / accuracy) ** (1.0 / 3.0))


def wall_flux(position: np.ndarray, profile: np.ndarray, metric: int, end: int, nodes: int = STENCIL) -> np.ndarray:
    """Flux r^m dw/dr (k,) at an end by a one-sided difference over ``nodes`` in the coordinate ``integral r^-m dr``
    (exact in steady wall-driven flow); ``profile`` (k, N)."""
    if end == LOWER:
        near, w = position[:nodes] - position[0], profile[:, :nodes]
        wall = position[0]
    else:
        near, w = (position[-nodes:] - position[-1])[::-1], profile[:, : -nodes - 1 : -1]
        wall = position[-1]
    r = wall + near
    along = {
        0: lambda: near,
        1: lambda: np.log1p(near / wall),
        3: lambda: near * (r + wall) / (2.0 * (r * wall) ** 2),
    }[metric]()
    scale = along[-1]
    return (w - w[:, :1]) @ _first_slope(along / scale) / scale


def _first_slope(x: np.ndarray) -> np.ndarray:
    """Weights (q,) of the derivative at the first of the nodes ``x`` (q,); that of the first is left 0, since values
    count from there."""
    apart = x[:, None] - x
    np.fill_diagonal(apart, 1.0)
    weight = apart[0].prod() / apart[0] / apart.prod(axis=1)
    weight[0] = 0.0
    return weight


def wall_values_before(position: np.ndarray, profile: np.ndarray, infinite: np.ndarray) -> np.ndarray:
    """Profiles whose wall value is the continuation of the liquid's where the wall has just jumped.

    ``profile`` (k, N), ``infinite`` (k, 2); a layer of no thickness carries no momentum, yet a cubic sees some.
    """
    if not infinite.any():
        return profile
    out = profile.copy()
    for end, nodes, wall in ((LOWER, slice(1, 4), 0), (UPPER, slice(-4, -1), -1)):
        rows = np.flatnonzero(infinite[:, end])
        if len(rows):
            value, _ = _lagrange(position[None, nodes] - position[wall], np.zeros((1, 1)))
            out[rows, wall] = out[rows, nodes] @ value[0, 0]
    return out
