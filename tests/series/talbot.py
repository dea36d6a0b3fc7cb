"""A judge of the series that shares nothing with it: textbook solutions in Laplace space, inverted at 30 digits.

Transfer functions from Carslaw & Jaeger, Conduction of Heat in Solids (1959), ch. 12-13 (true Bessel functions,
unscaled); inversion by the fixed Talbot method (Abate & Valko, Int. J. Numer. Meth. Eng. 60 (2004) 979).
"""

from __future__ import annotations

import functools
from collections.abc import Callable

import mpmath as mp
import numpy as np

from transient.drive.pieces import Pieces
from transient.gap.problem import Problem

DIGITS, NODES = 30, 26


FAR = 45  # the general routine is quick beyond this argument only


def macdonald(order: int, z: mp.mpc) -> mp.mpc:
    """K_order(z), order 0, 1, 2, by its series (A&S 9.6.11, 9.6.13) with digits to spare for what cancels in them."""
    if abs(z) > FAR:
        return mp.besselk(order, z)
    with mp.workdps(mp.mp.dps + 5 + int(2 * abs(z) / 2.3)):
        if order == 2:
            return macdonald(0, z) + 2 / z * macdonald(1, z)
        x, term, harmonic, total, k = z * z / 4, mp.mpc(1), mp.mpf(0), mp.mpc(0), 0
        while k < 3 or abs(term) > mp.eps:
            part = harmonic if order == 0 else -(harmonic + mp.mpf(1) / (2 * (k + 1))) * z / 2
            total, k = total + term * part, k + 1
            term *= x / (k * (k + order))
            harmonic += mp.mpf(1) / k
        log = mp.log(z / 2) + mp.euler
        return total - log * mp.besseli(0, z) if order == 0 else 1 / z + log * mp.besseli(1, z) + total


def ordinary(metric: int, q: mp.mpc) -> tuple[Callable, Callable, Callable, Callable]:
    """Decaying solution, its slope, growing solution, its slope, of (r^m w')' = q^2 r^m w."""
    if metric == 0:
        return (
            lambda r: mp.exp(-q * r), lambda r: -q * mp.exp(-q * r),
            lambda r: mp.exp(q * r), lambda r: q * mp.exp(q * r),
        )  # fmt: skip
    n, p = (0, 0) if metric == 1 else (1, 1)
    return (
        lambda r: macdonald(n, q * r) / r**p, lambda r: -q * macdonald(n + 1, q * r) / r**p,
        lambda r: mp.besseli(n, q * r) / r**p, lambda r: q * mp.besseli(n + 1, q * r) / r**p,
    )


def transfer(problem: Problem, row: int, s: mp.mpc, radii: list) -> list:
    """[lower stress, upper stress, velocities at ``radii``] for input ``row`` = 1 in Laplace space, SI."""
    nu, mu = mp.mpf(problem.viscosity) / mp.mpf(problem.density), mp.mpf(problem.viscosity)
    a, b = mp.mpf(problem.inner), mp.mpf(problem.outer)
    q = mp.sqrt(s / nu)
    down, down_slope, up, up_slope = (functools.cache(f) for f in ordinary(problem.metric, q))
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
    if low.kind == "axis":
        amounts = [0, right[1] / matrix[1, 1]]
    else:
        determinant = matrix[0, 0] * matrix[1, 1] - matrix[0, 1] * matrix[1, 0]
        amounts = [
            (right[0] * matrix[1, 1] - right[1] * matrix[0, 1]) / determinant,
            (right[1] * matrix[0, 0] - right[0] * matrix[1, 0]) / determinant,
        ]

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


def response(problem: Problem, pieces: Pieces, row: int, t: float, radii: np.ndarray, more: int = 1) -> np.ndarray:
    """(2 + k,) stresses and velocities at time ``t``, less the steady flow of ``pieces.before``; other inputs still.

    ``more``: times as many nodes and digits, where the breaks' answers cancel.
    """
    with mp.workdps(more * DIGITS):
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

            total = [x + y for x, y in zip(total, invert(asked, age, more * NODES), strict=True)]
        return np.array([float(v) for v in total])
