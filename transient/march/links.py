"""A problem's bodies and its prescribed flow as the kernel's arrays."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from transient.gap.problem import Problem
from transient.gap.system import System
from transient.march import closure


@dataclass(frozen=True, eq=False)
class Links:
    """For a batch of one: ``link`` [2, 1, LINKS], ``flow`` (1,), the curves end to end (V,), ``end_weight`` [2, 1]."""

    link: np.ndarray
    flow: np.ndarray
    curve_speed: np.ndarray
    curve_value: np.ndarray
    end_weight: np.ndarray


def links(problem: Problem, system: System) -> Links:
    """What couples the walls and the flow of a problem to its fluid.

    The body of a no-slip wall carries that wall's half cell of fluid.
    """
    link = np.zeros((2, 1, closure.LINKS))
    speeds: list[float] = []
    values: list[float] = []
    whole = (problem.section or 0.0) * problem.count
    for end, wall in enumerate(problem.walls):
        body = wall.body
        if body is None:
            continue
        row = link[end, 0]
        grip = body.grip / system.grid.stress_radius[end]
        half = system.end_volume[end]
        row[closure.KIND] = closure.BODY
        row[closure.MASS] = body.mass + grip * problem.density * half
        row[closure.DAMPING], row[closure.STIFFNESS] = body.damping, body.stiffness
        row[closure.GRIP] = grip
        row[closure.PUSH] = grip * half + (problem.length or 0.0) * body.displaced
        row[closure.SLIDING], row[closure.BREAKAWAY] = body.sliding, body.breakaway
        row[closure.SWEEP] = body.displaced / whole if body.displaced else 0.0
        row[closure.CURVE_FIRST] = len(speeds)
        speeds += body.curve[0]
        values += body.curve[1]
        row[closure.CURVE_STOP] = len(speeds)
        row[closure.REFUSE] = 0.0 if body.held_beyond else 1.0
    weight = system.grid.mean_weight
    stop = system.first + system.unknowns
    ends = np.array([[weight[0] if system.first else 0.0], [weight[-1] if stop < len(weight) else 0.0]])
    flow = np.array([0 if problem.flow is None else 1], np.int64)
    return Links(link, flow, np.array(speeds or [0.0]), np.array(values or [0.0]), ends)
