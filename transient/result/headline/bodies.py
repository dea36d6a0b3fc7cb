"""Bodies on walls: how fast they get, when they have settled, what drives and what resists them, how far they coast."""

from __future__ import annotations

from typing import Any

import numpy as np

from transient.result.curve import Curve
from transient.result.driven import body_acceleration, body_place, body_speed
from transient.result.headline.settling import Judge
from transient.result.run import ZERO, BodyFacts, Run


def bodies(run: Run) -> dict[str, Any]:
    """Summary of every wall that carries a body, by the wall's name; m/s and N, or rad/s and N m where rotating."""
    names = {wall.end: wall.name for wall in run.walls}
    return {names[body.end]: _body(run, body) for body in run.bodies}


def _body(run: Run, body: BodyFacts) -> dict[str, Any]:
    from transient.result.headline import plain

    history, end = run.history, body.end
    speed = body_speed(history, end)
    fastest, fastest_at = speed.magnitude()
    infinite = bool(np.isnan(body.acceleration).any())
    quickest, quickest_at = body_acceleration(history, body.acceleration, body.jerk).magnitude()
    settled, spread, grazes = _settling(run, body)
    return {
        "terminal_speed": None if body.terminal is None else body.terminal + 0.0,  # never -0
        "speed_settling_time": settled,
        "speed_settling_error": spread,
        "speed_settling_grazes": grazes,
        "final_speed": float(history.speed[-1, end]),
        "final_speed_error": _error(run, "speed", end, -1),
        "final_position": float(history.place[-1, end]),
        "final_position_error": _error(run, "place", end, -1),
        "peak_speed": fastest,
        "peak_speed_time": fastest_at,
        "peak_speed_error": _beside(run, "speed", end, fastest_at),
        "peak_acceleration": None if infinite else plain(quickest),
        "peak_acceleration_time": None if infinite else plain(quickest_at),
        "peak_acceleration_error": None if infinite else _beside(run, "acceleration", end, quickest_at),
        **_drive(run, body, speed),
        **_film(run, body),
        "coast_down": _coast_down(run, body),
        "standstills": _standstills(run, body),
        "error_kind": run.errors.kind,
    }


def _error(run: Run, name: str, end: int, row: int) -> float | None:
    error = run.errors.more.get(name)
    return None if error is None else float(error[row, end])


def _beside(run: Run, name: str, end: int, time: float) -> float | None:
    """Largest error of the rows beside a time."""
    error = run.errors.more.get(name)
    if error is None:
        return None
    near = np.clip(np.searchsorted(run.history.time, time) + np.arange(-1, 2), 0, len(error) - 1)
    return float(error[near, end].max())


def _settling(run: Run, body: BodyFacts) -> tuple[float | None, float | None, bool]:
    """(time, error, whether the speed runs along the band).

    Within the settling fraction of the speed it ends in, of its peak where that is zero.
    """
    away = run.regime.deviation
    error = run.errors.more.get("level_speed")
    if away is None or body.size is None:
        return None, None, False
    peak = abs(body_speed(run.history, body.end).magnitude()[0])
    size = body.size if body.size > ZERO * peak else peak
    known = np.zeros(len(away.time)) if error is None else error[:, body.end]
    judge = Judge(body_speed(away, body.end), known, size)
    time = judge.time(run.settle_within)
    if error is None:
        return time, None, False
    spread = judge.spread(run.settle_within, time)
    return time, spread, judge.grazes(run.settle_within, time, spread)


def _drive(run: Run, body: BodyFacts, speed: Curve) -> dict[str, Any]:
    """Largest load and power of the drive: load history, weight and force-speed curve together."""
    history = run.history
    value, rate = speed.value, speed.rate
    load = body.load + body.curve_load(value)
    slope = body.curve_slope(value)
    changes = body.load_rate + slope * np.where(np.isfinite(rate), rate, 0.0)
    force = Curve(history.time, load, changes, history.step)
    power = Curve(history.time, load * value, changes * value + load * rate, history.step)
    peak, at = max(force.magnitude(), *_at_corners(run, body, speed), key=lambda found: abs(found[0]))
    strongest, strongest_at = power.magnitude()
    error = _beside(run, "speed", body.end, at)
    return {
        "peak_drive_load": peak,
        "peak_drive_load_time": at,
        "peak_drive_load_error": None if error is None else float(np.abs(slope).max()) * error,
        "peak_drive_power": strongest,
        "peak_drive_power_time": strongest_at,
    }


def _at_corners(run: Run, body: BodyFacts, speed: Curve) -> list[tuple[float, float]]:
    """(load, time) where the speed first passes a corner of the curve: a peak there lies between rows."""
    load = Curve(speed.time, body.load, body.load_rate, speed.step)
    out = [(0.0, 0.0)]
    for corner, value in zip(*body.curve, strict=True):
        sign = 1.0 if corner >= speed.value[0] else -1.0
        time = speed.first_at(sign * float(corner), sign)
        if np.isfinite(time):
            out.append((float(load.sample(np.array([time]))[0] + value), time))
    return out


def _film(run: Run, body: BodyFacts) -> dict[str, Any]:
    """Largest load of the film on the body, and of the pressure on a face that displaces fluid."""
    history = run.history
    infinite = run.unbounded[body.end] > 0.0
    peak, at = history.stress_curve(body.end).magnitude()
    out: dict[str, Any] = {
        "peak_film_load": None if infinite else body.grip * peak,
        "peak_film_load_time": float(run.unbounded_time[body.end]) if infinite else at,
        "peak_film_load_error": None if infinite else body.grip * float(run.errors.peak[body.end]),
        "film_load_unbounded": bool(infinite),
    }
    if body.face:
        push, push_at = history.gradient_curve().magnitude()
        sudden = run.pressure_jump is not None
        out["peak_pressure_load"] = None if sudden else body.face * push
        out["peak_pressure_load_time"] = run.pressure_jump if sudden else push_at
    return out


def _coast_down(run: Run, body: BodyFacts) -> dict[str, Any] | None:
    """Time and distance from where the drive ends until the speed stays within the settling fraction, of its value
    at that instant, of where it ends; None where the drive does not end while the body moves."""
    begin, history, end = body.released, run.history, body.end
    if begin is None:
        return None
    first = int(np.searchsorted(history.time, begin, side="right")) - 1
    speed = float(history.speed[first, end])
    if speed == 0.0:
        return None
    left = slice(first, None)
    curve = Curve(
        history.time[left], history.speed[left, end] - (body.terminal or 0.0), history.acceleration[left, end],
        history.step[first:], history.offset[first:-1],
    )  # fmt: skip
    error = run.errors.more.get("speed")
    known = np.zeros(len(curve.time)) if error is None else error[left, end]
    judge = Judge(curve, known, abs(curve.value[0]))
    stop = judge.time(run.settle_within)
    out: dict[str, Any] = {
        "begins": begin, "speed": speed, "time": None, "time_error": None, "distance": None, "distance_error": None,
        "within": run.settle_within, "grazes": False,
    }  # fmt: skip
    if stop is None:
        return out
    place = body_place(history, end)
    there = float(place.sample(np.array([stop]))[0])
    out["time"], out["distance"] = stop - begin, there - float(history.place[first, end])
    if error is not None:
        late = judge.spread(run.settle_within, stop) or 0.0
        out["time_error"], out["grazes"] = late, judge.grazes(run.settle_within, stop, late)
        moved = [_error(run, "place", end, first), _beside(run, "place", end, stop)]
        slow = run.settle_within * judge.size + abs(body.terminal or 0.0)
        out["distance_error"] = sum(part for part in moved if part is not None) + slow * late
    return out


def _standstills(run: Run, body: BodyFacts) -> list[list[float | None]]:
    """[from, to] s during which dry friction holds the body; ``to`` None where it does to the end."""
    if not body.sticks:
        return []
    history = run.history
    still = history.speed[:, body.end] == 0.0
    edges = np.diff(np.concatenate([[0], still.astype(int), [0]]))
    begins, ends = np.flatnonzero(edges == 1), np.flatnonzero(edges == -1) - 1
    last = len(still) - 1
    return [
        [float(history.time[i]), None if j == last else float(history.time[j])]
        for i, j in zip(begins, ends, strict=True)
        if history.time[j] > history.time[i]
    ]
