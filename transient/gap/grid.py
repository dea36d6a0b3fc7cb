"""Nodes across the gap, graded towards the walls, and the finite volumes on them.

Every steady state is exact at the nodes on any grid: the conductance of an interval is
``1 / integral r^-m dr`` and the face between two nodes lies where ``r_f^(m+1) = integral r dr / integral r^-m dr``
(midpoint between plates), so wall-driven and pressure-driven steady flow satisfy the discrete balance identically.
At a pipe's axis both integrals degenerate: face at r_1/2, conductance 1/2.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

_GAUSS_X, _GAUSS_W = np.polynomial.legendre.leggauss(10)


@dataclass(frozen=True, eq=False)
class Grid:
    """N + 1 nodes from the lower to the upper end and the volumes around them (viscosity and density left out).

    ``metric`` m; ``radius`` (N+1,) coordinate r, m; ``step`` (N,) interval lengths, m (kept apart: near the upper
    wall they are smaller than the round-off of r); ``conductance`` (N,) = 1 / integral r^-m dr;
    ``volume`` (N+1,) = integral r^m dr around a node; ``mean_weight`` (N+1,) such that ``mean_weight @ w`` is the
    mean velocity; ``stress_radius`` (2,) what a flux r^m mu dw/dr is divided by to give the stress.
    """

    metric: int
    radius: np.ndarray
    step: np.ndarray
    conductance: np.ndarray
    volume: np.ndarray
    mean_weight: np.ndarray
    stress_radius: np.ndarray


def spacing(cells: int, lower_layer: float, upper_layer: float) -> tuple[np.ndarray, np.ndarray]:
    """(distances from the lower wall, from the upper wall) of ``cells`` + 1 nodes across a unit gap.

    The density of nodes is 1/(y + lower_layer) + 1/(1 - y + upper_layer): cells grow in proportion to the distance
    from a wall beyond its layer.  Doubling ``cells`` keeps every node.
    """
    lower = np.log1p(1.0 / lower_layer)
    upper = np.log1p(1.0 / upper_layer)
    along = np.linspace(0.0, lower + upper, cells + 1)
    back = along[::-1]
    low = lower_layer * np.expm1(along) / (1.0 + lower_layer / (1.0 + upper_layer) * np.exp(along))
    high = upper_layer * np.expm1(back) / (1.0 + upper_layer / (1.0 + lower_layer) * np.exp(back))
    low[-1] = high[0] = 1.0
    return low, high


def build(metric: int, inner: float, outer: float, cells: int, layers: tuple[float, float]) -> Grid:
    """The grid of a gap.  ``layers``: thickness of each wall's fine zone as a share of the gap."""
    low, high = spacing(cells, *layers)
    gap = outer - inner
    step = gap * np.where(low[1:] < 0.5, np.diff(low), -np.diff(high))
    radius = inner + gap * low
    radius[-1] = outer
    conductance, beyond = _intervals(metric, radius, step)
    volume = _volumes(metric, radius, step, beyond)
    weight = _mean_weights(metric, radius, step, conductance, volume)
    divisor = radius[[0, -1]] ** min(metric, 2) if metric else np.ones(2)
    return Grid(metric, radius, step, conductance, volume, weight, np.where(divisor > 0, divisor, 1.0))


def _intervals(metric: int, radius: np.ndarray, step: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """(conductance, distance from the interval's lower node to its face), free of cancellation in thin gaps."""
    low, high = radius[:-1], radius[1:]
    if metric == 0:
        return 1.0 / step, 0.5 * step
    if metric == 3:
        conductance = 2.0 * low**2 * high**2 / (step * (low + high))
        x = step / low
        return conductance, low * x / (np.sqrt(1.0 + x) + 1.0)
    safe = np.where(low > 0.0, low, 1.0)
    x = step / safe
    log = np.log1p(x)
    # (1 + x/2) x / log1p(x) - 1, by its series where the direct form would lose its digits
    small = x < 1e-3
    direct = (1.0 + 0.5 * x) * x / log - 1.0
    excess = np.where(small, x + x * x / 6.0 - x**4 / 180.0 + x**5 / 180.0, direct)
    beyond = safe * excess / (np.sqrt(1.0 + excess) + 1.0)
    axis = low == 0.0
    return np.where(axis, 0.5, 1.0 / log), np.where(axis, 0.5 * step, beyond)


def _volumes(metric: int, radius: np.ndarray, step: np.ndarray, beyond: np.ndarray) -> np.ndarray:
    """Integral of r^m over each node's cell: the part below it and the part above."""
    before = np.append(0.0, step - beyond)
    after = np.append(beyond, 0.0)
    width = before + after
    centre = radius + 0.5 * (after - before)
    if metric == 0:
        return width
    if metric == 1:
        return width * centre
    return width * centre * (centre**2 + 0.25 * width**2)


def _mean_weights(
    metric: int, radius: np.ndarray, step: np.ndarray, conductance: np.ndarray, volume: np.ndarray
) -> np.ndarray:
    """Weights of the mean velocity: exact for steady flow, fourth order otherwise.

    In each interval the profile is the wall-driven steady one through its two nodes plus a bubble carried by the
    local curvature (1/r^m)(r^m w')', which the nodes' own balances supply.
    The mean is over the section; in a rotating gap that of the tangential speed r w over the radius.
    """
    low = radius[:-1, None]
    x = 0.5 * step[:, None] * (1.0 + _GAUSS_X)
    weight = 0.5 * step[:, None] * _GAUSS_W
    r = low + x
    measure = {0: np.ones_like(r), 1: r, 3: r}[metric] * weight
    safe = np.where(low > 0.0, low, 1.0)
    whole = step[:, None]
    if metric == 0:
        share = x / whole
        bubble = 0.5 * x * (whole - x)
    elif metric == 1:
        share = np.where(low > 0.0, np.log1p(x / safe) / np.log1p(whole / safe), (x / whole) ** 2)
        bubble = 0.25 * (whole * (2.0 * low + whole) * share - x * (2.0 * low + x))
    else:
        high = low + whole
        share = (x * (2.0 * low + x) / (low * r) ** 2) / (whole * (low + high) / (low * high) ** 2)
        bubble = 0.125 * (whole * (2.0 * low + whole) * share - x * (2.0 * low + x))
    upper = (measure * share).sum(axis=1)
    lower = measure.sum(axis=1) - upper
    curve = (measure * bubble).sum(axis=1)
    out = np.zeros(len(radius))
    out[:-1] += lower
    out[1:] += upper
    out += _curvature_weights(curve, conductance, volume)
    return out / (step.sum() if metric == 3 else measure.sum())


def _curvature_weights(curve: np.ndarray, conductance: np.ndarray, volume: np.ndarray) -> np.ndarray:
    """The bubbles' weight moved from curvatures to node values; an end node borrows its neighbour's curvature."""
    nodes = len(volume)
    share = np.zeros(nodes)
    share[:-1] += 0.5 * curve
    share[1:] += 0.5 * curve
    if nodes > 2:
        share[1] += share[0]
        share[-2] += share[-1]
    share[0] = share[-1] = 0.0
    share /= volume
    flux = np.diff(share)  # minus the divergence's transpose, interval by interval
    out = np.zeros(nodes)
    out[:-1] -= conductance * flux
    out[1:] += conductance * flux
    return out
