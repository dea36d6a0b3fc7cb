"""Pressure waves: is the pressure drop uniform along the gap while it changes?"""

from __future__ import annotations

import numpy as np

from transient.gap.problem import PRESSURE, Problem
from transient.result.history import History
from transient.trust.check import Check, judge
from transient.trust.validity.motion import GAS_BELOW

# Slowest usual speed of sound: 1000 to 1500 m/s in liquids (common practice, no source); air 340 m/s (from memory).
LIQUID, GAS = 1000.0, 340.0
CAUTION, LIMIT = 0.1, 1.0
SOURCE = "sound at 1000 m/s in liquids (1000 to 1500) and 340 m/s in gases; a tenth: common practice, no source"


def rise_time(problem: Problem, until: float) -> float | None:
    """Swing of the pressure drop (of a prescribed flow) over its steepest rate, s; 0 with a jump, None where it is
    constant."""
    row = problem.inputs(until).row(PRESSURE)
    if np.any(row.jumps() != 0.0):
        return 0.0
    ends = np.append(row.starts[1:], max(until, float(row.starts[-1])))
    piece = np.repeat(np.arange(len(row.starts)), 17)
    offset = (np.linspace(0.0, 1.0, 17) * (ends - row.starts)[:, None]).ravel()
    steepest = float(np.abs(row.at(piece, offset, 1)).max())
    return float(np.ptp(row.at(piece, offset))) / steepest if steepest > 0.0 else None


def moving_time(history: History) -> float | None:
    """Swing of a wall's speed over its largest rate, s, of the faster wall; None where none changes."""
    swing = np.ptp(history.speed, axis=0)
    # where the stress is infinite so is the rate, for no time at all
    fastest = np.where(np.isnan(history.stress), 0.0, np.abs(history.acceleration)).max(axis=0)
    times = [float(s / f) for s, f in zip(swing, fastest, strict=True) if f > 0.0 and s > 0.0]
    return min(times, default=None)


def pressure_wave(problem: Problem, history: History) -> Check | None:
    """Time of a pressure wave along the length over the slower of the drive's change and the gap's response."""
    if problem.length is None or problem.rotating:
        return None
    rise = rise_time(problem, float(history.time[-1]))
    if problem.flow is not None:
        # the pressure answers to the walls as well
        rise = min((time for time in (rise, moving_time(history)) if time is not None), default=None)
    if rise is None:
        return None
    sound = GAS if problem.density < GAS_BELOW else LIQUID
    value = problem.length / sound / max(rise, problem.diffusion_time)
    status = judge(value, CAUTION, LIMIT)
    words = {
        "pass": "pressure waves cross the length far faster than the flow changes",
        "caution": "pressure waves take a noticeable part of the time in which the flow changes",
        "fail": "pressure waves are slower than the flow's change; the pressure drop is not uniform along the gap",
    }
    return Check("pressure-wave time", "validity", status, value, LIMIT, SOURCE, words[status])
