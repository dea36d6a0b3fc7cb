"""Who solves the verification's problems: any solver with headline numbers and stated errors; by default one of three
attempts here, since this room lies below the one that answers users."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Protocol

import numpy as np

from transient.gap.problem import Problem
from transient.march.facts import run_of
from transient.march.levels import climb
from transient.march.regime import outlook
from transient.result.headline import headlines
from transient.result.history import History
from transient.result.run import Run
from transient.trust.demand import demands, unmet
from transient.trust.exact import compare, exact_of, sharpened
from transient.trust.refine import estimate

ATTEMPTS = 3
SERIES, REFINEMENT = "series", "refinement"  # where stated errors come from


class Solved(Protocol):
    """``run`` with the extrapolated history, what it ends in and row errors; ``parts``: headline numbers by summary
    key."""

    run: Run
    parts: dict[str, Any]


Solver = Callable[[Problem, str], Solved]  # of a problem and where its errors are to come from


@dataclass(frozen=True, eq=False)
class Marched:
    """A solved problem."""

    problem: Problem
    run: Run
    parts: dict[str, Any]

    @property
    def history(self) -> History:
        """The stored rows."""
        return self.run.history


@dataclass(frozen=True)
class Bench:
    """The solver under test."""

    solver: Solver

    def solve(self, problem: Problem, judge: str = SERIES) -> Marched:
        """The solver's answer."""
        found = self.solver(problem, judge)
        return Marched(problem, found.run, found.parts)


def attempts(problem: Problem, judge: str) -> Marched:
    """March, judge by the series or by refinement alone, refine until the request is met."""
    ahead = outlook(problem)
    refine, levels = (1.0, 2) if judge == SERIES else (0.5, 3)
    for _ in range(ATTEMPTS):
        ladder = climb(problem, ahead, problem.accuracy, refine, levels)
        exact = exact_of(problem, ahead, ladder) if judge == SERIES else None
        errors = estimate(ladder) if exact is None else compare(problem, ahead, ladder, exact)
        run = run_of(problem, ahead, ladder, errors)
        parts = headlines(run)
        if exact is not None and run.regime.deviation is not None:
            ends = {wall.name: wall.end for wall in run.walls}
            parts["settling"] = sharpened(parts["settling"], exact, run.regime.deviation, errors, ends)
        calm = ladder.best.steady_stress if ahead.kind == "steady" else None
        missing = unmet(demands(run, parts, problem.accuracy, calm))
        if not missing:
            break
        refine *= float(np.clip(np.sqrt(2.0 * missing[0].ratio), 1.5, 8.0))
    return Marched(problem, run, parts)
