"""Reynolds numbers by shape: is the flow laminar?"""

from __future__ import annotations

import numpy as np

from transient.gap.problem import Problem
from transient.result.history import History
from transient.trust.check import NEAR, Check, judge
from transient.trust.validity.motion import film_height, pressed, relative_mean, speed_difference

# Plane Couette flow, one wall moving, full gap: four times 325 on half the gap and half the speed difference.
COUETTE = 1300.0
COUETTE_SOURCE = (
    "Dauchot & Daviaud 1995: turbulence lasts from 325 on half gap and half speed difference (from memory), "
    "times 4 for the full gap"
)
# Plane Poiseuille flow, mean velocity and full height: 1000 x 2/3 x 2 from centreline velocity and half height.
CHANNEL = 4000.0 / 3.0
CHANNEL_SOURCE = (
    "Carlson, Widnall & Peeters 1982: about 1000 on centreline velocity and half height (from memory), "
    "converted to mean velocity and height"
)
PIPE = 2040.0
PIPE_SOURCE = "Avila et al., Science 333 (2011) 192: turbulence lasts above 2040"
ANNULUS_SOURCE = f"{PIPE_SOURCE}; taken on the hydraulic diameter: common practice, no source"


def _kinematic(problem: Problem) -> float:
    return problem.viscosity / problem.density


def _check(name: str, value: float, limit: float, source: str) -> Check:
    status = judge(value, NEAR * limit, limit)
    words = {
        "pass": f"laminar: {value:.3g} is well below {limit:.4g}",
        "caution": f"{value:.3g} is close to {limit:.4g}, where turbulence can last; disturbances may not die out",
        "fail": f"{value:.3g} is above {limit:.4g}: the flow may be turbulent and the answer does not apply",
    }
    return Check(name, "validity", status, value, limit, source, words[status])


def _wall_value(problem: Problem, history: History) -> float | None:
    if problem.walls[0].kind == "axis" or not any(wall.kind == "moving" for wall in problem.walls):
        return None
    difference = speed_difference(problem, history)
    return difference * film_height(problem) / _kinematic(problem) if difference > 0.0 else None


def _pressure_value(problem: Problem, history: History) -> tuple[float, float, str] | None:
    """(Reynolds number, limit, source) of the flow that the pressure drives."""
    if problem.rotating or not any(wall.kind == "moving" for wall in problem.walls):
        return None
    round_bore = problem.walls[0].kind == "axis"
    if not round_bore and not pressed(problem, history):
        return None
    # The largest of the run; nothing that moves with its wall counts.
    velocity = float(np.abs(relative_mean(problem, history)).max())
    number = velocity / _kinematic(problem)
    if round_bore:
        return number * 2.0 * problem.outer, PIPE, PIPE_SOURCE
    if problem.metric == 0:
        return number * film_height(problem), CHANNEL, CHANNEL_SOURCE
    return number * 2.0 * film_height(problem), PIPE, ANNULUS_SOURCE


def wall_reynolds(problem: Problem, history: History) -> Check | None:
    """speed difference x gap / kinematic viscosity, for flows between two surfaces (a rotating gap: thin-gap value)."""
    value = _wall_value(problem, history)
    if value is None:
        return None
    return _check("Reynolds number, wall-driven", value, COUETTE, COUETTE_SOURCE)


def pressure_reynolds(problem: Problem, history: History) -> Check | None:
    """mean velocity x diameter (pipe), height (plates) or hydraulic diameter (annulus) / kinematic viscosity."""
    found = _pressure_value(problem, history)
    return None if found is None else _check("Reynolds number, pressure-driven", *found)


def combined_reynolds(problem: Problem, history: History) -> Check | None:
    """Sum of both numbers' shares of their limits, for walls and pressure acting together; on the safe side."""
    wall, pressure = _wall_value(problem, history), _pressure_value(problem, history)
    if wall is None or pressure is None:
        return None
    value = wall / COUETTE + pressure[0] / pressure[1]
    source = "sum of the shares of both limits: common practice, no source"
    return _check("Reynolds number, walls and pressure together", value, 1.0, source)
