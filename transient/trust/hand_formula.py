"""Would the hand formula have been enough?  Its peaks (and, with bodies, its settling time) beside the answer's."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from transient.gap.problem import LOWER, PRESSURE, UPPER, Inputs, Problem
from transient.result.curve import Curve
from transient.result.history import History
from transient.trust.massless import Film, Motion, film_of, hand_motion
from transient.trust.quasi_steady import quasi_steady_gradient, quasi_steady_stress

# The hand formula is enough where it finds the peak to 5 %: common practice, no source.
ENOUGH = 0.05
# Points between neighbouring rows at which the drive is looked at for its extremes.
BETWEEN = 7
# By name: the share of the film's own inertia that moves with the body.
FORMULAS = {"massless_film": 0.0, "film_inertia": 1.0}


@dataclass(frozen=True, eq=False)
class Instants:
    """Where the hand formula is looked at: ``piece``, ``offset`` of ``inputs``, ``time`` (n,) rising."""

    inputs: Inputs
    piece: np.ndarray
    offset: np.ndarray
    time: np.ndarray


def instants(problem: Problem, history: History) -> Instants:
    """The history's rows and points between them: a drive's own extremes need not be rows."""
    inputs = problem.inputs(float(history.time[-1]))
    first = np.append(True, np.diff(history.piece) > 0)
    begins = history.time[first]
    # a run may have more pieces than its drive, as where a body stops
    own = np.searchsorted(inputs.starts, begins * (1.0 + 1e-12), side="right") - 1
    number = np.cumsum(first) - 1
    piece = own[number]
    offset = history.offset + (begins - inputs.starts[own])[number]
    same = np.flatnonzero((piece[1:] == piece[:-1]) & (np.diff(offset) > 0.0))
    inside = (np.arange(BETWEEN) + 1.0) / (BETWEEN + 1.0)
    more = (offset[same, None] + np.diff(offset)[same, None] * inside).ravel()
    pieces = np.concatenate([piece, np.repeat(piece[same], BETWEEN)])
    offsets = np.concatenate([offset, more])
    order = np.lexsort((offsets, pieces))
    pieces, offsets = pieces[order], offsets[order]
    return Instants(inputs, pieces, offsets, inputs.starts[pieces] + offsets)


def given_motion(problem: Problem, at: Instants) -> tuple[np.ndarray, np.ndarray]:
    """(speeds (n, 2), pressure drop per length (n,)) of walls and flow that are all prescribed."""
    low, up, last = (at.inputs.row(row).at(at.piece, at.offset) for row in (LOWER, UPPER, PRESSURE))
    speeds = np.stack([low, up], axis=1)
    return speeds, last if problem.flow is None else quasi_steady_gradient(problem, speeds, last)


def compare(
    problem: Problem, history: History, peaks: Mapping[str, float | None],
    bodies: Mapping[str, Mapping[str, Any]] | None = None, drop: float | None = None,
) -> dict[str, Any]:  # fmt: skip
    """Hand formula beside the answer, as in the summary: "enough", "peak_stress", "difference", "note".

    ``peaks``: wall name -> signed true peak stress in Pa, None where it is infinite (a sudden start).
    Walls that carry no stress (an axis, a shear-free surface) may be left out.  ``bodies``: their headline numbers;
    ``drop``: the true peak of a prescribed flow's pressure drop per length, None where infinite.
    """
    at = instants(problem, history)
    found: dict[str, Motion | None] = {}
    if bodies:
        film = film_of(problem)
        start = _start(problem, history)
        found = {
            name: hand_motion(problem, at.inputs, at.piece, at.offset, start, film, share)
            for name, share in FORMULAS.items()
        }
        speeds, gradient = _followed(problem, history, at, film, found["massless_film"])
    else:
        speeds, gradient = given_motion(problem, at)
    stress, difference = _walls(problem, quasi_steady_stress(problem, speeds, gradient), peaks)
    out: dict[str, Any] = {"enough": True, "peak_stress": stress, "difference": difference}
    missed = dict(difference)
    if problem.flow is not None:
        hand = float(gradient[np.abs(gradient).argmax()])
        apart = None if drop is None else _apart(hand, drop)
        out["peak_drop_per_length"], out["drop_difference"] = hand, apart
        missed["pressure drop"] = apart
    if bodies:
        out["bodies"] = _bodies(problem, at, found, peaks, bodies)
        for name, said in out["bodies"].items():
            massless = said["massless_film"]
            if massless is not None and massless["settling_difference"] is not None:
                missed[f"{name} settling"] = massless["settling_difference"]
    out["enough"] = all(d is not None and d <= ENOUGH for d in missed.values())
    out["note"] = _sentence(difference, missed)
    return out


def _start(problem: Problem, history: History) -> tuple[np.ndarray, np.ndarray]:
    return history.speed[0], history.place[0]


def _followed(
    problem: Problem, history: History, at: Instants, film: Film, massless: Motion | None
) -> tuple[np.ndarray, np.ndarray]:
    """Speeds and pressure of the massless film; of the answer itself where that formula has none."""
    if massless is not None:
        return massless.speed, massless.gradient
    speeds, _ = given_motion(problem, at)
    for end, wall in enumerate(problem.walls):
        if wall.body is not None:
            speeds[:, end] = history.speed_curve(end).sample(at.time)
    given = at.inputs.row(PRESSURE).at(at.piece, at.offset)
    return speeds, speeds @ film.pressure + film.pressure_push * given


def _walls(
    problem: Problem, hand: np.ndarray, peaks: Mapping[str, float | None]
) -> tuple[dict[str, float], dict[str, float | None]]:
    """Largest hand-formula stress of each wall, and how far it is from the true one."""
    top = hand[np.abs(hand).argmax(axis=0), [LOWER, UPPER]]
    largest = max((abs(p) for p in peaks.values() if p is not None), default=0.0)
    stress: dict[str, float] = {}
    difference: dict[str, float | None] = {}
    for index, wall in enumerate(problem.walls):
        if wall.kind == "axis" or wall.name not in peaks:
            continue
        true = peaks[wall.name]
        stress[wall.name] = float(top[index])
        # Against a peak that is round-off beside the other wall's, a relative difference says nothing.
        if true is None:
            difference[wall.name] = None
        elif abs(true) <= 1e-12 * largest or true == 0.0:
            difference[wall.name] = 0.0 if abs(top[index]) <= 1e-9 * largest else 1.0
        else:
            difference[wall.name] = _apart(float(top[index]), true)
    return stress, difference


def _apart(hand: float, true: float) -> float:
    """Relative difference; 0 where both are zero."""
    return abs(hand - true) / abs(true) if true != 0.0 else float(hand != 0.0)


def _bodies(
    problem: Problem, at: Instants, found: Mapping[str, Motion | None],
    peaks: Mapping[str, float | None], bodies: Mapping[str, Mapping[str, Any]],
) -> dict[str, Any]:  # fmt: skip
    """For each body and formula: time constant, settling time of the speed and peak stress, with the verdict."""
    out: dict[str, Any] = {}
    for end, wall in enumerate(problem.walls):
        if wall.body is None:
            continue
        out[wall.name] = {
            name: None if motion is None else _one(problem, at, motion, end, peaks.get(wall.name), bodies[wall.name])
            for name, motion in found.items()
        }
    return out


def _one(
    problem: Problem, at: Instants, motion: Motion, end: int, peak: float | None, said: Mapping[str, Any]
) -> dict[str, Any]:
    stress = quasi_steady_stress(problem, motion.speed, motion.gradient)[:, end]
    top = float(stress[np.abs(stress).argmax()])
    apart = None if peak is None else _apart(top, peak)
    settled = _settled(problem, at, motion, end, said)
    true = said["speed_settling_time"]
    late = None if settled is None or true is None else _apart(settled, true)
    return {
        "time_constant": motion.time_constant,
        "frequency": motion.frequency,
        "speed_settling_time": settled,
        "settling_difference": late,
        "peak_stress": top,
        "peak_difference": apart,
        "enough": apart is not None and apart <= ENOUGH and (late is None or late <= ENOUGH),
    }


def _settled(
    problem: Problem, at: Instants, motion: Motion, end: int, said: Mapping[str, Any]
) -> float | None:
    """Settling time of the speed by the formula, relative as the answer's own."""
    terminal = said["terminal_speed"]
    if terminal is None:
        return None
    speed, acceleration = motion.speed[:, end], motion.acceleration[:, end]
    step = np.where(np.diff(at.piece) == 0, np.diff(at.offset), 0.0)
    largest = float(np.abs(speed).max())
    size = abs(terminal) if abs(terminal) > 1e-6 * largest else largest
    if size == 0.0:
        return 0.0
    time = Curve(at.time, speed - terminal, acceleration, step).last_above(problem.settle_within * size)
    return None if np.isnan(time) else float(time)


def _sentence(difference: Mapping[str, float | None], missed: Mapping[str, float | None]) -> str:
    infinite = [name for name, d in difference.items() if d is None]
    if infinite:
        return f"a sudden start has no finite peak on the {' or '.join(infinite)} wall, which the hand formula misses"
    if not missed:
        return "no wall carries a stress"
    if any(d is None for d in missed.values()):
        return "a sudden change has no finite pressure peak, which the hand formula misses"
    name, worst = max(missed.items(), key=lambda item: item[1] or 0.0)
    settles = len(missed) > len(difference) and any(name.endswith("settling") for name in missed)
    if worst is not None and worst <= ENOUGH:
        but = " and settling time" if settles else ""
        after = "" if settles else ", but not how long the flow takes"
        return f"the hand formula finds every peak{but} within {100 * worst:.2g} %{after}"
    if name in difference:
        return f"the hand formula misses the peak on the {name} wall by {100 * (worst or 0.0):.3g} %"
    return f"the hand formula misses the {name} by {100 * (worst or 0.0):.3g} %"
