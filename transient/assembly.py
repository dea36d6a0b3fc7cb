"""From a solved problem to a result: stored variables, summary, checks and the verdict they make."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from transient.case.model import Case
from transient.gap.problem import Problem
from transient.march.levels import Ladder
from transient.march.regime import Outlook
from transient.march.rows import stored
from transient.result.result import Result
from transient.result.run import Run
from transient.trust.balance import BALANCES
from transient.trust.body_balance import accounts, body_checks
from transient.trust.check import Check, verdict
from transient.trust.demand import Demand, unmet
from transient.trust.hand_formula import compare
from transient.trust.validity import validity_checks
from transient.variables import variables


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
    kept = variables(problem, run, rows, solved.ladder, solved.ahead.until)
    summary = _summary(case, problem, solved, seconds)
    return Result(kept, summary, case.text(), {"title": case.title})


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
        "shape": case.gap.shape.word,
        "verdict": verdict(checks),
        **parts,
        "quasi_steady": compare(
            problem, run.history, peaks, parts["bodies"], parts["pressure"]["peak_drop_per_length"]
        ),
        "energy": accounts(problem, run),
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
    run = solved.run
    checks = [_difference(problem, solved), *(check(problem, run.history) for check in BALANCES)]
    checks += body_checks(problem, run)
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
