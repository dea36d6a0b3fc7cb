"""Observed orders of the march in space and in time, and its balances of momentum and energy."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from transient.gap.problem import PRESSURE, UPPER, Problem
from transient.march.march import Plan, march
from transient.march.plan import features, resolve
from transient.march.readings import history
from transient.trust.balance import energy_balance, momentum_balance, stress_difference
from transient.trust.grid_convergence import convergence
from transient.trust.verification.gaps import SHAPES, diffusion_time, driven, gap, size
from transient.trust.verification.kinds import build
from transient.trust.verification.row import Row, row
from transient.trust.verification.solved import Bench

DECLARED, WITHIN = 2.0, 0.1
CELIK = "order 2 by design; three solutions after Celik et al. (2008), J. Fluids Eng. 130, 078001"
OWN = "conservation, from the stored rows and profiles alone"
UNTIL, AT = 1.5, 0.75  # diffusion times: end of the run, and the middle of its smooth change, where it is looked at
LAYERS = (0.3, 0.3)
GRIDS, STEPS = (64, 32, 16), (160, 80, 40)  # fine to coarse; steps in each smooth piece
ACCURACY = 1e-3


def orders(bench: Bench) -> Iterator[Row]:
    """Distance of the observed order from 2, on a half-cosine change of wall speed."""
    for shape in SHAPES:
        time = diffusion_time(shape)
        problem = gap(shape, {UPPER: build("smooth_ramp", to=size(shape, UPPER), over=time)}, duration=UNTIL * time)
        space = convergence(tuple(_stress(problem, cells, STEPS[0]) for cells in GRIDS), 2.0, 2.0)
        time_ = convergence(tuple(_stress(problem, GRIDS[0], steps) for steps in STEPS), 2.0, 2.0)
        name = f"{shape}: observed order of the wall stress in"
        yield row(f"{name} space, its distance from 2", abs(space.order - DECLARED), WITHIN, CELIK)
        yield row(f"{name} time, its distance from 2", abs(time_.order - DECLARED), WITHIN, CELIK)


def _stress(problem: Problem, cells: int, steps: int) -> float:
    """Stress on the moving wall at three quarters of its change, on a grid and with even steps."""
    until = problem.duration
    assert until is not None
    inputs = problem.inputs(until)
    found = features(problem, inputs, until)
    usual = resolve(problem, inputs, found, ACCURACY, 0.1 * problem.diffusion_time, 1e-4)
    resolution = replace(usual, cells=cells, layers=LAYERS)
    trace = march(problem, inputs, until, found, resolution, plan=_even(inputs.starts, until, steps))
    rows = history(problem, inputs, trace)
    at = np.abs(rows.time - AT * problem.diffusion_time).argmin()
    return float(rows.stress[at, UPPER])


def _even(starts: np.ndarray, until: float, each: int) -> Plan:
    ends = np.append(starts[1:], until)
    share = np.arange(1, each + 1) / each
    return Plan(((ends - starts)[:, None] * share).ravel(), np.tile(share == 1.0, len(starts)), 1)


def balances(bench: Bench) -> Iterator[Row]:
    """Momentum, energy, and stress against profile over a ramp; limits are what the kept rows can tell."""
    for shape in SHAPES:
        time = diffusion_time(shape)
        index = PRESSURE if PRESSURE in driven(shape) else UPPER
        inputs = {UPPER: build("ramp", to=size(shape, UPPER), over=0.2 * time)}
        if index == PRESSURE:
            inputs[index] = build("ramp", to=size(shape, index), over=0.3 * time)
        marched = bench.solve(gap(shape, inputs, accuracy=ACCURACY))
        for name, closure in (
            ("momentum closes over the run", momentum_balance(marched.problem, marched.history)),
            ("work closes with kinetic energy and dissipation", energy_balance(marched.problem, marched.history)),
            ("stored stress agrees with stored profiles", stress_difference(marched.problem, marched.history)),
        ):
            yield row(f"{shape}: {name}", closure.residual, max(ACCURACY, closure.resolution), OWN)
