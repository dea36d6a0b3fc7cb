"""Does the model apply, judged before anything is solved: the validity checks on the steady flow of each instant."""

from __future__ import annotations

import numpy as np

from transient.gap.problem import LOWER, PRESSURE, UPPER, Inputs, Problem
from transient.result.history import History
from transient.trust.check import Check
from transient.trust.massless import Motion, film_of, hand_motion
from transient.trust.quasi_steady import (
    quasi_steady_gradient,
    quasi_steady_mean,
    quasi_steady_stress,
    steady_profile,
)
from transient.trust.validity import validity_checks

# Instants per smooth piece of the drive, and points across the gap: enough to see its largest values to a few per cent.
INSTANTS, ACROSS = 9, 33
# More instants than this tell nothing new of a drive that repeats itself.
MOST = 2000
# After so many of its time constants a body is at its speed to a per cent.
TIME_CONSTANTS = 5.0


def preview(problem: Problem, until: float) -> list[Check]:
    """The validity checks as far as the hand formula tells, over [0, ``until``] s.

    The solved flow can differ: it lags behind, and its stresses are larger where the drive is fast.
    """
    return validity_checks(problem, hand_history(problem, _long_enough(problem, until)))


def _long_enough(problem: Problem, until: float) -> float:
    """``until``, or later where bodies take longer to come up to speed and the case names no duration."""
    if problem.duration is not None or all(wall.body is None for wall in problem.walls):
        return until
    film = film_of(problem)
    tardy = 0.0
    for end, wall in enumerate(problem.walls):
        if wall.body is not None:
            holds = wall.body.damping - film.resistance[end, end]
            inertia = wall.body.mass + film.inertia[end, end]
            tardy = max(tardy, inertia / holds if holds > 0.0 else 0.0)
    return until + TIME_CONSTANTS * tardy


def hand_history(problem: Problem, until: float) -> History:
    """The steady flow of each instant as a history; rates and travel, which the checks do not ask for, are zero."""
    inputs = problem.inputs(until)
    starts = inputs.starts
    ends = np.append(starts[1:], max(until, float(starts[-1])))
    share = np.linspace(0.0, 1.0, INSTANTS)
    offset = ((ends - starts)[:, None] * share).ravel()[:MOST]
    piece = np.repeat(np.arange(len(starts)), INSTANTS)[:MOST]
    speed, gradient = _driven(problem, inputs, piece, offset)
    position = np.linspace(problem.inner, problem.outer, ACROSS)
    profile = np.stack([steady_profile(problem, s, g, position) for s, g in zip(speed, gradient, strict=True)])
    rows = len(piece)
    return History(
        time=starts[piece] + offset,
        piece=piece,
        offset=offset,
        stress=quasi_steady_stress(problem, speed, gradient),
        stress_rate=np.zeros((rows, 2)),
        speed=speed,
        acceleration=np.zeros((rows, 2)),
        mean=quasi_steady_mean(problem, speed, gradient),
        mean_rate=np.zeros(rows),
        gradient=gradient,
        gradient_rate=np.zeros(rows),
        place=np.zeros((rows, 2)),
        position=position,
        profile_row=np.arange(rows),
        profile=profile,
        profile_rate=np.zeros_like(profile),
        travel=np.zeros_like(profile),
    )


def _driven(
    problem: Problem, inputs: Inputs, piece: np.ndarray, offset: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """Wall speeds (n, 2) and pressure drop per length (n,); bodies move as a film that follows at once lets them."""
    given = inputs.row(PRESSURE).at(piece, offset)
    speed = np.stack([inputs.row(row).at(piece, offset) for row in (LOWER, UPPER)], axis=1)
    motion = _hand_motion(problem, inputs, piece, offset)
    if motion is not None:
        return motion.speed, motion.gradient
    return speed, given if problem.flow is None else quasi_steady_gradient(problem, speed, given)


def _hand_motion(problem: Problem, inputs: Inputs, piece: np.ndarray, offset: np.ndarray) -> Motion | None:
    """Bodies as a film that follows at once lets them move; None without bodies."""
    bodies = [wall.body for wall in problem.walls]
    if all(body is None for body in bodies):
        return None
    start = (
        np.array([0.0 if body is None else body.initial_speed or 0.0 for body in bodies]),
        np.array([0.0 if body is None else body.initial_displacement for body in bodies]),
    )
    film = film_of(problem)
    # a body without mass has at least the film's own
    found = (hand_motion(problem, inputs, piece, offset, start, film, share) for share in (0.0, 1.0))
    return next((motion for motion in found if motion is not None), None)
