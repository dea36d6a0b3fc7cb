"""Who solves the verification's problems: any solver with headline numbers and stated errors.

It is handed in, since this room lies below the one that answers users.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Protocol

from transient.gap.problem import Problem
from transient.result.history import History
from transient.result.run import Run

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
