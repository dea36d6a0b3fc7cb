"""What a march recorded, read as histories of physical quantities.

All levels share the base level's rows and nodes, so histories are extrapolated point by point (Richardson 1911):
the finer level plus a third of its difference to the coarser one.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from transient.gap.problem import LOWER, PRESSURE, UPPER, Inputs, Problem
from transient.gap.system import System
from transient.march import kernel
from transient.march.march import State, Trace
from transient.march.rates import stress_rates
from transient.result.history import History

EXTRAPOLATED = (
    "stress", "speed", "acceleration", "mean", "mean_rate", "gradient", "gradient_rate", "place",
    "profile", "profile_rate", "travel",
)  # fmt: skip
FRESH = 4.0  # first steps, over the accuracy, after which the layers of a sudden motion are many cells wide
SOON = 1e-5  # of a piece: no more of it is left out


def history(
    problem: Problem, inputs: Inputs, trace: Trace, before: Before | None = None, every: int = 1
) -> History:
    """Rows in physical quantities; ``every``-th node of the trace's grid is kept.

    ``before``: the state just before the first row where its break must be told from a smooth start.
    """
    rows = [inputs.row(index) for index in (LOWER, UPPER, PRESSURE)]
    value, slope = (np.array([row.at(trace.piece, trace.offset, order) for row in rows]) for order in range(2))
    system = trace.system
    fields = trace.fields
    for end, wall in enumerate(problem.walls):
        if wall.body is not None:
            value[end] = fields[:, kernel.WALLS + end]
            slope[end] = _as_before_events(trace, fields[:, kernel.WALLS + 2 + end])
            if before is not None and problem.start == "rest" and wall.body.initial_speed is not None:
                value[end, 0] = wall.body.initial_speed
    if problem.flow is not None:
        value[PRESSURE] = fields[:, kernel.DROP]
    stress = _stresses(problem, trace, value, slope)
    _join_breaks(problem, inputs, trace, stress, value[PRESSURE], before)
    _join_accelerations(problem, inputs, trace, value, slope, stress)
    stress_rate = np.full_like(stress, np.nan)  # of the histories that are read between rows: see ``with_rates``
    if problem.flow is not None:
        slope[PRESSURE] = stress_rates(trace.piece, trace.offset, value[PRESSURE][:, None])[:, 0]
    weight = system.grid.mean_weight
    ends = np.array([weight[0] if system.first else 0.0, weight[-1] if system.end_volume[1] > 0 else 0.0])
    mean = fields[:, kernel.MEAN] + ends @ value[:2]
    mean_rate = fields[:, kernel.MEAN_RATE] + ends @ slope[:2]
    time = inputs.starts[trace.piece] + trace.offset
    at = trace.profile_row
    place = _wall_travel(time, value[:2].T, slope[:2].T)
    for end, wall in enumerate(problem.walls):
        if wall.body is not None:
            place[:, end] = fields[:, kernel.WALLS + 4 + end]
    walls = value[:2].T, slope[:2].T, place - place[0]
    profile, profile_rate, travel = (
        system.nodes(trace.profiles[:, i], wall[at])[:, ::every] for i, wall in enumerate(walls)
    )
    whole = History(
        time, trace.piece, trace.offset, stress, stress_rate, value[:2].T, slope[:2].T, mean, mean_rate,
        value[PRESSURE], slope[PRESSURE], place, system.grid.radius[::every], at, profile, profile_rate, travel,
        system.grid.radius[::every] if problem.rotating else None,
    )  # fmt: skip
    return whole if problem.flow is None else without_first_steps(whole, problem.accuracy)


def without_first_steps(history: History, accuracy: float) -> History:
    """The rows but for the first steps after an infinite pressure of a prescribed flow.

    Walls' half cells take a new speed at once, and the pressure answers for all of the gap: until the layers are many
    cells wide, the stress at the far wall is not yet what its finite peak may be read from.
    """
    keep = np.ones(len(history.time), bool)
    for start in np.flatnonzero(np.isnan(history.gradient)):
        rows = np.flatnonzero(history.piece == history.piece[start])
        rows = rows[(rows > start) & (rows < rows[-1])]
        if len(rows):
            until = min(FRESH / accuracy * history.offset[rows[0]], SOON * history.offset[rows[-1]])
            keep[rows[history.offset[rows] < until]] = False
    if keep.all():
        return history
    kept = keep[history.profile_row]
    rows = {name: getattr(history, name)[keep] for name in (
        "time", "piece", "offset", "stress", "stress_rate", "speed", "acceleration", "mean", "mean_rate", "gradient",
        "gradient_rate", "place",
    )}  # fmt: skip
    profiles = {name: getattr(history, name)[kept] for name in ("profile", "profile_rate", "travel")}
    return replace(history, **rows, **profiles, profile_row=(np.cumsum(keep) - 1)[history.profile_row[kept]])


def _as_before_events(trace: Trace, acceleration: np.ndarray) -> np.ndarray:
    """A body's acceleration (rows,) with the limit from the left, not what follows, where it stops or breaks away."""
    out = acceleration.copy()
    for row in np.flatnonzero(trace.mark == kernel.EVENT):
        if row < 1 or trace.piece[row - 1] != trace.piece[row]:
            continue
        out[row] = acceleration[row - 1]
        step, before = trace.offset[row] - trace.offset[row - 1], 0.0
        if row > 1 and trace.piece[row - 2] == trace.piece[row]:
            before = trace.offset[row - 1] - trace.offset[row - 2]
        if step <= before:
            out[row] += (acceleration[row - 1] - acceleration[row - 2]) * step / before
    return out


def _wall_travel(time: np.ndarray, speed: np.ndarray, acceleration: np.ndarray) -> np.ndarray:
    """Running integral (n, 2) of the walls' speeds, by the cubic through values and rates."""
    h = np.diff(time)[:, None]
    part = 0.5 * h * (speed[1:] + speed[:-1]) + h * h / 12.0 * (acceleration[:-1] - acceleration[1:])
    return np.concatenate([np.zeros((1, 2)), np.cumsum(part, axis=0)])


def _stresses(problem: Problem, trace: Trace, value: np.ndarray, slope: np.ndarray) -> np.ndarray:
    """Wall stresses (rows, 2) from the balance of each wall's half cell.

    Flux through the last face, plus what the half cell stores, less what the pressure gives it: exact in steady
    flow.  After a break the half cell's storage jumps with the wall's acceleration although the stress does not:
    the limit from the left is used on both sides, which is second order where the right one is first.
    """
    system = trace.system
    stress = np.zeros((len(trace.piece), 2))
    for end, near in ((0, kernel.FIRST), (1, kernel.LAST)):
        conductance, half = system.end_conductance[end], system.end_volume[end]
        balance = conductance * (trace.fields[:, near] - value[end]) + half * value[PRESSURE]
        stress[:, end] = (balance - problem.density * half * slope[end]) / system.grid.stress_radius[end]
    return stress


@dataclass(frozen=True, eq=False)
class Before:
    """Just before t = 0: wall ``stress`` (2,) Pa, wall ``speed`` (2,) and ``gradient`` Pa/m."""

    stress: np.ndarray
    speed: np.ndarray
    gradient: float


def _join_breaks(
    problem: Problem, inputs: Inputs, trace: Trace, stress: np.ndarray, gradient: np.ndarray, before: Before | None
) -> None:
    """Right-hand limits at breaks: infinite where a no-slip wall moves suddenly against the fluid, else the left-hand
    limit; the pressure of a prescribed flow is infinite with them."""
    enters = np.flatnonzero(trace.offset == 0.0)
    pieces = trace.piece[enters]
    sudden = sudden_motion(problem, inputs, None if before is None else before.speed)[pieces]
    for end in (0, 1):
        if trace.system.end_volume[end] == 0.0:
            continue
        first = stress[0, end] if before is None else before.stress[end]
        left = np.where(enters > 0, stress[enters - 1, end], first)
        # a massless plate takes its load at once: there the stress itself jumps
        body = problem.walls[end].body
        if body is None or body.mass > 0.0:
            own = sudden[:, end] != 0.0
            if problem.flow is not None:
                left = left + np.where(own, 0.0, sudden[:, 1 - end] * _felt(problem, 1 - end))
            stress[enters, end] = np.where(own, np.nan, left)
    if problem.flow is not None:
        gradient[enters[(sudden != 0.0).any(axis=1)]] = np.nan


def _join_accelerations(
    problem: Problem, inputs: Inputs, trace: Trace, value: np.ndarray, slope: np.ndarray, stress: np.ndarray
) -> None:
    """Accelerations (``slope``) of linear bodies right after breaks, from all that acts on them: what the step knows is
    that of the body with its wall's half cell, which the liquid has not yet reached."""
    enters = np.flatnonzero(trace.offset == 0.0)
    for end, wall in enumerate(problem.walls):
        body = wall.body
        if body is None or body.mass == 0.0 or not body.linear or trace.system.end_volume[end] == 0.0:
            continue
        load = inputs.row(end).at(trace.piece[enters], np.zeros(len(enters)))
        place = trace.fields[enters, kernel.WALLS + 4 + end]
        push = body.displaced * (problem.length or 0.0)
        total = load - body.damping * value[end, enters] - body.stiffness * place + body.grip * stress[enters, end]
        total = total + push * value[PRESSURE, enters] if push else total
        slope[end, enters] = np.where(np.isfinite(total), total / body.mass, slope[end, enters])


def _felt(problem: Problem, mover: int) -> float:
    """Jump of a wall's stress per jump of the other one's speed, where the flow is prescribed.

    The layer that the other wall drags along, 2 sqrt(nu t / pi) deep, moves the rest of the section back; what that
    makes of the stress here, half-space against half-space, is constant in time (own derivation).
    """
    radius = (problem.inner, problem.outer)
    section = problem.gap * (1.0 if problem.metric == 0 else 0.5 * (problem.inner + problem.outer))
    return -problem.viscosity * radius[mover] ** problem.metric / section


def sudden_motion(problem: Problem, inputs: Inputs, speed_before: np.ndarray | None) -> np.ndarray:
    """Jump (P, 2) of each no-slip wall's speed against the fluid beside it at every piece's start.

    ``speed_before``: of walls with bodies before t = 0 (None: as after).  A sudden change of the prescribed flow
    moves all fluid at once; so does a wall that displaces fluid and is set in motion suddenly.
    """
    jumps = np.stack([inputs.row(index).jumps(0) for index in (LOWER, UPPER, PRESSURE)], axis=1)
    walls = jumps[:, :2].copy()
    core = jumps[:, PRESSURE].copy() if problem.flow is not None else np.zeros(len(jumps))
    for end, wall in enumerate(problem.walls):
        if wall.body is not None:
            walls[:, end] = 0.0
            if speed_before is not None and problem.start == "rest":  # else it moves on as it did before
                walls[0, end] = (wall.body.initial_speed or 0.0) - speed_before[end]
            if wall.body.displaced and problem.section:
                core -= wall.body.displaced / (problem.section * problem.count) * walls[:, end]
    out = np.zeros_like(walls)
    for end, wall in enumerate(problem.walls):
        if wall.kind == "moving" and wall.slip_length == 0.0:
            out[:, end] = walls[:, end] - core
    return out


def before_start(problem: Problem, system: System, inputs: Inputs, start: State) -> Before:
    """What the run comes from: rest, or the steady flow of the inputs' values before t = 0."""
    if problem.start == "rest":
        return Before(np.zeros(2), np.zeros(2), 0.0)
    speeds, gradient = inputs.before[:2].copy(), float(inputs.before[PRESSURE])
    if problem.closed:
        speeds = np.where([wall.body is not None for wall in problem.walls], start.speed, speeds)
        gradient = start.gradient
    return Before(steady_stress(system, start.velocity, speeds, gradient), speeds, gradient)


def steady_stress(system: System, velocity: np.ndarray, speeds: np.ndarray, gradient: float) -> np.ndarray:
    """Wall stresses (2,) of a steady flow, from the flux at each wall."""
    flux = system.end_conductance * (velocity[[0, -1]] - speeds) + system.end_volume * gradient
    return flux / system.grid.stress_radius


def extrapolate(coarse: History, fine: History) -> History:
    """Point by point ``fine + (fine - coarse) / 3``; both have the same rows and nodes."""
    mixed = {
        name: getattr(fine, name) + (getattr(fine, name) - getattr(coarse, name)) / 3.0
        for name in EXTRAPOLATED
    }
    return with_rates(replace(fine, position=coarse.position, lever=coarse.lever, **mixed))


def with_rates(rows: History) -> History:
    """The history with the rates of its stresses, from its own rows."""
    return replace(rows, stress_rate=stress_rates(rows.piece, rows.offset, rows.stress))
