"""Bodies on films and prescribed flow: a plate set in motion by a constant load, a developed flow, a sealed gap."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np
from scipy.optimize import brentq

from transient.drive.pieces import constant
from transient.gap.problem import LOWER, UPPER, Body, Problem
from transient.trust.verification.gaps import diffusion_time, gap, size
from transient.trust.verification.kinds import build
from transient.trust.verification.row import Row, row
from transient.trust.verification.solved import Bench, Marched

RATIOS = (0.05, 1.0, 20.0)  # liquid's mass over the body's
MODES = 2000  # leave 2e-9 of the final speed in the worst case
DIGITS = 2e-8
AREA = 0.03  # m^2
ACCURACY = 1e-3
STEADY = 1e-9
BLOCK = "roots of x tan x = liquid's mass / body's (Carslaw & Jaeger 1959, App. IV, Table I), shares by residues (own)"
POISEUILLE = "12 mu U / h^2 (plane Poiseuille flow, textbook)"
CLOSED = "4 mu U / h and 2 mu U / h, 6 mu U / h^2 (plane Couette flow with a return flow, textbook)"


def driven_bodies(bench: Bench) -> Iterator[Row]:
    """Rows of plates; round gaps are judged by the program's own series on every solve."""
    worst = 0.0
    for ratio in RATIOS:
        marched = bench.solve(_loaded(ratio))
        speed = marched.history.speed[:, UPPER]
        true = _block(marched, ratio)
        error = marched.run.errors.more["speed"][:, UPPER]
        off = np.abs(speed - true)
        worst = max(worst, float((off / (error + DIGITS * np.abs(true).max())).max()))
        name = f"plates: speed of a plate under a constant load, liquid {ratio:g} times as heavy"
        yield row(name, off.max() / np.abs(true).max(), ACCURACY, BLOCK)
    yield row("plates: worst difference of a body's speed over its stated error", worst, 1.0, BLOCK)
    yield from _flows(bench)


def _loaded(ratio: float) -> Problem:
    problem = gap("plates", {}, accuracy=ACCURACY)
    load = constant(problem.viscosity * AREA * size("plates", UPPER) / problem.gap)
    mass = problem.density * problem.gap * AREA / ratio
    wall = replace(problem.walls[UPPER], area=AREA, body=Body(mass, load, AREA))
    return replace(problem, walls=(problem.walls[LOWER], wall))


def _block(marched: Marched, ratio: float) -> np.ndarray:
    """Speeds (n,) at the history's rows: U (1 - sum of 2 C^2 exp(-x^2 T) / (x^2 (x^2 + C + C^2)))."""
    low = np.pi * np.arange(MODES)
    roots = np.array([brentq(lambda x: x * np.sin(x) - ratio * np.cos(x), a, a + np.pi / 2, xtol=1e-15) for a in low])
    share = 2.0 * ratio**2 / (roots**2 * (roots**2 + ratio + ratio**2))
    time = marched.history.time / diffusion_time("plates")
    return size("plates", UPPER) * (1.0 - np.exp(-np.outer(time, roots**2)) @ share)


def _flows(bench: Bench) -> Iterator[Row]:
    time, speed = diffusion_time("plates"), size("plates", UPPER)
    problem = gap("plates", {}, accuracy=ACCURACY)
    given = replace(problem, flow=build("smooth_ramp", to=speed, over=0.1 * time), duration=6.0 * time)
    drop = 12.0 * problem.viscosity * speed / problem.gap**2
    found = bench.solve(given).history.gradient[-1]
    yield row("plates: pressure drop of a prescribed flow in the end", abs(found / drop - 1.0), STEADY, POISEUILLE)
    moved = gap("plates", {UPPER: build("smooth_ramp", to=speed, over=0.1 * time)}, accuracy=ACCURACY)
    history = bench.solve(replace(moved, flow=constant(0.0), duration=6.0 * time)).history
    shear = problem.viscosity * speed / problem.gap
    ends = np.array([history.stress[-1, UPPER] / (-4.0 * shear), history.stress[-1, LOWER] / (-2.0 * shear),
                     history.gradient[-1] / (-0.5 * drop)])  # fmt: skip
    yield row("plates: stresses and pressure drop of a sealed gap", np.abs(ends - 1.0).max(), STEADY, CLOSED)
