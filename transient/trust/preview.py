"""Does the model apply, judged before anything is solved: the validity checks on the steady flow of each instant."""

from __future__ import annotations

import numpy as np

from transient.gap.problem import LOWER, PRESSURE, UPPER, Problem
from transient.result.history import History
from transient.trust.check import Check
from transient.trust.quasi_steady import quasi_steady_mean, quasi_steady_stress, steady_profile
from transient.trust.validity import validity_checks

# Instants per smooth piece of the drive, and points across the gap: enough to see its largest values to a few per cent.
INSTANTS, ACROSS = 9, 33
# More instants than this tell nothing new of a drive that repeats itself.
MOST = 2000


def preview(problem: Problem, until: float) -> list[Check]:
    """The validity checks as far as the hand formula tells, over [0, ``until``] s.

    The solved flow can differ: it lags behind, and its stresses are larger where the drive is fast.
    """
    return validity_checks(problem, hand_history(problem, until))


def hand_history(problem: Problem, until: float) -> History:
    """The steady flow of each instant as a history; rates and travel, which the checks do not ask for, are zero."""
    inputs = problem.inputs(until)
    starts = inputs.starts
    ends = np.append(starts[1:], max(until, float(starts[-1])))
    share = np.linspace(0.0, 1.0, INSTANTS)
    offset = ((ends - starts)[:, None] * share).ravel()[:MOST]
    piece = np.repeat(np.arange(len(starts)), INSTANTS)[:MOST]
    low, up, gradient = (inputs.row(row).at(piece, offset) for row in (LOWER, UPPER, PRESSURE))
    speed = np.stack([low, up], axis=1)
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
