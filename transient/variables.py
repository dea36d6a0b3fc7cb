"""What a result file stores: histories on rows that straight lines may join, and profiles, with units and titles."""

from __future__ import annotations

import numpy as np

from transient.gap.problem import Problem
from transient.march.levels import Ladder
from transient.march.rows import Motion, Rows, denser, profile_times
from transient.result.headline.motion import reach
from transient.result.history import between
from transient.result.result import Variable
from transient.result.run import Run
from transient.trust.quasi_steady import quasi_steady_gradient, quasi_steady_stress

BY_WALL = ("time", "wall")


def variables(problem: Problem, run: Run, rows: Rows, ladder: Ladder, until: float) -> dict[str, Variable]:
    """All variables of a solved case by name."""
    columns = [wall.end for wall in run.walls]
    angular = "rad/s" if problem.rotating else "m/s"
    out = {
        "time": Variable(("time",), rows.time, "s", "time since the start of the run"),
        "wall": Variable(("wall",), np.array([wall.name for wall in run.walls]), "1", "wall"),
        "wall_stress": Variable(
            BY_WALL, rows.stress[:, columns], "Pa", "stress of the fluid on the wall, positive along +x"
        ),
        "wall_speed": Variable(BY_WALL, rows.speed[:, columns], angular, "speed of the wall"),
    }
    error = [np.interp(rows.time, run.history.time, run.errors.stress[:, end]) for end in columns]
    out["wall_stress_error"] = Variable(BY_WALL, np.stack(error, axis=1), "Pa", "bound of the wall stress's error")
    out |= _loads(problem, rows, columns)
    if rows.motion is not None:
        out |= _motion(problem, run, rows, rows.motion, columns)
    out["mean_velocity"] = Variable(("time",), rows.mean, "m/s", "mean velocity")
    if problem.section is not None:
        flow = rows.mean * problem.section * problem.count
        out["flow_rate"] = Variable(("time",), flow, "m^3/s", "flow rate of all gaps")
    out["pressure_drop_per_length"] = Variable(
        ("time",), rows.gradient, "Pa/m", "pressure drop per length, positive along +x"
    )
    gradient = rows.gradient if problem.flow is None else quasi_steady_gradient(problem, rows.speed, rows.mean)
    out["quasi_steady_stress"] = Variable(
        BY_WALL,
        quasi_steady_stress(problem, rows.speed, gradient)[:, columns],
        "Pa",
        "wall stress by the hand formula (steady profile at each instant)",
    )
    return out | _profiles(problem, run, rows, ladder, until, columns)


def areas(problem: Problem, columns: list[int]) -> np.ndarray | None:
    """Wetted areas (w,) of one gap; one that the sizes do not tell is taken to face that of the other wall."""
    known = [problem.walls[end].area for end in columns]
    given = [(area, end) for area, end in zip(known, columns, strict=True) if area is not None]
    if not given:
        return None
    size, end = given[0]
    own = problem.walls[end].radius
    out = []
    for area, column in zip(known, columns, strict=True):
        share = problem.walls[column].radius / own if own > 0.0 else 1.0
        out.append(size * share if area is None else area)
    return np.array(out)


def _loads(problem: Problem, rows: Rows, columns: list[int]) -> dict[str, Variable]:
    """Force or torque of all gaps, where an area is known."""
    wetted = areas(problem, columns)
    if wetted is None:
        return {}
    factor = wetted * problem.count
    if problem.rotating:
        factor = factor * [problem.walls[end].radius for end in columns]
        return {
            "wall_torque": Variable(
                BY_WALL, rows.stress[:, columns] * factor, "N*m", "torque of the fluid on the wall, all gaps"
            )
        }
    return {
        "wall_force": Variable(
            BY_WALL, rows.stress[:, columns] * factor, "N", "force of the fluid on the wall, all gaps"
        )
    }


def _motion(problem: Problem, run: Run, rows: Rows, motion: Motion, columns: list[int]) -> dict[str, Variable]:
    """How the walls move, and what drives them: for a wall without a body, what its motion asks for."""
    speed, load = ("rad/s", "N*m") if problem.rotating else ("m/s", "N")
    place = "rad" if problem.rotating else "m"
    wetted = areas(problem, columns)
    drive = np.zeros_like(rows.stress[:, columns])
    face = np.zeros_like(drive)
    bodies = {body.end: body for body in run.bodies}
    for i, end in enumerate(columns):
        body = bodies.get(end)
        if body is not None:
            drive[:, i] = motion.load[:, end] + body.curve_load(rows.speed[:, end])
            face[:, i] = body.face * rows.gradient
        elif wetted is not None:
            lever = problem.walls[end].radius if problem.rotating else 1.0
            drive[:, i] = -rows.stress[:, end] * wetted[i] * problem.count * lever
    out = {
        "wall_position": Variable(BY_WALL, motion.place[:, columns], place, "displacement of the wall since t = 0"),
        "wall_acceleration": Variable(
            BY_WALL, motion.acceleration[:, columns], f"{speed[:-2]}/s^2", "acceleration of the wall"
        ),
        "drive_load": Variable(
            BY_WALL, drive, load, "load that drives the wall: on a body its load history, weight and force-speed curve"
        ),
    }
    if face.any():
        out["pressure_load"] = Variable(
            BY_WALL, face, load, "load of the pressure on the face of a body that displaces fluid"
        )
    return out


def _profiles(
    problem: Problem, run: Run, rows: Rows, ladder: Ladder, until: float, columns: list[int]
) -> dict[str, Variable]:
    history = run.history
    if problem.profile_times is not None:
        at = np.array([t for t in problem.profile_times if t <= until])
    else:
        at = profile_times(history, problem.profiles)
    velocity, travel = history.profiles_at(at)
    infinite = history.time[np.isnan(history.stress).any(axis=1)]
    parts, position = denser(problem, ladder.layers, len(history.position) - 1)
    velocity, travel = (between(field, parts, np.isin(at, infinite)) for field in (velocity, travel))
    lever = position if problem.rotating else np.ones(len(position))
    depth = reach(run)
    kept = history.time[history.profile_row]
    breaks = np.unique(ladder.inputs.starts)
    return {
        "profile_time": Variable(("profile_time",), at, "s", "time of the velocity profiles"),
        "position": Variable(
            ("position",), position, "m", "radius" if problem.metric else "distance from the lower wall"
        ),
        "velocity": Variable(
            ("profile_time", "position"), velocity * lever, "m/s",
            "tangential velocity" if problem.rotating else "velocity along +x",
        ),
        "travel": Variable(
            ("profile_time", "position"), travel * lever, "m", "distance that the fluid has travelled since the start"
        ),
        "reach": Variable(
            ("time", "wall"),
            np.stack([np.interp(rows.time, kept, depth[:, end]) for end in columns], axis=1),
            "m",
            "depth that the wall's motion or drag has reached into the gap (1 % depth)",
        ),
        "drive_break": Variable(("drive_break",), breaks, "s", "break points of the drive"),
    }  # fmt: skip
