"""Steady flow, exact on any grid: stress and mean velocity of runs that begin in it and stay there."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from transient.drive.pieces import constant
from transient.gap.problem import LOWER, PRESSURE, UPPER, Problem
from transient.trust.verification.gaps import diffusion_time, gap, size
from transient.trust.verification.row import Row, row
from transient.trust.verification.solved import Bench

LIMIT = 1e-11
PRINTED = 6e-5  # half a unit of the table's last digit, relative
COUETTE = "Couette-Poiseuille flow, stress mu U/h (1 -+ P), flow 1/2 + P/6 (exact algebra)"
PIPE = "Hagen-Poiseuille: stress G R/2, mean velocity G R^2/(8 mu)"
DRAG = "axial drag of a rod: mu U/(r ln(b/a)) (Bird, Stewart & Lightfoot; from memory)"
ANNULUS = "annulus: R. B. Bird et al., Transport Phenomena, 2.4 (from memory)"
TORQUE = "torque per length 4 pi mu a^2 b^2 (difference of speeds)/(b^2 - a^2) (Couette; from memory)"
WHITE = "White, Fluid Mechanics, Table 6.3 (four digits printed)"
# Darcy friction factor times Reynolds number of the hydraulic diameter, by ratio of radii
FRICTION = {
    0.0: 64.0, 1e-5: 70.09, 1e-4: 71.78, 1e-3: 74.68, 0.01: 80.11, 0.05: 86.27, 0.1: 89.37, 0.2: 92.35, 0.4: 94.71,
    0.6: 95.59, 0.8: 95.92, 1.0: 96.0,
}  # fmt: skip


def steadies(bench: Bench) -> Iterator[Row]:
    """Rows of all shapes."""
    h, mu = gap("plates", {}).gap, gap("plates", {}).viscosity
    speed = size("plates", UPPER)
    for share, words in ((1.0, "with the pressure"), (-1.0, "at the onset of backflow"), (-3.0, "without net flow")):
        push = share * 2.0 * mu * speed / h**2
        shear = mu * speed / h
        exact = (shear * (1.0 + share), -shear * (1.0 - share), speed * (0.5 + share / 6.0))
        problem = gap("plates", _held({UPPER: speed, PRESSURE: push}), **_keys("plates"))
        yield _row(bench, f"plates: steady, upper wall moves {words}", problem, exact, (shear, shear, speed), COUETTE)
    yield _pipe(bench)
    yield from _axial(bench)
    yield _rotating(bench)
    name = "pipe, axial annuli, plates: friction factor of steady flow at 12 ratios of radii"
    yield row(name, _friction(bench), PRINTED, WHITE)


def _held(values: dict[int, float]) -> dict:
    return {index: constant(value) for index, value in values.items()}


def _row(bench: Bench, name: str, problem: Problem, exact: tuple, size_: tuple, source: str) -> Row:
    """Worst of both stresses and the mean velocity over a run on the coarsest grid."""
    run = bench.solve(problem).history
    columns = (run.stress[:, LOWER], run.stress[:, UPPER], run.mean)
    off = max(
        float(np.abs(column - true).max()) / scale for column, true, scale in zip(columns, exact, size_, strict=True)
    )
    return row(name, off, LIMIT, source)


def _keys(shape: str) -> dict:
    return {"start": "steady", "duration": diffusion_time(shape), "accuracy": 0.05}


def _pipe(bench: Bench) -> Row:
    problem = gap("pipe", _held({PRESSURE: size("pipe", PRESSURE)}), **_keys("pipe"))
    push, radius = size("pipe", PRESSURE), problem.outer
    stress, mean = 0.5 * push * radius, push * radius**2 / (8.0 * problem.viscosity)
    return _row(bench, "pipe: steady, pressure", problem, (0.0, stress, mean), (stress, stress, mean), PIPE)


def _axial(bench: Bench) -> Iterator[Row]:
    shape = "axial annulus"
    keys = _keys(shape)
    speed, push = size(shape, UPPER), size(shape, PRESSURE)
    problem = gap(shape, _held({UPPER: speed}), **keys)
    a, b, mu = problem.inner, problem.outer, problem.viscosity
    log, square = np.log(b / a), b * b - a * a
    inner, outer = mu * speed / (a * log), -mu * speed / (b * log)
    mean = speed * (b * b / square - 0.5 / log)
    yield _row(bench, f"{shape}: steady, outer wall moves", problem, (inner, outer, mean), (inner, -outer, mean), DRAG)
    problem = gap(shape, _held({PRESSURE: push}), **keys)
    inner = push / 4.0 * (square / (a * log) - 2.0 * a)
    outer = push / 4.0 * (2.0 * b - square / (b * log))
    mean = push / (8.0 * mu) * (a * a + b * b - square / log)
    yield _row(bench, f"{shape}: steady, pressure", problem, (inner, outer, mean), (inner, outer, mean), ANNULUS)


def _rotating(bench: Bench) -> Row:
    shape = "rotating annulus"
    speed = size(shape, UPPER)
    problem = gap(shape, _held({UPPER: speed}), **_keys(shape))
    a, b = problem.inner, problem.outer
    torque = 4.0 * np.pi * problem.viscosity * a**2 * b**2 * speed / (b * b - a * a)
    inner, outer = torque / (2.0 * np.pi * a**2), -torque / (2.0 * np.pi * b**2)
    square = b * b - a * a
    mean = speed * b * b / square * (0.5 * square - a * a * np.log(b / a)) / (b - a)
    name = f"{shape}: steady, outer wall turns"
    return _row(bench, name, problem, (inner, outer, mean), (inner, -outer, mean), TORQUE)


def _friction(bench: Bench) -> float:
    """Worst difference of 2 G D^2/(mu V), D the hydraulic diameter, from the table."""
    worst = 0.0
    for ratio, printed in FRICTION.items():
        shape = {0.0: "pipe", 1.0: "plates"}.get(ratio, "axial annulus")
        push = size(shape, PRESSURE)
        problem = gap(shape, _held({PRESSURE: push}), **_keys(shape))
        if shape == "axial annulus":
            problem = _with_inner(problem, ratio * problem.outer)
        mean = float(bench.solve(problem).history.mean[-1])
        found = 2.0 * push * (2.0 * problem.gap) ** 2 / (problem.viscosity * mean)
        worst = max(worst, abs(found / printed - 1.0))
    return worst


def _with_inner(problem: Problem, inner: float) -> Problem:
    walls = (replace(problem.walls[0], radius=inner), problem.walls[1])
    return replace(problem, inner=inner, walls=walls)
