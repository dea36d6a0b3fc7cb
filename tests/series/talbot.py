"""A judge of the series that shares nothing with it: textbook solutions in Laplace space, inverted at 30 digits.

Transfer functions from Carslaw & Jaeger, Conduction of Heat in Solids (1959), ch. 12-13 (true Bessel functions,
unscaled); inversion by the fixed Talbot method (Abate & Valko, Int. J. Numer. Meth. Eng. 60 (2004) 979).
"""

from __future__ import annotations

from collections.abc import Callable

import mpmath as mp
import numpy as np

from transient.drive.pieces import Pieces
from transient.gap.problem import Problem

DIGITS, NODES = 30, 26


def ordinary(metric: int, q: mp.mpc) -> tuple[Callable, Callable, Callable, Callable]:
    """Decaying solution, its slope, growing solution, its slope, of (r^m w')' = q^2 r^m w."""
    if metric == 0:
        return (
            lambda r: mp.exp(-q * r), lambda r: -q * mp.exp(-q * r),
            lambda r: mp.exp(q * r), lambda r: q * mp.exp(q * r),
        )  # fmt: skip
    n, p = (0, 0) if metric == 1 else (1, 1)
    return (
        lambda r: mp.besselk(n, q * r) / r**p, lambda r: -q * mp.besselk(n + 1, q * r) / r**p,
        lambda r: mp.besseli(n, q * r) / r**p, lambda r: q * mp.besseli(n + 1, q * r) / r**p,
    )


def transfer(problem: Problem, row: int, s: mp.mpc, radii: list) -> list:
    """[lower stress, upper stress, velocities at ``radii``] for input ``row`` = 1 in Laplace space, SI."""
    nu, mu = mp.mpf(problem.viscosity) / mp.mpf(problem.density), mp.mpf(problem.viscosity)
    a, b = mp.mpf(problem.inner), mp.mpf(problem.outer)
    q = mp.sqrt(s / nu)
    down, down_slope, up, up_slope = ordinary(problem.metric, q)
    push = 1 / (s * mp.mpf(problem.density)) if row == 2 else mp.mpf(0)
    low, high = problem.walls
    matrix, right = mp.zeros(2), [mp.mpf(0), mp.mpf(0)]
    for k, (wall, r, side) in enumerate(((low, a, -1), (high, b, 1))):
        if wall.kind == "axis":
            matrix[k, 0] = 1
            continue
        slip = mp.mpf(wall.slip_length)
        free = wall.kind == "shear_free"
        for n, (value, slope) in enumerate(((down, down_slope), (up, up_slope))):
            matrix[k, n] = slope(r) if free else value(r) + side * slip * slope(r)
        right[k] = mp.mpf(0) if free else (1 if row == k else 0) - push
    amounts = mp.lu_solve(matrix, mp.matrix(right)) if low.kind != "axis" else [0, right[1] / matrix[1, 1]]

    def velocity(r: mp.mpf) -> mp.mpc:
        return push + amounts[1] * up(r) + (amounts[0] * down(r) if amounts[0] else 0)

    def gradient(r: mp.mpf) -> mp.mpc:
        return amounts[1] * up_slope(r) + (amounts[0] * down_slope(r) if amounts[0] else 0)

    levers = (a, b) if problem.metric == 3 else (1, 1)
    lower = 0 if low.kind == "axis" else mu * gradient(a) * levers[0]
    return [lower, -mu * gradient(b) * levers[1], *(velocity(r) for r in radii)]


def invert(function: Callable, t: mp.mpf, nodes: int = NODES) -> list:
    """Fixed Talbot: values at time ``t`` of the vector of transforms ``function(s)``."""
    r = mp.mpf(2 * nodes) / (5 * t)
    total = [mp.exp(r * t) / 2 * v for v in function(r)]
    for k in range(1, nodes):
        angle = k * mp.pi / nodes
        cot = mp.cot(angle)
        s = r * angle * (cot + 1j)
        weight = mp.exp(t * s) * (1 + 1j * (angle + (angle * cot - 1) * cot))
        total = [x + weight * v for x, v in zip(total, function(s), strict=True)]
    return [mp.re(v * r / nodes) for v in total]


def jumps(pieces: Pieces, j: int) -> tuple[list, list]:
    """Cubic and exponentials that begin at break ``j``: the piece less the one before, continued."""
    cubic = [mp.mpf(float(c)) for c in pieces.poly[j]]
    waves = [(mp.mpc(c), mp.mpc(r)) for c, r in zip(pieces.coeff[j], pieces.rate[j], strict=True)]
    if j == 0:
        cubic[0] -= mp.mpf(pieces.before)
        return cubic, waves
    x = mp.mpf(float(pieces.starts[j])) - mp.mpf(float(pieces.starts[j - 1]))
    old = [mp.mpf(float(c)) for c in pieces.poly[j - 1]]
    for order in range(4):
        for degree in range(order, 4):
            cubic[order] -= mp.binomial(degree, order) * old[degree] * x ** (degree - order)
    past = zip(pieces.coeff[j - 1], pieces.rate[j - 1], strict=True)
    return cubic, waves + [(-mp.mpc(c) * mp.exp(mp.mpc(r) * x), mp.mpc(r)) for c, r in past]


def response(problem: Problem, pieces: Pieces, row: int, t: float, radii: np.ndarray) -> np.ndarray:
    """(2 + k,) stresses and velocities at time ``t``, less the steady flow of ``pieces.before``; other inputs still."""
    with mp.workdps(DIGITS):
        places = [mp.mpf(float(r)) for r in radii]
        total = [mp.mpf(0)] * (2 + len(places))
        for j in range(len(pieces.starts)):
            age = mp.mpf(t) - mp.mpf(float(pieces.starts[j]))
            cubic, waves = jumps(pieces, j)
            if age <= 0 or not (any(cubic) or any(c for c, _ in waves)):
                continue

            def asked(s: mp.mpc, cubic: list = cubic, waves: list = waves) -> list:
                drive = sum(c * mp.factorial(k) / s ** (k + 1) for k, c in enumerate(cubic))
                for c, r in waves:
                    drive += (c / (s - r) + mp.conj(c) / (s - mp.conj(r))) / 2
                return [drive * h for h in transfer(problem, row, s, places)]

            total = [x + y for x, y in zip(total, invert(asked, age), strict=True)]
        return np.array([float(v) for v in total])
