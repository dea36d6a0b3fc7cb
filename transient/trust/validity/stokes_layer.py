"""Stokes-layer Reynolds number: is the layer at an oscillating wall, or under an oscillating flow, laminar?"""

from __future__ import annotations

import math

import numpy as np

from transient.gap.problem import UPPER, Problem
from transient.result.history import History
from transient.trust.check import Check, judge
from transient.trust.validity.motion import relative_mean

TURBULENT, DISTURBED = 500.0, 85.0
SOURCE = (
    "turbulence from about 500: Vittori & Verzicco, JFM 371 (1998) 207; passing disturbances from 85: "
    "Blondeaux & Vittori 2021"
)


def _amplitude(values: np.ndarray) -> float:
    return 0.5 * float(np.ptp(values, axis=0).max())


def stokes_layer(problem: Problem, history: History) -> Check | None:
    """U sqrt(2 nu/omega)/nu for periodic drives whose layer is thinner than the gap (else the gap's own number rules).

    U is half the swing of the wall speeds or of the mean flow against them; omega belongs to the longest period.
    """
    periods = [drive.eventual.period for drive in problem.drives]
    periods = [period for period in periods if period is not None]
    if not periods:
        return None
    kinematic = problem.viscosity / problem.density
    layer = math.sqrt(kinematic * max(periods) / math.pi)
    if layer >= problem.gap:
        return None
    speed = history.speed[:, UPPER:] if problem.walls[0].kind == "axis" else history.speed
    radii = np.array([problem.inner, problem.outer]) if problem.rotating else np.ones(speed.shape[1])
    swing = _amplitude(speed * radii)
    if not problem.rotating:
        swing = max(swing, _amplitude(relative_mean(problem, history)[:, None]))
    value = swing * layer / kinematic
    status = judge(value, DISTURBED, TURBULENT)
    words = {
        "pass": "the oscillating layer stays laminar",
        "caution": "disturbances may grow for part of each cycle in the oscillating layer",
        "fail": "the oscillating layer may be turbulent; the answer does not apply",
    }
    return Check("Stokes-layer Reynolds number", "validity", status, value, TURBULENT, SOURCE, words[status])
