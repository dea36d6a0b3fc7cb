"""The hand formula: the steady flow that belongs to the drive's present values, at every instant.

Steady flow of every shape follows from one flux: ``r^m mu dw/dr = F(r) = F_inner - G (r^(m+1) - inner^(m+1))/(m+1)``.
For plates this is the Couette-Poiseuille profile, for a pipe Hagen-Poiseuille, for annuli the profiles of
Bird, Stewart & Lightfoot, Transport Phenomena (2.4 and 3.6; section numbers from memory).
All differences of nearly equal radii are taken from the depth ``r - inner``: a nearly closed annulus keeps its digits.
"""

from __future__ import annotations

from functools import cache

import numpy as np

from transient.gap.problem import LOWER, UPPER, Problem
from transient.result.history import History

# Gauss points across the gap for averages; in the logarithm of the radius these are exact to round-off at ratio 0.01.
GAUSS = 48


def lever(problem: Problem) -> tuple[float, float]:
    """Factors A with ``flux r^m mu dw/dr = A x stress``: r^m, or r^2 in a rotating gap.  Two numbers, ends in order."""
    power = 2 if problem.rotating else problem.metric
    return problem.inner**power, problem.outer**power


def _less_log(x: np.ndarray) -> np.ndarray:
    """``x - log(1 + x)`` for x >= 0 without loss of digits (series of 2 artanh(z), z = x/(2 + x), where x is small)."""
    x = np.asarray(x, dtype=float)
    z = np.where(x < 0.2, x / (2.0 + x), 0.0)
    square = z * z
    tail = np.zeros_like(z)
    for odd in range(21, 1, -2):
        tail = square * (tail + 1.0 / odd)
    return np.where(x < 0.2, 2.0 * square / (1.0 - z) - 2.0 * z * tail, x - np.log1p(x))


def resistance(metric: int, inner: float, depth: np.ndarray) -> np.ndarray:
    """Integral of r^-m dr from the inner end over ``depth`` (k,); infinite from an axis."""
    depth = np.asarray(depth, dtype=float)
    if metric == 0:
        return depth
    if inner == 0.0:
        return np.full_like(depth, np.inf)
    if metric == 1:
        return np.log1p(depth / inner)
    return depth * (2.0 * inner + depth) / (2.0 * inner**2 * (inner + depth) ** 2)


def pressure_head(metric: int, inner: float, depth: np.ndarray) -> np.ndarray:
    """Integral of r^-m (r^(m+1) - inner^(m+1))/(m+1) dr over ``depth`` (k,): mu x fall of velocity per unit G."""
    depth = np.asarray(depth, dtype=float)
    if metric == 0:
        return 0.5 * depth**2
    if metric != 1:
        return np.zeros_like(depth)
    if inner == 0.0:
        return 0.25 * depth**2
    x = depth / inner
    return 0.5 * inner**2 * (0.5 * x * x + _less_log(x))


def section_measure(problem: Problem) -> float:
    """Integral of r^m dr over the gap for m = 0, 1 (0 in a rotating gap, which no pressure drives)."""
    gap = problem.gap
    return {0: gap, 1: 0.5 * gap * (problem.inner + problem.outer)}.get(problem.metric, 0.0)


def _fluxes(
    problem: Problem, speeds: np.ndarray, gradient: np.ndarray
) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """(flux at inner, flux at outer, fluid's w at the first end, at the second end), each (n,).

    At an axis or a shear-free inner end the speed there follows from the other wall.
    """
    if problem.law.code != 0:
        raise ValueError("the steady formulas are those of a constant viscosity")
    low, up = problem.walls
    mu, m, gap = problem.viscosity, problem.metric, np.asarray(problem.gap)
    held = (low.kind == "moving", up.kind == "moving")
    if not any(held):
        raise ValueError("a gap without any wall that holds the fluid has no steady flow")
    push = section_measure(problem)
    head = pressure_head(m, problem.inner, gap)
    through = resistance(m, problem.inner, gap)
    slip_low = low.slip_length / problem.inner**m if held[0] else 0.0
    slip_up = up.slip_length / problem.outer**m if held[1] else 0.0
    if all(held):
        difference = mu * (speeds[:, UPPER] - speeds[:, LOWER])
        first = (difference + gradient * (head + slip_up * push)) / (through + slip_low + slip_up)
    else:
        first = np.zeros_like(gradient) if held[1] else gradient * push
    second = first - gradient * push
    # With the inner end free, F_inner is 0 and an axis' infinite resistance carries nothing.
    across = ((first * through if held[0] else 0.0) - gradient * head) / mu
    if held[0]:
        start = speeds[:, LOWER] + slip_low * first / mu
        end = speeds[:, UPPER] - slip_up * second / mu if held[1] else start + across
    else:
        end = speeds[:, UPPER] - slip_up * second / mu
        start = end - across
    return first, second, start, end


def _rows(speeds: np.ndarray, gradient: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    return np.atleast_2d(np.asarray(speeds, dtype=float)), np.atleast_1d(np.asarray(gradient, dtype=float))


def quasi_steady_stress(problem: Problem, speeds: np.ndarray, gradient: np.ndarray) -> np.ndarray:
    """Steady wall stress (n, 2) in Pa, traction of the fluid on the wall.

    ``speeds`` (n, 2) m/s or rad/s, ``gradient`` (n,) pressure drop per length in Pa/m.
    Raises ValueError where no wall holds the fluid or the viscosity is not constant.
    """
    speeds, gradient = _rows(speeds, gradient)
    first, second, _, _ = _fluxes(problem, speeds, gradient)
    at_inner, at_outer = lever(problem)
    lower = first / at_inner if problem.walls[LOWER].kind == "moving" else np.zeros_like(first)
    upper = -second / at_outer if problem.walls[UPPER].kind == "moving" else np.zeros_like(second)
    return np.stack([lower, upper], axis=1)


def profiles(problem: Problem, speeds: np.ndarray, gradient: np.ndarray, depth: np.ndarray) -> np.ndarray:
    """Steady w (n, k) at ``depth`` (k,) from the inner end, from the fluid's value there."""
    first, _, start, _ = _fluxes(problem, speeds, gradient)
    m, inner, mu = problem.metric, problem.inner, problem.viscosity
    w = start[:, None] - gradient[:, None] * pressure_head(m, inner, depth) / mu
    if problem.walls[LOWER].kind == "moving" or np.any(first):
        w = w + first[:, None] * resistance(m, inner, depth) / mu
    return w


def steady_profile(problem: Problem, speeds: np.ndarray, gradient: float, r: np.ndarray) -> np.ndarray:
    """Steady velocity (k,) in m/s (angular speed in rad/s in a rotating gap) at coordinates ``r`` (k,) m."""
    speeds, gradient_row = _rows(speeds, np.asarray(gradient))
    return profiles(problem, speeds, gradient_row, np.asarray(r, dtype=float) - problem.inner)[0]


@cache
def _gauss() -> tuple[np.ndarray, np.ndarray]:
    """Gauss-Legendre points and weights on [0, 1]."""
    x, weight = np.polynomial.legendre.leggauss(GAUSS)
    return 0.5 * (x + 1.0), 0.5 * weight


def mean_weights(problem: Problem) -> tuple[np.ndarray, np.ndarray]:
    """(depth (k,) m from the inner end, weight (k,)): mean velocity = sum(weight x w), m/s.

    The mean over the flow area; in a rotating gap the tangential speed averaged over the radius (w is angular there).
    """
    x, weight = _gauss()
    inner, gap = problem.inner, problem.gap
    if problem.metric == 0:
        return gap * x, weight
    if inner == 0.0:
        return gap * x, 2.0 * x * weight
    span = np.log1p(gap / inner)
    depth = inner * np.expm1(span * x)
    area = section_measure(problem) if problem.metric == 1 else gap
    return depth, weight * span * (inner + depth) ** 2 / area


def quasi_steady_mean(problem: Problem, speeds: np.ndarray, gradient: np.ndarray) -> np.ndarray:
    """Steady mean velocity (n,) in m/s for ``speeds`` (n, 2), ``gradient`` (n,), as in ``mean_weights``."""
    speeds, gradient = _rows(speeds, gradient)
    depth, weight = mean_weights(problem)
    return profiles(problem, speeds, gradient, depth) @ weight


def quasi_steady_gradient(problem: Problem, speeds: np.ndarray, mean: np.ndarray) -> np.ndarray:
    """Steady pressure drop per length (n,) in Pa/m that makes ``mean`` (n,) m/s flow between walls at ``speeds``."""
    speeds, mean = _rows(speeds, mean)
    nothing = np.zeros_like(mean)
    dragged = quasi_steady_mean(problem, speeds, nothing)
    pushed = quasi_steady_mean(problem, np.zeros((1, 2)), np.ones(1))
    return (mean - dragged) / pushed


def steady_drop(problem: Problem, history: History) -> np.ndarray:
    """Pressure drop per length (n,) of the steady flow at each row: the drive's own, or, where the flow is prescribed,
    what that flow would need if it were steady (finite where the true one is not)."""
    if problem.flow is None:
        return history.gradient
    return quasi_steady_gradient(problem, history.speed, history.mean)
