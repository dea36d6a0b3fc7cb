"""How fast the liquid and the walls move: the velocities that dimensionless numbers are built from."""

from __future__ import annotations

import numpy as np

from transient.gap.problem import LOWER, UPPER, Problem
from transient.result.history import History

# Below this density the fluid is taken as a gas: common practice, no source.
GAS_BELOW = 50.0


def pressed(problem: Problem, history: History) -> bool:
    """Whether a pressure drop acts at any time of the run or before it."""
    return bool(np.any(history.gradient != 0.0)) or (problem.start == "steady" and problem.gradient.before != 0.0)


def film_height(problem: Problem) -> float:
    """Gap height, doubled where one end is shear-free (the film is half of a symmetric gap), m."""
    kinds = [wall.kind for wall in problem.walls]
    return problem.gap * (2.0 if "shear_free" in kinds else 1.0)


def speed_difference(problem: Problem, history: History) -> float:
    """Largest difference of speed across the gap over the run, walls and mean flow taken together, m/s.

    Under a pressure drop of the walls only.  In a rotating gap the difference of angular speed times the radius of
    the faster wall.
    """
    speed = history.speed[:, UPPER:] if problem.walls[LOWER].kind == "axis" else history.speed
    columns = [*speed.T]
    if not pressed(problem, history):
        middle = 0.5 * (problem.inner + problem.outer)
        columns.append(history.mean / middle if problem.rotating else history.mean)
    stacked = np.stack(columns, axis=1)
    spread = float(np.max(stacked.max(axis=1) - stacked.min(axis=1)))
    if not problem.rotating:
        return spread
    fastest = np.abs(history.speed).max(axis=0)
    return spread * (problem.outer if fastest[UPPER] >= fastest[LOWER] else problem.inner)


def relative_mean(problem: Problem, history: History) -> np.ndarray:
    """Mean velocity against the mean speed of the walls that hold the fluid, per row (n,) m/s."""
    held = [index for index, wall in enumerate(problem.walls) if wall.kind == "moving"]
    return history.mean - history.speed[:, held].mean(axis=1) if held else history.mean
