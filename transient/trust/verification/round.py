"""Classical start-up series in a pipe and between cylinders, after a unit jump."""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from scipy.special import j0, j1, jn_zeros, jv, yv

from transient.gap.problem import Problem
from transient.trust.verification.unit_jump import StartUp, startup

PIPE = "start-up of pipe flow: Szymanski (1932), J. Math. Pures Appl. 11, 67"
BORE = "cylinder with a surface value: Carslaw & Jaeger, Conduction of Heat in Solids, 7.6 (from memory)"
SLEEVE = "hollow cylinder with surface values: Carslaw & Jaeger, Conduction of Heat in Solids, 7.10 (from memory)"
ANNULUS = "start-up of flow in an annulus: W. Mueller (1936), ZAMM 16, 227 (from memory)"
ROTATING = "tangential start-up in an annulus: Bird & Curtiss (1959), Chem. Eng. Sci. 11, 108 (from memory)"


@lru_cache(maxsize=4)
def _zeros(modes: int) -> np.ndarray:
    return jn_zeros(0, modes)


def bore(problem: Problem, r: np.ndarray, modes: int) -> StartUp:
    """The pipe's wall starts: u/U = 1 - 2 sum J0(l r/R)/(l J1(l)) exp(-l^2 nu t/R^2), J0(l) = 0."""
    radius, mu, l = problem.outer, problem.viscosity, _zeros(modes)
    stress = np.full(modes, 2.0 * mu / radius)
    profile = (2.0 / (l * j1(l)))[:, None] * j0(np.outer(l, r / radius))
    steady = np.concatenate([[0.0, 0.0, 1.0], np.ones(len(r))])
    return _series(BORE, problem, l / radius, steady, [np.zeros(modes), stress, 4.0 / l**2, profile])


def pipe_pressure(problem: Problem, r: np.ndarray, modes: int) -> StartUp:
    """u = G R^2/mu [(1 - x^2)/4 - 2 sum J0(l x)/(l^3 J1(l)) exp(-l^2 nu t/R^2)], x = r/R, J0(l) = 0."""
    radius, mu, l = problem.outer, problem.viscosity, _zeros(modes)
    unit, x = radius**2 / mu, r / radius
    profile = (2.0 * unit / (l**3 * j1(l)))[:, None] * j0(np.outer(l, x))
    steady = np.concatenate([[0.0, 0.5 * radius, unit / 8.0], 0.25 * unit * (1.0 - x**2)])
    return _series(
        PIPE, problem, l / radius, steady, [np.zeros(modes), 2.0 * radius / l**2, 4.0 * unit / l**4, profile]
    )


def axial_inner(problem: Problem, r: np.ndarray, modes: int) -> StartUp:
    """The inner cylinder starts along its axis."""
    a, b, mu = problem.inner, problem.outer, problem.viscosity
    log = np.log(b / a)
    steady = np.concatenate([[-mu / (a * log), mu / (b * log), 1.0 - _dragged(a, b)], np.log(b / r) / log])
    root, ratio = _cross_zeros(0, a, b, modes)
    return _between(SLEEVE, problem, r, root, ratio, steady, -np.pi * ratio / (1.0 - ratio**2))


def axial_outer(problem: Problem, r: np.ndarray, modes: int) -> StartUp:
    """The outer cylinder starts along its axis."""
    a, b, mu = problem.inner, problem.outer, problem.viscosity
    log = np.log(b / a)
    steady = np.concatenate([[mu / (a * log), -mu / (b * log), _dragged(a, b)], np.log(r / a) / log])
    root, ratio = _cross_zeros(0, a, b, modes)
    return _between(SLEEVE, problem, r, root, ratio, steady, np.pi / (1.0 - ratio**2))


def annulus_pressure(problem: Problem, r: np.ndarray, modes: int) -> StartUp:
    """Pressure starts in an annulus at rest."""
    a, b, mu = problem.inner, problem.outer, problem.viscosity
    log, square = np.log(b / a), b * b - a * a
    slope = np.array([-2.0 * a + square / (a * log), 2.0 * b - square / (b * log)]) / 4.0
    mean = (a * a + b * b - square / log) / (8.0 * mu)
    steady = np.concatenate([slope, [mean], (b * b - r * r - square * np.log(b / r) / log) / (4.0 * mu)])
    root, ratio = _cross_zeros(0, a, b, modes)
    return _between(ANNULUS, problem, r, root, ratio, steady, np.pi / (mu * root**2 * (1.0 + ratio)))


def rotating_inner(problem: Problem, r: np.ndarray, modes: int) -> StartUp:
    """The inner cylinder starts to turn."""
    a, b, mu = problem.inner, problem.outer, problem.viscosity
    square = b * b - a * a
    mean = a * a / square * (b * b * np.log(b / a) - 0.5 * square) / (b - a)
    omega = a * a / square * (b * b / r**2 - 1.0)
    steady = np.concatenate([[-2.0 * mu * b * b / square, 2.0 * mu * a * a / square, mean], omega])
    root, ratio = _cross_zeros(1, a, b, modes)
    return _between(ROTATING, problem, r, root, ratio, steady, -np.pi * a * ratio / (1.0 - ratio**2))


def rotating_outer(problem: Problem, r: np.ndarray, modes: int) -> StartUp:
    """The outer cylinder starts to turn."""
    a, b, mu = problem.inner, problem.outer, problem.viscosity
    square = b * b - a * a
    mean = b * b / square * (0.5 * square - a * a * np.log(b / a)) / (b - a)
    omega = b * b / square * (1.0 - a * a / r**2)
    steady = np.concatenate([[2.0 * mu * b * b / square, -2.0 * mu * a * a / square, mean], omega])
    root, ratio = _cross_zeros(1, a, b, modes)
    return _between(ROTATING, problem, r, root, ratio, steady, np.pi * b / (1.0 - ratio**2))


def _dragged(a: float, b: float) -> float:
    """Mean of ln(r/a)/ln(b/a) over the annulus."""
    return (b * b * np.log(b / a) - 0.5 * (b * b - a * a)) / ((b * b - a * a) * np.log(b / a))


@lru_cache(maxsize=8)
def _cross_zeros(order: int, a: float, b: float, modes: int) -> tuple[np.ndarray, np.ndarray]:
    """Roots x of J(x a) Y(x b) - J(x b) Y(x a) (modes,), by bisection, and J(x b)/J(x a) there.

    One root lies within half a spacing of n pi/(b - a) (Abramowitz & Stegun 1964, 9.5.27 and 9.5.28).
    """
    step = np.pi / (b - a)
    n = np.arange(1, modes + 1)
    low, high = (n - 0.5) * step, (n + 0.5) * step

    def cross(x: np.ndarray) -> np.ndarray:
        return jv(order, x * a) * yv(order, x * b) - jv(order, x * b) * yv(order, x * a)

    below = np.sign(cross(low))
    for _ in range(54):
        middle = 0.5 * (low + high)
        left = np.sign(cross(middle)) == below
        low, high = np.where(left, middle, low), np.where(left, high, middle)
    root = 0.5 * (low + high)
    # J or Y, whichever is the larger, gives the ratio without loss of digits
    inner, outer = (np.stack([jv(order, root * x), yv(order, root * x)]) for x in (a, b))
    larger = np.abs(inner).argmax(axis=0)
    pick = np.arange(modes)
    return root, outer[larger, pick] / inner[larger, pick]


def _between(source, problem, r, root, ratio, steady, share) -> StartUp:
    """Modes C(x r) = J(x r) Y(x b) - J(x b) Y(x r) with ``share`` (N,) each; ``ratio`` J(x b)/J(x a).

    By the Wronskian of Bessel functions C'(b) = -2/(pi b) and C'(a) = -2 ratio/(pi a), with respect to r.
    """
    a, b, mu = problem.inner, problem.outer, problem.viscosity
    order = 1 if problem.rotating else 0
    at_a, at_b = -2.0 * ratio / (np.pi * a), np.full_like(root, -2.0 / (np.pi * b))
    if problem.rotating:
        mean = (at_a - at_b) / (root**2 * (b - a))
    else:
        mean = 2.0 / (b * b - a * a) * (a * at_a - b * at_b) / root**2
    x = np.outer(root, r)
    shape = jv(order, x) * yv(order, root * b)[:, None] - jv(order, root * b)[:, None] * yv(order, x)
    shape = shape / r if problem.rotating else shape
    parts = [share * mu * at_a, -share * mu * at_b, share * mean, share[:, None] * shape]
    return _series(source, problem, root, steady, parts)


def _series(source, problem, root, steady, parts) -> StartUp:
    fading = np.column_stack(parts)
    return startup(source, root, problem.viscosity / problem.density, problem.gap, steady, fading)
