"""The periodic state of oscillating flow: largest stress and mean velocity over one period, in closed form."""

from __future__ import annotations

from collections.abc import Callable, Iterator

import numpy as np
from scipy.special import ive

from transient.gap.problem import LOWER, PRESSURE, UPPER, Problem
from transient.trust.verification.gaps import diffusion_time, gap, size
from transient.trust.verification.kinds import build
from transient.trust.verification.row import Row, row
from transient.trust.verification.solved import Bench

ACCURACY = 1e-3
STOKES = "oscillating plate over a film: Stokes (1851), finite depth"
PLATES = "oscillating pressure between plates: hyperbolic form (from memory)"
WOMERSLEY = "oscillating pressure in a pipe: Womersley (1955), J. Physiol. 127, 553"


def oscillations(bench: Bench) -> Iterator[Row]:
    """A fast and a slow oscillation of each."""
    cases: tuple[tuple[str, str, int, Callable[[Problem, complex, float], tuple[float, float, float]], str], ...] = (
        ("plates: upper wall oscillates", "plates", UPPER, _wall, STOKES),
        ("plates: pressure oscillates", "plates", PRESSURE, _push, PLATES),
        ("pipe: pressure oscillates", "pipe", PRESSURE, _pulse, WOMERSLEY),
    )
    for name, shape, index, exact, source in cases:
        for swings, pace in ((0.4, "slowly"), (12.0, "fast")):
            frequency = swings / diffusion_time(shape)
            drive = build("sine", amplitude=size(shape, index), frequency=frequency)
            problem = gap(shape, {index: drive}, accuracy=ACCURACY)
            regime = bench.solve(problem).run.regime
            turn = 2.0 * np.pi * frequency
            true = np.array(exact(problem, np.sqrt(1j * turn * problem.density / problem.viscosity), turn))
            true = true * size(shape, index)
            found = np.array([regime.stress[LOWER], regime.stress[UPPER], regime.mean])
            off = np.abs(found - true)[true > 0] / true[true > 0]
            yield row(f"{name} {pace}: amplitudes of stress and mean velocity", off.max(), ACCURACY, source)


def _wall(problem: Problem, k: complex, turn: float) -> tuple[float, float, float]:
    """u = sinh(k y)/sinh(k h) per unit speed, k = sqrt(i omega/nu)."""
    mu, h = problem.viscosity, problem.gap
    mean = np.tanh(0.5 * k * h) / (k * h)
    return abs(mu * k / np.sinh(k * h)), abs(mu * k / np.tanh(k * h)), abs(mean)


def _push(problem: Problem, k: complex, turn: float) -> tuple[float, float, float]:
    """u = (1 - cosh(k z)/cosh(k a))/(i omega density) per unit pressure drop, a half the gap."""
    a = 0.5 * problem.gap
    stress = abs(np.tanh(k * a) / k)
    return stress, stress, abs((1.0 - np.tanh(k * a) / (k * a)) / (turn * problem.density))


def _pulse(problem: Problem, k: complex, turn: float) -> tuple[float, float, float]:
    """u = (1 - I0(k r)/I0(k R))/(i omega density) per unit pressure drop."""
    radius = problem.outer
    quotient = ive(1, k * radius) / ive(0, k * radius)
    return 0.0, abs(quotient / k), abs((1.0 - 2.0 * quotient / (k * radius)) / (turn * problem.density))
