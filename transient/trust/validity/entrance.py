"""Entrance length: is the flow developed along most of the gap?"""

from __future__ import annotations

import numpy as np

from transient.gap.problem import Problem
from transient.result.history import History
from transient.trust.check import Check, judge
from transient.trust.validity.motion import film_height, pressed, relative_mean

SOURCE = "Durst et al., J. Fluids Eng. 127 (2005) 1154 (from memory); caution at a tenth: common practice, no source"
CAUTION, LIMIT = 0.1, 1.0


def pipe_entrance(reynolds: float) -> float:
    """Entrance length over diameter by Reynolds number on the diameter (Durst et al. 2005, from memory)."""
    return (0.619**1.6 + (0.0567 * reynolds) ** 1.6) ** (1 / 1.6)


def channel_entrance(reynolds: float) -> float:
    """Entrance length over height by Reynolds number on the height (Durst et al. 2005, from memory)."""
    return (0.631**1.6 + (0.0442 * reynolds) ** 1.6) ** (1 / 1.6)


def entrance_length(problem: Problem, history: History) -> Check | None:
    """Share of the length that the flow needs to develop, at the run's largest mean velocity.

    For pressure-driven flow through a gap of known length; an annulus counts as a channel of its clearance.
    """
    if problem.length is None or not pressed(problem, history):
        return None
    velocity = float(np.abs(relative_mean(problem, history)).max())
    kinematic = problem.viscosity / problem.density
    if problem.walls[0].kind == "axis":
        size = 2.0 * problem.outer
        needed = size * pipe_entrance(velocity * size / kinematic)
    else:
        size = film_height(problem)
        needed = size * channel_entrance(velocity * size / kinematic)
    value = needed / problem.length
    status = judge(value, CAUTION, LIMIT)
    words = {
        "pass": "the flow is developed along nearly all of the length",
        "caution": f"the flow needs {100 * value:.2g} % of the length to develop; more pressure is lost there",
        "fail": "the flow does not develop within the length; the answer does not apply",
    }
    return Check("entrance length", "validity", status, value, LIMIT, SOURCE, words[status])
