"""Case in, answer out: problem -> ladder of marches -> headline numbers -> trust."""

from __future__ import annotations

import time
from dataclasses import replace

import numpy as np

from transient.assembly import Solved, result_of
from transient.case.model import Case
from transient.gap.problem import Problem
from transient.march.facts import run_of
from transient.march.levels import Ladder, climb
from transient.march.march import SolveError
from transient.march.regime import Outlook, outlook
from transient.result.headline import headlines
from transient.result.result import Result
from transient.series.gapshape import SeriesError
from transient.trust.demand import demands, unmet
from transient.trust.exact import Exact, compare, exact_of
from transient.trust.passage import sharpened
from transient.trust.refine import estimate

MOST_ATTEMPTS = 6
MOST_IN_VAIN = 2  # attempts on end that are no better than a coarser one: round-off has the last word there
# A further attempt aims below the request, since the law of errors holds on the average only.
AIM = 0.5
FINEST = 4000.0  # refinement over the first guess beyond which no attempt is made
MOST_WORK = 4e9  # cells x steps of the finest level of an attempt
MOST_WORK_UNJUDGED = 3e7  # the same with three levels and bodies or flow closed in every step


def run(case: Case, judge: str = "series") -> Result:
    """Solve a case: histories, headline numbers with errors, checks.

    ``judge`` "series": errors against the exact solution; "refinement": from refinement alone, as where no exact
    solution is known.  Raises ``SolveError`` where the march stops.
    """
    began = time.perf_counter()
    problem = case.problem()
    solved = solve(problem, judge)
    return result_of(case, problem, solved, time.perf_counter() - began)


def solve(problem: Problem, judge: str = "series") -> Solved:
    """Refine until every headline number's error meets the accuracy, or no finer level is in reach."""
    ahead = look(problem)
    # without a series three levels must judge themselves
    judged = judge == "series" and _has_series(problem)
    levels = 2 if judged else 3
    refine, best, in_vain = 1.0 if judged else 0.5, None, 0
    for _ in range(MOST_ATTEMPTS):
        attempt = _attempt(problem, ahead, refine, levels, judge)
        missing = unmet(attempt.wanted)
        if best is None or _worst(attempt) < _worst(best):
            best, in_vain = attempt, 0
        else:
            in_vain += 1
        if not missing:
            return attempt
        # errors fall with the square of refine (the extrapolated ones of a smooth flow)
        factor = float(np.clip(np.sqrt(missing[0].ratio / AIM), 1.5, 8.0))
        work = attempt.ladder.cells * attempt.ladder.steps * factor**1.5
        if in_vain == MOST_IN_VAIN or refine * factor > FINEST or work > (MOST_WORK if judged else MOST_WORK_UNJUDGED):
            break
        refine *= factor
    assert best is not None
    return best


def look(problem: Problem) -> Outlook:
    """The outlook with a run long enough for every profile that was asked for."""
    try:
        ahead = outlook(problem)
    except ValueError as error:
        raise SolveError(f"{error}, such as run.duration = \"2 s\"") from None
    latest = max(problem.profile_times or (0.0,))
    if problem.duration is None and latest > ahead.until:
        return replace(ahead, until=latest)
    return ahead


def _attempt(problem: Problem, ahead: Outlook, refine: float, levels: int, judge: str) -> Solved:
    ladder = climb(problem, ahead, problem.accuracy, refine, levels)
    series = _series(problem, ahead, ladder, judge)
    errors = estimate(ladder) if series is None else compare(problem, ahead, ladder, series)
    run = run_of(problem, ahead, ladder, errors)
    parts = headlines(run)
    if series is not None and run.regime.deviation is not None:
        parts["settling"] = sharpened(parts["settling"], series, ladder, run)
    calm = ladder.best.steady_stress if ahead.kind == "steady" else None
    return Solved(ahead, ladder, run, parts, demands(run, parts, problem.accuracy, calm))


def _has_series(problem: Problem) -> bool:
    """Whether an exact solution is to be had: not under force-speed curves and dry friction."""
    return problem.linear


def _series(problem: Problem, ahead: Outlook, ladder: Ladder, judge: str) -> Exact | None:
    """The exact solution, None where there is none or it is not to be used."""
    if judge == "refinement" or not _has_series(problem):
        return None
    try:
        return exact_of(problem, ahead, ladder)
    except SeriesError:
        return None


def _worst(solved: Solved) -> float:
    missing = unmet(solved.wanted)
    return missing[0].ratio if missing else 0.0


def exit_status(result: Result) -> int:
    """0 solved and trusted, 1 outside the model or a self-check failed, 3 the accuracy was not reached."""
    if result.summary["verdict"] in ("failed", "outside"):
        return 1
    return 3 if not result.summary["accuracy"]["met"] else 0


__all__ = ["SolveError", "exit_status", "run", "solve"]
