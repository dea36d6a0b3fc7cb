"""Classical start-up series between plates (height h, nu the kinematic viscosity), after a unit jump."""

from __future__ import annotations

import numpy as np
from scipy.optimize import brentq

from transient.gap.problem import Problem
from transient.trust.verification.unit_jump import StartUp, startup

COUETTE = "start-up of plane Couette flow: Christov (2013), arXiv 1305.5999"
POISEUILLE = "start-up between plates: sine series (from memory; the plane case of Szymanski 1932)"
FREE = "film with a free surface: Carslaw & Jaeger, Conduction of Heat in Solids, 3.4 (from memory)"
SLIP = "surface resistance on both sides: Carslaw & Jaeger, Conduction of Heat in Solids, 3.11 (from memory)"


def upper(problem: Problem, y: np.ndarray, modes: int) -> StartUp:
    """The upper plate starts: u/U = y/h + (2/pi) sum (-1)^n/n exp(-n^2 pi^2 nu t/h^2) sin(n pi y/h)."""
    h, mu = problem.gap, problem.viscosity
    n = np.arange(1, modes + 1)
    sign = (-1.0) ** n
    shear = 2.0 * mu / h
    stresses = np.stack([-shear * sign, np.full(modes, shear)], axis=1)
    mean = -2.0 / np.pi * sign / n * (1.0 - sign) / (n * np.pi)
    profile = -2.0 / np.pi * (sign / n)[:, None] * np.sin(np.outer(n, np.pi * y / h))
    steady = np.concatenate([[mu / h, -mu / h, 0.5], y / h])
    return _series(COUETTE, problem, n * np.pi / h, steady, np.column_stack([stresses, mean, profile]))


def lower(problem: Problem, y: np.ndarray, modes: int) -> StartUp:
    """The lower plate starts: the same seen from the other side."""
    other = upper(problem, problem.gap - y, modes)
    swap = np.r_[1, 0, 2 : 3 + len(y)]
    return StartUp(COUETTE, other.decay, other.steady[swap], other.fading[:, swap], other.beyond[swap])


def pressure(problem: Problem, y: np.ndarray, modes: int) -> StartUp:
    """u = G h^2/(2 mu) eta (1 - eta) - G h^2/mu sum over odd n of 4/(n pi)^3 exp(...) sin(n pi eta), eta = y/h."""
    h, mu = problem.gap, problem.viscosity
    n = 2.0 * np.arange(modes) + 1.0
    eta = y / h
    stress = 4.0 * h / (n * np.pi) ** 2
    mean = 8.0 * h**2 / mu / (n * np.pi) ** 4
    profile = (4.0 * h**2 / mu / (n * np.pi) ** 3)[:, None] * np.sin(np.outer(n, np.pi * eta))
    steady = np.concatenate([[0.5 * h, 0.5 * h, h**2 / (12.0 * mu)], 0.5 * h**2 / mu * eta * (1.0 - eta)])
    return _series(POISEUILLE, problem, n * np.pi / h, steady, np.column_stack([stress, stress, mean, profile]))


def free_lower(problem: Problem, y: np.ndarray, modes: int) -> StartUp:
    """The upper plate starts over a shear-free lower side: half-integer cosines."""
    h, mu = problem.gap, problem.viscosity
    n = np.arange(modes) + 0.5
    sign = (-1.0) ** np.arange(modes)
    stress = np.full(modes, 2.0 * mu / h)
    mean = 2.0 / (n * np.pi) ** 2
    profile = (2.0 * sign / (n * np.pi))[:, None] * np.cos(np.outer(n, np.pi * y / h))
    steady = np.concatenate([[0.0, 0.0, 1.0], np.ones(len(y))])
    return _series(FREE, problem, n * np.pi / h, steady, np.column_stack([np.zeros(modes), stress, mean, profile]))


def pressure_with_slip(problem: Problem, y: np.ndarray, modes: int) -> StartUp:
    """Equal slip lengths b on both plates, half-gap a: cosines of x z/a with x tan x = a/b, z from the middle."""
    a, mu = 0.5 * problem.gap, problem.viscosity
    slip = problem.walls[0].slip_length
    x = np.array([_slip_root(a / slip, n) for n in range(modes)])
    z = (y - a) / a
    # projection of the steady profile: integral of u cos is G a^2/mu sin x / x^3, of cos^2 1/2 (1 + sin 2x / 2x)
    share = a**2 / mu * np.sin(x) / x**3 / (0.5 + 0.25 * np.sin(2.0 * x) / x)
    stress = share * mu / a * x * np.sin(x)
    profile = share[:, None] * np.cos(np.outer(x, z))
    parabola = 0.5 * a**2 / mu * (1.0 - z**2 + 2.0 * slip / a)
    steady = np.concatenate([[a, a, a**2 / mu * (1.0 / 3.0 + slip / a)], parabola])
    fading = np.column_stack([stress, stress, share * np.sin(x) / x, profile])
    return _series(SLIP, problem, x / a, steady, fading)


def _slip_root(ratio: float, n: int) -> float:
    """Root of x tan x = ``ratio`` between n pi and (n + 1/2) pi (Abramowitz & Stegun 1964, Table 4.20)."""
    low, high = n * np.pi, (n + 0.5) * np.pi
    return float(brentq(lambda x: x * np.sin(x) - ratio * np.cos(x), low, high, xtol=1e-14, rtol=1e-15))


def _series(source, problem, root, steady, fading) -> StartUp:
    return startup(source, root, problem.viscosity / problem.density, problem.gap, steady, fading)
