"""A ladder's answer gathered for the headline numbers: regime, walls, infinite stresses, free motion."""

from __future__ import annotations

import numpy as np

from transient.drive.pieces import Pieces
from transient.gap.problem import PRESSURE, Body, Problem
from transient.gap.system import assemble, steady
from transient.march.levels import Ladder
from transient.march.rates import accelerations
from transient.march.readings import sudden_motion
from transient.march.regime import Outlook
from transient.result.driven import body_speed
from transient.result.history import History, largest
from transient.result.run import BodyFacts, Errors, Regime, Run, WallFacts

SAME = 1e-9  # of a jump: a difference below it is round-off
DENSE = 8  # times the nodes of the finest level, where the largest steady velocity is looked for


def run_of(problem: Problem, ahead: Outlook, ladder: Ladder, errors: Errors) -> Run:
    """Everything that headline numbers are made from."""
    best = ladder.best
    unbounded, when = infinite_stress(problem, ladder)
    return Run(
        best.flow,
        _regime(problem, ahead, ladder),
        errors,
        tuple(
            WallFacts(wall.name, end, wall.area, wall.radius, wall.kind == "shear_free")
            for end, wall in enumerate(problem.walls)
            if wall.kind != "axis"
        ),
        problem.rotating,
        problem.count,
        problem.section,
        problem.settle_within,
        problem.viscosity,
        unbounded,
        when,
        _free_motion(problem, best.flow),
        tuple(body_facts(problem, ladder, end) for end, wall in enumerate(problem.walls) if wall.body is not None),
        problem.flow is not None,
        _pressure_jump(problem, ladder),
    )


def body_facts(problem: Problem, ladder: Ladder, end: int) -> BodyFacts:
    """A body's loads and motion on the history's rows."""
    body = problem.walls[end].body
    assert body is not None
    best, flow = ladder.best, ladder.best.flow
    row = ladder.inputs.row(end)
    acceleration, jerk = accelerations(problem, ladder.inputs, flow, end)
    terminal = size = None
    if best.orbit is not None:
        size = abs(body_speed(best.orbit, end).magnitude()[0])
    elif best.deviation is not None:
        terminal = float(best.steady_speeds[end])
        size = abs(terminal)
    return BodyFacts(
        end,
        row.at(flow.piece, flow.offset),
        row.at(flow.piece, flow.offset, 1),
        (np.array(body.curve[0]), np.array(body.curve[1])),
        body.grip,
        body.displaced * (problem.length or 0.0),
        acceleration,
        jerk,
        terminal,
        size,
        _released(body, row, float(flow.speed[0, end])),
        body.breakaway > 0.0,
    )


def _released(body: Body, row: Pieces, first_speed: float) -> float | None:
    """Start of the last pieces in which no drive acts on the body; from the start only where it moves then."""
    if np.any(np.array(body.curve[1]) != 0.0):
        return None
    acts = (row.poly != 0.0).any(axis=1) | (row.coeff != 0.0).any(axis=1)
    driven = np.flatnonzero(acts)
    first = int(driven[-1]) + 1 if len(driven) else 0
    if first == len(row.starts) or (first == 0 and first_speed == 0.0):
        return None
    return float(row.starts[first])


def _pressure_jump(problem: Problem, ladder: Ladder) -> float | None:
    """Time of the first instant at which the pressure of a prescribed flow is infinite."""
    if problem.flow is None:
        return None
    flow, inputs = ladder.best.flow, ladder.inputs
    times = np.concatenate(
        [flow.time[np.isnan(flow.gradient)], inputs.starts[inputs.row(PRESSURE).jumps(0) != 0.0]]
    )
    return float(times.min()) if len(times) else None


def _regime(problem: Problem, ahead: Outlook, ladder: Ladder) -> Regime:
    best = ladder.best
    if ahead.kind == "steady" and best.deviation is not None:
        size = _largest_steady(problem, ladder)
        return Regime("steady", None, best.deviation, size, abs(best.steady_mean), np.abs(best.steady_stress))
    if ahead.kind == "periodic":
        assert best.orbit is not None
        orbit = best.orbit
        stress = np.array(
            [
                np.inf if np.isnan(orbit.stress[:, end]).any() else abs(orbit.stress_curve(end).magnitude()[0])
                for end in (0, 1)
            ]
        )
        velocity = orbit.largest_curve().extreme(1.0)[0]
        mean = abs(orbit.mean_curve().magnitude()[0])
        return Regime("periodic", ahead.period, best.deviation, velocity, mean, stress)
    return Regime("none", None, None, 0.0, 0.0, np.zeros(2))


def _largest_steady(problem: Problem, ladder: Ladder) -> float:
    """Largest |w| over the gap of the steady end: a steady state is exact on any grid, so one denser than the
    march's tells what lies between its nodes."""
    speeds, gradient = ladder.best.steady_speeds, ladder.best.steady_gradient
    system = assemble(problem, DENSE * ladder.cells, ladder.layers)
    profile = system.nodes(steady(system, speeds, gradient), speeds)[None, :]
    if problem.rotating:
        profile = profile * system.grid.radius
    return float(largest(system.grid.radius, profile, np.zeros_like(profile))[0][0])


def infinite_stress(problem: Problem, ladder: Ladder) -> tuple[np.ndarray, np.ndarray]:
    """(coefficient K of |stress| ~ K / sqrt(t - t_jump), its time) per wall (2,): that of the largest jump, 0 without.

    K = sqrt(density viscosity / pi) x jump of the wall's surface speed against the fluid (Stokes 1851; from memory):
    so soon after a jump every gap is a half space.
    """
    inputs = ladder.inputs
    factor = np.sqrt(problem.density * problem.viscosity / np.pi)
    lever = (problem.inner, problem.outer) if problem.rotating else (1.0, 1.0)
    coefficient, when = np.zeros(2), np.zeros(2)
    jumps = np.abs(sudden_motion(problem, inputs, ladder.speed_before)) * lever
    for end in (0, 1):
        # of equal jumps, which a repeat makes but for round-off, the first
        largest_jump = int(np.flatnonzero(jumps[:, end] >= (1.0 - SAME) * jumps[:, end].max())[0])
        coefficient[end] = factor * jumps[largest_jump, end]
        when[end] = inputs.starts[largest_jump] if coefficient[end] > 0.0 else 0.0
    return coefficient, when


def _free_motion(problem: Problem, flow: History) -> np.ndarray:
    """What the pressure alone would have added to the velocity since t = 0, at the kept profiles (k,)."""
    if problem.rotating:
        return np.zeros(len(flow.profile_row))
    begin = flow.gradient[0] if problem.start == "steady" and np.isfinite(flow.gradient[0]) else 0.0
    rate = np.where(np.isfinite(flow.gradient), flow.gradient - begin, 0.0) / problem.density
    change = np.where(np.isfinite(flow.gradient_rate), flow.gradient_rate, 0.0) / problem.density
    h = flow.step
    part = 0.5 * h * (rate[1:] + rate[:-1]) + h * h / 12.0 * (change[:-1] - change[1:])
    return np.concatenate([[0.0], np.cumsum(part)])[flow.profile_row]
