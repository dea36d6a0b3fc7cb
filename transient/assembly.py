"""From a solved problem to a result: stored variables, summary, checks and the verdict they make."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from transient.case.model import Case
from transient.gap.problem import Problem
from transient.march.levels import Ladder
from transient.march.regime import Outlook
from transient.march.rows import Rows, between, denser, profile_times, stored
from transient.result.headline.motion import reach
from transient.result.result import Result, Variable
from transient.result.run import Run
from transient.trust.balance import BALANCES
from transient.trust.check import Check, verdict
from transient.trust.demand import Demand, unmet
from transient.trust.quasi_steady import compare, quasi_steady_stress
from transient.trust.validity import validity_checks


@dataclass(frozen=True, eq=False)
class Solved:
    """What an attempt came to."""

    ahead: Outlook
    ladder: Ladder
    run: Run
    parts: dict[str, Any]
    wanted: list[Demand]


def result_of(case: Case, problem: Problem, solved: Solved, seconds: float) -> Result:
    """The result of a case; ``seconds`` spent solving."""
    run = solved.run
    rows = stored(problem, run.history, solved.ladder.inputs, run.errors.stress)
    variables = _variables(problem, solved, rows)
    summary = _summary(case, problem, solved, seconds)
    return Result(variables, summary, case.text(), {"title": case.title})


def _summary(case: Case, problem: Problem, solved: Solved, seconds: float) -> dict[str, Any]:
    run, parts = solved.run, solved.parts
    peaks = {
        name: None if wall["unbounded"] else wall["peak_stress"]
        for name, wall in parts["walls"].items()
    }
    checks = [*_self_checks(problem, solved), *validity_checks(problem, run.history)]
    missing = unmet(solved.wanted)
    reached = problem.accuracy * max((d.ratio for d in solved.wanted if not d.grazes), default=0.0)
    return {
        "title": case.title,
        "shape": problem.shape,
        "verdict": verdict(checks),
        **parts,
        "quasi_steady": compare(problem, run.history, peaks),
        "checks": [check.as_dict() for check in checks],
        "accuracy": {
            "asked": problem.accuracy,
            "met": not missing,
            "worst": missing[0].name if missing else None,
            "reached": reached,
        },
        "duration": solved.ahead.until,
        "numerics": {
            "points": solved.ladder.cells + 1,
            "steps": solved.ladder.steps,
            "solves": solved.ladder.solves,
            "seconds": seconds,
            "accuracy": problem.accuracy,
            "reached": reached,
        },
    }


def _self_checks(problem: Problem, solved: Solved) -> list[Check]:
    errors = solved.run.errors
    checks = [_difference(problem, solved), *(check(problem, solved.run.history) for check in BALANCES)]
    grazing = [d for d in solved.wanted if d.grazes and d.ratio > 1.0]
    if grazing:
        checks.append(_grazing(grazing[0]))
    return [*checks, _reached(problem, solved, errors.kind)]


def _difference(problem: Problem, solved: Solved) -> Check:
    """Worst stated error of the stress histories as a share of each wall's largest stress."""
    errors, history = solved.run.errors, solved.run.history
    worst = 0.0
    largest = float(np.nanmax(np.abs(history.stress), initial=0.0))
    for wall in solved.run.walls:
        if wall.shear_free or solved.run.unbounded[wall.end] > 0.0:
            continue
        size = max(float(np.nanmax(np.abs(history.stress[:, wall.end]), initial=0.0)), 1e-6 * largest)
        if size > 0.0:
            worst = max(worst, float(errors.stress[:, wall.end].max()) / size)
    exact = errors.kind == "exact"
    name = "exact solution" if exact else "refinement"
    source = "eigenfunction series of the same case" if exact else "grid and steps refined together"
    status = "pass" if worst <= problem.accuracy else "caution"
    against = "the exact solution" if exact else "a finer solve"
    note = f"stresses differ from {against} by {worst:.1e}"
    return Check(name, "numerics", status, worst, problem.accuracy, source, note)


def _reached(problem: Problem, solved: Solved, kind: str) -> Check:
    missing = unmet(solved.wanted)
    ratio = max((d.ratio for d in solved.wanted if not d.grazes), default=0.0)
    note = "every headline number is within the accuracy asked for"
    if missing:
        note = f"the accuracy was not reached: {missing[0].name} is {missing[0].ratio:.3g} times too far off"
    return Check(
        "accuracy reached", "numerics", "caution" if missing else "pass", ratio * problem.accuracy, problem.accuracy,
        "stated errors of the headline numbers", note,
    )  # fmt: skip


def _grazing(demand: Demand) -> Check:
    note = f"{demand.name}: the deviation runs along the settling band, so the time is uncertain by its stated error"
    return Check("settling band", "numerics", "caution", demand.error, demand.allowed, "stated error", note)


def _variables(problem: Problem, solved: Solved, rows: Rows) -> dict[str, Variable]:
    run = solved.run
    columns = [wall.end for wall in run.walls]
    angular = "rad/s" if problem.rotating else "m/s"
    out = {
        "time": Variable(("time",), rows.time, "s", "time since the start of the run"),
        "wall": Variable(("wall",), np.array([wall.name for wall in run.walls]), "1", "wall"),
        "wall_stress": Variable(
            ("time", "wall"), rows.stress[:, columns], "Pa", "stress of the fluid on the wall, positive along +x"
        ),
        "wall_speed": Variable(("time", "wall"), rows.speed[:, columns], angular, "speed of the wall"),
    }
    out |= _loads(problem, run, rows, columns)
    out["mean_velocity"] = Variable(("time",), rows.mean, "m/s", "mean velocity")
    if problem.section is not None:
        flow = rows.mean * problem.section * problem.count
        out["flow_rate"] = Variable(("time",), flow, "m^3/s", "flow rate of all gaps")
    out["pressure_drop_per_length"] = Variable(
        ("time",), rows.gradient, "Pa/m", "pressure drop per length, positive along +x"
    )
    out["quasi_steady_stress"] = Variable(
        ("time", "wall"),
        quasi_steady_stress(problem, rows.speed, rows.gradient)[:, columns],
        "Pa",
        "wall stress by the hand formula (steady profile at each instant)",
    )
    return out | _profiles(problem, run, solved, rows, columns)


def _loads(problem: Problem, run: Run, rows: Rows, columns: list[int]) -> dict[str, Variable]:
    """Force or torque of all gaps, where the area is known."""
    if any(problem.walls[end].area is None for end in columns):
        return {}
    factor = np.array([problem.walls[end].area for end in columns], dtype=float) * problem.count
    if problem.rotating:
        factor = factor * [problem.walls[end].radius for end in columns]
        return {
            "wall_torque": Variable(
                ("time", "wall"), rows.stress[:, columns] * factor, "N*m", "torque of the fluid on the wall, all gaps"
            )
        }
    return {
        "wall_force": Variable(
            ("time", "wall"), rows.stress[:, columns] * factor, "N", "force of the fluid on the wall, all gaps"
        )
    }


def _profiles(problem: Problem, run: Run, solved: Solved, rows: Rows, columns: list[int]) -> dict[str, Variable]:
    history = run.history
    if problem.profile_times is not None:
        at = np.array([t for t in problem.profile_times if t <= solved.ahead.until])
    else:
        at = profile_times(history, problem.profiles)
    velocity, travel = history.profiles_at(at)
    infinite = history.time[np.isnan(history.stress).any(axis=1)]
    parts, position = denser(problem, solved.ladder.layers, len(history.position) - 1)
    velocity, travel = (between(field, parts, np.isin(at, infinite)) for field in (velocity, travel))
    lever = position if problem.rotating else np.ones(len(position))
    depth = reach(run)
    kept = history.time[history.profile_row]
    breaks = np.unique(solved.ladder.inputs.starts)
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



