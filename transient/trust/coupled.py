"""What bodies and a prescribed flow make results, against the exact solution: motion of the walls and pressure."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from transient.gap.problem import Inputs, Problem
from transient.march.rates import accelerations
from transient.result.curve import Curve
from transient.result.driven import body_acceleration, body_place, body_speed
from transient.result.history import History
from transient.series.coupled import ClosedSolution
from transient.series.orbit import ClosedDeviation

Look = Callable[[np.ndarray, np.ndarray], tuple[np.ndarray, np.ndarray]]

ROUNDING = 1e-13  # of the largest value
BETWEEN_MARGIN = 1.25  # where the march only interpolates: the looks are not quite where it errs most
_COLUMN = {"speed": 0, "acceleration": 2, "place": 4, "gradient": 6}  # of ``ClosedSolution.motion``, the lower wall's


def motion_errors(
    problem: Problem, inputs: Inputs, history: History, exact: ClosedSolution
) -> dict[str, np.ndarray]:
    """``Errors.more`` on the history's rows: |march - series| + bound at the rows, and between them beside each."""
    rows = len(history.time)
    out = {"speed": np.zeros((rows, 2)), "acceleration": np.zeros((rows, 2)), "place": np.zeros((rows, 2))}
    out["gradient"] = np.zeros(rows)
    curves: dict[tuple[str, int], Curve] = {}
    for end, wall in enumerate(problem.walls):
        if wall.body is None:
            continue
        curves["speed", end] = body_speed(history, end)
        curves["place", end] = body_place(history, end)
        curves["acceleration", end] = body_acceleration(history, *accelerations(problem, inputs, history, end))
    if problem.flow is not None:
        curves["gradient", 0] = history.gradient_curve()
    found = _errors(history, exact.motion, list(curves.values()), [_COLUMN[name] + end for name, end in curves])
    for (name, end), error in zip(curves, found.T, strict=True):
        if name == "gradient":
            out[name] = error
        else:
            out[name][:, end] = error
    return out


def speed_errors(problem: Problem, history: History, exact: ClosedSolution | ClosedDeviation) -> np.ndarray:
    """Errors (n, 2) of the bodies' speeds alone, at the history's rows and between them."""
    out = np.zeros((len(history.time), 2))
    bodies = [end for end, wall in enumerate(problem.walls) if wall.body is not None]
    if bodies:
        out[:, bodies] = _errors(history, exact.speeds, [body_speed(history, end) for end in bodies], bodies)
    return out


def _errors(history: History, look: Look, curves: list[Curve], columns: list[int]) -> np.ndarray:
    """Errors (n, c) of ``curves`` against ``columns`` of the exact ``look``."""
    inside = np.flatnonzero(history.step > 0.0)
    # right after a break the cubic is a parabola, and misses most at 0.36 of the step
    first = history.offset[inside] == 0.0
    looks = [np.where(first, early, share) for early, share in ((0.15, 0.25), (0.36, 0.5), (0.7, 0.75))]
    piece = np.concatenate([history.piece, *(history.piece[inside] for _ in looks)])
    passed = [history.offset[inside] + curves[0].passed(inside, share) for share in looks]
    true, bound = look(piece, np.concatenate([history.offset, *passed]))
    out = []
    for curve, column in zip(curves, columns, strict=True):
        value = np.concatenate([curve.value, *(curve.at(inside, share) for share in looks)])
        error = _beside(_off(value, true[:, column], bound[:, column]), inside, len(history.time))
        out.append(np.where(np.isfinite(curve.value), error, 0.0))
    return np.stack(out, axis=1)


def _off(value: np.ndarray, true: np.ndarray, bound: np.ndarray) -> np.ndarray:
    """Errors (m,), 0 where the march itself says infinite."""
    finite = np.isfinite(value)
    size = np.median(np.abs(value[finite])) if finite.any() else 0.0
    with np.errstate(invalid="ignore"):
        off = np.abs(value - true) + bound
    off = np.where(np.isfinite(off), off + ROUNDING * (size + np.abs(np.where(finite, value, 0.0))), np.inf)
    return np.where(finite, off, 0.0)


def _beside(off: np.ndarray, inside: np.ndarray, rows: int) -> np.ndarray:
    """Errors at the rows (n,), each at least those towards its neighbours; ``off`` holds rows, then looks."""
    out, between = off[:rows].copy(), BETWEEN_MARGIN * off[rows:].reshape(-1, len(inside)).max(axis=0, initial=0.0)
    out[inside] = np.maximum(out[inside], between)
    out[inside + 1] = np.maximum(out[inside + 1], between)
    return out
